"""Which files there are: the places named on the command line as folders to watch, and the files in them."""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from reactance.daemon.ignore import ignored


@dataclass(frozen=True, slots=True)
class Root:
    """A folder to watch: with everything below it if `deep`, else only the exports in `files`.

    Folders are watched and never files, because a replaced file is another file under the same name.
    """

    folder: Path
    deep: bool
    files: frozenset[str] = frozenset()

    def holds(self, path: Path) -> bool:
        """Whether a file of that path may be an export to watch."""
        if str(path) in self.files:
            return True
        return self.deep and path.is_relative_to(self.folder) and not ignored(path, self.folder)

    def hears_of(self, path: Path) -> bool:
        """Whether watching this root brings word of that file."""
        return path.parent == self.folder or (self.deep and path.is_relative_to(self.folder))

    def below(self, folder: Path) -> Iterator[Path]:
        """All files that may be exports, in `folder` (this root's or one below it), ignored folders left out."""
        if not self.deep:
            yield from (Path(file) for file in sorted(self.files))
            return
        for where, folders, files in os.walk(folder):
            base = Path(where)
            folders[:] = sorted(name for name in folders if not ignored(base / name, self.folder, folder=True))
            for name in sorted(files):
                if not ignored(base / name, self.folder):
                    yield base / name


def roots_of(places: Iterable[Path]) -> tuple[Root, ...]:
    """The folders to watch for places that exist: each folder, and the folder of each file; none twice."""
    deep = {place.resolve() for place in places if place.is_dir()}
    deep = {folder for folder in deep if not any(other in folder.parents for other in deep)}
    files: dict[Path, set[str]] = {}
    for place in places:
        if not place.is_dir():
            resolved = place.resolve()
            files.setdefault(resolved.parent, set()).add(str(resolved))
    roots = [Root(folder, True, frozenset(files.pop(folder, ()))) for folder in sorted(deep)]
    roots += [Root(folder, False, frozenset(found)) for folder, found in sorted(files.items())]
    return tuple(roots)
