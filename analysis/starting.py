"""How an output settles when power comes on: all sources step from 0 to their DC level, every capacitor empty."""

from __future__ import annotations

import numpy as np
from reactance.analysis.brief_tables import CouplingTable, SettleTable
from reactance.analysis.circuit.network import CircuitError, FloatArray
from reactance.analysis.circuit.transient import TimeResponse, start_response
from reactance.analysis.measuring import band
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Curve, LimitLine
from reactance.analysis.reuse import Results
from reactance.analysis.values import unknown

POINTS = 400
ENDLESS = "the output does not settle"


class Start:
    """The start of one path for sets of values, each solved once."""

    def __init__(self, networks: SignalNetworks) -> None:
        self.networks = networks
        self.block = networks.start
        self.parameters = self.block.parameters
        self._known: dict[bytes, TimeResponse] = {}

    def response(self, values: FloatArray) -> TimeResponse:
        """v_to(t) in volts for each row of `values` (V, P)."""
        key = values.tobytes()
        if key not in self._known:
            self._known[key] = start_response(
                self.block.network, self.networks.probe, parameters=self.parameters, values=values
            )
        return self._known[key]


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

    try:
        if settle is not None:
            near = f"{float(settle.within):.3g}" if settle.within.share else format_quantity(float(settle.within), "V")
            found["settling"] = band(settling, start.parameters, "s", f"within {near}", ENDLESS)
        found["startup_peak"] = band(peak, start.parameters, "V", "", ENDLESS)
    except CircuitError as problem:
        names = ("settling", "startup_peak") if settle is not None else ("startup_peak",)
        return {name: unknown("s" if name == "settling" else "V", str(problem)) for name in names}
    return found


def start_curve(networks: SignalNetworks, check: Check) -> Curve:
    """v_to(t) after power comes on, with the band around its final value or the pin's voltage limits."""
    start = Start(networks)
    nominal = np.array([[parameter.nominal for parameter in start.parameters]])
    response = start.response(nominal)
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
        nominal=tuple(response.value(t)[0].tolist()),
        limits=tuple(lines),
        log_x=False,
    )
