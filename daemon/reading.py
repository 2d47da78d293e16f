"""From paths to bytes: everything that one board's analysis depends on, read in one go, and which files those are."""

from __future__ import annotations

import os
import stat
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from types import MappingProxyType

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports import ExportFiles, companion_names, kind_of, stem
from reactance.analysis.files import BoardFiles, wanted_files

BRIEF_SUFFIX = ".brief.toml"
TEAM_PARTS = "parts.toml"
MOST_BYTES = 256 * 2**20
_HEAD_BYTES = 8192
_NO_EXPORTS = (BRIEF_SUFFIX, ".parts.csv")

Stamp = tuple[int, int, int, int] | None
Signature = tuple[Stamp, ...]


@dataclass(frozen=True, slots=True)
class Reading:
    """A board's files as read, or why they could not be.

    `seen` maps the paths of all files that matter to the board, those that do not exist among them, to how they
    looked just before they were read. `saved` is the newest modification time, in seconds since 1970.
    """

    files: BoardFiles | None
    error: InputError | None
    seen: Mapping[str, Stamp]
    saved: float


def signature(paths: Iterable[str]) -> Signature:
    """Changes whenever one of these files is replaced or written, as far as the file system tells."""
    return tuple(stamp(path) for path in paths)


def stamp(path: str) -> Stamp:
    """Changes whenever that file is replaced or written; None where there is none."""
    try:
        found = Path(path).stat()
    except OSError:
        return None
    return (found.st_ino, found.st_size, found.st_mtime_ns, found.st_mode)


def is_export(path: Path) -> bool:
    """Whether the file's content is an open export format; its name alone never decides."""
    if path.name.lower().endswith(_NO_EXPORTS) or path.name.lower() == TEAM_PARTS:
        return False
    try:
        if not stat.S_ISREG(path.stat().st_mode):
            return False
        with path.open("rb") as file:
            return kind_of(path.name, file.read(_HEAD_BYTES)) is not None
    except OSError:
        return False


def brief_path(export: Path) -> Path:
    """Where the brief of an export stands unless another is named."""
    return export.with_name(stem(export.name) + BRIEF_SUFFIX)


def read_board(export: Path, brief: Path | None = None) -> Reading:
    """Reads the export, its companions, its brief (the named one, or the one beside it) and its part knowledge.

    Names in messages are as the paths were given. Never raises for what is in the files or missing.
    """
    reader = _Reader()
    try:
        files = _board_files(reader, export, brief)
    except InputError as error:
        return Reading(None, error, MappingProxyType(reader.seen), reader.newest)
    return Reading(files, None, MappingProxyType(reader.seen), reader.newest)


class _Reader:
    """Reads files and remembers which were looked at, and the newest time among them."""

    def __init__(self) -> None:
        self.seen: dict[str, Stamp] = {}
        self.newest = 0.0

    def note(self, path: Path) -> None:
        """The board depends on that file, whether it exists or not."""
        where = str(path.parent.resolve() / path.name)
        if where not in self.seen:
            self.seen[where] = stamp(where)

    def optional(self, path: Path) -> bytes | None:
        """The file's bytes, None where there is none."""
        self.note(path)
        try:
            if not stat.S_ISREG(path.stat().st_mode) and not path.is_dir():
                raise InputError("is not a plain file", Place(str(path)), "name a file")
            with path.open("rb") as file:
                found = os.fstat(file.fileno())
                if found.st_size > MOST_BYTES:
                    remedy = "export the schematic without drawings, or board by board"
                    raise InputError(f"larger than {MOST_BYTES // 2**20} MiB", Place(str(path)), remedy)
                self.newest = max(self.newest, found.st_mtime)
                return file.read()
        except (FileNotFoundError, NotADirectoryError):
            return None
        except IsADirectoryError:
            raise InputError("is a folder, not a file", Place(str(path)), "name a file in it") from None
        except OSError as error:
            raise _unreadable(path, error) from None

    def required(self, path: Path, remedy: str) -> bytes:
        """The file's bytes; `InputError` where there is none."""
        data = self.optional(path)
        if data is None:
            raise InputError("there is no such file", Place(str(path)), remedy)
        return data


def _unreadable(path: Path, error: OSError) -> InputError:
    if path.is_dir():  # Windows says "permission denied" of a folder
        return InputError("is a folder, not a file", Place(str(path)), "name a file in it")
    why = error.strerror or type(error).__name__
    return InputError(f"cannot be read: {why}", Place(str(path)), "check its permissions")


def _board_files(reader: _Reader, export: Path, brief: Path | None) -> BoardFiles:
    if export.is_dir():
        raise InputError("is a folder, not a file", Place(str(export)), "name a file in it")
    folder = export.parent
    # noted before anything can fail, so that mending any of them is noticed
    for name in (*companion_names(export.name), brief_path(export).name):
        reader.note(folder / name)
    main = reader.required(export, "check the name of the export")
    companions = {}
    for name in companion_names(export.name):
        data = reader.optional(folder / name)
        if data is not None:
            companions[name[len(stem(export.name)) :]] = data
    where = brief if brief is not None else brief_path(export)
    if brief is None:
        text = reader.optional(where)
    else:
        text = reader.required(where, "check the name after --brief, or leave it out")
    knowledge = _knowledge(reader, export, where, text)
    files = ExportFiles(main=main, name=str(export), companions=MappingProxyType(companions))
    return BoardFiles(files, text, str(where), MappingProxyType(knowledge))


def _knowledge(reader: _Reader, export: Path, brief: Path, text: bytes | None) -> dict[str, bytes]:
    """The team part tables (those that the brief names, then `parts.toml` upward, nearest first), then the measured
    data that brief and tables name, under the names as written."""
    tables: dict[str, bytes] = {}
    measured: dict[str, bytes] = {}
    _follow(reader, brief, text, tables, measured)
    for folder in _upward(export):
        data = reader.optional(folder / TEAM_PARTS)
        if data is not None and str(folder / TEAM_PARTS) not in tables:
            tables[str(folder / TEAM_PARTS)] = data
            _follow(reader, folder / TEAM_PARTS, data, tables, measured)
    return {**tables, **measured}


def _follow(
    reader: _Reader, namer: Path, text: bytes | None, tables: dict[str, bytes], measured: dict[str, bytes]
) -> None:
    for name in wanted_files(text, str(namer)):
        path = namer.parent / name
        is_table = name.lower().endswith(".toml")
        if (str(path) if is_table else name) in (tables if is_table else measured):
            continue
        data = reader.optional(path)
        if data is None:
            line = _line_naming(text or b"", name)
            remedy = f"put the file at {path}, or take its name out"
            raise InputError(f"names {name}, which does not exist", Place(str(namer), line), remedy)
        if is_table:
            tables[str(path)] = data
            _follow(reader, path, data, tables, measured)
        else:
            measured[name] = data


def _line_naming(text: bytes, name: str) -> int | None:
    for number, line in enumerate(text.decode("utf-8", "replace").splitlines(), 1):
        if name in line:
            return number
    return None


def _upward(export: Path) -> list[Path]:
    """The export's folder as given, then its ancestors."""
    return [export.parent, *export.parent.resolve().parents]
