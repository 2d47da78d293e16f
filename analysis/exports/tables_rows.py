"""Rows of a delimited table with the line each began in."""

from __future__ import annotations

import csv
from collections.abc import Callable, Iterator
from dataclasses import dataclass

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports.limits import Limits
from reactance.analysis.exports.tables_columns import Header
from reactance.analysis.exports.text import lines_of, visible


@dataclass(frozen=True, slots=True)
class Row:
    """One row below the header: its line, from 1, and its cells without blanks around them."""

    line: int
    cells: tuple[str, ...]

    def cell(self, index: int | None) -> str:
        """The cell, empty where the row is shorter."""
        return self.cells[index] if index is not None and index < len(self.cells) else ""


class Table:
    """A delimited table (RFC 4180, with semicolon or tab as well) below a header that `find` recognises.

    Raises InputError for what is no text, has no such header, or is beyond the limits.
    """

    def __init__(
        self, data: bytes, file: str, limits: Limits, find: Callable[[list[str]], Header | None], expected: str
    ) -> None:
        self.file = file
        self._limits = limits
        self._lines = lines_of(data, file, limits, expected)
        self._lines[-1] = self._lines[-1].rstrip("\x1a")  # the end of a text, once
        header = find(self._lines)
        if header is None:
            raise _no_header(self._lines, file, expected)
        self.header = header

    def rows(self) -> Iterator[Row]:
        """The rows below the header; empty ones are left out. Raises InputError for a quotation mark too few."""
        first = self.header.line
        lines = _Lines(self._lines, first)
        # Not strict: a quotation mark inside a cell (an inch, say) is a plain character.
        reader = csv.reader(lines, delimiter=self.header.delimiter, skipinitialspace=True)
        while True:
            line = first + reader.line_num + 1
            try:
                cells = next(reader)
            except StopIteration:
                return
            except csv.Error as error:
                raise self._broken(error, line) from None
            if lines.exhausted:  # a row asks for a line that is not there only while a quotation mark is open
                raise self._unclosed(line)
            self._check(line, cells)
            if any(cells):
                yield Row(line, tuple([visible(cell).strip() for cell in cells]))

    def place(self, row: Row, index: int | None = None) -> Place:
        """Where a cell of a row begins, as far as quotation marks let it be known."""
        text = self._lines[row.line - 1]
        if index is None or '"' in text:
            return Place(self.file, row.line, 1)
        cells = text.split(self.header.delimiter)[: index + 1]
        if len(cells) <= index:
            return Place(self.file, row.line, len(text) + 1)
        blanks = len(cells[index]) - len(cells[index].lstrip())
        return Place(self.file, row.line, sum(map(len, cells[:index])) + index + blanks + 1)

    def _check(self, line: int, cells: list[str]) -> None:
        if len(cells) > self._limits.columns:
            self._limits.check("columns", len(cells), Place(self.file, line, 1))

    def _unclosed(self, line: int) -> InputError:
        return InputError(
            "a quotation mark opens a cell in this row and none closes it before the file ends",
            Place(self.file, line, self._lines[line - 1].find('"') + 1),
            "close the cell with a quotation mark; one within a cell is written twice",
        )

    def _broken(self, error: csv.Error, line: int) -> InputError:
        place = Place(self.file, line, 1)
        if "field limit" in str(error):
            message = f"a cell with more characters than the limit of {csv.field_size_limit():,} (limit `text`)"
            return InputError(message, place, "a quotation mark may be missing here")
        return InputError(f"no table row: {error}", place, "save the table as CSV again")


class _Lines:
    """The lines below the header, each with its end, and whether all of them have been taken."""

    def __init__(self, lines: list[str], first: int) -> None:
        self._lines = lines
        self._next = first
        self.exhausted = False

    def __iter__(self) -> _Lines:
        return self

    def __next__(self) -> str:
        if self._next >= len(self._lines):
            self.exhausted = True
            raise StopIteration
        line = self._lines[self._next]
        self._next += 1
        return line + "\n"


def _no_header(lines: list[str], file: str, expected: str) -> InputError:
    number, found = next(((n, line.strip()) for n, line in enumerate(lines, 1) if line.strip()), (1, ""))
    what = f"found {visible(found[:60])}" if found else "the file is empty"
    return InputError(
        f"no header; expected {expected}, {what}",
        Place(file, number, 1),
        "put the names of the columns into the first line, separated by commas, semicolons or tabs",
    )
