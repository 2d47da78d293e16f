"""A movement as one line for people: the check, its figures, its limit, and the edits that touch it."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence

from reactance.analysis.movements import split_id
from reactance.analysis.parts.attributes import ALIASES, folded
from reactance.analysis.quantity import QuantityError, format_quantity, parse_quantity
from reactance.analysis.report import Check, Duty, Edit, Limit, Movement, Report

_PERCENT = frozenset({"stress", "tilt", "overshoot"})
_NAMES: Mapping[str, str] = {
    "corner_low": "lower corner",
    "corner_high": "upper corner",
    "startup_peak": "start-up peak",
    "impedance": "impedance over target",
    "dc": "DC difference",
    "stress": "voltage stress",
    "range": "temperature room",
    "return": "DC path",
    "bypass": "capacitors per supply pin",
}
_UNIT_BY_KIND: Mapping[str, str] = {"capacitor": "F", "resistor": "ohm", "inductor": "H"}
_VALUE_NAMES = frozenset(map(folded, ALIASES["value"]))
# What is only said of a part; it goes along with a change of the part itself.
_ONLY_SAID = frozenset(folded(name) for said in ("description", "number") for name in ALIASES[said])
_MOST_EDITS = 3
_WORD = re.compile(r"[\w/+.-]+")


def sentence(movement: Movement, edits: Sequence[Edit], older: Report | None, newer: Report) -> str:
    """`+3V3 droop 81 → 164 mV of 165 mV: C14 100 nF → 10 nF`.

    `edits` are those of the whole comparison; the line names the ones with a share in the cause where causes are
    known, else those whose part, net or brief table the check is about, or the only one that there is.
    """
    before = _check(older, movement.check)
    after = _check(newer, movement.check)
    check = after or before
    if check is None:
        return movement.check
    line = f"{name_words(check)} {_figures(movement, check, before if after is None else None)}"
    behind = _edits_behind(movement, edits, check, older, newer)
    if behind:
        named = [edit_words(edit, older, newer) for edit in behind[:_MOST_EDITS]]
        more = f" and {len(behind) - _MOST_EDITS} more" if len(behind) > _MOST_EDITS else ""
        line += f": {', '.join(named)}{more}"
    return line


def _check(report: Report | None, check_id: str) -> Check | None:
    return next((check for check in report.checks if check.id == check_id), None) if report else None


def name_words(check: Check) -> str:
    """What a check is about, in words: `+3V3 droop`, `anti-alias attenuation at 100kHz`."""
    _, anchor, rest = split_id(check)
    measure, _, detail = rest.partition("@")
    words = _NAMES.get(measure, measure.replace("_", " "))
    joint = "of" if measure == "rejection" else "at"
    return f"{anchor.replace('>', ' → ')} {words}{f' {joint} {detail}' if detail else ''}"


def _figures(movement: Movement, check: Check, vanished: Check | None) -> str:
    if vanished is not None:
        return f"{_value(movement.before.nominal, check)} → no longer there"
    if movement.before.status is None:
        return f"{_value(movement.after.nominal, check)}, not there before{_limit(check)}"
    old, new = _value(movement.before.nominal, check), _value(movement.after.nominal, check)
    if old == new:
        change = f"{new}{_limit(check)}"
        statuses = movement.before.status, movement.after.status
        return f"{change}, {statuses[0]} → {statuses[1]}" if statuses[0] != statuses[1] else change
    number, space, unit = old.rpartition(" ")
    if space and new.endswith(f" {unit}") and not number.endswith(("no", "unknown")):
        old = number
    return f"{old} → {new}{_limit(check)}"


def _value(value: float | None, check: Check) -> str:
    if value is None:
        return "unknown"
    if check.measure == "return":
        return "present" if value >= 1 else "missing"
    return format_quantity(value, "fraction" if check.measure in _PERCENT else check.unit)


def _limit(check: Check) -> str:
    limit: Limit | None = check.limit
    if limit is None or check.measure == "return":
        return ""
    if limit.min is not None and limit.max is not None:
        return f" within {_value(limit.min, check)} to {_value(limit.max, check)}"
    return f" of {_value(limit.max, check)}" if limit.max is not None else f" of at least {_value(limit.min, check)}"


def _edits_behind(
    movement: Movement, edits: Sequence[Edit], check: Check, older: Report | None, newer: Report
) -> list[Edit]:
    if movement.causes:
        by_id = {edit.id: edit for edit in edits}
        ranked = sorted(movement.causes, key=lambda cause: -abs(cause.share))
        return [by_id[cause.edit] for cause in ranked if cause.edit in by_id]
    effective = _telling(edits)
    if len(effective) == 1:
        return effective
    parts, nets = _surroundings(check, [report for report in (older, newer) if report])
    return [edit for edit in effective if _touches(edit, check, parts, nets)]


def _telling(edits: Sequence[Edit]) -> list[Edit]:
    """Without renumberings, and without order numbers and descriptions that go along with a part's other edits."""
    said = [edit.kind == "attribute changed" and folded(edit.attribute or "") in _ONLY_SAID for edit in edits]
    otherwise = {edit.part for edit, only in zip(edits, said, strict=True) if not only and edit.part is not None}
    return [
        edit
        for edit, only in zip(edits, said, strict=True)
        if edit.kind != "part renumbered" and not (only and edit.part in otherwise)
    ]


