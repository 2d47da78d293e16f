"""What the page of one check shows: what happened to it, its curves, and where its number comes from."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from urllib.parse import urlencode

from reactance.analysis.measures import find_measure
from reactance.analysis.movement_words import name_words
from reactance.analysis.movements import split_id
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Movement, ProblemEntry
from reactance.dashboard import words
from reactance.dashboard.origins import Provenance, provenance
from reactance.dashboard.pages import Head, head
from reactance.dashboard.rows import TONES, Strips, Tone, check_href, numbered, revision_href
from reactance.dashboard.shown import Shown, movement_text
from reactance.dashboard.strip import Strip

SINES = (("slow", 0.1), ("at the corner", 1.0), ("fast", 10.0))


@dataclass(frozen=True, slots=True)
class Side:
    """A check's figures in one revision, in words."""

    name: str
    figure: str
    band: str
    limit: str
    margin: str
    status: str
    tone: Tone


@dataclass(frozen=True, slots=True)
class Moment:
    """A check's figures in one save of the list under its strip."""

    number: int
    when: str
    machine: str
    figure: str
    band: str
    status: str
    tone: Tone
    verdict: str
    edits: str
    href: str
    revision_href: str
    shown: bool


@dataclass(frozen=True, slots=True)
class CheckPage:
    """One check in one revision, against its baseline."""

    head: Head
    check_id: str
    name: str
    meaning: str
    lead: str
    word: str
    tone: Tone
    explain: str
    sides: tuple[Side, ...]
    strip: Strip
    curve_href: str
    sine_href: str
    sine_at: str
    sine_choices: tuple[tuple[str, str], ...]
    origin: Provenance
    cautions: tuple[ProblemEntry, ...]
    moments: tuple[Moment, ...]
    older_href: str
    newer_href: str


def check_page(found: Shown, check_id: str) -> CheckPage | None:
    """The page of a check, or None where neither the revision nor its history knows it."""
    report = found.report
    check = next((check for check in report.checks if check.id == check_id), None)
    strips = found.strips()
    if check is None and not strips.cells(check_id):
        return None
    before = _earlier(found, check_id)
    known = check or before
    name = name_words(known) if known else words.id_words(check_id)
    move = _movement(found, check_id)
    origin = Provenance(missing="The check is not on the board in this save.")
    if check is not None:
        origin = provenance(found.archive, check_id, found.revision, found.baseline)
    about = _asked_frequency(found, check) if check else None
    older, newer = _neighbours(found, check_id)
    return CheckPage(
        head=head(found),
        check_id=check_id,
        name=name,
        meaning=_meaning(known) if known else "",
        lead=_lead(found, check, move, name),
        word=words.VERDICT[move.verdict] if move else (words.STATUS[check.status] if check else "gone"),
        tone=TONES.get(move.verdict if move else (check.status if check else "fail"), "watched"),
        explain=check.explain if check else "",
        sides=_sides(found, before, check),
        strip=strips.strip(check_id),
        curve_href=data_href("curve", found, check_id),
        sine_href=data_href("sine", found, check_id) if about else "",
        sine_at=format_quantity(about, "Hz") if about else "",
        sine_choices=tuple((text, format_quantity(about * factor, "Hz")) for text, factor in SINES) if about else (),
        origin=origin,
        cautions=_cautions(report.problems, origin),
        moments=_moments(found, strips, known, check_id),
        older_href=older,
        newer_href=newer,
    )


def data_href(kind: str, found: Shown, check_id: str) -> str:
    """Where the browser fetches a plot of this check in this revision."""
    return f"/board/{found.board.id}/{kind}?{urlencode({'id': check_id, 'at': found.revision.id})}"


def _earlier(found: Shown, check_id: str) -> Check | None:
    checks = found.older.checks if found.older else ()
    return next((check for check in checks if check.id == check_id), None)


def _movement(found: Shown, check_id: str) -> Movement | None:
    moves = found.comparison.movements if found.comparison else ()
    return next((move for move in moves if move.check == check_id), None)


