"""What a watched folder passes over: editors' temporary files, hidden folders, `.reactanceignore` patterns.

A line of `.reactanceignore` is a glob pattern. Without a slash it is for any name below the file's folder; with
one it is for paths relative to that folder; a trailing slash restricts it to folders; `!` in front takes a
file back in; `#` starts a comment. The last line that matches decides.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fnmatch import fnmatchcase
from functools import lru_cache
from pathlib import Path, PurePosixPath

from reactance.analysis.exports.sniff import TEMPORARY

IGNORE_FILE = ".reactanceignore"
_MOST_BYTES = 1_000_000

# Beside what editors leave: copies on their way here, and a history that lies among what it is the history of.
_PASSING = (*TEMPORARY, "*.filepart", "*.sqlite*")


def is_temporary(name: str) -> bool:
    """Whether a file or folder of that name is an editor's own affair."""
    return any(fnmatchcase(name.lower(), pattern) for pattern in _PASSING)


@dataclass(frozen=True, slots=True)
class _Rule:
    pattern: str
    anchored: bool
    folders_only: bool
    take_back: bool

    def matches(self, relative: PurePosixPath, folder: bool) -> bool:
        if self.folders_only and not folder:
            return False
        return fnmatchcase(str(relative) if self.anchored else relative.name, self.pattern)


def _parse(text: str) -> tuple[_Rule, ...]:
    rules = []
    for raw in text.splitlines():
        line = raw.strip()
        if not line or line.startswith("#"):
            continue
        take_back, line = line.startswith("!"), line.removeprefix("!")
        folders_only, line = line.endswith("/"), line.rstrip("/")
        if line:
            rules.append(_Rule(line.removeprefix("/"), "/" in line, folders_only, take_back))
    return tuple(rules)


@lru_cache(maxsize=1024)
def _rules(path: str, stamp: tuple[int, int]) -> tuple[_Rule, ...]:
    """The rules in one file; `stamp` (time and size) makes a changed file another entry."""
    del stamp
    try:
        with Path(path).open("rb") as file:
            return _parse(file.read(_MOST_BYTES).decode("utf-8", "replace"))
    except OSError:
        return ()


def _rules_of(folder: Path) -> tuple[_Rule, ...]:
    path = folder / IGNORE_FILE
    try:
        found = path.stat()
    except OSError:
        return ()
    return _rules(str(path), (found.st_mtime_ns, found.st_size))


def ignored(path: Path, root: Path, *, folder: bool = False) -> bool:
    """Whether `path` below the watched `root` is passed over, by its own name or by a folder it lies in."""
    try:
        parts: Sequence[str] = path.relative_to(root).parts
    except ValueError:
        return True
    rules: list[tuple[Path, tuple[_Rule, ...]]] = []
    where = root
    for depth, name in enumerate(parts):
        rules.append((where, _rules_of(where)))
        where = where / name
        if is_temporary(name) or _ruled_out(where, rules, folder or depth < len(parts) - 1):
            return True
    return False


def _ruled_out(path: Path, rules: Sequence[tuple[Path, tuple[_Rule, ...]]], folder: bool) -> bool:
    out = False
    for base, found in rules:
        for rule in found:
            if rule.matches(PurePosixPath(path.relative_to(base).as_posix()), folder):
                out = not rule.take_back
    return out
