"""What the columns of plain tables are called, and which row is the header."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator, Mapping, Sequence
from types import MappingProxyType
from typing import Literal, NamedTuple

from reactance.analysis.exports.text import visible
from reactance.analysis.parts.attributes import folded

Column = Literal["refdes", "pin", "net", "pin name", "direction"]

DELIMITERS = (",", ";", "\t")

# Header words of each column, most telling first; compared without case, blanks and marks.
# Common practice of parts lists and net lists; there is no published list.
COLUMNS: Mapping[Column, tuple[str, ...]] = MappingProxyType(
    {
        "refdes": (
            "refdes",
            "refdesignator",
            "refdesignators",
            "referencedesignator",
            "referencedesignators",
            "designator",
            "designators",
            "reference",
            "references",
            "partreference",
            "partreferences",
            "ref",
            "refs",
            "componentreference",
            "component",
            "components",
            "comp",
            "part",
            "parts",
        ),
        "pin": ("pin", "pinnumber", "pinno", "pinnum", "pinnr", "pindesignator", "pad", "padnumber", "terminal"),
        "net": ("net", "netname", "nets", "signal", "signalname", "node", "nodename", "netlabel"),
        "pin name": ("pinname", "pinlabel", "pinfunction", "port", "portname", "function"),
        "direction": ("direction", "pindirection", "pintype", "electricaltype", "type"),
    }
)

# Columns that number or count the rows of a parts table. They are no attributes of a part: one capacitor more
# would else be an edit of every other of its row.
COUNTING = frozenset(
    ("", "item", "itemno", "itemnumber", "line", "lineno", "no", "nr", "pos", "qty", "quantity", "count")
)

_HEADER_WITHIN = 20
"""How many lines of titles may come before the header."""

_LONGEST_WORD = 60
"""How long a header word may be where nothing else tells a table from prose that speaks of parts, pins and nets."""


class Header(NamedTuple):
    """Where the header is and what it says: line from 1, delimiter, its cells, and the columns found in them."""

    line: int
    delimiter: str
    cells: tuple[str, ...]
    columns: Mapping[Column, int]


def columns_of(cells: Iterable[str], wanted: Iterable[Column]) -> dict[Column, int]:
    """Which cell is the header of each wanted column, for those that are there."""
    position: dict[str, int] = {}
    for index, cell in enumerate(cells):
        position.setdefault(folded(cell), index)
    found: dict[Column, int] = {}
    for column in wanted:
        for word in COLUMNS[column]:
            if word in position and position[word] not in found.values():
                found[column] = position[word]
                break
    return found


def find_pins_header(lines: Sequence[str]) -> Header | None:
    """The header of a pins table: a line with columns for refdes, pin and net."""
    for number, delimiter, cells in _candidates(lines):
        columns = columns_of(cells, COLUMNS)
        if "pin" not in columns and "pin name" in columns:
            columns["pin"] = columns.pop("pin name")
        if {"refdes", "pin", "net"} <= columns.keys():
            return Header(number, delimiter, cells, columns)
    return None


def find_parts_header(lines: Sequence[str]) -> Header | None:
    """The header of a parts table: a line with a column for refdes and at least one more, else that column alone."""
    for number, delimiter, cells in _candidates(lines):
        columns = columns_of(cells, ("refdes",))
        if columns and sum(map(bool, cells)) > 1:
            return Header(number, delimiter, cells, columns)
    number, first = next(((number, line) for number, line in enumerate(lines, 1) if line.strip()), (1, ""))
    alone = (visible(first).strip().strip('"'),)
    columns = columns_of(alone, ("refdes",))
    return Header(number, ",", alone, columns) if columns else None


def has_pins_header(head: str) -> bool:
    """Whether a text begins like a pins table: a header, and cells below it if there is anything below it."""
    lines = head.replace("\r", "\n").split("\n")
    header = find_pins_header(lines)
    if header is None or max(map(len, header.cells)) > _LONGEST_WORD:
        return False
    below = next((line for line in lines[header.line :] if line.strip()), None)
    return below is None or header.delimiter in below


def _candidates(lines: Sequence[str]) -> Iterator[tuple[int, str, tuple[str, ...]]]:
    met = 0
    for number, line in enumerate(lines, 1):
        if not line.strip():
            continue
        met += 1
        if met > _HEADER_WITHIN or len(line) > 10_000:
            return
        for delimiter in DELIMITERS:
            if delimiter in line:
                cells = next(csv.reader([line], delimiter=delimiter, skipinitialspace=True), [])
                yield number, delimiter, tuple(visible(cell).strip() for cell in cells)
