"""What the pages of all boards, one board and one revision show, ready for the templates."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from reactance.analysis.report import Comparison, ProblemEntry
from reactance.daemon.history import BoardRow, History, RevisionRow
from reactance.dashboard import words
from reactance.dashboard.archive import Archive
from reactance.dashboard.capacitors import CapacitorRow, capacitor_rows
from reactance.dashboard.groups import Group, groups
from reactance.dashboard.rows import (
    Row,
    Save,
    Strips,
    Tone,
    by_verdict,
    by_weight,
    changes,
    check_row,
    columns,
    movement_row,
    numbered,
    revision_href,
)
from reactance.dashboard.shown import Shown, movement_text

MOST_MOVEMENTS = 24
MOST_FAILING = 24
MOST_CAPACITORS = 60
MOST_SAVES = 12
MOST_EDITS = 12


@dataclass(frozen=True, slots=True)
class BoardLine:
    """One board in the list of boards."""

    board: BoardRow
    href: str
    when: str
    machine: str
    standing: str
    tone: Tone
    outcome: str
    error: str


@dataclass(frozen=True, slots=True)
class Head:
    """The head of a page about one revision of a board."""

    board: BoardRow
    number: int
    revision: RevisionRow
    when: str
    machine: str
    standing: str
    against: str
    unjudged: RevisionRow | None
    unjudged_when: str


@dataclass(frozen=True, slots=True)
class Change:
    """What a revision changed and what that did."""

    title: str
    edits: tuple[str, ...]
    more_edits: tuple[str, ...]
    movements: tuple[Row, ...]
    more_movements: int
    first: bool


@dataclass(frozen=True, slots=True)
class BoardPage:
    """One board: the answers in their order."""

    head: Head
    change: Change
    failing: tuple[Row, ...]
    more_failing: int
    groups: tuple[Group, ...]
    capacitors: tuple[CapacitorRow, ...]
    more_capacitors: int
    cautions: tuple[ProblemEntry, ...]
    notes: tuple[ProblemEntry, ...]
    saves: tuple[Save, ...]
    more_saves: int
    first_when: str
    last_when: str
    columns: int


def board_lines(history: History) -> tuple[BoardLine, ...]:
    """The list of boards, those with failures first."""
    lines = [_board_line(history, board) for board in history.boards()]
    order = {"bad": 0, "near": 1}
    return tuple(sorted(lines, key=lambda line: (line.board.gone, order.get(line.tone, 2))))


def _board_line(history: History, board: BoardRow) -> BoardLine:
    good, newest = history.latest(board.id), history.latest(board.id, good=False)
    shown = good or newest
    tone: Tone = "good"
    if good is None or good.status.get("fail"):
        tone = "bad"
    elif good.status.get("marginal"):
        tone = "near"
    worse = f"the last save made {words.count(good.worse, 'check')} worse" if good and good.worse else ""
    return BoardLine(
        board=board,
        href=f"/board/{board.id}",
        when=words.moment(shown.saved) if shown else "",
        machine=words.machine_moment(shown.saved) if shown else "",
        standing=words.tally(good.status) if good else "not judged yet",
        tone=tone,
        outcome=worse,
        error=newest.error or "" if newest else "",
    )


def board_page(found: Shown) -> BoardPage:
    """Everything on the page of one board."""
    strips, report, board = found.strips(), found.report, found.board.id
    failing = by_weight((check for check in report.checks if check.status == "fail"), found.comparison)
    capacitors = capacitor_rows(board, report)
    few = columns(found.archive, found.revisions, None)
    saves = save_list(found.archive, found.revisions)
    return BoardPage(
        head=head(found),
        change=change(found, strips),
        failing=tuple(check_row(board, check, strips, since=True) for check in failing[:MOST_FAILING]),
        more_failing=max(0, len(failing) - MOST_FAILING),
        groups=groups(found, strips),
        capacitors=capacitors[:MOST_CAPACITORS],
        more_capacitors=max(0, len(capacitors) - MOST_CAPACITORS),
        cautions=tuple(problem for problem in report.problems if problem.severity != "note"),
        notes=tuple(problem for problem in report.problems if problem.severity == "note"),
        saves=saves[:MOST_SAVES],
        more_saves=max(0, len(saves) - MOST_SAVES),
        first_when=few[0].when if few else "",
        last_when=few[-1].when if len(few) > 1 else "",
        columns=len(few),
    )


def head(found: Shown) -> Head:
    """Which board and save this is, how it stands, and whether a newer save could not be judged."""
    numbers = numbered(found.revisions)
    newest = found.revisions[-1]
    latest = found.revision.id == max(row.id for row in found.revisions if row.error is None)
    unjudged = newest if latest and newest.error is not None else None
    pinned = found.baseline is not None and found.baseline.id == found.board.pinned
    against = ""
    if found.baseline is not None:
        kind = "the pinned baseline, " if pinned else ""
        against = f"{kind}save {numbers[found.baseline.id]} of {words.moment(found.baseline.saved)}"
    return Head(
        board=found.board,
        number=numbers[found.revision.id],
        revision=found.revision,
        when=words.moment(found.revision.saved),
        machine=words.machine_moment(found.revision.saved),
        standing=words.tally(found.revision.status),
        against=against,
        unjudged=unjudged,
        unjudged_when=words.moment(unjudged.saved) if unjudged else "",
    )


def change(found: Shown, strips: Strips | None, most: int = MOST_MOVEMENTS) -> Change:
    """The edits of the shown revision and a sentence for each check that they moved."""
    comparison = found.comparison or Comparison((), ())
    edits = words.edit_lines(comparison.edits, found.older, found.report)
    moves = by_verdict(comparison.movements)
    pinned = found.baseline is not None and found.baseline.id == found.board.pinned
    return Change(
        title="What changed since the pinned baseline" if pinned else "What the last save changed",
        edits=edits[:MOST_EDITS],
        more_edits=edits[MOST_EDITS:],
        movements=tuple(
            movement_row(found.board.id, move, movement_text(found, move), strips, found.revision.id)
            for move in moves[:most]
        ),
        more_movements=max(0, len(moves) - most),
        first=found.baseline is None,
    )


def save_list(archive: Archive, revisions: Sequence[RevisionRow]) -> tuple[Save, ...]:
    """All saves, newest first."""
    numbers, told = numbered(revisions), changes(archive, revisions)
    first = next(iter(told), None)
    return tuple(
        _save(revision, numbers[revision.id], "first save" if revision.id == first else told.get(revision.id, ""))
        for revision in reversed(revisions)
    )


def _save(revision: RevisionRow, number: int, edits: str) -> Save:
    failing = revision.status.get("fail", 0)
    outcome = [words.count(revision.worse, "worse", "worse")] if revision.worse else []
    outcome += [words.count(failing, "fails", "fail")] if failing else []
    return Save(
        number=number,
        revision=revision.id,
        when=words.moment(revision.saved),
        machine=words.machine_moment(revision.saved),
        author=revision.author or "",
        edits=edits,
        outcome=", ".join(outcome) or ("not judged" if revision.error else "nothing worse"),
        tone="bad" if revision.worse or revision.error else ("near" if failing else "good"),
        error=revision.error or "",
        href=revision_href(revision.board, revision.id),
    )
