"""Writes a Design as EDIF 2 0 0 in the habits of several authors. For tests only."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

from reactance.analysis.design import Design, Net, Part
from reactance.analysis.exports import ExportFiles


@dataclass(frozen=True)
class Habit:
    """How an author's editor writes EDIF.

    `refdes` is where a part's reference designator goes. `names` maps attribute names to the words this author uses.
    `pages` makes a schematic view with so many pages. `plain_names` leaves out `rename` where a name is an
    identifier. `codes` writes characters beyond ASCII as `%181%`.
    """

    refdes: Literal["designator", "display", "instance", "property", "annotation"] = "designator"
    hierarchical: bool = False
    names: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    pages: int = 0
    plain_names: bool = False
    encoding: str = "utf-8"
    codes: bool = False
    capitals: bool = False
    newline: str = "\n"
    top_named: bool = True
    port_instances: bool = False


OTHER_WORDS = MappingProxyType(
    {
        "VALUE": "Comment",
        "TOLERANCE": "Tol",
        "VOLTAGE": "Voltage Rating",
        "DIELECTRIC": "Temperature Coefficient",
        "FOOTPRINT": "PCB Footprint",
    }
)

HABITS: Mapping[str, Habit] = MappingProxyType(
    {
        "designators": Habit(),
        "instance names": Habit(refdes="instance", plain_names=True, newline="\r\n"),
        "properties": Habit(refdes="property", capitals=True, top_named=False),
        "hierarchy": Habit(hierarchical=True, refdes="display"),
        "schematic pages": Habit(pages=3, port_instances=True),
        "latin-1, other words": Habit(names=OTHER_WORDS, encoding="latin-1", codes=True, refdes="designator"),
        "back-annotated": Habit(refdes="annotation", hierarchical=True, newline="\r\n"),
    }
)


def edif(design: Design, habit: Habit = Habit(), name: str = "board.edn") -> ExportFiles:
    """The design as EDIF; with `habit.hierarchical` the parts' paths become blocks."""
    return ExportFiles(_Writer(design, habit).text().encode(habit.encoding), name)


@dataclass
class _Block:
    """One level of the hierarchy: what is drawn in it, and the nets that also appear above it."""

    path: tuple[str, ...]
    parts: list[Part] = field(default_factory=list)
    inner: dict[str, _Block] = field(default_factory=dict)

    def all_parts(self) -> Iterable[Part]:
        yield from self.parts
        for block in self.inner.values():
            yield from block.all_parts()


