"""How an output settles when power comes on: all sources step from 0 to their DC level, every capacitor empty."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import cached_property

import msgspec
import numpy as np

from reactance.analysis.blocks import Block
from reactance.analysis.brief_tables import CouplingTable, SettleTable
from reactance.analysis.circuit.charge import ChargeLaw
from reactance.analysis.circuit.network import Capacitor, CircuitError, FloatArray, Network
from reactance.analysis.circuit.spread import spread
from reactance.analysis.circuit.start import StartMotion, large_signal_start
from reactance.analysis.circuit.transient import TimeResponse, start_response
from reactance.analysis.elements import across
from reactance.analysis.measuring import band
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Curve, LimitLine
from reactance.analysis.reuse import Results
from reactance.analysis.values import Value, unknown

POINTS = 400
ENDLESS = "the output does not settle"
FOLLOWS = "capacitance follows its voltage, charge conserved"
TOLERANCE = 1e-8


class Start:
    """The start of one path for sets of values, each solved once."""

    def __init__(self, networks: SignalNetworks) -> None:
        self.networks = networks
        self.block = without_inductance(networks.start)
        self.parameters = self.block.parameters
        self._known: dict[bytes, TimeResponse] = {}
        self._large: dict[bytes, StartMotion] = {}

    def response(self, values: FloatArray) -> TimeResponse:
        """v_to(t) in volts for each row of `values` (V, P), every capacitance as at the operating point."""
        key = values.tobytes()
        if key not in self._known:
            self._known[key] = start_response(
                self.block.network, self.networks.probe,
                parameters=self.parameters, values=values, family=self.block.family,
            )  # fmt: skip
        return self._known[key]

    @cached_property
    def biased(self) -> dict[str, tuple[CapacitorModel, float]]:
        """Capacitors of the start that lose capacitance to their DC voltage, with that voltage in volts."""
        found: dict[str, tuple[CapacitorModel, float]] = {}
        for section in self.networks.start_region.sections:
            model = section.model
            if isinstance(model, CapacitorModel) and model.value is not None and model.measured is None:
                volts = across(self.networks.local_volts, section) or 0.0
                if model.bias_matters(abs(volts)):
                    found[section.name] = (model, abs(volts))
        return found

    def large(self, values: FloatArray) -> StartMotion:
        """The start for one row of `values` (P,) with charge conserved and capacitances that follow their voltage."""
        key = values.tobytes()
        if key not in self._large:
            changed = {(p.name, p.attribute): float(v) for p, v in zip(self.parameters, values, strict=True)}
            network = self.block.network.with_values(changed)
            laws: dict[str, ChargeLaw] = {}
            empty: dict[tuple[str, str], float] = {}
            for name, (model, volts) in self.biased.items():
                at_rest = float(model.capacitance_at(volts))
                scale = changed.get((name, "capacitance"), at_rest) / at_rest
                laws[name] = _law(model, scale, 2.0 * volts)
                empty[name, "capacitance"] = scale * float(model.capacitance_at(0.0))
            found = large_signal_start(network.with_values(empty), self.networks.probe, laws, tolerance=TOLERANCE)
            self._large[key] = found
        return self._large[key]


def without_inductance(block: Block) -> Block:
    """The block with capacitors that have no L_s.

    It acts for picoseconds, and the spike that it lets through at the very first edge is no start-up peak.
    """
    elements = tuple(replace(e, esl=0.0) if isinstance(e, Capacitor) else e for e in block.network.elements)
    return replace(block, network=Network(elements, block.network.ground))


def _law(model: CapacitorModel, scale: float, greatest: float) -> ChargeLaw:
    return ChargeLaw.of_capacitance(lambda v: scale * model.capacitance_at(v), greatest)


def within_volts(settle: SettleTable, response: TimeResponse) -> FloatArray:
    """The voltage (V,) within which the output has settled; a percentage is of the greatest |v(t) − v(∞)|."""
    final = np.asarray(response.final)
    if not settle.within.share:
        return np.full_like(final, float(settle.within))
    return float(settle.within) * np.asarray(response.peak(final).size)


def start_measures(networks: SignalNetworks, settle: SettleTable | None) -> Results:
    """`settling`, where the brief says how near, and `startup_peak`."""
    start = Start(networks)
    found: Results = {}

    def peak(values: FloatArray) -> FloatArray:
        return np.asarray(start.response(values).farthest())

    def settling(values: FloatArray) -> FloatArray:
        assert settle is not None
        response = start.response(values)
        return np.asarray(response.settling_time(within_volts(settle, response)))

    def large_settling(motion: StartMotion) -> float:
        assert settle is not None
        near = float(settle.within) * (motion.peak(motion.final) if settle.within.share else 1.0)
        return motion.settling_time(near)

    try:
        if settle is not None:
            near = f"{float(settle.within):.3g}" if settle.within.share else format_quantity(float(settle.within), "V")
            found["settling"] = _start_band(start, settling, large_settling, "s", f"within {near}")
        unlimited = "amplifiers taken without supply limits" if networks.start_region.amplifiers else ""
        found["startup_peak"] = _start_band(start, peak, StartMotion.farthest, "V", unlimited)
    except CircuitError as problem:
        names = ("settling", "startup_peak") if settle is not None else ("startup_peak",)
        return {name: unknown("s" if name == "settling" else "V", str(problem)) for name in names}
    return found


def _start_band(
    start: Start,
    linear: Callable[[FloatArray], FloatArray],
    large: Callable[[StartMotion], float],
    unit: str,
    note: str,
) -> Value:
    """The band of a measure of the start; with capacitors that lose to bias, solved again where it is extreme.

    Which set of values is extreme is found with every capacitance as at the operating point.
    """
    samples = 0 if start.biased else start.block.samples
    value = band(linear, start.parameters, unit, note, ENDLESS, samples=samples)
    if not start.biased or not value.known:
        return value
    ends = spread(linear, start.parameters) if start.parameters else None
    nominal = np.array([parameter.nominal for parameter in start.parameters])
    rows = [nominal] if ends is None else [nominal, ends.at_low, ends.at_high]
    try:
        figures = [large(start.large(row)) for row in rows]
    except CircuitError as problem:
        why = f"{note}; capacitance as at the operating point, since {problem}".lstrip("; ")
        return msgspec.structs.replace(value, note=why)
    note = f"{note}; {FOLLOWS}".lstrip("; ")
    return Value(figures[0], min(figures), max(figures), unit, note, "", value.matters)


def start_curve(networks: SignalNetworks, check: Check) -> Curve:
    """v_to(t) after power comes on, with the band around its final value or the pin's voltage limits."""
    start = Start(networks)
    nominal = np.array([[parameter.nominal for parameter in start.parameters]])
    response = start.response(nominal)
    moving = start.large(nominal[0]) if start.biased else None
    final = float(np.asarray(response.final)[0])
    settled = float(np.asarray(response.settling_time(np.array([1e-3 * max(abs(final), 1e-3)])))[0])
    table = networks.path.table
    end = settled * 1.2 if np.isfinite(settled) and settled > 0 else 1.0
    t = np.unique(np.concatenate([[0.0], np.geomspace(end * 1e-6, end, POINTS // 2), np.linspace(0, end, POINTS // 2)]))
    lines: list[LimitLine] = []
    if check.measure == "settling" and isinstance(table, CouplingTable) and table.settle is not None:
        near = float(within_volts(table.settle, response)[0])
        lines = [
            LimitLine("settled", (0.0, end), (final + near, final + near), "above"),
            LimitLine("settled", (0.0, end), (final - near, final - near), "below"),
        ]
    elif check.limit is not None:
        if check.limit.max is not None:
            lines.append(LimitLine("greatest voltage", (0.0, end), (check.limit.max, check.limit.max), "above"))
        if check.limit.min is not None:
            lines.append(LimitLine("least voltage", (0.0, end), (check.limit.min, check.limit.min), "below"))
    return Curve(
        check=check.id,
        title=f"{networks.path.to_net} after power comes on",
        x_label="time",
        x_unit="s",
        y_label="voltage",
        y_unit="V",
        x=tuple(t.tolist()),
        nominal=tuple((moving.value(t) if moving else response.value(t)[0]).tolist()),
        limits=tuple(lines),
        log_x=False,
    )
