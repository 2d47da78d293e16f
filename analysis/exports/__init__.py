"""Open-format exports: bytes in, one immutable Design out.

Each format's reader is imported only when a file of that format is met, so that importing this package stays quick.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from reactance.analysis.design import Design
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.sniff import (
    PARTS_TABLE,
    Format,
    companion_names,
    content_of,
    expected_format,
    is_export,
    kind_of,
    stem,
    unknown_content,
)

if TYPE_CHECKING:
    from reactance.analysis.exports.edif_forms import FormMemory

__all__ = [
    "DEFAULT_LIMITS",
    "ExportFiles",
    "FormMemory",
    "Format",
    "Limits",
    "companion_names",
    "is_export",
    "kind_of",
    "read_export",
    "stem",
]


@dataclass(frozen=True, slots=True)
class ExportFiles:
    """One board's export, already read by the caller.

    `name` is the path as the user knows it, for messages. `companions` maps the suffix of each file that stands
    beside the export and belongs to it (see `companion_names`) to its bytes; missing ones are absent.
    """

    main: bytes
    name: str
    companions: Mapping[str, bytes] = field(default_factory=lambda: MappingProxyType({}))


def read_export(files: ExportFiles, *, memory: FormMemory | None = None, limits: Limits = DEFAULT_LIMITS) -> Design:
    """The design that an export describes, whatever open format its content is in.

    `memory`, kept by the caller from one reading to the next, spares what has not changed since. Bad entries of a
    readable file are among the design's problems.

    Raises InputError, with file, line, column and remedy, for what is broken, no export, or beyond `limits`.
    """
    parts_table = files.companions.get(PARTS_TABLE)
    match content_of(files.main) or expected_format(files.name):
        case "EDIF":
            from reactance.analysis.exports.edif import read_edif

            return read_edif(files.main, files.name, limits=limits, memory=memory)
        case "IPC-D-356":
            from reactance.analysis.exports.ipc356 import read_ipc356

            return read_ipc356(files.main, files.name, parts_table, limits=limits)
        case "IPC-2581":
            from reactance.analysis.exports.ipc2581 import read_ipc2581

            return read_ipc2581(files.main, files.name, limits=limits)
        case "tables":
            from reactance.analysis.exports.tables import read_tables

            return read_tables(files.main, files.name, parts_table, limits=limits)
        case None:
            raise unknown_content(files.name)


def __getattr__(name: str) -> Any:
    if name == "FormMemory":
        from reactance.analysis.exports.edif_forms import FormMemory

        return FormMemory
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
