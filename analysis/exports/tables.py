"""Plain tables: `<stem>.pins.csv` with refdes, pin and net, and `<stem>.parts.csv` with values."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from reactance.analysis.design import Design, Direction, Pin, Place
from reactance.analysis.exports.collect import Collector
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.sniff import stem
from reactance.analysis.exports.tables_columns import Column, find_pins_header
from reactance.analysis.exports.tables_parts import add_parts, note_missing_table, read_parts
from reactance.analysis.exports.tables_rows import Row, Table

FORMAT = "tables"

_EXPECTED = "the columns refdes, pin and net"

# How a net list says that a pin is on no net, in lower case. Common practice.
UNCONNECTED = frozenset(("", "n/c"))

# How pins' directions are written, in lower case. Common practice.
_DIRECTIONS: Mapping[str, Direction] = MappingProxyType(
    {
        "i": "input",
        "in": "input",
        "input": "input",
        "o": "output",
        "out": "output",
        "output": "output",
        "io": "inout",
        "i/o": "inout",
        "inout": "inout",
        "bidir": "inout",
        "bidirectional": "inout",
    }
)


def read_tables(data: bytes, file: str, parts: bytes | None = None, *, limits: Limits = DEFAULT_LIMITS) -> Design:
    """The design in a table of pins and, where there is one, the table of parts beside it.

    Header words are matched loosely, columns may stand in any order, delimited by comma, semicolon or tab.
    Raises InputError for a table that cannot be read or is beyond `limits`.
    """
    table = Table(data, file, limits, find_pins_header, _EXPECTED)
    collector = Collector(file, limits)
    for row in table.rows():
        _add_pin(row, table, collector)
    if parts is None:
        note_missing_table(file, collector)
    else:
        add_parts(read_parts(parts, file, collector.parts, collector), collector, file)
    return collector.design(_name(file), FORMAT)


def _add_pin(row: Row, table: Table, collector: Collector) -> None:
    columns = table.header.columns
    refdes, number, net = row.cell(columns["refdes"]), row.cell(columns["pin"]), row.cell(columns["net"])
    if not (refdes and number):
        missing: Column = "pin" if refdes else "refdes"
        message = f"no {missing} in this row; it is left out"
        collector.problem("error", table.place(row, columns[missing]), message)
        return
    if len(row.cells) <= columns["net"]:
        message = f"the row of {refdes[:40]}.{number[:40]} ends before its net; taken as not connected"
        collector.problem("caution", table.place(row, columns["net"]), message)
    elif len(row.cells) > len(table.header.cells) and any(row.cells[len(table.header.cells) :]):
        message = f"{len(row.cells)} cells where the header has {len(table.header.cells)}"
        collector.problem("caution", table.place(row), message)
    pin = Pin(
        number,
        row.cell(columns.get("pin name")),
        None if net.lower() in UNCONNECTED else net,
        _DIRECTIONS.get(row.cell(columns.get("direction")).lower(), ""),
    )
    collector.pin(refdes, pin, Place(table.file, row.line, 1))


def _name(file: str) -> str:
    return stem(file[max(file.rfind("/"), file.rfind("\\")) + 1 :])
