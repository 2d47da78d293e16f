"""One pass over places: analyse and store what is there now and was not stored before, without watching."""

from __future__ import annotations

import time
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path

from reactance.daemon.history import History, Saved
from reactance.daemon.intake import Intake, author_of
from reactance.daemon.outcome import Outcome
from reactance.daemon.reading import is_export, read_board
from reactance.daemon.walk import Root, roots_of


def catch_up(
    places: Iterable[Path], history: History, intake: Intake, progress: Callable[[int, int], None]
) -> Iterator[Outcome]:
    """What came of each export that the places hold, and of each board known there whose export is gone."""
    roots = roots_of(places)
    exports = list(dict.fromkeys(path for root in roots for path in _exports(root)))
    for row in history.boards():
        path = Path(row.file)
        if path not in exports and not path.exists() and any(root.holds(path) for root in roots):
            yield intake.gone(row.file, True)
    progress(0, len(exports))
    for done, path in enumerate(exports, 1):
        yield _take(path, history, intake)
        progress(done, len(exports))
    intake.keep()


def _exports(root: Root) -> Iterator[Path]:
    for path in root.below(root.folder):
        if str(path) in root.files or is_export(path):
            yield path


def _take(path: Path, history: History, intake: Intake) -> Outcome:
    board = str(path)
    reading = read_board(path)
    save = Saved(board, reading.saved, time.time(), author_of(str(path.parent)))
    if reading.files is None:
        return intake.refuse(save, None, str(reading.error))
    row = history.board_of(board)
    newest = history.latest(row.id, good=False) if row else None
    if newest is not None and newest.error is None and newest.sha256 == reading.files.sha256:
        return intake.gone(board, False)
    outcome = intake.take(save, reading.files)
    if outcome.kind == "broken":
        return intake.refuse(save, reading.files, outcome.message)
    return outcome
