"""A response that can be searched: its extremes, its local maxima, where it falls through a level.

The grid grows from the poles and zeros of the response itself, so that no resonance falls between two points however
sharp it is; what is found on it is then polished far below 1e-6 in frequency.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.network import CircuitError, ComplexArray, FloatArray, Network, Parameter
from reactance.analysis.circuit.search import bracketed_root, polish
from reactance.analysis.circuit.system import NEAR_INFINITY, NEAR_ZERO, System

_PER_DECADE = 12
_BLIND_PER_DECADE = 150  # where measured data without a fit hides the poles
_CANDIDATES = 4


class Response:
    """Voltage at `probe` per unit of `source` over frequency, for one or (with `values` (V, P)) many sets of values.

    Results are arrays (V,) and (V, F), with V = 1 without `values`. Where something does not exist the answer is NaN.
    `family`, of the same network and parameters, lets many responses share what they have in common.
    """

    def __init__(
        self,
        network: Network,
        source: str,
        probe: str | tuple[str, str],
        *,
        parameters: Sequence[Parameter] = (),
        values: ArrayLike | None = None,
        family: Family | None = None,
    ) -> None:
        grid = None if values is None else np.asarray(values, float)
        self.source = source
        self.family = family or Family(network, parameters)
        self.system = self.family.system(grid, over_time=False)
        self.probe = self.system.probe(probe)
        self.system.drive(source)
        self._values = grid
        self._rates: FloatArray | None = None

    def at(self, frequencies: ArrayLike) -> ComplexArray:
        """H (V, F) at frequencies (F,) in Hz."""
        return self._at(np.atleast_1d(np.asarray(frequencies, float))[None, :])

    def size_at(self, frequency: float) -> FloatArray:
        """|H| (V,) at one frequency in Hz."""
        return np.asarray(np.abs(self.at(frequency))[:, 0])

    def grid(self, low: float, high: float) -> FloatArray:
        """Frequencies from `low` to `high` between which the response holds no surprise, (F,)."""
        return np.unique(self._grid(low, high))

    def greatest(self, low: float, high: float) -> tuple[FloatArray, FloatArray]:
        """Where |H| is greatest in [low, high], and how great."""
        return self._extreme(low, high, 1.0)

    def least(self, low: float, high: float) -> tuple[FloatArray, FloatArray]:
        """Where |H| is least in [low, high], and how small."""
        return self._extreme(low, high, -1.0)

    def local_maxima(self, low: float, high: float) -> tuple[tuple[float, float], ...]:
        """Every local maximum strictly inside (low, high): (frequency, |H|), by frequency. Not for a batch."""
        if self.system.count != 1:
            raise ValueError("local maxima are listed for one set of values")
        f = self._grid(low, high)
        size = np.abs(self._at(f))
        inside = _inside_peaks(size)
        choice = np.flatnonzero(inside[0])[None, :]
        if not choice.size:
            return ()
        at, top = self._polish(f, size, choice, 1.0)
        return tuple((float(x), float(y)) for x, y in zip(at[0], top[0], strict=True))

    def greatest_local_maximum(self, low: float, high: float) -> tuple[FloatArray, FloatArray]:
        """The greatest local maximum strictly inside (low, high); NaN where there is none."""
        f = self._grid(low, high)
        size = np.abs(self._at(f))
        score = np.where(_inside_peaks(size), size, -np.inf)
        choice = np.argsort(-score, axis=1)[:, :_CANDIDATES]
        at, top = self._polish(f, size, choice, 1.0)
        top = np.where(np.isfinite(np.take_along_axis(score, choice, 1)), top, -np.inf)
        rows, best = np.arange(len(f)), top.argmax(axis=1)
        none = np.isneginf(top[rows, best])
        return np.where(none, np.nan, at[rows, best]), np.where(none, np.nan, top[rows, best])

    def falls_through(
        self, level: ArrayLike, from_frequency: ArrayLike, direction: Literal["up", "down"], until: float
    ) -> FloatArray:
        """Going from `from_frequency` up or down to `until`, where |H| first falls through `level`.

        `level` and `from_frequency` may be (V,). NaN where it does not.
        """
        count = self.system.count
        start = np.broadcast_to(np.asarray(from_frequency, float), (count,))
        levels = np.broadcast_to(np.asarray(level, float), (count,))
        f = self._between(start, until)
        if direction == "down":
            f = f[:, ::-1]
        size = np.abs(self._at(f))
        f, size = self._with_dips(f, size)
        low = size < levels[:, None]
        rows = np.arange(count)
        first = low.argmax(axis=1)
        exists = low.any(axis=1) & (first > 0)
        a = f[rows, np.maximum(first - 1, 0)]
        b = f[rows, first]
        found = self._cross(a, b, levels)
        return np.where(exists, found, np.nan)

    # within

    def _at(self, f: FloatArray) -> ComplexArray:
        return evaluate(self.system, self.source, self.probe, f)

    def _own_rates(self) -> FloatArray:
        """Complex poles and zeros (V, n) as real pairs, (2, V, n): rate in rad/s and damping; n = 0 if unknown."""
        if self._rates is None:
            try:
                found = self.family.poles(self._values), self.family.zeros(self._values, self.source, self.probe)
                roots = np.concatenate([one.roots for one in found], axis=1)
            except CircuitError:
                roots = np.zeros((self.system.count, 0), complex)
            sharp = (np.abs(roots.imag) > 0.5 * np.abs(roots.real)) & (roots.imag > 0)
            kept = sharp.any(axis=0)
            rate = np.where(sharp, np.abs(roots), np.nan)[:, kept]
            self._rates = np.stack([rate, np.abs(roots.real)[:, kept]])
        return self._rates

    def _grid(self, low: float, high: float) -> FloatArray:
        return self._between(np.full(self.system.count, float(low)), float(high))

    def _between(self, start: FloatArray, until: float) -> FloatArray:
        """A grid (V, F), ascending, from each start to `until` (either may be the lower)."""
        low, high = np.minimum(start, until), np.maximum(start, until)
        rate, damping = self._own_rates()
        blind = self.system.measured and not rate.shape[1]
        per_decade = _BLIND_PER_DECADE if blind else _PER_DECADE
        floor = np.maximum(low, high * 1e-15)
        decades = float(np.log10(high / floor).max())
        share = np.linspace(0.0, 1.0, max(3, int(np.ceil(decades * per_decade)) + 1))
        base = floor[:, None] * (high / floor)[:, None] ** share
        base[:, 0], base[:, -1] = low, high
        found = [base]
        offsets = np.array([-6.0, -3.0, -1.5, -0.75, -0.375, 0.0, 0.375, 0.75, 1.5, 3.0, 6.0])
        for i in range(rate.shape[1]):
            width = np.maximum(damping[:, i], 1e-9 * rate[:, i])
            near = (rate[:, i, None] + offsets * width[:, None]) / (2.0 * np.pi)
            found.append(np.where(near > 0, near, np.nan))
        f = np.concatenate(found, axis=1)
        f = np.where(np.isnan(f), low[:, None], f)
        return np.sort(np.clip(f, low[:, None], high[:, None]), axis=1)

    def _extreme(self, low: float, high: float, sign: float) -> tuple[FloatArray, FloatArray]:
        f = self._grid(low, high)
        size = sign * np.abs(self._at(f))
        padded = np.pad(size, ((0, 0), (1, 1)), constant_values=-np.inf)
        peak = (size >= padded[:, :-2]) & (size >= padded[:, 2:]) & _distinct(f)
        choice = np.argsort(np.where(peak, -size, np.inf), axis=1)[:, :_CANDIDATES]
        at, top = self._polish(f, sign * size, choice, sign)
        rows = np.arange(len(f))
        best = (sign * top).argmax(axis=1)
        return at[rows, best], top[rows, best]

    def _polish(
        self, f: FloatArray, size: FloatArray, choice: NDArray[np.intp], sign: float
    ) -> tuple[FloatArray, FloatArray]:
        return polish(lambda x: np.abs(self._at(x)), f, size, choice, sign, 3e-8)

    def _cross(self, a: FloatArray, b: FloatArray, level: FloatArray) -> FloatArray:
        """Where |H| passes `level` between a (above) and b (below), (V,), in log frequency."""

        def above(x: FloatArray) -> FloatArray:
            size = np.abs(self._at(np.exp(x)[:, None]))[:, 0]
            return np.asarray(np.log(np.maximum(size, 1e-300) / level))

        return np.exp(bracketed_root(above, np.log(np.maximum(a, 1e-300)), np.log(np.maximum(b, 1e-300))))

    def _with_dips(self, f: FloatArray, size: FloatArray) -> tuple[FloatArray, FloatArray]:
        """The grid with its local minima polished in, so that a notch is seen for what it is."""
        dip = _inside_peaks(-size)
        number = int(dip.sum(axis=1).max(initial=0))
        if not number:
            return f, size
        choice = np.argsort(~dip, axis=1, kind="stable")[:, :number]
        ascending = f[0, 0] <= f[0, -1]
        grid, heights = (f, size) if ascending else (f[:, ::-1], size[:, ::-1])
        if not ascending:
            choice = f.shape[1] - 1 - choice
        at, low = self._polish(grid, heights, choice, -1.0)
        f, size = np.concatenate([f, at], axis=1), np.concatenate([size, low], axis=1)
        order = np.argsort(f if ascending else -f, axis=1, kind="stable")
        return np.take_along_axis(f, order, 1), np.take_along_axis(size, order, 1)


def _distinct(f: FloatArray) -> NDArray[np.bool_]:
    """The first of equal frequencies: points clipped to an end of the grid are one candidate, not many."""
    return np.concatenate([np.ones((len(f), 1), bool), f[:, 1:] > f[:, :-1]], axis=1)


def _inside_peaks(size: FloatArray) -> NDArray[np.bool_]:
    """Local maxima (V, F) with a lower point on either side, ends excluded; of a plateau, its first point."""
    peak = np.zeros(size.shape, bool)
    rise = size[:, 1:-1] > size[:, :-2] * (1.0 + 1e-12 * np.sign(size[:, :-2]))
    peak[:, 1:-1] = rise & (size[:, 1:-1] >= size[:, 2:])
    return peak


def evaluate(system: System, source: str, probe: tuple[str, str], frequencies: FloatArray) -> ComplexArray:
    """The response (V, F) at `frequencies` (V or 1, F) in Hz, with the limits at 0 and inf."""
    rates = np.clip(2.0 * np.pi * frequencies, NEAR_ZERO, NEAR_INFINITY)
    answer = system.respond(np.asarray(1j * rates), system.drive(source), probe)
    at_limit = np.broadcast_to((rates == NEAR_ZERO) | (rates == NEAR_INFINITY), answer.shape)
    return np.where(at_limit, _limit(answer), answer) if at_limit.any() else answer


def _limit(answer: ComplexArray) -> ComplexArray:
    """At an end of the frequency axis a response is real, zero or unbounded."""
    size = np.abs(answer)
    real = np.where(size > 1e20, np.inf, np.where(size < 1e-20, 0.0, answer.real))
    return np.asarray(real, complex)
