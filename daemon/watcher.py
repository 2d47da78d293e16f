"""Watches places: turns words of changes into saves, reads each save when it is over, hands it to the analyst.

One thread (the caller of `run`) decides and reads; the analyst's thread analyses and writes. So a save made while
another is being analysed is read at once and waits its turn, and is not lost when a third one follows.
"""

from __future__ import annotations

import queue
import time
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from reactance.analysis.files import BoardFiles
from reactance.daemon.analyst import Analyst, Job
from reactance.daemon.history import History
from reactance.daemon.intake import Intake
from reactance.daemon.outcome import Outcome, Timings
from reactance.daemon.reading import Signature, Stamp, is_export, read_board, signature, stamp
from reactance.daemon.registry import Registry
from reactance.daemon.settle import QUIET_POLLED, Hint, Settler
from reactance.daemon.sources import Source
from reactance.daemon.walk import Root, roots_of
from reactance.daemon.workers import Workers

POLLING_SECONDS = 2.0
_ASIDE_SECONDS = 1.0  # files outside the watched folders are looked at this often
_RESCAN_SECONDS = 60.0
_RESCAN_SHARE = 500.0  # ... or more rarely, so that rescans take no more than this fraction of the time
_PATIENCE = 5.0


@dataclass(frozen=True, slots=True)
class _Event:
    path: str
    hint: Hint
    folder: bool


@dataclass(frozen=True, slots=True)
class _Done:
    job: Job
    outcome: Outcome


class _Lost:
    """Events went missing."""


class _Stop:
    """The end."""


