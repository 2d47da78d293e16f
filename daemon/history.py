"""The history: every board's revisions with all that they were read from and all that came of them.

One SQLite file in WAL mode, written by one thread of one process at a time, read by any number. A revision is
stored in one transaction, so it is there whole or not at all, whenever the process is killed.
"""

from __future__ import annotations

import sqlite3
from collections import Counter
from collections.abc import Mapping
from pathlib import Path
from types import MappingProxyType, TracebackType
from typing import Any

import msgspec

from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Comparison, Report, Status, Verdict
from reactance.daemon import contents
from reactance.daemon.database import Database
from reactance.daemon.places import board_file
from reactance.daemon.rows import BoardRow, HistoryError, RevisionRow, Saved, StripCell

__all__ = ["BoardRow", "History", "HistoryError", "RevisionRow", "Saved", "StripCell"]

MOST_BLOCKS = 100  # deposits of solved blocks kept per board; what falls out is solved again

_REVISION = "SELECT id, board, sha256, saved, read, author, parts, status, worse, error FROM revision"
_BOARD = "SELECT id, name, file, gone, pinned FROM board"


class History:
    """The history in one file. Safe to use from many threads; every answer is read whole and then let go."""

    def __init__(self, database: Database) -> None:
        self._database = database

    @classmethod
    def open(cls, path: Path, *, create: bool = True) -> History:
        """Opens the file, makes it where `create` allows, and brings its tables to this version.

        Raises `HistoryError` where it cannot: no such file, a newer version's, not ours, on a network share.
        """
        return cls(Database(path, create=create))

    @property
    def path(self) -> Path:
        """The database file."""
        return self._database.path

    def close(self) -> None:
        """Closes all connections; any later use raises `HistoryError`."""
        self._database.close()

    def __enter__(self) -> History:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    # -- boards and revisions ------------------------------------------------------------------------------

    def boards(self) -> tuple[BoardRow, ...]:
        """All boards by name."""
        return tuple(_board(row) for row in self._database.rows(f"{_BOARD} ORDER BY name, id"))

    def board(self, board_id: int) -> BoardRow | None:
        """The board of that id."""
        row = self._database.row(f"{_BOARD} WHERE id = ?", (board_id,))
        return _board(row) if row else None

    def board_of(self, file: str) -> BoardRow | None:
        """The board whose export is `file` (any way of writing its path)."""
        row = self._database.row(f"{_BOARD} WHERE file = ?", (file,))
        row = row or self._database.row(f"{_BOARD} WHERE file = ?", (board_file(file),))
        return _board(row) if row else None

    def revisions(self, board_id: int) -> tuple[RevisionRow, ...]:
        """All revisions of a board, oldest first, those that could not be used among them."""
        rows = self._database.rows(f"{_REVISION} WHERE board = ? ORDER BY id", (board_id,))
        return tuple(_revision(row) for row in rows)

    def revision(self, revision_id: int) -> RevisionRow | None:
        """The revision of that id."""
        row = self._database.row(f"{_REVISION} WHERE id = ?", (revision_id,))
        return _revision(row) if row else None

    def latest(self, board_id: int, *, good: bool = True) -> RevisionRow | None:
        """The newest revision: of those that could be used, or with `good=False` of all."""
        only = " AND error IS NULL" if good else ""
        row = self._database.row(f"{_REVISION} WHERE board = ?{only} ORDER BY id DESC LIMIT 1", (board_id,))
        return _revision(row) if row else None

    def previous(self, revision_id: int) -> RevisionRow | None:
        """The newest usable revision of the same board before that one."""
        row = self._database.row(
            f"{_REVISION} WHERE board = (SELECT board FROM revision WHERE id = ?) AND id < ? "
            "AND error IS NULL ORDER BY id DESC LIMIT 1",
            (revision_id, revision_id),
        )
        return _revision(row) if row else None

    def baseline(self, board_id: int, newer_id: int | None = None) -> RevisionRow | None:
        """What the revision `newer_id` is compared against: the pinned one if it is older, else the previous.

        Without `newer_id`: what a revision stored next would be compared against.
        """
        board = self.board(board_id)
        if board is None:
            return None
        if board.pinned is not None and (newer_id is None or board.pinned < newer_id):
            return self.revision(board.pinned)
        return self.latest(board_id) if newer_id is None else self.previous(newer_id)

    def pin(self, board_id: int, revision_id: int | None) -> None:
        """Pins the board's baseline, or with None lets every revision be compared with the previous one."""
        if revision_id is not None:
            revision = self.revision(revision_id)
            if revision is None or revision.board != board_id:
                raise HistoryError(f"this board has no revision {revision_id} (`reactance history` lists them)")
            if revision.error is not None:
                raise HistoryError(
                    f"revision {revision_id} could not be analysed ({revision.error}); "
                    "pin one that could (`reactance history` lists them)"
                )
        with self._database.writing() as connection:
            connection.execute("UPDATE board SET pinned = ? WHERE id = ?", (revision_id, board_id))

    # -- what a revision holds -----------------------------------------------------------------------------

    def report(self, revision_id: int) -> Report | None:
        """The results of a revision; None for one that could not be analysed."""
        row = self._database.row("SELECT report FROM revision WHERE id = ?", (revision_id,))
        return contents.decode(row[0], Report) if row and row[0] is not None else None

    def files(self, revision_id: int) -> BoardFiles:
        """Everything the revision was read from, byte for byte."""
        rows = self._database.rows(
            "SELECT content.role, content.name, blob.data FROM content LEFT JOIN blob ON blob.id = content.blob "
            "WHERE content.revision = ? ORDER BY content.id",
            (revision_id,),
        )
        found = contents.bundle(rows)
        if found is None:
            raise HistoryError(f"the history keeps no files of revision {revision_id} (they could not be read)")
        return found

    def comparison(self, revision_id: int) -> Comparison | None:
        """The comparison with the baseline as it was judged when the revision was stored."""
        row = self._database.row("SELECT comparison FROM revision WHERE id = ?", (revision_id,))
        return contents.decode(row[0], Comparison) if row and row[0] is not None else None

    def compared_with(self, revision_id: int) -> RevisionRow | None:
        """The baseline of that stored comparison."""
        row = self._database.row("SELECT baseline FROM revision WHERE id = ?", (revision_id,))
        return self.revision(row[0]) if row and row[0] is not None else None

    def compare(self, older_id: int, newer_id: int) -> Comparison:
        """What was edited between any two revisions of a board and what that moved."""
        from reactance.analysis.difference import compare
        from reactance.analysis.exports import read_export

        sides = []
        for revision_id in (older_id, newer_id):
            report = self.report(revision_id)
            if report is None:
                raise HistoryError(f"revision {revision_id} has no results to compare")
            files = self.files(revision_id)
            sides.append((read_export(files.export), report, files.brief))
        return compare(sides[0], sides[1])

    def strip(self, board_id: int, most: int = 60) -> Mapping[str, tuple[StripCell, ...]]:
        """The last `most` usable revisions of every check of the newest of them, oldest first.

        Checks come in the order of the newest report; those that vanished follow.
        """
        names = dict(self._database.rows("SELECT id, check_id FROM measured WHERE board = ?", (board_id,)))
        rows = self._database.rows(
            "SELECT revision, measured, nominal, low, high, margin, status, verdict FROM figure "
            "WHERE revision IN (SELECT id FROM revision WHERE board = ? AND error IS NULL "
            "ORDER BY id DESC LIMIT ?) ORDER BY revision, measured",
            (board_id, most),
        )
        cells: dict[str, list[StripCell]] = {name: [] for name in names.values()}
        for revision, measured, *figures in rows:
            name = names[measured]
            cells[name].append(StripCell(revision, name, *figures))
        cells = {name: found for name, found in cells.items() if found}
        return MappingProxyType({check: tuple(found) for check, found in self._ordered(board_id, cells)})

    def cells(self, board_id: int, check_id: str, most: int = 60) -> tuple[StripCell, ...]:
        """The last `most` usable revisions of one check, oldest first; as `strip`, without reading the others."""
        rows = self._database.rows(
            "SELECT figure.revision, ?2, figure.nominal, figure.low, figure.high, figure.margin, figure.status, "
            "figure.verdict FROM figure WHERE figure.measured = "
            "(SELECT id FROM measured WHERE board = ?1 AND check_id = ?2) AND figure.revision IN "
            "(SELECT id FROM revision WHERE board = ?1 AND error IS NULL ORDER BY id DESC LIMIT ?3) "
            "ORDER BY figure.revision",
            (board_id, check_id, most),
        )
        return tuple(StripCell(*row) for row in rows)

    def _ordered(self, board_id: int, cells: Mapping[str, list[StripCell]]) -> list[tuple[str, list[StripCell]]]:
        newest = self.latest(board_id)
        report = self.report(newest.id) if newest else None
        place = {check.id: order for order, check in enumerate(report.checks)} if report else {}
        return sorted(cells.items(), key=lambda item: place.get(item[0], len(place)))

    # -- writing -------------------------------------------------------------------------------------------

    def store(
        self,
        save: Saved,
        files: BoardFiles,
        report: Report,
        comparison: Comparison | None = None,
        baseline: int | None = None,
    ) -> RevisionRow | None:
        """Stores a revision whole; None where the newest one holds the same contents already.

        `comparison` is that with the revision `baseline`.
        """
        counts = Counter(check.status for check in report.checks)
        verdicts = {move.check: move.verdict for move in comparison.movements} if comparison else {}
        packed_report = contents.encode(report)
        packed_comparison = contents.encode(comparison) if comparison else None
        pieces = contents.pieces(files)
        name = report.design.name or Path(save.file).stem
        with self._database.writing() as connection:
            board = _board_row(connection, save.file, name)
            if _same_as_newest(connection, board, files.sha256, None):
                return None
            revision = _insert_revision(
                connection,
                (
                    board,
                    files.sha256,
                    save.saved,
                    save.read,
                    save.author,
                    report.design.parts,
                    msgspec.json.encode(counts).decode(),
                    sum(verdict == "worse" for verdict in verdicts.values()),
                    None,
                    baseline,
                    packed_report,
                    packed_comparison,
                ),
            )
            contents.insert(connection, revision, pieces)
            _insert_figures(connection, board, revision, report, verdicts)
        return self.revision(revision)

    def store_error(self, save: Saved, files: BoardFiles | None, message: str) -> RevisionRow | None:
        """Records a save that could not be used, with its message; None where that is the newest row already.

        What was stored before stays as it is, and stays what is shown.
        """
        pieces = contents.pieces(files) if files else ()
        sha256 = files.sha256 if files else ""
        with self._database.writing() as connection:
            board = _board_row(connection, save.file, None)
            if _same_as_newest(connection, board, sha256, message):
                return None
            revision = _insert_revision(
                connection,
                (board, sha256, save.saved, save.read, save.author, 0, "{}", 0, message, None, None, None),
            )
            contents.insert(connection, revision, pieces)
        return self.revision(revision)

    def mark_gone(self, file: str, gone: bool = True) -> bool:
        """Marks a board's export as gone, or as back; whether that was news. Its history stays."""
        with self._database.writing() as connection:
            changed = connection.execute(
                "UPDATE board SET gone = ? WHERE file = ? AND gone <> ?", (int(gone), file, int(gone))
            )
            return changed.rowcount > 0

    def blocks(self, board_id: int) -> tuple[bytes, ...]:
        """The solved blocks kept for the board, oldest first, for reuse after a restart."""
        rows = self._database.rows("SELECT data FROM solved WHERE board = ? ORDER BY id", (board_id,))
        return tuple(contents.unpack(row[0]) for row in rows)

    def keep_blocks(self, board_id: int, blocks: bytes, most: int = MOST_BLOCKS) -> None:
        """Keeps solved blocks for the board beside those kept before, of which the oldest make room."""
        packed = contents.pack(blocks)
        with self._database.writing(announce=False) as connection:
            connection.execute("INSERT INTO solved (board, data) VALUES (?, ?)", (board_id, packed))
            connection.execute(
                "DELETE FROM solved WHERE board = ? AND id <= "
                "(SELECT id FROM solved WHERE board = ? ORDER BY id DESC LIMIT 1 OFFSET ?)",
                (board_id, board_id, most),
            )

    # -- noticing changes ----------------------------------------------------------------------------------

    def version(self) -> int:
        """Grows with every change that any process makes."""
        return self._database.version()

    def wait(self, since: int, timeout: float) -> int:
        """Blocks until `version() > since` or `timeout` seconds have passed; the version then."""
        return self._database.wait(since, timeout)


