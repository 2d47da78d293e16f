"""Everything that one board's analysis depends on, already read: one immutable bundle of bytes."""

from __future__ import annotations

import hashlib
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Any

from reactance.analysis.exports import ExportFiles


@dataclass(frozen=True)
class BoardFiles:
    """The export with its companions, the brief, and the files of part knowledge.

    `knowledge` maps the paths of team part tables (`parts.toml`) and of measured data to their bytes, nearest
    first. Two bundles with equal `sha256` have equal contents and equal roles, whatever they are called.
    """

    export: ExportFiles
    brief: bytes | None = None
    brief_name: str = ""
    knowledge: Mapping[str, bytes] = field(default_factory=lambda: MappingProxyType({}))

    @cached_property
    def sha256(self) -> str:
        """SHA-256 over all contents, each with its role and length, in hexadecimal."""
        digest = hashlib.sha256()
        pieces = [("export", self.export.main), ("brief", self.brief)]
        pieces += [(f"companion {suffix}", data) for suffix, data in sorted(self.export.companions.items())]
        pieces += [(f"knowledge {order}", data) for order, data in enumerate(self.knowledge.values())]
        for role, data in pieces:
            if data is not None:
                digest.update(f"{role} {len(data)}\n".encode())
                digest.update(data)
        return digest.hexdigest()

    @cached_property
    def export_sha256(self) -> str:
        """SHA-256 of the export's own bytes, in hexadecimal."""
        return hashlib.sha256(self.export.main).hexdigest()


def wanted_files(data: bytes | None, name: str) -> tuple[str, ...]:
    """Other files that a brief, or a team part table, names: part tables and measured data, as written in it.

    Paths are relative to the folder of the file that names them. Broken TOML names none; reading it for the
    analysis reports what is wrong with it.
    """
    del name
    try:
        document = tomllib.loads((data or b"").decode("utf-8-sig"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, RecursionError):
        return ()
    board = document.get("board")
    parts = board.get("parts", ()) if isinstance(board, dict) else ()
    wanted = [path for path in _listed(parts) if isinstance(path, str)]
    for row in _listed(document.get("part", ())):
        touchstone = row.get("touchstone") if isinstance(row, dict) else None
        path = touchstone.get("file") if isinstance(touchstone, dict) else touchstone
        if isinstance(path, str):
            wanted.append(path)
    return tuple(dict.fromkeys(wanted))


def _listed(value: Any) -> list[Any]:
    if isinstance(value, list | tuple):
        return list(value)
    return [value]
