"""One pass over places: analyse and store what is there now and was not stored before, without watching."""

from __future__ import annotations

import time
from collections import deque
from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from reactance.analysis.files import BoardFiles
from reactance.daemon.history import History, Saved
from reactance.daemon.intake import Intake, author_of
from reactance.daemon.outcome import Outcome
from reactance.daemon.reading import is_export, read_board
from reactance.daemon.walk import Root, roots_of
from reactance.daemon.workers import Waiting, Workers


@dataclass(frozen=True, slots=True)
class _Taken:
    """An export on its way: what is known without analysing it, or what to store and who analyses it."""

    outcome: Outcome | None
    save: Saved
    files: BoardFiles | None = None
    waiting: Waiting | None = None

    @property
    def ready(self) -> bool:
        """Whether finishing it waits for nobody."""
        return self.outcome is not None or (self.waiting is not None and self.waiting.done())


def catch_up(
    places: Iterable[Path],
    history: History,
    intake: Intake,
    progress: Callable[[int, int], None],
    workers: Workers | None = None,
) -> Iterator[Outcome]:
    """What came of each export that the places hold, and of each board known there whose export is gone.

    `workers` share the analysis where there are enough boards for that. What is stored is stored in the order of the
    exports, each as soon as it can be.
    """
    roots = roots_of(places)
    exports = list(dict.fromkeys(path for root in roots for path in _exports(root)))
    for row in history.boards():
        path = Path(row.file)
        if path not in exports and not path.exists() and any(root.holds(path) for root in roots):
            yield intake.gone(row.file, True)
    progress(0, len(exports))
    helpers = workers if workers is not None and workers.pay(len(exports)) else None
    under_way: deque[_Taken] = deque()
    done = 0
    for path in exports:
        under_way.append(_take_up(path, history, intake, helpers))
        while under_way and (helpers is None or not helpers.room or under_way[0].ready):
            yield _finish(under_way.popleft(), intake)
            done += 1
            progress(done, len(exports))
    for done_now, taken in enumerate(under_way, done + 1):
        yield _finish(taken, intake)
        progress(done_now, len(exports))
    intake.keep()


def _exports(root: Root) -> Iterator[Path]:
    for path in root.below(root.folder):
        if str(path) in root.files or is_export(path):
            yield path


def _take_up(path: Path, history: History, intake: Intake, helpers: Workers | None) -> _Taken:
    board = str(path)
    reading = read_board(path)
    save = Saved(board, reading.saved, time.time(), author_of(str(path.parent)))
    if reading.files is None:
        return _Taken(intake.refuse(save, None, str(reading.error)), save)
    row = history.board_of(board)
    newest = history.latest(row.id, good=False) if row else None
    if newest is not None and newest.error is None and newest.sha256 == reading.files.sha256:
        return _Taken(intake.gone(board, False), save)
    waiting = intake.begin(board, reading.files, helpers) if helpers is not None else None
    return _Taken(None, save, reading.files, waiting)


def _finish(taken: _Taken, intake: Intake) -> Outcome:
    if taken.outcome is not None or taken.files is None:
        assert taken.outcome is not None
        return taken.outcome
    outcome = intake.take(taken.save, taken.files, waiting=taken.waiting)
    return intake.refuse(taken.save, taken.files, outcome.message) if outcome.kind == "broken" else outcome
