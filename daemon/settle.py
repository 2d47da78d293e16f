"""When a save is over: decides from events and file signatures, and from nothing else, what to read when.

A save may come in one piece or in many, in place or by renames. A board is read once its files have been quiet
for a moment, is called broken once they have been so for two seconds, and gone once its export has stayed away.
Time is an argument of every method, so that all of this can be tested without waiting.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Literal

Signature = tuple[object, ...]
Hint = Literal["arrived", "closed", "opened", "written", "removed", "found"]
Step = Literal["read", "broken", "gone"]

# How long files must have been quiet, by what the file system said last. A rename brings a whole file. A writer
# that has closed its file is most likely done. One that has written without closing is most likely not.
_QUIET: Mapping[Hint, float] = {
    "arrived": 0.02,
    "closed": 0.05,
    "found": 0.1,
    "removed": 0.1,
    "opened": 0.15,
    "written": 0.4,
}
# Only Linux says when a writer closes; elsewhere a file that was written may be whole.
_QUIET_WITHOUT_CLOSE: Mapping[Hint, float] = {**_QUIET, "written": 0.15}
# Where files are only looked at, nothing says that a writer is done.
QUIET_POLLED: Mapping[Hint, float] = {**_QUIET, "found": 0.4}
BROKEN_AFTER = 2.0
GONE_AFTER = 1.0
RESTLESS_AFTER = 0.5
_LOOK_AGAIN = 0.03


@dataclass(slots=True)
class _Pending:
    """A board with something going on. `failed` is the message of a reading that found it broken."""

    since: float
    changed: float
    hint: Hint
    signature: Signature | None = None
    absent_since: float | None = None
    failed: str | None = None


@dataclass(slots=True)
class Settler:
    """Boards on which something is going on, by key. `present` and `signature` look at the files themselves."""

    present: Callable[[str], bool]
    signature: Callable[[str], Signature]
    quiet: Mapping[Hint, float] = field(
        default_factory=lambda: _QUIET if sys.platform == "linux" else _QUIET_WITHOUT_CLOSE
    )
    _pending: dict[str, _Pending] = field(default_factory=dict)

    def note(self, board: str, hint: Hint, now: float) -> None:
        """Something happened to one of the board's files."""
        pending = self._pending.get(board)
        if pending is None:
            self._pending[board] = _Pending(now, now, hint, self.signature(board))
            return
        pending.changed, pending.hint, pending.failed = now, hint, None

    def broken(self, board: str, signature: Signature, message: str, changed: float) -> None:
        """A reading of these very contents failed; they get until two seconds after `changed`, their last change."""
        pending = self._pending.get(board)
        if pending is None:
            pending = self._pending[board] = _Pending(changed, changed, "found", signature)
        if self.signature(board) == signature:
            pending.failed, pending.signature = message, signature
        else:
            pending.failed = None

    def settled(self, board: str) -> None:
        """The board was read whole; whatever happens next is another save."""
        self._pending.pop(board, None)

    def __contains__(self, board: str) -> bool:
        return board in self._pending

    def boards(self) -> tuple[str, ...]:
        """The boards on which something is going on."""
        return tuple(self._pending)

    def changed(self, board: str, now: float) -> float:
        """When the board last changed, as far as is known."""
        pending = self._pending.get(board)
        return pending.changed if pending else now

    def wait(self, now: float) -> float | None:
        """Seconds until a board should be looked at again; None if nothing is going on."""
        if not self._pending:
            return None
        return max(0.0, min(self._next(pending, now) for pending in self._pending.values()) - now)

    def _next(self, pending: _Pending, now: float) -> float:
        if pending.absent_since is not None:
            return min(pending.absent_since + GONE_AFTER, now + _LOOK_AGAIN)
        if pending.failed is not None:
            return min(pending.changed + BROKEN_AFTER, now + 4 * _LOOK_AGAIN)
        return min(pending.changed + self.quiet[pending.hint], now + _LOOK_AGAIN)

    def due(self, now: float) -> list[tuple[str, Step, str]]:
        """What is to be done now: (board, step, message of a broken one)."""
        steps = []
        for board, pending in list(self._pending.items()):
            step = self._judge(board, pending, now)
            if step is not None:
                steps.append((board, step, pending.failed or ""))
                if step != "read":
                    del self._pending[board]
        return steps

    def _judge(self, board: str, pending: _Pending, now: float) -> Step | None:
        if not self.present(board):
            pending.failed = None
            if pending.absent_since is None:
                pending.absent_since = now
            return "gone" if now - pending.absent_since >= GONE_AFTER else None
        signature = self.signature(board)
        if pending.absent_since is not None or signature != pending.signature:
            if pending.absent_since is not None:
                pending.hint = "found"
            pending.absent_since, pending.signature, pending.failed, pending.changed = None, signature, None, now
            return None
        still = now - pending.changed
        if pending.failed is not None:
            return "broken" if still >= BROKEN_AFTER else None
        # A file that is saved over and over gets no rest, but each save leaves it whole for a while.
        restless = pending.hint in ("arrived", "closed") and now - pending.since >= RESTLESS_AFTER
        return "read" if restless or still >= self.quiet[pending.hint] else None
