"""The boards that a watcher knows: which files each depends on, and what was last read of it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

from reactance.daemon.reading import Signature, Stamp, signature
from reactance.daemon.settle import Hint


@dataclass(slots=True)
class Known:
    """One board. `seen` is how its files looked when last read; `sha256` that of the contents last handed on."""

    seen: Mapping[str, Stamp]
    sha256: str | None = None
    gone: bool = False


class Registry:
    """Boards by the path of their export, and the way back from any file to the boards that depend on it."""

    def __init__(self) -> None:
        self._boards: dict[str, Known] = {}
        self._dependents: dict[str, set[str]] = {}

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
            known = self._boards[board] = Known({board: None})
            self._dependents.setdefault(board, set()).add(board)
        return known

    def saw(self, board: str, seen: Mapping[str, Stamp]) -> None:
        """The board was read: it depends on these files, which looked like this, and on no others."""
        known = self.know(board)
        if known.seen.keys() != seen.keys():
            for path in known.seen:
                self._dependents.get(path, set()).discard(board)
            for path in (board, *seen):
                self._dependents.setdefault(path, set()).add(board)
        known.seen = {board: None, **seen}

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
        return signature(known.seen if known else (board,))

    def changed(self, board: str, look: Callable[[str], Stamp], only: Callable[[str], bool]) -> Hint | None:
        """Whether files of the board that `only` picks look other than when last read, and how: if one is missing
        it is `removed`, for it may be on its way. Only a board that was read once can have changed."""
        known = self._boards[board]
        found: Hint | None = None
        for path, old in known.seen.items():
            now = look(path) if only(path) else old
            if now != old:
                found = "removed" if now is None else found or "found"
        return found
