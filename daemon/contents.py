"""Contents as they are stored: every blob once by its SHA-256, compressed; bundles of them per revision."""

from __future__ import annotations

import hashlib
import sqlite3
import zlib
from collections.abc import Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any, TypeVar

import msgspec

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles

_T = TypeVar("_T")

_LEVEL = 5  # exports are repetitive: higher levels cost time on the way to the screen and save little


@dataclass(frozen=True, slots=True)
class Piece:
    """One stored file of a revision: what it was to the board, its name, and its bytes, compressed."""

    role: str
    name: str
    sha256: str = ""
    packed: bytes | None = None


def pack(data: bytes) -> bytes:
    """`data` compressed."""
    return zlib.compress(data, _LEVEL)


def unpack(packed: bytes) -> bytes:
    """The bytes that `pack` was given."""
    return zlib.decompress(packed)


def encode(value: msgspec.Struct) -> bytes:
    """A struct as compressed JSON."""
    return pack(msgspec.json.encode(value))


def decode(packed: bytes, kind: type[_T]) -> _T:
    """The struct that `encode` was given."""
    return msgspec.json.decode(unpack(packed), type=kind)


def pieces(files: BoardFiles) -> tuple[Piece, ...]:
    """Everything in the bundle, ready to be stored; done before the write so that it holds up no reader."""
    found = [_piece("export", files.export.name, files.export.main)]
    found += [_piece("companion", suffix, data) for suffix, data in files.export.companions.items()]
    if files.brief is not None:
        found.append(_piece("brief", files.brief_name, files.brief))
    else:
        found.append(Piece("no brief", files.brief_name))
    found += [_piece("knowledge", path, data) for path, data in files.knowledge.items()]
    return tuple(found)


def _piece(role: str, name: str, data: bytes) -> Piece:
    return Piece(role, name, hashlib.sha256(data).hexdigest(), pack(data))


def insert(connection: sqlite3.Connection, revision: int, found: Sequence[Piece]) -> None:
    """Stores the pieces as the revision's contents, inside the caller's transaction."""
    for piece in found:
        blob = None
        if piece.packed is not None:
            row = connection.execute("SELECT id FROM blob WHERE sha256 = ?", (piece.sha256,)).fetchone()
            if row is None:
                added = connection.execute(
                    "INSERT INTO blob (sha256, data) VALUES (?, ?)", (piece.sha256, piece.packed)
                )
                blob = added.lastrowid
            else:
                blob = row[0]
        connection.execute(
            "INSERT INTO content (revision, role, name, blob) VALUES (?, ?, ?, ?)",
            (revision, piece.role, piece.name, blob),
        )


def bundle(rows: Sequence[tuple[Any, ...]]) -> BoardFiles | None:
    """The bundle from rows of (role, name, packed bytes) in the order stored; None where none was kept."""
    main: bytes | None = None
    name = ""
    brief: bytes | None = None
    brief_name = ""
    companions: dict[str, bytes] = {}
    knowledge: dict[str, bytes] = {}
    for role, piece_name, packed in rows:
        if role == "no brief":
            brief_name = piece_name
            continue
        data = unpack(packed)
        if role == "export":
            main, name = data, piece_name
        elif role == "brief":
            brief, brief_name = data, piece_name
        elif role == "companion":
            companions[piece_name] = data
        else:
            knowledge[piece_name] = data
    if main is None:
        return None
    export = ExportFiles(main=main, name=name, companions=MappingProxyType(companions))
    return BoardFiles(export, brief, brief_name, MappingProxyType(knowledge))
