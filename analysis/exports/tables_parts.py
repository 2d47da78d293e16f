"""The parts table beside an export without values: which parts there are, and their attributes."""

from __future__ import annotations

import re
from collections.abc import Container, Iterator
from dataclasses import dataclass

from reactance.analysis.design import Place
from reactance.analysis.exports.collect import Collector, listed
from reactance.analysis.exports.limits import Limits
from reactance.analysis.exports.sniff import PARTS_TABLE, stem
from reactance.analysis.exports.tables_columns import COUNTING, find_parts_header
from reactance.analysis.exports.tables_rows import Row, Table
from reactance.analysis.parts.attributes import folded

_EXPECTED = "a header with a column refdes and columns such as value, tolerance"
_RANGE = re.compile(
    r"(?P<letters>.*?[^\d\s])(?P<first>\d{1,9})\s*(?:-|–|—|‥|…|\.\.\.?)\s*(?:(?P=letters))?(?P<last>\d{1,9})"
)
_AROUND_DASH = re.compile(r"\s+([-–—‥…]|\.\.\.?)\s+")
_SEPARATORS = re.compile(r"[,;\s]+")


class BadRangeError(ValueError):
    """A refdes range that is too long."""


@dataclass(frozen=True, slots=True)
class PartEntry:
    """What the parts table says of one part."""

    refdes: str
    attributes: tuple[tuple[str, str], ...]
    place: Place


def parts_table_name(export: str) -> str:
    """The name of the parts table that belongs to an export."""
    return stem(export) + PARTS_TABLE


def read_parts(data: bytes, export: str, known: Container[str], collector: Collector) -> tuple[PartEntry, ...]:
    """The entries of a parts table, one for each refdes of each row; bad rows are noted in the collector.

    `known` holds refdes that the export itself uses, so that one with a dash or a blank in it is no range or list.
    Raises InputError for a table that cannot be read.
    """
    limits = collector.limits
    table = Table(data, parts_table_name(export), limits, find_parts_header, _EXPECTED)
    refdes_column = table.header.columns["refdes"]
    attributes = _attribute_columns(table, refdes_column, collector)
    entries: list[PartEntry] = []
    for row in table.rows():
        found = tuple((name, row.cell(index)) for index, name in attributes if row.cell(index))
        place = table.place(row, refdes_column)
        names = _names_in(row, refdes_column, known, collector, place)
        entries += [PartEntry(name, found, place) for name in names]
        limits.check("parts", len(entries), place)
        if any(row.cells[len(table.header.cells) :]):
            message = f"{len(row.cells)} cells where the header has {len(table.header.cells)}"
            message += "; a delimiter within a cell needs quotation marks around the cell"
            collector.problem("caution", place, message)
    return tuple(entries)


def add_parts(entries: tuple[PartEntry, ...], collector: Collector, pins_file: str) -> None:
    """Give the parts their attributes; parts without pins are kept, and noted together."""
    without_pins: dict[str, None] = {}
    for entry in entries:
        draft = collector.parts.get(entry.refdes)
        if draft is None:
            draft = collector.part(entry.refdes, entry.place)
        if not draft.pins:
            without_pins[entry.refdes] = None
        for name, text in entry.attributes:
            collector.attribute(draft, name, text, entry.place)
    if without_pins:
        message = f"no pins in {pins_file} of parts that are listed here: {listed(without_pins)}"
        collector.problem("note", Place(entries[0].place.file), message)
    described = {entry.refdes for entry in entries}
    bare = [refdes for refdes in collector.parts if refdes not in described]
    if bare:
        message = f"parts of {pins_file} that are not listed here have no value: {listed(bare)}"
        collector.problem("caution", Place(entries[0].place.file if entries else pins_file), message)


def note_missing_table(export: str, collector: Collector) -> None:
    """Say that there is no parts table."""
    name = parts_table_name(export)
    message = f"there is no {name}, so that no part has a value; expected it with the columns refdes and value"
    collector.problem("caution", Place(export), message)


def expand(cell: str, known: Container[str], limits: Limits) -> Iterator[str]:
    """The refdes that a cell lists: `C1, C2, C7-C9`.

    A range runs over the last number, with leading zeros kept. Raises BadRangeError for one longer than the limit
    `array`.
    """
    if cell in known:
        yield cell
        return
    for word in _SEPARATORS.split(_AROUND_DASH.sub(r"\1", cell)):
        match = None if word in known or len(word) > 100 else _RANGE.fullmatch(word)
        if match is None:
            if word:
                yield word
            continue
        first, last = sorted((int(match["first"]), int(match["last"])))
        if last - first >= limits.array:
            message = f"the range {word[:40]} has {last - first + 1:,} members, more than the limit of "
            raise BadRangeError(f"{message}{limits.array:,} (limit `array`)")
        width = len(match["first"]) if match["first"].startswith("0") else 0
        for number in range(first, last + 1):
            yield f"{match['letters']}{number:0{width}d}"


def _attribute_columns(table: Table, refdes: int, collector: Collector) -> list[tuple[int, str]]:
    columns: list[tuple[int, str]] = []
    for index, name in enumerate(table.header.cells):
        if index == refdes or folded(name) in COUNTING:
            continue
        if any(name == other for _, other in columns):
            place = Place(table.file, table.header.line)
            collector.problem("caution", place, f"there are two columns {name[:40]}; the first filled one counts")
        columns.append((index, name))
    return columns


def _names_in(row: Row, column: int, known: Container[str], collector: Collector, place: Place) -> tuple[str, ...]:
    cell = row.cell(column)
    try:
        names = tuple(expand(cell, known, collector.limits))
    except BadRangeError as error:
        collector.problem("error", place, f"{error}; the row is left out")
        return ()
    if not names:
        collector.problem("error", place, "no refdes in this row; it is left out")
    return names