class _Writer:
    def __init__(self, design: Design, habit: Habit) -> None:
        self._design = design
        self._habit = habit
        self._cells: dict[tuple[tuple[str, str, str], ...], tuple[str, str]] = {}
        self._lines: list[str] = []
        self._nets = {net.name: f"N{index}" for index, net in enumerate(design.nets)}
        self._instances = {part.refdes: f"INST{index}X" for index, part in enumerate(design.parts)}
        words = sorted({word for part in design.parts for word in part.attributes})
        self._words = {word: f"W{index}" for index, word in enumerate(words)}
        self._ends = {net.name: [part for part in design.parts if _touches(part, net)] for net in design.nets}

    def text(self) -> str:
        """The whole file."""
        root = _Block(())
        for part in self._design.parts:
            block = root
            for step in part.path if self._habit.hierarchical else ():
                block = block.inner.setdefault(step, _Block((*block.path, step)))
            block.parts.append(part)
        head = ["(edif (rename board " + self._string("a board") + ")", "(edifVersion 2 0 0) (edifLevel 0)"]
        head.append("(keywordMap (keywordLevel 0))")
        head.append("(status (written (timeStamp 2026 1 2 3 4 5) (author " + self._string("nobody") + ")))")
        self._library(root)
        tail = []
        if self._habit.top_named:
            tail.append(f"(design (rename D {self._string(self._design.name)}) (cellRef TOP (libraryRef WORK)))")
        lines = self._habit.newline.join([*head, *self._lines, *tail, ")", ""])
        return _capitals(lines) if self._habit.capitals else lines

    def _library(self, root: _Block) -> None:
        self._lines += ["(library PARTS (edifLevel 0) (technology (numberDefinition))"]
        for part in self._design.parts:
            self._part_cell(part)
        self._lines += [")", "(library WORK (edifLevel 0) (technology (numberDefinition))"]
        self._block_cell(root, "TOP")
        self._lines.append(")")

    def _part_cell(self, part: Part) -> None:
        key = tuple((pin.number, pin.name, pin.direction) for pin in part.pins)
        if (part.cell, key) in self._cells:
            return
        ident = f"CELL{len(self._cells)}"
        self._cells[part.cell, key] = ident
        ports = []
        for index, (number, name, direction) in enumerate(key):
            shown = "" if self._habit.port_instances else f" (designator {self._string(number)})"
            pointing = f" (direction {direction.upper()})" if direction else ""
            ports.append(f"(port {self._name(f'P{index}', name or number)}{shown}{pointing})")
        symbol = (
            "(symbol (boundingBox (rectangle (pt 0 0) (pt 10 10))) (figure G (path (pointList (pt 0 0) (pt 5 5)))))"
        )
        drawn = symbol if self._habit.pages else ""
        self._lines.append(f"(cell {self._name(ident, part.cell or ident)} (cellType GENERIC)")
        view = f"(view V (viewType {'SCHEMATIC' if self._habit.pages else 'NETLIST'})"
        self._lines.append(f"{view} (interface {' '.join(ports)} {drawn}))) ")

    def _block_cell(self, block: _Block, ident: str) -> None:
        for order, (step, inner) in enumerate(block.inner.items()):
            self._block_cell(inner, f"{ident}_{order}_{_plain(step)}")
        ports = [f"(port {self._name(self._nets[net.name], self._local(net, block))})" for net in self._outward(block)]
        kind = "SCHEMATIC" if self._habit.pages else "NETLIST"
        self._lines.append(f"(cell {ident} (cellType GENERIC) (view V (viewType {kind}) (interface {' '.join(ports)})")
        self._lines.append("(contents")
        pages = max(1, self._habit.pages)
        for page in range(pages):
            if self._habit.pages:
                self._lines.append(f"(page PG{page} (pageSize (rectangle (pt 0 0) (pt 1700 1100)))")
            self._page(block, ident, page, pages)
            if self._habit.pages:
                self._lines.append(")")
        self._lines.append(")))" if self._habit.refdes != "annotation" else f") ) {self._view_map(block)})")

    def _page(self, block: _Block, ident: str, page: int, pages: int) -> None:
        parts = block.parts[page::pages]
        for part in parts:
            self._instance(part)
        inner = list(enumerate(block.inner.items())) if page == 0 else []
        for order, (step, _) in inner:
            cell = f"{ident}_{order}_{_plain(step)}"
            self._lines.append(
                f"(instance {self._name(f'B{order}', step)} (viewRef V (cellRef {cell} (libraryRef WORK))))"
            )
        refdes = {part.refdes for part in parts}
        for net in self._design.nets:
            ends = [
                f"(portRef {self._pin_ident(net, r, n)} (instanceRef {self._instances_ident(r)}))"
                for r, n in net.pins
                if r in refdes
            ]
            for order, (_, below) in inner:
                if net in self._outward(below):
                    ends.append(f"(portRef {self._nets[net.name]} (instanceRef B{order}))")
            if not ends:
                continue
            if net in self._outward(block):
                ends.append(f"(portRef {self._nets[net.name]})")
            shown = self._name(self._nets[net.name], self._local(net, block))
            figure = " (figure W (path (pointList (pt 0 0) (pt 9 9))))" if self._habit.pages else ""
            self._lines.append(f"(net {shown} (joined {' '.join(ends)}){figure})")

    def _instance(self, part: Part) -> None:
        key = tuple((pin.number, pin.name, pin.direction) for pin in part.pins)
        cell = self._cells[part.cell, key]
        where = {
            "designator": f"(designator {self._string(part.refdes)})",
            "display": f"(designator (stringDisplay {self._string(part.refdes)} (display REF)))",
            "property": f"(property REFDES (string {self._string(part.refdes)}))",
        }.get(self._habit.refdes, "")
        shown = part.refdes if self._habit.refdes == "instance" else ""
        ident = self._instances_ident(part.refdes)
        self._lines.append(
            f"(instance {self._name(ident, shown or ident)} (viewRef V (cellRef {cell} (libraryRef PARTS)))"
        )
        self._lines.append(f"  {where}")
        for word, text in part.attributes.items():
            name = self._name(self._words[word], self._habit.names.get(word, word))
            self._lines.append(f"  (property {name} (string {self._string(text)}))")
        if self._habit.port_instances:
            for index, pin in enumerate(part.pins):
                self._lines.append(f"  (portInstance P{index} (designator {self._string(pin.number)}))")
        self._lines.append(")")

    def _view_map(self, block: _Block) -> str:
        notes = [
            f"(instanceBackAnnotate (instanceRef {self._instances_ident(part.refdes)}) "
            f"(designator {self._string(part.refdes)}))"
            for part in block.parts
        ]
        return f"(viewMap {' '.join(notes)})" if notes else ""

    def _instances_ident(self, refdes: str) -> str:
        if self._habit.refdes == "instance" and self._habit.plain_names and _is_identifier(refdes):
            return refdes
        return self._instances[refdes]

    def _pin_ident(self, net: Net, refdes: str, number: str) -> str:
        part = self._design.parts_by_refdes[refdes]
        index = next(order for order, pin in enumerate(part.pins) if pin.number == number)
        assert part.pins[index].net == net.name
        return f"P{index}"

    def _outward(self, block: _Block) -> list[Net]:
        """Nets with pins both in the block (or below it) and outside it."""
        if not block.path:
            return []
        inside = {part.refdes for part in block.all_parts()}
        return [
            net
            for net in self._design.nets
            if any(p.refdes in inside for p in self._ends[net.name])
            and any(p.refdes not in inside for p in self._ends[net.name])
        ]

    def _local(self, net: Net, block: _Block) -> str:
        """The net's name within the block: `FILTERED` for `PROBE1/FILTERED` inside PROBE1."""
        prefix = "/".join(block.path) + "/"
        return net.name.removeprefix(prefix) if block.path else net.name

    def _name(self, ident: str, shown: str) -> str:
        if shown == ident or (self._habit.plain_names and shown.lower() == ident.lower()):
            return ident
        return f"(rename {ident} {self._string(shown)})"

    def _string(self, text: str) -> str:
        coded = "".join(f"%{ord(ch)}%" if ch in '"%' or (ord(ch) > 126 and self._habit.codes) else ch for ch in text)
        return f'"{coded}"'


def _touches(part: Part, net: Net) -> bool:
    return any(pin.net == net.name for pin in part.pins)


def _is_identifier(text: str) -> bool:
    return text.isascii() and text.replace("_", "").isalnum() and text[:1].isalpha()


def _plain(text: str) -> str:
    return "".join(ch if ch.isascii() and ch.isalnum() else "_" for ch in text)


def _capitals(text: str) -> str:
    """Everything outside strings in capitals."""
    pieces = text.split('"')
    return '"'.join(piece if index % 2 else piece.upper() for index, piece in enumerate(pieces))


Writer = Callable[[Design], ExportFiles]
