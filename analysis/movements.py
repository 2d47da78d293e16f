"""Which checks moved between two revisions, and which way."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from reactance.analysis.brief_edits import tables_by_anchor
from reactance.analysis.quantity import QuantityError, parse_quantity
from reactance.analysis.report import Check, Figure, Movement, Report, Status, Verdict

# pass > marginal > fail. A check that can no longer be computed has lost what it said, so `unknown` stands last;
# `watched` complains of nothing.
_RANK: Mapping[Status, int] = {"watched": 3, "pass": 3, "marginal": 2, "fail": 1, "unknown": 0}
_ROUNDING = 1e-9
_GONE = Figure(None, None, None)
# The keys of the brief without which a measure is not asked for; all others come with the duty itself.
_ASKED_BY: Mapping[tuple[str, str], tuple[str, ...]] = {
    ("rail", "droop"): ("step",),
    ("rail", "resonant_droop"): ("step",),
    ("rail", "impedance"): ("step", "allowed"),
    ("coupling", "loss"): ("lowest_frequency",),
    ("coupling", "settling"): ("settle",),
    ("coupling", "tilt"): ("tilt",),
    ("filter", "attenuation"): ("attenuation",),
    ("filter", "ripple"): ("passband",),
}
# An antiresonance is there or not; neither makes the board worse before the impedance does.
_COMES_AND_GOES = frozenset({"antiresonance"})

Tables = Mapping[str, Mapping[str, Any]]


def find_movements(
    older: Report,
    newer: Report,
    share: float,
    *,
    briefs: tuple[bytes | None, bytes | None] = (None, None),
    parts: Mapping[str, str] | None = None,
    nets: Mapping[str, str] | None = None,
) -> tuple[Movement, ...]:
    """The checks of `newer` that differ from `older`, in its order, then those that vanished.

    `share`: how far margins, and unjudged figures, may drift. `briefs`: the older and the newer brief's bytes, which
    tell whether a vanished check's duty is still there. `parts` and `nets`: newer name by older one, for what was
    renamed; a check of a renamed part or net is followed under its new id.
    """
    before = {check.id: check for check in older.checks}
    after = {check.id: check for check in newer.checks}
    became = _followed(before, after, parts or {}, nets or {})
    came_from = {new: old for old, new in became.items()}
    tables = tables_by_anchor(briefs[0]), tables_by_anchor(briefs[1])
    found: list[Movement] = []
    for check_id, check in after.items():
        old = before.get(came_from.get(check_id, ""))
        verdict = _verdict(old, check, share) if old else _appeared(check, tables)
        if verdict:
            found.append(Movement(check_id, verdict, _figure(old) if old else _GONE, _figure(check)))
    for check_id, check in before.items():
        if check_id not in became and (verdict := _vanished(check, tables)):
            found.append(Movement(check_id, verdict, _figure(check), _GONE))
    return tuple(found)


def _figure(check: Check) -> Figure:
    return Figure(check.nominal, check.status, check.margin)


def _followed(
    before: Mapping[str, Check], after: Mapping[str, Check], parts: Mapping[str, str], nets: Mapping[str, str]
) -> dict[str, str]:
    """Newer id by older id for the checks that are in both revisions."""
    became: dict[str, str] = {}
    for check_id, check in before.items():
        new = _renamed(check, parts, nets)
        if new in after:
            became[check_id] = new
    taken = set(became.values())
    for check_id in before.keys() - became.keys():
        if check_id in after and check_id not in taken and check_id.split(":")[1:2][0] not in parts:
            became[check_id] = check_id
    return became


def _renamed(check: Check, parts: Mapping[str, str], nets: Mapping[str, str]) -> str:
    scope, anchor, rest = split_id(check)
    measure, _, detail = rest.partition("@")
    if measure == "rejection" and detail in nets:
        rest = f"{measure}@{nets[detail]}"
    if scope == "part":
        anchor = parts.get(anchor, anchor)
    elif scope in ("rail", "net"):
        anchor = nets.get(anchor, anchor)
    else:
        start, arrow, end = anchor.partition(">")
        anchor = f"{nets.get(start, start)}>{nets.get(end, end)}" if arrow else anchor
    return f"{scope}:{anchor}:{rest}"


def split_id(check: Check) -> tuple[str, str, str]:
    """Scope, anchor and measure with its detail. Anchors may hold colons themselves; the measure decides."""
    scope, _, rest = check.id.partition(":")
    cut = rest.rfind(f":{check.measure}")
    if cut < 0:
        cut = rest.rfind(":")
    return scope, rest[:cut], rest[cut + 1 :]


def _verdict(old: Check, new: Check, share: float) -> Verdict | None:
    if old.limit is None and new.limit is None:
        return "moved" if _drifted(old.nominal, new.nominal, share) else None
    if new.limit is None:
        return "moved" if _drifted(old.nominal, new.nominal, share) else None
    step = _RANK[new.status] - _RANK[old.status]
    if {old.status, new.status} == {"unknown", "fail"}:
        return "worse"  # either way somebody has to look: it fails, or nobody knows any more whether it does
    if step:
        return "worse" if step < 0 else "better"
    return _by_margin(old, new, share)


def _by_margin(old: Check, new: Check, share: float) -> Verdict | None:
    if old.margin is None or new.margin is None:
        return "moved" if old.limit is None and _drifted(old.nominal, new.nominal, share) else None
    # Against a limit of 0 the margin is a distance in the check's own unit: the share is taken of that distance.
    distance = new.limit is not None and 0.0 in (new.limit.min, new.limit.max)
    allowed = share * abs(old.margin) if distance else share
    change = new.margin - old.margin
    if abs(change) <= allowed * (1 + _ROUNDING) + _ROUNDING * max(abs(old.margin), abs(new.margin)):
        return None
    return "worse" if change < 0 else "better"


def _drifted(old: float | None, new: float | None, share: float) -> bool:
    if old is None or new is None:
        return old is not new
    return abs(new - old) > share * abs(old) * (1 + _ROUNDING)


def _vanished(check: Check, tables: tuple[Tables, Tables]) -> Verdict | None:
    return _one_sided(check, tables, "worse")


def _appeared(check: Check, tables: tuple[Tables, Tables]) -> Verdict | None:
    """A check that the older brief asked for as well, and that the older board did not have."""
    return _one_sided(check, tables, "better") if check.limit is not None else None


def _one_sided(check: Check, tables: tuple[Tables, Tables], verdict: Verdict) -> Verdict | None:
    scope, anchor, rest = split_id(check)
    measure, _, detail = rest.partition("@")
    if not all(_asks(table.get(f"{scope}:{anchor}"), scope, measure, detail) for table in tables):
        return None
    return "moved" if measure in _COMES_AND_GOES else verdict


def _asks(table: Mapping[str, Any] | None, scope: str, measure: str, detail: str) -> bool:
    """Whether the brief's table, if there is one, asks for the measure."""
    if table is None or not all(key in table for key in _ASKED_BY.get((scope, measure), ())):
        return False
    return measure != "attenuation" or any(_is_at(entry, detail) for entry in table["attenuation"])


def _is_at(entry: Any, frequency: str) -> bool:
    try:
        stated, wanted = parse_quantity(entry["at"], "Hz"), parse_quantity(frequency, "Hz")
    except (QuantityError, LookupError, TypeError):
        return False
    return math.isclose(stated, wanted, rel_tol=1e-3)  # the id rounds to a few digits
