"""What the pages of all boards, one board and one revision show, ready for the templates."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from reactance.analysis.design import InputError
from reactance.analysis.difference import sentence
from reactance.analysis.movement_words import edit_words
from reactance.analysis.report import Check, Comparison, Movement, ProblemEntry, Report
from reactance.daemon.history import BoardRow, History, RevisionRow
from reactance.dashboard import words
from reactance.dashboard.archive import Archive
from reactance.dashboard.capacitors import CapacitorRow, capacitor_rows
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

MOST_MOVEMENTS = 24
MOST_FAILING = 24
MOST_IN_GROUP = 12
SMALL_BOARD = 90  # up to so many checks are all shown at once
MOST_CAPACITORS = 60
MOST_SAVES = 12
MOST_EDITS = 12
_PRESSING = frozenset({"fail", "marginal", "unknown"})
_QUIET_KINDS = frozenset({"part", "net"})  # many, and rarely news


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
class Group:
    """Checks of one kind: those shown, those behind a disclosure, and how many more there are."""

    key: str
    title: str
    standing: str
    rows: tuple[Row, ...]
    quiet: tuple[Row, ...]
    total: int

    @property
    def rest(self) -> int:
        """How many are not on the page."""
        return self.total - len(self.rows) - len(self.quiet)


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


@dataclass(frozen=True, slots=True)
class Shown:
    """A revision of a board with everything that pages about it need."""

    archive: Archive
    board: BoardRow
    revisions: tuple[RevisionRow, ...]
    revision: RevisionRow
    report: Report
    baseline: RevisionRow | None
    comparison: Comparison | None

    @property
    def older(self) -> Report | None:
        """The results of the baseline."""
        return self.archive.report(self.baseline.id) if self.baseline else None

    def strips(self) -> Strips:
        """Draws strips over this board's last saves, the shown one marked."""
        older = self.older
        return Strips(
            self.archive,
            self.board.id,
            columns(self.archive, self.revisions, self.revision.id),
            (older, self.report) if older else (self.report,),
            self.baseline.id if self.baseline else None,
        )


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


def shown(
    archive: Archive, board_id: int, revision_id: int | None = None, *, alone: bool = False
) -> Shown | BoardRow | None:
    """The revision to show (the newest usable one); only the board where none is usable; None for no board.

    It is compared with its baseline, or with `alone` with the save before, whatever is pinned.
    """
    history = archive.history
    board = history.board(board_id)
    if board is None:
        return None
    revisions = history.revisions(board_id)
    usable = [revision for revision in revisions if revision.error is None]
    if revision_id is not None:
        usable = [revision for revision in usable if revision.id == revision_id]
    report = archive.report(usable[-1].id) if usable else None
    if report is None:
        return board
    revision = usable[-1]
    wanted = history.previous(revision.id) if alone else history.baseline(board_id, revision.id)
    baseline, comparison = _comparison(archive, revision, wanted)
    return Shown(archive, board, revisions, revision, report, baseline, comparison)


def _comparison(
    archive: Archive, revision: RevisionRow, wanted: RevisionRow | None
) -> tuple[RevisionRow | None, Comparison | None]:
    """The comparison with the wanted baseline, as stored or, where another was pinned since, made now.

    Where this version cannot read one of the two exports any more, the stored comparison and its own baseline.
    """
    if wanted is None:
        return None, None
    stored = archive.stored(revision.id)
    if stored.baseline == wanted.id:
        return wanted, stored.comparison
    try:
        return wanted, archive.compare(wanted.id, revision.id)
    except InputError:
        then = archive.history.revision(stored.baseline) if stored.baseline is not None else None
        return then, stored.comparison


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
    edits = tuple(edit_words(edit, found.older, found.report) for edit in comparison.edits)
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


def movement_text(found: Shown, move: Movement) -> str:
    """The sentence of a movement: the check, its figures, the limit, and the edits behind it."""
    edits = found.comparison.edits if found.comparison else ()
    return sentence(move, edits, found.older, found.report)


def groups(found: Shown, strips: Strips) -> tuple[Group, ...]:
    """All checks by what they are about; on a large board the most pressing of each kind."""
    kinds: dict[str, list[Check]] = {}
    for check in found.report.checks:
        kinds.setdefault(kind_of(check), []).append(check)
    return tuple(_summary(found, strips, scope, kinds[scope]) for scope in words.SCOPES if scope in kinds)


def kind_of(check: Check) -> str:
    """The kind of a check, a key of `words.SCOPES`."""
    scope = check.id.partition(":")[0]
    return scope if scope in words.SCOPES else ""


def _summary(found: Shown, strips: Strips, scope: str, checks: Sequence[Check]) -> Group:
    """A kind on the page of its board: what is pressing in the open, the rest behind a disclosure or a link."""
    moved = {move.check for move in found.comparison.movements} if found.comparison else set()
    pressing = [check for check in checks if check.status in _PRESSING or check.id in moved]
    if len(checks) <= MOST_IN_GROUP and scope not in _QUIET_KINDS:
        return _group(found, strips, checks, checks)
    if len(found.report.checks) > SMALL_BOARD:
        return _group(found, strips, checks, by_weight(checks, found.comparison)[:MOST_IN_GROUP])
    chosen = {check.id for check in pressing}
    quiet = [check for check in checks if check.id not in chosen]
    return _group(found, strips, checks, by_weight(pressing, found.comparison), quiet)


def page_of_group(found: Shown, scope: str, start: int, most: int) -> Group | None:
    """One kind's checks from `start`, at most `most`, the most pressing first; None where there are none."""
    checks = [check for check in found.report.checks if kind_of(check) == scope]
    ordered = by_weight(checks, found.comparison)[start : start + most]
    return _group(found, found.strips(), checks, ordered) if ordered else None


def _group(
    found: Shown, strips: Strips, checks: Sequence[Check], shown: Sequence[Check], quiet: Sequence[Check] = ()
) -> Group:
    board, scope = found.board.id, kind_of(checks[0])
    return Group(
        key=scope or "other",
        title=words.SCOPES[scope],
        standing=words.tally(Counter(check.status for check in checks)),
        rows=tuple(check_row(board, check, strips) for check in shown),
        quiet=tuple(check_row(board, check, strips) for check in quiet),
        total=len(checks),
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
