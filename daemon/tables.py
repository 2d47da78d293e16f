"""Tables: drawn with rich on a terminal, in plain aligned columns anywhere else."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import click

from reactance.daemon.text import clean

Tone = Literal["", "bad", "near", "good", "quiet"]

# After Okabe and Ito, whose colours stay apart for colour-blind readers; the words say the same without colour.
_STYLES: dict[Tone, str] = {
    "": "",
    "bad": "bold #d55e00",
    "near": "#e69f00",
    "good": "#0072b2",
    "quiet": "dim",
}


@dataclass(frozen=True, slots=True)
class Column:
    """A column's heading; `right` for figures."""

    heading: str
    right: bool = False


@dataclass(frozen=True, slots=True)
class Row:
    """One row of texts, in one tone."""

    cells: tuple[str, ...]
    tone: Tone = ""


def show(columns: Sequence[Column], rows: Sequence[Row]) -> None:
    """Prints a table; nothing at all where it has no rows."""
    if not rows:
        return
    rows = [Row(tuple(clean(cell) for cell in row.cells), row.tone) for row in rows]
    if sys.stdout.isatty():
        _draw(columns, rows)
    else:
        for line in plain(columns, rows):
            click.echo(line)


def plain(columns: Sequence[Column], rows: Sequence[Row]) -> list[str]:
    """The table as lines of aligned columns, two spaces apart."""
    lines = [tuple(column.heading for column in columns), *(row.cells for row in rows)]
    widths = [max(len(line[place]) for line in lines) for place in range(len(columns))]
    return ["  ".join(_aligned(line, widths, columns)).rstrip() for line in lines]


def _aligned(line: Sequence[str], widths: Sequence[int], columns: Sequence[Column]) -> list[str]:
    return [
        cell.rjust(width) if column.right else cell.ljust(width)
        for cell, width, column in zip(line, widths, columns, strict=True)
    ]


def _draw(columns: Sequence[Column], rows: Sequence[Row]) -> None:
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table(box=None, pad_edge=False, header_style="bold", padding=(0, 2, 0, 0))
    for place, column in enumerate(columns):
        table.add_column(column.heading, justify="right" if column.right else "left", no_wrap=place == 0)
    for row in rows:
        table.add_row(*(Text(cell) for cell in row.cells), style=_STYLES[row.tone])
    Console(highlight=False).print(table)
