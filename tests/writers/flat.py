"""Writes a Design as IPC-D-356 with a parts table, as IPC-2581, and as plain tables. For tests only."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from xml.sax.saxutils import quoteattr

from reactance.analysis.design import Design, Part
from reactance.analysis.exports import ExportFiles


@dataclass(frozen=True)
class TableHabit:
    """How an author writes tables: delimiter, encoding, line ends, header words, order of columns."""

    delimiter: str = ","
    encoding: str = "utf-8"
    newline: str = "\r\n"
    refdes: str = "RefDes"
    pin: str = "Pin"
    net: str = "Net"
    turned: bool = False


def parts_table(design: Design, habit: TableHabit = TableHabit()) -> bytes:
    """The parts table: one row for each part with attributes."""
    names = sorted({name for part in design.parts for name in part.attributes})
    rows = [[part.refdes, *(part.attributes.get(name, "") for name in names)] for part in design.parts]
    return _table([habit.refdes, *names], rows, habit)


def tables(design: Design, habit: TableHabit = TableHabit(), name: str = "board.pins.csv") -> ExportFiles:
    """Pins and parts as plain tables."""
    header = [habit.refdes, habit.pin, habit.net, "Pin Name", "Direction"]
    rows = [
        [part.refdes, pin.number, pin.net or "", pin.name, pin.direction] for part in design.parts for pin in part.pins
    ]
    return ExportFiles(_table(header, rows, habit), name, {".parts.csv": parts_table(design, habit)})


def _table(header: list[str], rows: list[list[str]], habit: TableHabit) -> bytes:
    stream = io.StringIO()
    writer = csv.writer(stream, delimiter=habit.delimiter, lineterminator=habit.newline)
    for row in (header, *rows):
        writer.writerow(row[::-1] if habit.turned else row)
    return stream.getvalue().encode(habit.encoding)


def ipc356(design: Design, name: str = "board.ipc", *, cut: Callable[[str], str] | None = None) -> ExportFiles:
    """IPC-D-356A, with alias records for net names that do not fit 14 columns, and the parts table beside it.

    `cut` makes six columns of a longer refdes. Every third pin is written twice, as a pad on either side.
    """
    lines = ["C  written for a test", "P  JOB   board", "P  UNITS CUST 0", "P  VER   IPC-D-356A"]
    columns: dict[str, str] = {}
    for net in design.nets:
        columns[net.name] = net.name
        if len(net.name) > 14 or net.name.startswith("NNAME"):
            columns[net.name] = f"NNAME{len(columns)}"
            lines.append(f"P  {columns[net.name]}  {net.name}")
    count = 0
    for part in design.parts:
        refdes = cut(part.refdes) if cut else part.refdes
        for pin in part.pins:
            net = "N/C" if pin.net is None else columns[pin.net]
            count += 1
            code, access = ("327", "A01") if len(part.pins) == 2 else ("317", "A00")
            record = f"{code}{net:14}   {refdes:6}-{pin.number:4}{'M' if count % 5 == 0 else ' '}      {access}"
            record += f"X+{count:06d}Y-{count:06d}X0600Y0600R000S0"
            lines += [record] * (2 if count % 3 == 0 else 1)
            if pin.net is not None:
                lines.append(f"317{net:14}   VIA         D0300PA00X+{count:06d}Y+000000")
    lines += ["367                 MTG1        D1250UA00X+000000Y+000000", "999", ""]
    return ExportFiles("\r\n".join(lines).encode(), name, {".parts.csv": parts_table(design)})


def ipc2581(design: Design, name: str = "board.xml", *, prefix: str = "", encoding: str = "utf-8") -> ExportFiles:
    """IPC-2581 revision C with bill, packages, placement and the logical netlist."""
    document = _Xml(prefix)
    document.open("IPC-2581", {"revision": "C", f"xmlns{':' if prefix else ''}{prefix}": "http://webstds.ipc.org/2581"})
    document.open("Bom", {"name": "bill"})
    document.open("BomHeader", {"assembly": "board", "revision": "1"})
    document.element("StepRef", {"name": design.name})
    document.close("BomHeader")
    for part in design.parts:
        _bom_item(document, part)
    document.close("Bom")
    document.open("Ecad", {"name": "ecad"})
    document.element("CadHeader", {"units": "MILLIMETER"})
    document.open("CadData", {})
    for side in ("TOP", "BOTTOM"):
        document.element("Layer", {"name": f"L{side}", "layerFunction": "CONDUCTOR", "side": side})
    document.open("Step", {"name": design.name})
    for index, part in enumerate(design.parts):
        document.open("Package", {"name": f"land{index}", "type": "OTHER"})
        for pin in part.pins:
            named = {"name": pin.name} if pin.name else {}
            document.element("Pin", {"number": pin.number, **named, "type": "SURFACE", "electricalType": "ELECTRICAL"})
        document.close("Package")
    for index, part in enumerate(design.parts):
        _component(document, part, f"land{index}")
    for net in design.nets:
        document.open("LogicalNet", {"name": net.name})
        for refdes, number in net.pins:
            document.element("PinRef", {"componentRef": refdes, "pin": number})
        document.close("LogicalNet")
    for element in ("Step", "CadData", "Ecad", "IPC-2581"):
        document.close(element)
    head = f'<?xml version="1.0" encoding="{encoding}"?>\n'
    return ExportFiles((head + document.text()).encode(encoding), name)


def _bom_item(document: _Xml, part: Part) -> None:
    document.open("BomItem", {"OEMDesignNumberRef": part.cell, "quantity": "1", "category": "ELECTRICAL"})
    document.element("RefDes", {"name": part.refdes, "populate": "true", "layerRef": "LTOP"})
    document.open("Characteristics", {"category": "ELECTRICAL"})
    for key, value in part.attributes.items():
        names = {"textualCharacteristicName": key, "textualCharacteristicValue": value}
        document.element("Textual", {"definitionSource": "test", **names})
    document.close("Characteristics")
    document.close("BomItem")


def _component(document: _Xml, part: Part, package: str) -> None:
    layer = {"top": "LTOP", "bottom": "LBOTTOM"}.get(part.side, "")
    document.open("Component", {"refDes": part.refdes, "packageRef": package, "part": part.cell, "layerRef": layer})
    document.element("Xform", {"rotation": "90"})
    if part.position:
        x, y = part.position
        document.element("Location", {"x": repr(x * 1e3), "y": repr(y * 1e3)})
    document.close("Component")


class _Xml:
    def __init__(self, prefix: str) -> None:
        self._prefix = f"{prefix}:" if prefix else ""
        self._lines: list[str] = []

    def open(self, name: str, attributes: Mapping[str, str]) -> None:
        self._lines.append(f"<{self._prefix}{name}{_attributes(attributes)}>")

    def element(self, name: str, attributes: Mapping[str, str]) -> None:
        self._lines.append(f"<{self._prefix}{name}{_attributes(attributes)}/>")

    def close(self, name: str) -> None:
        self._lines.append(f"</{self._prefix}{name}>")

    def text(self) -> str:
        return "\n".join(self._lines)


def _attributes(attributes: Mapping[str, str]) -> str:
    return "".join(f" {name}={quoteattr(value)}" for name, value in attributes.items())
