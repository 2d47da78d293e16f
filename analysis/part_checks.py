"""The checks of single parts and nets: stress, polarity, dielectric range, and the DC path of a net."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from msgspec.structs import replace

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board, Section
from reactance.analysis.checks import judge
from reactance.analysis.dc import DcBand, dc_band
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Limit
from reactance.analysis.reuse import Solved
from reactance.analysis.values import Value, banded, exactly, unknown


def part_checks(board: Board, bias: Bias, solved: Solved) -> Iterable[Check]:
    """Stress, polarity and range of every fitted capacitor; of an array, the stress of its worst section."""
    sections: dict[str, list[Section]] = {}
    for section in board.capacitors():
        sections.setdefault(section.refdes, []).append(section)
    for members in sections.values():
        section, model = members[0], members[0].model
        if not isinstance(model, CapacitorModel):
            continue
        yield _stress(board, bias, solved, members, model)
        if model.polarised:
            yield _polarity(board, bias, solved, section, model)
        if model.dielectric_range is not None:
            yield _range(board, section, model.dielectric_range)


def _stress(
    board: Board, bias: Bias, solved: Solved, members: Sequence[Section], model: CapacitorModel
) -> Check:
    check_id, limit = f"part:{model.refdes}:stress", Limit(max=model.derating)
    if model.rated_voltage is None:
        value = unknown("1", "its rated voltage is not stated")
        return judge(check_id, "part", "stress", value, None)
    values = [_stress_of(board, bias, solved, section, model.rated_voltage) for section in members]
    if len(values) > 1:
        values = [
            replace(value, note=f"the section at pins {section.pin_a} and {section.pin_b}: {value.note}")
            for section, value in zip(members, values, strict=True)
        ]
    worst = max((v for v in values if v.nominal is not None), key=lambda v: v.nominal or 0.0, default=values[0])
    missing = next((value for value in values if not value.known), None)
    fails = worst.nominal is not None and worst.nominal > model.derating
    return judge(check_id, "part", "stress", worst if fails or missing is None else missing, limit)


def _stress_of(board: Board, bias: Bias, solved: Solved, section: Section, rated: float) -> Value:
    """The stress of one section of a capacitor rated for `rated` volts."""
    band = _across(board, bias, solved, section, upper=True)
    if isinstance(band, str):
        return unknown("1", band)
    ends = sorted((abs(band.low), abs(band.high)))
    least = 0.0 if band.low <= 0.0 <= band.high else ends[0]
    note = f"{format_quantity(abs(band.nominal), 'V')} across {format_quantity(rated, 'V')} rated"
    value = banded(abs(band.nominal) / rated, least / rated, ends[1] / rated, "1", _joined(note, band), "")
    return replace(value, samples=tuple(abs(volts) / rated for volts in band.samples))


def _joined(note: str, band: DcBand) -> str:
    return f"{note}; {band.note}" if band.note else note


def _polarity(board: Board, bias: Bias, solved: Solved, section: Section, model: CapacitorModel) -> Check:
    check_id, limit = f"part:{section.refdes}:polarity", Limit(min=0.0)
    band = _across(board, bias, solved, section, upper=False)
    if isinstance(band, str):
        return judge(check_id, "part", "polarity", unknown("V", band), limit)
    if model.positive_pin == section.pin_b:
        band = DcBand(-band.nominal, -band.high, -band.low, tuple(-volts for volts in band.samples), band.note)
    value = banded(band.nominal, band.low, band.high, "V", _joined(f"positive pin {model.positive_pin}", band), "")
    return judge(check_id, "part", "polarity", replace(value, samples=band.samples), limit)


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
