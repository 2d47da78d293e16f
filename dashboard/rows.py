"""Rows of a page: a check with its sentence and its strip, and the columns that all strips share."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime
from typing import Literal
from urllib.parse import urlencode

from reactance.analysis.movement_words import name_words
from reactance.analysis.report import Check, Comparison, Movement, Report, Status, Verdict
from reactance.daemon.history import RevisionRow, StripCell
from reactance.dashboard import words
from reactance.dashboard.archive import Archive
from reactance.dashboard.strip import Column, Strip, draw, scale_of

MOST_COLUMNS = 60
_EDITS_NAMED = 3

Tone = Literal["good", "bad", "near", "watched"]
TONES: Mapping[str, Tone] = {
    "pass": "good",
    "marginal": "near",
    "fail": "bad",
    "worse": "bad",
    "better": "good",
    "moved": "watched",
}


@dataclass(frozen=True, slots=True)
class Row:
    """One line of a page: `word` says how it stands, `text` what it is, `note` why; `strip` how it came about."""

    key: str
    word: str
    tone: Tone
    text: str
    figure: str
    note: str
    href: str
    strip: Strip | None


@dataclass(frozen=True, slots=True)
class Save:
    """One save in a list: what it changed and what came of it."""

    number: int
    revision: int
    when: str
    machine: str
    author: str
    edits: str
    outcome: str
    tone: Tone
    error: str
    href: str


def check_href(board: int, check: str, at: int | None = None) -> str:
    """Where a check is shown. Its id goes into the query, because it holds colons, slashes and more."""
    query = {"id": check} | ({"at": str(at)} if at is not None else {})
    return f"/board/{board}/check?{urlencode(query)}"


def revision_href(board: int, revision: int) -> str:
    """Where is shown what a revision changed."""
    return f"/board/{board}/revision/{revision}"


def numbered(revisions: Sequence[RevisionRow]) -> Mapping[int, int]:
    """Saves are counted from 1 for people, whatever their ids are in a history of many boards."""
    return {revision.id: place for place, revision in enumerate(revisions, start=1)}


def columns(archive: Archive, revisions: Sequence[RevisionRow], shown: int | None) -> tuple[Column, ...]:
    """The columns of the strips: the last saves, oldest first, unjudged ones among them."""
    numbers = numbered(revisions)
    changed = changes(archive, revisions)
    found: list[Column] = []
    day = ""
    for revision in revisions[-MOST_COLUMNS:]:
        today = f"{datetime.fromtimestamp(revision.saved):%Y-%m-%d}"
        found.append(
            Column(
                revision=revision.id,
                number=numbers[revision.id],
                when=words.short_moment(revision.saved),
                edits=changed.get(revision.id, ""),
                new_day=bool(found) and today != day,
                unjudged=revision.error is not None,
                shown=revision.id == shown,
            )
        )
        day = today
    return tuple(found)


def changes(archive: Archive, revisions: Sequence[RevisionRow]) -> Mapping[int, str]:
    """What each usable revision changed, in one line; said with since when, where that is not the save before."""
    numbers = numbered(revisions)
    told: dict[int, str] = {}
    before: int | None = None
    for revision in revisions:
        if revision.error is not None:
            continue
        stored = archive.stored(revision.id)
        text = words.listed(words.edit_lines(stored.edits, None, None), _EDITS_NAMED)
        elsewhere = stored.baseline not in (None, before) and stored.baseline in numbers
        told[revision.id] = f"since save {numbers[stored.baseline or 0]}: {text}" if elsewhere and text else text
        before = revision.id
    return told


class Strips:
    """Draws the strips of one page, all over the same columns."""

    def __init__(
        self,
        archive: Archive,
        board: int,
        columns: Sequence[Column],
        reports: Sequence[Report],
        baseline: int | None,
    ) -> None:
        """`reports` are the baseline's, if there is one, and the shown revision's; the later one speaks."""
        self._archive = archive
        self._board = board
        self._columns = columns
        self._baseline = baseline
        self._known: dict[str, tuple[StripCell, ...]] = {}
        self._checks = {check.id: check for report in reports for check in report.checks}

    def cells(self, check_id: str) -> tuple[StripCell, ...]:
        """The cells of one check, read once."""
        if check_id not in self._known:
            self._known[check_id] = self._archive.history.cells(self._board, check_id, MOST_COLUMNS)
        return self._known[check_id]

    def strip(self, check_id: str) -> Strip:
        """The strip of one check."""
        cells = self.cells(check_id)
        check = self._checks.get(check_id)
        unit = check.unit if check else ""
        before = next((cell.nominal for cell in cells if cell.revision == self._baseline), None)
        if before is None:
            before = next((cell.nominal for cell in cells if cell.nominal is not None), None)
        scale = scale_of(cells, check.limit if check else None, unit, before)
        name = name_words(check) if check else words.id_words(check_id)
        edits = {column.revision: column.edits for column in self._columns}
        labels = {cell.revision: _cell_words(cell, check, edits.get(cell.revision, "")) for cell in cells}
        hrefs = {
            column.revision: revision_href(self._board, column.revision)
            if column.unjudged
            else check_href(self._board, check_id, column.revision)
            for column in self._columns
        }
        return draw(check_id, name, cells, self._columns, scale, labels, hrefs)


def _cell_words(cell: StripCell, check: Check | None, edits: str) -> str:
    if cell.nominal is None and cell.verdict is not None:
        figure = "no longer there"
    else:
        unit, measure = (check.unit, check.measure) if check else ("", "")
        figure = words.value_words(cell.nominal, unit, measure)
        limit = words.limit_words(check.limit, unit, measure) if check and cell.margin is not None else ""
        figure = f"{figure} {limit}".strip()
    verdict = f", {words.VERDICT[cell.verdict]}" if cell.verdict else ""
    why = f" after {edits}" if cell.verdict and edits else ""
    return f"{figure}, {words.STATUS[cell.status]}{verdict}{why}"


def check_row(board: int, check: Check, strips: Strips, *, since: bool = False) -> Row:
    """A check as it stands; with `since`, from which save on it fails and what that save changed."""
    strip = strips.strip(check.id)
    return Row(
        key=check.id,
        word=words.STATUS[check.status],
        tone=TONES.get(check.status, "watched"),
        text=name_words(check),
        figure=words.check_words(check),
        note=_since_words(strip) if since else "",
        href=check_href(board, check.id),
        strip=strip,
    )


def _since_words(strip: Strip) -> str:
    column = strip.failing_since
    if column is None:
        return ""
    edits = f": {column.edits}" if column.edits else ""
    return f"since save {column.number}, {column.when}{edits}"


def movement_row(board: int, move: Movement, text: str, strips: Strips | None, at: int | None = None) -> Row:
    """What a save did to one check."""
    return Row(
        key=move.check,
        word=words.VERDICT[move.verdict],
        tone=TONES.get(move.verdict, "watched"),
        text=text,
        figure="",
        note=_status_change(move),
        href=check_href(board, move.check, at),
        strip=strips.strip(move.check) if strips else None,
    )


def _status_change(move: Movement) -> str:
    before, after = move.before.status, move.after.status
    if after is None:
        return "no longer on the board"
    if before is None or before == after:
        return {"fail": "fails", "marginal": "marginal"}.get(after, "")
    return f"{words.STATUS[before]} → {words.STATUS[after]}"


_WEIGHT: Mapping[Status, int] = {"fail": 0, "marginal": 1, "unknown": 2, "pass": 3, "watched": 4}
_VERDICTS: Mapping[Verdict, int] = {"worse": 0, "better": 1, "moved": 2}


def by_weight(checks: Iterable[Check], comparison: Comparison | None) -> list[Check]:
    """What needs attention first: failing, then moved, then by margin; otherwise in the report's order."""
    moved = {move.check for move in comparison.movements} if comparison else set()
    found = list(checks)

    def weight(check: Check) -> tuple[int, int, float]:
        margin = check.margin if check.margin is not None else float("inf")
        return (_WEIGHT[check.status], check.id not in moved, margin)

    return sorted(found, key=weight)


def by_verdict(movements: Iterable[Movement]) -> list[Movement]:
    """Worse before better before moved; in each, what fails first."""

    def weight(move: Movement) -> tuple[int, int, float]:
        status = move.after.status or "fail"
        margin = move.after.margin if move.after.margin is not None else float("inf")
        return (_VERDICTS[move.verdict], _WEIGHT[status], margin)

    return sorted(movements, key=weight)
