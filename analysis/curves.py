"""The curve behind a check: impedance or gain over frequency, or a response over time, with band and limit."""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.brief_tables import CouplingTable
from reactance.analysis.circuit.modal import first
from reactance.analysis.circuit.transient import ramp, sine
from reactance.analysis.elements import node, rail_source_name
from reactance.analysis.filters import SETTLED, asked_frequency
from reactance.analysis.gains import top_of_band
from reactance.analysis.measuring import Measuring, time_grid
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.path_checks import PathStudy
from reactance.analysis.rail_checks import RailStudy
from reactance.analysis.rail_network import LOAD
from reactance.analysis.report import Check, Curve, LimitLine
from reactance.analysis.starting import start_curve

if TYPE_CHECKING:
    from reactance.analysis.study import Study

POINTS = 400
MOST_VERTICES = 64
FloatArray = NDArray[np.float64]


def curve_of(study: Study, check_id: str) -> Curve | None:
    """The curve of one check of a study, or None where the check has none."""
    check = study.check(check_id)
    if check is None:
        return None
    for rail in study.rails:
        if any(known.id == check_id for known in rail.checks):
            return _rail(study, rail, check)
    for path in study.paths:
        if any(known.id == check_id for known in path.checks):
            return None if path.failure else _path(study, path, check)
    if check_id.startswith("part:") and check.measure == "stress":
        return _capacitance(study, check)
    return None


def _banded(
    check: Check,
    seen: Measuring,
    x: FloatArray,
    evaluate: Callable[[FloatArray], FloatArray],
    labels: tuple[str, str, str, str, str],
    limits: tuple[LimitLine, ...] = (),
    *,
    log_x: bool,
    log_y: bool = False,
) -> Curve:
    """A curve whose band is the envelope over the vertices of the uncertain attributes. `evaluate`: (V, P) → (V, X)."""
    values = vertices(seen)
    rows = evaluate(values)
    title, x_label, x_unit, y_label, y_unit = labels
    return Curve(
        check=check.id,
        title=title,
        x_label=x_label,
        x_unit=x_unit,
        y_label=y_label,
        y_unit=y_unit,
        x=tuple(x.tolist()),
        nominal=tuple(rows[0].tolist()),
        low=tuple(rows.min(axis=0).tolist()) if len(rows) > 1 else (),
        high=tuple(rows.max(axis=0).tolist()) if len(rows) > 1 else (),
        limits=limits,
        log_x=log_x,
        log_y=log_y,
    )


