"""How much an export may ask of the reader. Every limit is named in the message of the error it causes."""

from __future__ import annotations

from dataclasses import dataclass

from reactance.analysis.design import InputError, Place


@dataclass(frozen=True, slots=True)
class Limits:
    """Bounds that keep a hostile or broken export from taking the daemon down.

    `depth` counts open brackets (or XML elements); the EDIF reader holds it exactly from 32 upward. `forms` counts
    the entries of a file that are kept, `levels` the hierarchy's depth, `blocks` the places where a hierarchical
    cell stands in the flattened design, `paths` the characters of all names that lead through it, `array` the
    members of one array, `columns` the cells in a row of a table.
    """

    bytes: int = 100_000_000
    depth: int = 100
    forms: int = 1_000_000
    parts: int = 250_000
    pins: int = 1_000_000
    blocks: int = 100_000
    levels: int = 1_000
    paths: int = 50_000_000
    array: int = 16_384
    name: int = 1_000
    text: int = 100_000
    columns: int = 1_000
    lines: int = 2_000_000
    problems: int = 200

    def check(self, what: str, count: int, place: Place) -> None:
        """Raise InputError, naming the limit `what`, where `count` is beyond it."""
        most: int = getattr(self, what)
        if count > most:
            raise InputError(
                f"{count:,} {_WORDS[what]} are more than the limit of {most:,} (limit `{what}`)",
                place,
                "split the export, or leave out what is not the schematic",
            )


DEFAULT_LIMITS = Limits()

_WORDS = {
    "bytes": "bytes",
    "depth": "nested brackets",
    "forms": "entries",
    "parts": "parts",
    "pins": "pins",
    "blocks": "hierarchical blocks",
    "levels": "levels of hierarchy",
    "paths": "characters of names through the hierarchy",
    "array": "members of one array",
    "name": "characters in one name",
    "text": "characters in one text",
    "columns": "cells in one row",
    "lines": "lines",
}
