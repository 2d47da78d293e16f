"""Server-sent events: a page learns that what it shows has changed.

A stream holds one thread of the server for as long as its page is open, so there is a greatest number of them.
The id of an event is the state that it announces; a browser that reconnects sends the last one it saw
(`Last-Event-ID`) and so misses nothing and repeats nothing.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator

from reactance.daemon.history import History, HistoryError

VIEWERS = 48  # open pages that are kept up to date; more of them ask again by themselves
RETRY_MS = 2000
HEARTBEAT = 12.0  # seconds; writing is how a viewer who has gone is noticed
_SLICE = 1.0  # how long a closing server waits for its streams


class Streams:
    """The open streams of one server."""

    def __init__(self, history: History, viewers: int = VIEWERS, heartbeat: float = HEARTBEAT) -> None:
        self._history = history
        self._places = threading.BoundedSemaphore(viewers)
        self.heartbeat = heartbeat
        self._closing = threading.Event()
        self._count = 0
        self._guard = threading.Lock()

    @property
    def open(self) -> int:
        """How many streams are open now."""
        return self._count

    def close(self) -> None:
        """Ends every stream within a second; new ones end at once."""
        self._closing.set()

    def stream(self, board: int | None, seen: str) -> Stream | None:
        """A stream of changes of a board (of any board with None), or None where all places are taken."""
        if not self._places.acquire(blocking=False):
            return None
        with self._guard:
            self._count += 1
        return Stream(self._changes(board, seen), self._release)

    def _release(self) -> None:
        with self._guard:
            self._count -= 1
        self._places.release()

    def _changes(self, board: int | None, seen: str) -> Iterator[str]:
        yield f"retry: {RETRY_MS}\n\n"
        spoken = time.monotonic()
        try:
            version = self._history.version()
            while not self._closing.is_set():
                now = state(self._history, board)
                if now != seen:
                    seen, spoken = now, time.monotonic()
                    yield f"id: {now}\nevent: change\ndata: {now}\n\n"
                version = max(version, self._history.wait(version, _SLICE))
                if time.monotonic() - spoken >= self.heartbeat:
                    spoken = time.monotonic()
                    yield ": here\n\n"
        except HistoryError:
            return  # closed while a page was still open


class Stream:
    """An open stream; it gives its place back when closed, also where it was never read."""

    def __init__(self, changes: Iterator[str], release: Callable[[], None]) -> None:
        self._changes = changes
        self._release = release
        self._guard = threading.Lock()
        self._open = True

    def __iter__(self) -> Iterator[str]:
        return self

    def __next__(self) -> str:
        try:
            return next(self._changes)
        except BaseException:
            self.close()
            raise

    def close(self) -> None:
        """Gives the place back. The server calls it when the viewer has gone."""
        with self._guard:
            if not self._open:
                return
            self._open = False
        self._release()


def state(history: History, board: int | None) -> str:
    """A short text that differs whenever a page about the board (or about all of them) would differ."""
    if board is None:
        return f"all-{history.version()}"
    row = history.board(board)
    if row is None:
        return "none"
    newest = history.latest(board, good=False)
    return f"{board}-{newest.id if newest else 0}-{int(row.gone)}-{row.pinned or 0}"