def _board(row: tuple[Any, ...]) -> BoardRow:
    return BoardRow(row[0], row[1], row[2], bool(row[3]), row[4])


def _revision(row: tuple[Any, ...]) -> RevisionRow:
    identity, board, sha256, saved, read, author, parts, status, worse, error = row
    counts = MappingProxyType(msgspec.json.decode(status, type=dict[Status, int]))
    return RevisionRow(identity, board, sha256, saved, read, author, parts, counts, worse, error)


def _board_row(connection: sqlite3.Connection, file: str, name: str | None) -> int:
    """The board's id, made where it is new; a save shows that the export is there, and may rename the board."""
    row = connection.execute("SELECT id, name, gone FROM board WHERE file = ?", (file,)).fetchone()
    if row is None:
        added = connection.execute(
            "INSERT INTO board (name, file, gone) VALUES (?, ?, 0)", (name or Path(file).stem, file)
        )
        return int(added.lastrowid or 0)
    if row[2] or (name is not None and name != row[1]):
        connection.execute("UPDATE board SET gone = 0, name = ? WHERE id = ?", (name or row[1], row[0]))
    return int(row[0])


def _same_as_newest(connection: sqlite3.Connection, board: int, sha256: str, error: str | None) -> bool:
    row = connection.execute(
        "SELECT sha256, error FROM revision WHERE board = ? ORDER BY id DESC LIMIT 1", (board,)
    ).fetchone()
    return row is not None and row == (sha256, error)