def _surroundings(check: Check, reports: Iterable[Report]) -> tuple[set[str], set[str]]:
    """Parts and nets that a check is about, as far as the reports tell."""
    scope, anchor, _ = split_id(check)
    parts = {anchor} if scope == "part" else set()
    nets = set() if scope == "part" else set(anchor.split(">"))
    for duty in (duty for report in reports for duty in report.duties if _is_about(duty, scope, anchor, nets)):
        parts.update(_WORD.findall(duty.because))
        if scope != "part" or duty.kind != "decoupling":
            parts.update(duty.parts)
        if scope in ("coupling", "filter"):
            nets.update(duty.nets)
    if scope in ("coupling", "filter"):
        nets -= {net.name for report in reports for net in report.nets if net.kind != "signal"}
    return parts, nets


def _is_about(duty: Duty, scope: str, anchor: str, nets: set[str]) -> bool:
    if scope == "part":
        return anchor in duty.parts
    if scope in ("rail", "net"):
        return anchor in duty.nets
    return duty.id == f"{scope}:{anchor}" or (">" in anchor and nets <= set(duty.nets))


def _touches(edit: Edit, check: Check, parts: set[str], nets: set[str]) -> bool:
    if edit.kind == "brief changed":
        _, anchor, _ = split_id(check)
        return edit.attribute is None or edit.attribute.startswith("board") or anchor in edit.attribute
    if edit.part is None:
        return bool({edit.before, edit.after} & nets)
    if edit.part in parts:
        return True
    return edit.kind == "pin moved" and bool({edit.before, edit.after} & nets)


def edit_words(edit: Edit, older: Report | None, newer: Report | None) -> str:
    """One edit: `C14 100 nF → 10 nF`, `C14 removed (100 nF)`; values as the reports read them, where they do."""
    part, name = edit.part or "", edit.attribute or ""
    if edit.kind == "part renumbered":
        return f"{edit.before} is now {edit.after}"
    if edit.kind == "pin moved":
        return f"{part} {name}: {edit.before or 'open'} → {edit.after or 'open'}"
    if edit.kind == "brief changed":
        return f"brief{f', {name},' if name else ''} {_change(edit.before, edit.after)}"
    if edit.kind == "attribute changed" and folded(name) not in _VALUE_NAMES:
        return f"{part} {name} {_change(edit.before, edit.after)}".strip()
    before, after = _as_value(part, edit.before, older), _as_value(part, edit.after, newer)
    if edit.kind == "attribute changed":
        return f"{part} {_change(before, after)}"
    kind, value = ("added", after) if edit.kind == "part added" else ("removed", before)
    return f"{part} {kind}{f' ({value})' if value else ''}"


def _as_value(part: str, text: str | None, report: Report | None) -> str | None:
    """The text as a quantity in the trade's notation where it is one and nothing more, else as found."""
    entry = next((entry for entry in report.parts if entry.refdes == part), None) if report else None
    unit = _UNIT_BY_KIND.get(entry.kind) if entry else None
    if text is None or entry is None or unit is None:
        return text
    try:
        return format_quantity(parse_quantity(text, unit), unit)  # type: ignore[arg-type]
    except QuantityError:
        return text


def _change(before: str | None, after: str | None) -> str:
    if before is None:
        return f"{after} stated" if after is not None else "changed"
    return f"{before} no longer stated" if after is None else f"{before} → {after}"
