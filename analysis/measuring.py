"""A block under one question, for many sets of values at once: its responses, and the band of a measure over them.

A measure takes responses for V sets of values and returns V figures; the band is the extremes that
`circuit.spread` finds over the ranges of the uncertain attributes.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from functools import cached_property

import numpy as np
from msgspec.structs import replace

from reactance.analysis.blocks import Block
from reactance.analysis.circuit.modal import PoleResidue, pole_residue
from reactance.analysis.circuit.network import ComplexArray, FloatArray, Parameter
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.spread import FINER, monte_carlo, spread
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import TimeResponse, step
from reactance.analysis.values import Value, banded

MOST_NAMED = 3
LEAST_SHARE = 0.05
ROUGH = 2e-4  # share to which a rough measure is exact
SEED = 1  # of every Monte Carlo run: the same board gives the same yield


def band(
    measure: Callable[[FloatArray], FloatArray],
    parameters: Sequence[Parameter],
    unit: str,
    note: str,
    missing: str,
    finer: float = FINER,
    samples: int = 0,
) -> Value:
    """Nominal and extremes of `measure` ((V, P) to (V,)) over `parameters`; NaN or infinity means `missing`.

    `samples` > 0 adds as many figures of a repeatable Monte Carlo run, every parameter uniform in its range.
    """
    if not parameters:
        nominal = float(measure(np.empty((1, 0)))[0])
        value = banded(nominal, nominal, nominal, unit, note, missing)
        return replace(value, samples=(nominal,) * samples) if samples and value.known else value
    found = spread(measure, parameters, finer=finer)
    value = banded(found.nominal, found.low, found.high, unit, note, missing)
    if not value.known:
        return value
    value = _with_shares(value, found.shares, parameters)
    if finer != FINER:
        rows = ([p.nominal for p in parameters], found.at_low.tolist(), found.at_high.tolist())
        value = replace(value, at=tuple(map(tuple, rows)))
    if samples:
        value = replace(value, samples=tuple(monte_carlo(measure, parameters, samples, SEED).tolist()))
    return value


def _with_shares(value: Value, shares: FloatArray, parameters: Sequence[Parameter]) -> Value:
    """Name the parts that move the figure most."""
    by_part: dict[str, float] = {}
    for parameter, share in zip(parameters, np.abs(shares), strict=True):
        if np.isfinite(share):
            by_part[parameter.name] = by_part.get(parameter.name, 0.0) + float(share)
    total = sum(by_part.values())
    if total <= 0:
        return value
    ranked = sorted(by_part.items(), key=lambda item: -item[1])[:MOST_NAMED]
    named = tuple((name, share / total) for name, share in ranked if share / total >= LEAST_SHARE)
    return replace(value, matters=named)


class Measuring:
    """One block excited by `source` and observed at `probe`. `sign` −1 turns a load's response into impedance."""

    def __init__(self, block: Block, source: str, probe: str, sign: float = 1.0) -> None:
        self.block, self.source, self.probe, self.sign = block, source, probe, sign
        self.parameters = block.parameters
        self._modes: dict[bytes, PoleResidue] = {}
        self._responses: dict[bytes, Response] = {}

    @cached_property
    def nominal(self) -> FloatArray:
        """The nominal values as one row (1, P)."""
        return np.array([[parameter.nominal for parameter in self.parameters]])

    def at(self, values: FloatArray, frequencies: FloatArray) -> ComplexArray:
        """The response (V, F) for each row of `values` (V, P) at `frequencies` (F,) in Hz."""
        found = frequency_response(
            self.block.network, self.source, self.probe, frequencies,
            parameters=self.parameters, values=values, family=self.block.family,
        )  # fmt: skip
        return np.asarray(self.sign * found)

    def response(self, values: FloatArray) -> Response:
        """The frequency response for each row of `values`, ready to be searched."""
        key = values.tobytes()
        if key not in self._responses:
            self._responses[key] = Response(
                self.block.network, self.source, self.probe,
                parameters=self.parameters, values=values, family=self.block.family,
            )  # fmt: skip
        return self._responses[key]

    def modes(self, values: FloatArray) -> PoleResidue:
        """Poles and residues for each row of `values`."""
        key = values.tobytes()
        if key not in self._modes:
            found = pole_residue(
                self.block.network, self.source, self.probe,
                parameters=self.parameters, values=values, family=self.block.family,
            )  # fmt: skip
            self._modes[key] = found.scaled(self.sign) if self.sign != 1.0 else found
        return self._modes[key]

    def step(self, values: FloatArray) -> TimeResponse:
        """The step response for each row of `values`."""
        return step(self.modes(values))

    def swept(self, measure: Callable[[Response], FloatArray], unit: str, note: str, missing: str) -> Value:
        """The band of a measure of frequency responses."""
        return self._band(lambda values: measure(self.response(values)), unit, note, missing)

    def modal(
        self,
        measure: Callable[[PoleResidue], FloatArray],
        unit: str,
        note: str,
        missing: str,
        rough: Callable[[PoleResidue], FloatArray] | None = None,
    ) -> Value:
        """The band of a measure of poles and residues.

        Where `rough` is given it finds which sets of values are extreme; the figures there are those of `measure`.
        """
        if rough is None or not self.parameters:
            return self._band(lambda values: measure(self.modes(values)), unit, note, missing)
        value = self._band(lambda values: rough(self.modes(values)), unit, note, missing, ROUGH)
        if not value.known or not value.at:
            return value
        figures = measure(self.modes(np.array(value.at)))
        return replace(
            value, nominal=float(figures[0]), low=float(figures.min()), high=float(figures.max()), at=()
        )

    def stepped(self, measure: Callable[[TimeResponse], FloatArray], unit: str, note: str, missing: str) -> Value:
        """The band of a measure of step responses."""
        return self._band(lambda values: measure(self.step(values)), unit, note, missing)

    def _band(
        self,
        measure: Callable[[FloatArray], FloatArray],
        unit: str,
        note: str,
        missing: str,
        finer: float = FINER,
    ) -> Value:
        return band(measure, self.parameters, unit, note, missing, finer, self.block.samples)

    def frequency_grid(self, low: float, high: float, points: int) -> FloatArray:
        """Frequencies in Hz for drawing: even on a logarithmic axis, and closer about every resonance between."""
        grid = [np.geomspace(low, high, points)]
        poles = self.modes(self.nominal).poles[0]
        for pole in poles[(poles.imag > 0) & (np.abs(poles.real) < np.abs(poles.imag))]:
            centre, width = abs(pole) / (2 * np.pi), abs(pole.real) / (2 * np.pi)
            around = centre + width * np.linspace(-6.0, 6.0, 41)
            grid.append(around[(around > low) & (around < high)])
        return np.unique(np.concatenate(grid))


def time_grid(response: TimeResponse, points: int, at_least: float) -> FloatArray:
    """Times in s for drawing a response that settles, by its first set of values: until 1 % of its motion is left.

    Half the points are even in time, half in its logarithm, so that early swings show as well as the end.
    """
    final = np.asarray(response.final)
    motion = response.peak(final)
    settled = np.asarray(response.settling_time(0.01 * np.asarray(motion.size)))[0]
    far = np.asarray(response.peak().time)[0]
    ends = [end for end in (1.25 * float(settled), 3.0 * float(far), 3.0 * at_least) if np.isfinite(end)]
    end = max(ends, default=0.0) or 1e-9
    return np.unique(np.concatenate([np.linspace(0.0, end, points // 2), np.geomspace(end * 1e-5, end, points // 2)]))