def _insert_revision(connection: sqlite3.Connection, values: tuple[object, ...]) -> int:
    added = connection.execute(
        "INSERT INTO revision (board, sha256, saved, read, author, parts, status, worse, error, baseline, "
        "report, comparison) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
        values,
    )
    return int(added.lastrowid or 0)


def _insert_figures(
    connection: sqlite3.Connection,
    board: int,
    revision: int,
    report: Report,
    verdicts: Mapping[str, Verdict],
) -> None:
    known = dict(connection.execute("SELECT check_id, id FROM measured WHERE board = ?", (board,)).fetchall())
    present = {check.id for check in report.checks}
    vanished = [check for check in verdicts if check not in present]
    for check_id in [*present, *vanished]:
        if check_id not in known:
            added = connection.execute("INSERT INTO measured (board, check_id) VALUES (?, ?)", (board, check_id))
            known[check_id] = added.lastrowid
    rows: list[tuple[object, ...]] = [
        (
            revision,
            known[check.id],
            check.nominal,
            check.low,
            check.high,
            check.margin,
            check.status,
            verdicts.get(check.id),
        )
        for check in {check.id: check for check in report.checks}.values()
    ]
    rows += [(revision, known[check], None, None, None, None, "unknown", verdicts[check]) for check in vanished]
    connection.executemany("INSERT INTO figure VALUES (?, ?, ?, ?, ?, ?, ?, ?)", rows)
