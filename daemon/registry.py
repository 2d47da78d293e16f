"""The boards that a watcher knows: which files each depends on, and what was last read of it."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from reactance.daemon.reading import Signature, signature


@dataclass(slots=True)
class Known:
    """One board. `sha256` is that of the contents last handed on, `seen` how its files looked when last read."""

    dependencies: tuple[str, ...]
    sha256: str | None = None
    gone: bool = False
    seen: Signature = ()


class Registry:
    """Boards by the path of their export, and the way back from any file to the boards that depend on it."""

    def __init__(self) -> None:
        self._boards: dict[str, Known] = {}
        self._dependents: dict[str, set[str]] = {}
        self.changes = 0

    def __contains__(self, board: str) -> bool:
        return board in self._boards

    def names(self) -> tuple[str, ...]:
        """All known boards."""
        return tuple(self._boards)

    def get(self, board: str) -> Known | None:
        """The board, if it is known."""
        return self._boards.get(board)

    def know(self, board: str) -> Known:
        """The board, known from now on."""
        known = self._boards.get(board)
        if known is None:
            known = self._boards[board] = Known((board,))
            self.changes += 1
            self._dependents.setdefault(board, set()).add(board)
        return known

    def depend(self, board: str, dependencies: tuple[str, ...]) -> None:
        """The board depends on these files and no others."""
        known = self.know(board)
        wanted = tuple(dict.fromkeys((board, *dependencies)))
        if wanted == known.dependencies:
            return
        self.changes += 1
        for path in known.dependencies:
            self._dependents.get(path, set()).discard(board)
        known.dependencies = wanted
        for path in known.dependencies:
            self._dependents.setdefault(path, set()).add(board)

    def paths(self) -> tuple[str, ...]:
        """All files that any board depends on. The same as long as `changes` is."""
        return tuple(path for path, boards in self._dependents.items() if boards)

    def dependents(self, path: str) -> tuple[str, ...]:
        """The boards that depend on a file."""
        return tuple(self._dependents.get(path, ()))

    def below(self, folder: str) -> tuple[str, ...]:
        """The boards that depend on a file in or below a folder."""
        where = Path(folder)
        found = {
            board for path, boards in self._dependents.items() if Path(path).is_relative_to(where) for board in boards
        }
        return tuple(sorted(found))

    def signature(self, board: str) -> Signature:
        """Changes whenever one of the board's files does."""
        known = self._boards.get(board)
        return signature(known.dependencies if known else (board,))

    def lost_some(self, board: str, now: Signature) -> bool:
        """Whether a file that was there when the board was last looked at is missing now."""
        known = self._boards.get(board)
        if known is None or len(known.seen) != len(now):
            return False
        return any(old is not None and new is None for old, new in zip(known.seen, now, strict=True))