def vertices(seen: Measuring) -> FloatArray:
    """Nominal first, then vertices of the uncertain attributes: all of few, the outer and single ones of many."""
    parameters = seen.parameters
    nominal = np.array([[p.nominal for p in parameters]])
    if not parameters:
        return nominal
    low, high = np.array([p.low for p in parameters]), np.array([p.high for p in parameters])
    if 2 ** len(parameters) <= MOST_VERTICES:
        picks = np.array(list(itertools.product((False, True), repeat=len(parameters))))
    else:
        one = np.eye(len(parameters), dtype=bool)[: MOST_VERTICES // 2]
        picks = np.vstack([np.zeros((1, len(parameters)), bool), np.ones((1, len(parameters)), bool), one, ~one])
    return np.vstack([nominal, np.where(picks, high, low)])


def _rail(study: Study, rail: RailStudy, check: Check) -> Curve | None:
    if rail.network is None or check.nominal is None:
        return None
    seen = Measuring(rail.network.block, LOAD, node(study.board, rail.net), sign=-1.0)
    asked = rail.asked
    if check.measure == "droop" and asked.current is not None and asked.rise is not None:
        current, rise = asked.current, asked.rise
        t = time_grid(ramp(seen.modes(seen.nominal), current, rise), POINTS, rise)

        def moved(values: FloatArray) -> FloatArray:
            return -ramp(seen.modes(values), current, rise).value(t)

        lines = _both_sides("allowed", t, asked.allowed)
        labels = (f"{rail.net} after a load step of {current:g} A", "time", "s", "change of the rail", "V")
        return _banded(check, seen, t, moved, labels, lines, log_x=False)
    if asked.band is None or check.measure in ("capacitance", "bypass"):
        return None
    f = seen.frequency_grid(*asked.band, POINTS)
    lines = ()
    if asked.allowed is not None and asked.current:
        target = asked.allowed / asked.current
        lines = (LimitLine("target impedance", (float(f[0]), float(f[-1])), (target, target), "above"),)
    labels = (f"{rail.net} as its load sees it", "frequency", "Hz", "impedance", "Ω")
    return _banded(check, seen, f, lambda v: np.abs(seen.at(v, f)), labels, lines, log_x=True, log_y=True)


def _both_sides(name: str, x: FloatArray, bound: float | None, centre: float = 0.0) -> tuple[LimitLine, ...]:
    if bound is None:
        return ()
    ends = (float(x[0]), float(x[-1]))
    return (
        LimitLine(name, ends, (centre + bound, centre + bound), "above"),
        LimitLine(name, ends, (centre - bound, centre - bound), "below"),
    )


def _path(study: Study, path: PathStudy, check: Check) -> Curve | None:
    if check.nominal is None or check.measure in ("dc", "noise"):
        return None
    networks = path.networks
    if path.path.kind == "coupling" and check.measure in ("settling", "startup_peak"):
        return start_curve(networks, check)
    source = networks.emf
    if check.measure == "rejection":
        source = rail_source_name(check.id.rpartition("@")[2])
    seen = Measuring(networks.ac, source, networks.probe)
    if check.measure in ("tilt", "overshoot", "rise_time", "settling"):
        return _step(path, seen, check)
    return _gain(path, seen, check)


def _step(path: PathStudy, seen: Measuring, check: Check) -> Curve:
    table = path.path.table
    if check.measure == "tilt" and isinstance(table, CouplingTable) and table.tilt is not None:
        t = np.linspace(0.0, float(table.tilt.pulse), POINTS)
    else:
        t = time_grid(seen.step(seen.nominal), POINTS, 0.0)
    final = float(np.asarray(seen.step(seen.nominal).final)[0])
    lines: tuple[LimitLine, ...] = ()
    if check.measure == "settling" and math.isfinite(final):
        lines = _both_sides("within 1 %", t, SETTLED * abs(final), final)
    if check.measure == "overshoot" and check.limit is not None and check.limit.max is not None:
        bound = final * (1 + check.limit.max)
        lines = (LimitLine("overshoot", (0.0, float(t[-1])), (bound, bound), "above" if final > 0 else "below"),)

    def stepped(values: FloatArray) -> FloatArray:
        return seen.step(values).value(t)

    labels = (f"{path.path.from_net} to {path.path.to_net}: step response", "time", "s", "output per volt", "V")
    return _banded(check, seen, t, stepped, labels, lines, log_x=False)


def _gain(path: PathStudy, seen: Measuring, check: Check) -> Curve:
    table = path.path.table
    asked = (
        float(table.lowest_frequency)
        if isinstance(table, CouplingTable) and table.lowest_frequency is not None
        else asked_frequency(table)
        if not isinstance(table, CouplingTable)
        else None
    )
    corner = next((c.nominal for c in path.checks if c.measure.startswith("corner") and c.nominal), None)
    about = corner or asked or 1e3
    far = max((float(e.at) for e in getattr(table, "attenuation", ())), default=about)
    top = min(top_of_band(seen.response(seen.nominal), asked), max(about, far) * 100)
    f = seen.frequency_grid(about / 100, top, POINTS)
    f = f[f <= top]

    def gain(values: FloatArray) -> FloatArray:
        size = np.abs(seen.at(values, f))
        return np.asarray(20 * np.log10(np.maximum(size, 1e-15)))

    title = f"{path.path.from_net} to {path.path.to_net}"
    if check.measure == "rejection":
        title = f"{check.id.rpartition('@')[2]} to {path.path.to_net}"
    return _banded(
        check, seen, f, gain, (title, "frequency", "Hz", "gain", "dB"), _gain_limits(path, check), log_x=True
    )


def _gain_limits(path: PathStudy, check: Check) -> tuple[LimitLine, ...]:
    """Limits that can be drawn into a gain over frequency: the loss or attenuation allowed, and corners."""
    reference = next((c.nominal for c in path.checks if c.measure == "gain" and c.nominal is not None), None)
    if check.limit is None or reference is None:
        return ()
    table = path.path.table
    if check.measure == "loss" and isinstance(table, CouplingTable) and table.lowest_frequency is not None:
        least, at = reference - (check.limit.max or 0.0), float(table.lowest_frequency)
        return (LimitLine("greatest loss", (at, at * 100), (least, least), "below"),)
    if check.measure == "attenuation" and check.limit.min is not None:
        most = reference - check.limit.min
        for entry in getattr(table, "attenuation", ()):
            if entry.least is not None and float(entry.least) == check.limit.min:
                return (LimitLine("least attenuation", (float(entry.at), float(entry.at) * 10), (most, most), "above"),)
    if check.measure.startswith("corner"):
        half = reference - 20 * math.log10(math.sqrt(2))
        bounds = [bound for bound in (check.limit.min, check.limit.max) if bound is not None]
        return tuple(LimitLine("corner", (bound, bound), (half - 20, half + 3), "below") for bound in bounds)
    if check.measure == "rejection" and check.limit.min is not None:
        return (LimitLine("least rejection", (10.0, 20e3), (-check.limit.min, -check.limit.min), "above"),)
    return ()


def _capacitance(study: Study, check: Check) -> Curve | None:
    """Effective capacitance over the DC voltage, up to the rated voltage."""
    refdes = check.id.split(":")[1]
    model = study.board.models.get(refdes)
    if not isinstance(model, CapacitorModel) or model.value is None or not model.rated_voltage:
        return None
    volts = np.linspace(0.0, model.rated_voltage, 100)
    bands = [model.effective(float(v)) for v in volts]
    return Curve(
        check=check.id,
        title=f"{refdes}: effective capacitance over its DC voltage",
        x_label="DC voltage",
        x_unit="V",
        y_label="capacitance",
        y_unit="F",
        x=tuple(volts.tolist()),
        nominal=tuple(b.nominal for b in bands),
        low=tuple(b.low for b in bands),
        high=tuple(b.high for b in bands),
        log_x=False,
    )


def sine_of(study: Study, check_id: str, frequency: float) -> Curve | None:
    """In and out over time for a sine of 1 V and `frequency` Hz switched on at t = 0.

    `nominal` is the output, `low` the input (both in volts); the title states amplitude ratio and phase lag.
    """
    for path in study.paths:
        if any(known.id == check_id for known in path.checks) and not path.failure:
            networks = path.networks
            seen = Measuring(networks.ac, networks.emf, networks.probe)
            t = np.linspace(0.0, 5.0 / frequency, 1000)
            into = np.sin(2 * np.pi * frequency * t)
            found = sine(first(seen.modes(seen.nominal)), frequency)
            lag = math.degrees(found.lag)
            ends = f"{path.path.from_net} to {path.path.to_net}"
            title = f"{ends} at {frequency:g} Hz: amplitude ratio {found.ratio:.4g}, phase lag {lag:.1f}°"
            out = found.value(t)
            return Curve(
                check_id, title, "time", "s", "voltage", "V", tuple(t.tolist()), tuple(out.tolist()),
                low=tuple(into.tolist()), log_x=False,
            )  # fmt: skip
    return None
