"""The revision that a page is about, with the baseline that it is compared with."""

from __future__ import annotations

from dataclasses import dataclass

from reactance.analysis.design import InputError
from reactance.analysis.difference import sentence
from reactance.analysis.report import Comparison, Movement, Report
from reactance.daemon.history import BoardRow, RevisionRow
from reactance.dashboard.archive import Archive
from reactance.dashboard.rows import Strips, columns


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


def movement_text(found: Shown, move: Movement) -> str:
    """The sentence of a movement: the check, its figures, the limit, and the edits behind it."""
    edits = found.comparison.edits if found.comparison else ()
    return sentence(move, edits, found.older, found.report)
