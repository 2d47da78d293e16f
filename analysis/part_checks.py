"""The checks of single parts and nets: stress, polarity, dielectric range, and the DC path of a net."""

from __future__ import annotations

from collections.abc import Iterable

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board, Section
from reactance.analysis.checks import judge
from reactance.analysis.dc import DcBand, dc_band
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Limit
from reactance.analysis.reuse import Solved
from reactance.analysis.values import Value, exactly, unknown


def part_checks(board: Board, bias: Bias, solved: Solved) -> Iterable[Check]:
    """Stress, polarity and range of every fitted capacitor."""
    for section in board.capacitors():
        model = section.model
        if not isinstance(model, CapacitorModel) or section.name != section.refdes:
            continue
        yield _stress(board, bias, solved, section, model)
        if model.polarised:
            yield _polarity(board, bias, solved, section, model)
        if model.dielectric_range is not None:
            yield _range(board, section, model.dielectric_range)


def _stress(board: Board, bias: Bias, solved: Solved, section: Section, model: CapacitorModel) -> Check:
    check_id, limit = f"part:{section.refdes}:stress", Limit(max=model.derating)
    if model.rated_voltage is None:
        value = unknown("1", "its rated voltage is not stated")
        return judge(check_id, "part", "stress", value, None)
    band = _across(board, bias, solved, section, upper=True)
    if isinstance(band, str):
        return judge(check_id, "part", "stress", unknown("1", band), limit)
    ends = sorted((abs(band.low), abs(band.high)))
    least = 0.0 if band.low <= 0.0 <= band.high else ends[0]
    rated = model.rated_voltage
    note = f"{format_quantity(abs(band.nominal), 'V')} across {format_quantity(rated, 'V')} rated"
    samples = tuple(abs(volts) / rated for volts in band.samples)
    value = Value(abs(band.nominal) / rated, least / rated, ends[1] / rated, "1", note, samples=samples)
    return judge(check_id, "part", "stress", value, limit)


def _polarity(board: Board, bias: Bias, solved: Solved, section: Section, model: CapacitorModel) -> Check:
    check_id, limit = f"part:{section.refdes}:polarity", Limit(min=0.0)
    band = _across(board, bias, solved, section, upper=False)
    if isinstance(band, str):
        return judge(check_id, "part", "polarity", unknown("V", band), limit)
    note = f"positive pin {model.positive_pin}"
    value = Value(band.nominal, band.low, band.high, "V", note, samples=band.samples)
    if model.positive_pin == section.pin_b:
        samples = tuple(-volts for volts in band.samples)
        value = Value(-band.nominal, -band.high, -band.low, "V", note, samples=samples)
    return judge(check_id, "part", "polarity", value, limit)


def _range(board: Board, section: Section, dielectric: tuple[float, float]) -> Check:
    low, high = board.conditions.temperature_low, board.conditions.temperature_high
    note = f"dielectric {dielectric[0]:g} to {dielectric[1]:g} °C, board {low:g} to {high:g} °C"
    value = exactly(min(low - dielectric[0], dielectric[1] - high), "K", note)
    return judge(f"part:{section.refdes}:range", "part", "range", value, Limit(min=0.0))


def _across(board: Board, bias: Bias, solved: Solved, section: Section, *, upper: bool) -> DcBand | str:
    """The DC voltage from a to b with its band, or why it is not known."""
    volts = bias.upper if upper else bias.volts
    a, b = volts.get(section.a), volts.get(section.b)
    if a is None or b is None:
        nets = [net for net, known in ((section.a, a), (section.b, b)) if known is None]
        return f"the DC potential of {' and '.join(nets)} is not defined by what the export and the brief say"
    if board.volts(section.a) is not None and board.volts(section.b) is not None:
        return DcBand(a - b, a - b, a - b, (a - b,) * board.samples)
    return dc_band(board, bias, solved, section.a, section.b, upper=upper)


def net_checks(bias: Bias, loads: frozenset[str]) -> Iterable[Check]:
    """Whether each net that a capacitor touches has a DC path. `loads` are nets of crystal load capacitors."""
    for net, reason in bias.returns.items():
        check_id, limit = f"net:{net}:return", Limit(min=1.0)
        if reason is not None:
            value = exactly(1.0, "1", reason)
        elif net in loads:
            value = unknown("1", "the oscillator behind the crystal biases this net; no [[pin]] describes it")
        else:
            value = exactly(0.0, "1", "no resistor, inductor or described pin leads to a defined potential")
        yield judge(check_id, "net", "return", value, limit)
