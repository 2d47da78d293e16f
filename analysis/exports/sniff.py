"""Which open format a file is in, by its content, and which files beside it belong to it, by its name."""

from __future__ import annotations

import re
from fnmatch import fnmatchcase
from typing import Literal

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports.text import encoding_of

Format = Literal["EDIF", "IPC-D-356", "IPC-2581", "tables"]

PINS_TABLE = ".pins.csv"
PARTS_TABLE = ".parts.csv"
HEAD_BYTES = 8192
"""How much of a file's beginning decides."""

# What files of each format are usually called; used only to say what was expected of a file with other content.
_EXTENSIONS: dict[str, Format] = {
    ".edn": "EDIF",
    ".edf": "EDIF",
    ".edif": "EDIF",
    ".ipc": "IPC-D-356",
    ".356": "IPC-D-356",
    ".d356": "IPC-D-356",
    ".xml": "IPC-2581",
    ".cvg": "IPC-2581",
    PINS_TABLE: "tables",
}

_WITH_PARTS_INSIDE = (".edn", ".edf", ".edif", ".xml", ".cvg")
"""Files of these names say themselves what their parts are: no parts table belongs to them."""

# Files that editors, synchronisers and downloads leave for a moment beside the real one, in lower case.
# Common practice, from memory.
TEMPORARY = (
    ".*",  # hidden: written, then renamed over the real file
    "~*",
    "*~",
    "#*#",
    "*.tmp",
    "*.temp",
    "*.~*",
    "*.bak",
    "*.old",
    "*.orig",
    "*.save",
    "*.autosave",
    "*.swp",
    "*.swo",
    "*.swx",
    "*.lck",
    "*.lock",
    "*.part",
    "*.partial",
    "*.download",
    "*.crdownload",
    "*.$$$",
)

_EDIF = re.compile(r"\s*\(\s*edif(?![\w&])", re.IGNORECASE)
_XML_ROOT = re.compile(r"<(?:[\w.-]+:)?IPC-2581[\s/>]")
_XML_BEFORE_ROOT = re.compile(r"\s*(?:(?:<\?.*?\?>|<!--.*?-->|<!DOCTYPE[^>\[]*(?:\[.*?\]\s*)?>)\s*)*+", re.DOTALL)
_RECORD = re.compile(r"3\d7.{14}(?:   |$)|P  [A-Z]")
_COMMENT = re.compile(r"C(?:\s|$)")


def kind_of(filename: str, head: bytes) -> Format | None:
    """The format of a file, by the beginning of its content (8 KiB suffice); None for what is no export.

    The name decides nothing but what is never an export: temporary files, and the tables that go with one.
    """
    name = _base(filename).lower()
    if name.endswith(PARTS_TABLE) or any(fnmatchcase(name, pattern) for pattern in TEMPORARY):
        return None
    return content_of(head)


def is_export(filename: str, head: bytes) -> bool:
    """Whether the file is an export in an open format (see `kind_of`)."""
    return kind_of(filename, head) is not None


def content_of(data: bytes) -> Format | None:
    """The format that the content is in, by its first bytes alone."""
    head = _text(data[:HEAD_BYTES])
    if _EDIF.match(head):
        return "EDIF"
    if head.lstrip().startswith("<"):
        return "IPC-2581" if _is_ipc2581(head) else None
    if _is_ipc356(head):
        return "IPC-D-356"
    from reactance.analysis.exports.tables_columns import has_pins_header

    return "tables" if has_pins_header(head) else None


def expected_format(filename: str) -> Format | None:
    """The format that a file of this name should be in; None where the name tells nothing."""
    name = _base(filename).lower()
    return next((kind for extension, kind in _EXTENSIONS.items() if name.endswith(extension)), None)


def unknown_content(filename: str) -> InputError:
    """What to say of a file that is no export."""
    return InputError(
        "no open export: expected (edif …), IPC-D-356 records, an <IPC-2581> element, or a table with the columns "
        "refdes, pin and net",
        Place(filename, 1, 1),
        "export the schematic as EDIF 2 0 0, IPC-D-356, IPC-2581 or as tables",
    )


def stem(filename: str) -> str:
    """The name without what marks its format: `board` for `board.edn` and `board.pins.csv`.

    The brief of a board is `<stem>.brief.toml`.
    """
    if filename.lower().endswith(PINS_TABLE):
        shorter = filename[: -len(PINS_TABLE)]
        return shorter if _base(shorter) else filename
    base = _base(filename)
    dot = base.rfind(".")
    return filename[: len(filename) - len(base) + dot] if dot > 0 else filename


def companion_names(filename: str) -> tuple[str, ...]:
    """Names of the files beside this one that are read with it: the parts table of a format without values."""
    if _base(filename).lower().endswith(_WITH_PARTS_INSIDE):
        return ()
    return (stem(filename) + PARTS_TABLE,)


def _base(filename: str) -> str:
    return filename[max(filename.rfind("/"), filename.rfind("\\")) + 1 :]


def _text(head: bytes) -> str:
    encoding = encoding_of(head)
    if encoding is None:
        return head.decode("latin-1")
    return head.decode(encoding, "ignore").removeprefix("\ufeff")


def _is_ipc2581(head: str) -> bool:
    before = _XML_BEFORE_ROOT.match(head)
    if before and _XML_ROOT.match(head, before.end()):
        return True
    # A long comment or declaration before the root element: the namespace, or the element further on, tells.
    return "<IPC-2581" in head or "//webstds.ipc.org/2581" in head


def _is_ipc356(head: str) -> bool:
    """Whether the first line that is no comment is a record of IPC-D-356."""
    lines = [line for line in head.splitlines() if line.strip("\x1a \t")]
    for line in lines:
        if not _COMMENT.match(line):
            return _RECORD.match(line) is not None
    return any("IPC-D-356" in line for line in lines)