class Watcher:
    """Watches `places` (files and folders that exist) until `stop()`. Every outcome goes to `tell`, sentences for
    people to `announce`; both are called from the thread in `run`. `first_pass(done, total)` shows how far the
    catching up at the start has come.
    """

    def __init__(
        self,
        places: Iterable[Path],
        history: History,
        intake: Intake,
        *,
        tell: Callable[[Outcome], None],
        announce: Callable[[str], None],
        polling: float | None = None,
        first_pass: Callable[[int, int], None] | None = None,
        workers: Workers | None = None,
    ) -> None:
        self._roots = roots_of(places)
        self._history = history
        self._tell = tell
        self._announce = announce
        self._polling = polling
        self._first_pass = first_pass or (lambda done, total: None)
        self._inbox: queue.SimpleQueue[_Event | _Done | _Lost | _Stop] = queue.SimpleQueue()
        self._registry = Registry()
        self._settler = Settler(lambda board: Path(board).exists(), self._registry.signature)
        self._analyst = Analyst(intake, lambda job, outcome: self._inbox.put(_Done(job, outcome)), workers)
        self._refused: dict[str, tuple[BoardFiles, str]] = {}
        self._no_exports: dict[str, Stamp] = {}
        self._polled: tuple[Root, ...] = ()
        self._next_poll = self._next_aside = self._next_rescan = 0.0
        self._folders: dict[Root, object] = {}
        self._catching_up: set[str] = set()
        self._caught_up = 0

    # -- life ----------------------------------------------------------------------------------------------

    def run(self) -> None:
        """Watches until `stop()` is called; then finishes what was read."""
        source = Source(
            lambda path, hint, folder: self._inbox.put(_Event(path, hint, folder)),
            lambda: self._inbox.put(_Lost()),
            self._announce,
        )
        self._analyst.start()
        try:
            if self._polling is not None:
                self._polled = self._roots
            else:
                deaf = source.start(self._roots)
                self._polled = tuple(root for root in self._roots if root.folder in deaf)
            if self._polled:
                self._settler.quiet = QUIET_POLLED
            self._catch_up()
            while self._turn(source):
                pass
        finally:
            source.stop()
            self._analyst.stop(_PATIENCE)
            self._drain()

    def stop(self) -> None:
        """Makes `run` return soon. May be called from any thread and from a signal handler."""
        self._inbox.put(_Stop())

    def _drain(self) -> None:
        while not self._inbox.empty():
            item = self._inbox.get()
            if isinstance(item, _Done):
                self._tell(item.outcome)

    def _turn(self, source: Source) -> bool:
        """Waits for the next thing to do and does it; False at the end."""
        now = time.monotonic()
        waits = [self._settler.wait(now), self._next_aside - now, self._next_rescan - now]
        if self._polled:
            waits.append(self._next_poll - now)
        try:
            item = self._inbox.get(timeout=max(0.0, min(wait for wait in waits if wait is not None)))
            while True:
                if isinstance(item, _Stop):
                    return False
                self._accept(item)
                item = self._inbox.get_nowait()
        except queue.Empty:
            pass
        self._look(source)
        for board, step, message in self._settler.due(time.monotonic()):
            if step == "read":
                self._read(board)
            elif step == "gone":
                self._lose(board)
            else:
                self._refuse(board, message)
        return True

    # -- noticing ------------------------------------------------------------------------------------------

    def _accept(self, item: _Event | _Done | _Lost | _Stop) -> None:
        if isinstance(item, _Done):
            self._finish(item.job, item.outcome)
        elif isinstance(item, _Lost):
            self._next_rescan = 0.0
        elif isinstance(item, _Event):
            self._hear(item)

    def _hear(self, event: _Event) -> None:
        if event.folder:
            for board in self._registry.below(event.path):
                self._note(board, "removed" if event.hint == "removed" else "found")
            if event.hint in ("arrived", "opened"):
                self._search(self._roots, Path(event.path))
            return
        boards = self._registry.dependents(event.path)
        for board in boards:
            self._note(board, event.hint)
        if event.path not in boards and event.hint != "removed":
            path = Path(event.path)
            if any(root.holds(path) for root in self._roots):
                self._note(event.path, event.hint)

    def _note(self, board: str, hint: Hint) -> None:
        self._settler.note(board, hint, time.monotonic())

    def _look(self, source: Source) -> None:
        """What is due to be looked at without any word of change."""
        now = time.monotonic()
        if now >= self._next_aside:
            self._next_aside = now + _ASIDE_SECONDS
            self._look_aside(source)
        if self._polled and now >= self._next_poll:
            self._search(self._polled)
            self._next_poll = time.monotonic() + (self._polling or POLLING_SECONDS)
        if now >= self._next_rescan:
            self._search(self._roots)
            took = time.monotonic() - now
            self._next_rescan = time.monotonic() + max(_RESCAN_SECONDS, took * _RESCAN_SHARE)

    def _look_aside(self, source: Source) -> None:
        """Looks at what known boards depend on outside the watched folders, and whether those are the same ones."""
        looks: dict[str, Stamp] = {}  # boards share such files: each is looked at once

        def look(path: str) -> Stamp:
            if path not in looks:
                looks[path] = stamp(path)
            return looks[path]

        for board in self._registry.names():
            self._check(board, look, self._is_aside)
        for root in self._roots if self._polling is None else ():
            identity = _identity(root.folder)
            if identity is not None and identity != self._folders.get(root):
                if root in self._folders:
                    source.again(root)
                    self._search((root,))
                self._folders[root] = identity

    @lru_cache(maxsize=65536)  # noqa: B019 - a watcher lives as long as its process
    def _is_aside(self, path: str) -> bool:
        return not any(root.hears_of(Path(path)) for root in self._roots)

    def _check(
        self, board: str, look: Callable[[str], Stamp] = stamp, only: Callable[[str], bool] = lambda path: True
    ) -> None:
        """Has a board read again whose files look other than when it was read, unless that is under way."""
        known = self._registry.get(board)
        if known is None or board in self._settler or (known.gone and not Path(board).exists()):
            return
        hint = self._registry.changed(board, look, only)
        if hint is not None:
            self._note(board, hint)

    def _search(self, roots: Iterable[Root], folder: Path | None = None) -> None:
        """Looks through roots (or through one folder of theirs) for exports that are new or have changed."""
        for root in roots:
            if folder is not None and not (root.deep and folder.is_relative_to(root.folder)):
                continue
            for path in root.below(folder or root.folder):
                board = str(path)
                if board in self._registry:
                    self._check(board)
                elif board not in self._settler and self._no_exports.get(board) != stamp(board):
                    self._note(board, "found")
        for board in self._registry.names():
            self._check(board)

    # -- reading -------------------------------------------------------------------------------------------

    def _read(self, board: str) -> None:
        if not self._is_board(board):
            self._no_exports[board] = stamp(board)
            self._settler.settled(board)
            return
        known = self._registry.know(board)
        started, clock = time.time(), time.perf_counter()
        reading = read_board(Path(board))
        if signature(reading.seen) != tuple(reading.seen.values()):
            self._settler.note(board, "written", time.monotonic())  # while it was being read
            return
        changed = self._settler.changed(board, time.monotonic())
        self._registry.saw(board, reading.seen)
        seen = self._registry.signature(board)
        took = time.perf_counter() - clock
        if reading.files is None:
            self._refused.pop(board, None)
            known.sha256 = None
            self._settler.broken(board, seen, str(reading.error), changed)
            return
        if reading.files.sha256 == known.sha256:
            self._same_again(board, seen, changed)
            return
        self._settler.settled(board)
        self._refused.pop(board, None)
        known.sha256, known.gone = reading.files.sha256, False
        timings = _so_far(reading.saved, started, time.monotonic() - took - changed, took)
        self._analyst.submit(Job("take", board, reading.saved, started, reading.files, "", seen, changed, timings))

    def _is_board(self, board: str) -> bool:
        if board in self._registry or any(board in root.files for root in self._roots):
            return True
        return is_export(Path(board))

    def _same_again(self, board: str, seen: Signature, changed: float) -> None:
        known = self._registry.know(board)
        refused = self._refused.get(board)
        if refused is not None:  # and still waiting to be called broken
            self._settler.broken(board, seen, refused[1], changed)
            return
        self._settler.settled(board)
        if known.gone:
            known.gone = False
            self._analyst.submit(Job("back", board))
        self._arrived(board)

    def _lose(self, board: str) -> None:
        known = self._registry.get(board)
        if known is None or known.gone:
            self._arrived(board)
            return
        known.gone = True
        self._analyst.submit(Job("gone", board))

    def _refuse(self, board: str, message: str) -> None:
        known = self._registry.know(board)
        saved = max((_modified(path) for path in known.seen), default=0.0)
        files, _ = self._refused.pop(board, (None, ""))
        self._analyst.submit(Job("refuse", board, saved, time.time(), files, message))

    # -- outcomes ------------------------------------------------------------------------------------------

    def _finish(self, job: Job, outcome: Outcome) -> None:
        known = self._registry.get(job.board)
        if job.kind == "take" and outcome.kind == "broken" and job.files is not None:
            if known is not None and known.sha256 == job.files.sha256:
                self._refused[job.board] = (job.files, outcome.message)
                self._settler.broken(job.board, job.signature, outcome.message, job.changed)
            return
        if outcome.kind == "not stored" and known is not None:
            known.sha256, known.seen = None, dict.fromkeys(known.seen)  # so that it is tried again
        self._tell(outcome)
        self._arrived(job.board)

    def _catch_up(self) -> None:
        """Takes up where the last run ended: boards that are gone, saves that were missed."""
        for row in self._history.boards():
            path = Path(row.file)
            if any(root.holds(path) for root in self._roots):
                known = self._registry.know(row.file)
                known.gone = row.gone
                newest = self._history.latest(row.id, good=False)
                known.sha256 = newest.sha256 if newest and newest.error is None else None
                self._note(row.file, "found")
        self._search(self._roots)
        now = time.monotonic()
        self._next_aside, self._next_poll = now + _ASIDE_SECONDS, now + (self._polling or POLLING_SECONDS)
        self._next_rescan = now + _RESCAN_SECONDS
        self._folders = {root: _identity(root.folder) for root in self._roots}
        self._catching_up = {board for board in self._settler.boards() if self._is_board(board)}
        self._first_pass(0, len(self._catching_up))

    def _arrived(self, board: str) -> None:
        if board in self._catching_up:
            self._catching_up.discard(board)
            self._caught_up += 1
            self._first_pass(self._caught_up, self._caught_up + len(self._catching_up))


def _so_far(saved: float, started: float, settled: float, read: float) -> Timings:
    """The first stages: the event's is known where the save was just made, and not found later."""
    event = started - settled - saved
    return Timings(event=event if 0.0 <= event < _PATIENCE else 0.0, settle=settled, read=read)


def _modified(path: str) -> float:
    try:
        return Path(path).stat().st_mtime
    except OSError:
        return 0.0


def _identity(folder: Path) -> object:
    try:
        found = folder.stat()
    except OSError:
        return None
    return (found.st_dev, found.st_ino)