def _meaning(check: Check) -> str:
    try:
        measure = find_measure(split_id(check)[0], check.measure)
    except KeyError:
        return ""
    return measure.words[:1].upper() + measure.words[1:]


def _lead(found: Shown, check: Check | None, move: Movement | None, name: str) -> str:
    if move is not None:
        return movement_text(found, move)
    if check is None:
        return f"{name} is not on the board in this save"
    return f"{name} {words.check_words(check)}"


def _sides(found: Shown, before: Check | None, after: Check | None) -> tuple[Side, ...]:
    numbers = numbered(found.revisions)
    sides = []
    if found.baseline is not None and before is not None:
        sides.append(_side(f"save {numbers[found.baseline.id]}", before))
    if after is not None:
        sides.append(_side(f"save {numbers[found.revision.id]}", after))
    return tuple(sides)


def _side(name: str, check: Check) -> Side:
    unit, measure = check.unit, check.measure
    margin = ""
    if check.margin is not None:
        zero = check.limit is not None and 0 in (check.limit.min, check.limit.max)
        margin = words.value_words(check.margin, unit, measure) if zero else format_quantity(check.margin, "fraction")
    return Side(
        name=name,
        figure=words.value_words(check.nominal, unit, measure),
        band=words.band_words(check.low, check.high, unit, measure),
        limit=words.limit_words(check.limit, unit, measure).removeprefix("of ").removeprefix("within "),
        margin=margin.replace("-", "−"),
        status=words.STATUS[check.status],
        tone=TONES.get(check.status, "watched"),
    )


def _asked_frequency(found: Shown, check: Check) -> float | None:
    """The frequency that a sine is most telling at: a corner of the same coupling or filter."""
    anchor = split_id(check)[:2]
    if anchor[0] not in ("coupling", "filter"):
        return None
    for other in found.report.checks:
        corner = other.unit == "Hz" and split_id(other)[:2] == anchor
        if corner and other.nominal and math.isfinite(other.nominal):
            return other.nominal
    return None


def _cautions(problems: Sequence[ProblemEntry], origin: Provenance) -> tuple[ProblemEntry, ...]:
    """Those about the parts that the number comes from."""
    return tuple(problem for problem in problems if problem.severity != "note" and problem.where in origin.about)


def _moments(found: Shown, strips: Strips, known: Check | None, check_id: str) -> tuple[Moment, ...]:
    cells = {cell.revision: cell for cell in strips.cells(check_id)}
    rows = {row.id: row for row in found.revisions}
    unit, measure = (known.unit, known.measure) if known else ("", "")
    moments = []
    for drawn in reversed(strips.strip(check_id).cells):
        cell, row = cells.get(drawn.column.revision), rows[drawn.column.revision]
        if cell is None and not drawn.column.unjudged:
            continue
        moments.append(
            Moment(
                number=drawn.column.number,
                when=words.moment(row.saved),
                machine=words.machine_moment(row.saved),
                figure=words.value_words(cell.nominal, unit, measure) if cell else "–",
                band=words.band_words(cell.low, cell.high, unit, measure) if cell else "",
                status=words.STATUS[cell.status] if cell else "not judged",
                tone=TONES.get(cell.status, "watched") if cell else "bad",
                verdict=words.VERDICT[cell.verdict] if cell and cell.verdict else "",
                edits=(drawn.column.edits if cell.verdict else "") if cell else row.error or "",
                href=check_href(found.board.id, check_id, row.id) if cell else "",
                revision_href=revision_href(found.board.id, row.id),
                shown=drawn.column.shown,
            )
        )
    return tuple(moments)


def _neighbours(found: Shown, check_id: str) -> tuple[str, str]:
    usable = [row.id for row in found.revisions if row.error is None]
    at = usable.index(found.revision.id)
    older = check_href(found.board.id, check_id, usable[at - 1]) if at > 0 else ""
    newer = check_href(found.board.id, check_id, usable[at + 1]) if at + 1 < len(usable) else ""
    return older, newer
