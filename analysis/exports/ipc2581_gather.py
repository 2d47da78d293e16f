"""What an IPC-2581 file holds that matters to a design, in the file's own words and order."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

from reactance.analysis.design import Place
from reactance.analysis.exports.ipc2581_items import LENGTHS, BomItem, characteristic, item_attributes, text
from reactance.analysis.exports.ipc2581_xml import Element
from reactance.analysis.exports.limits import Limits

_CHARACTERISTICS = frozenset(("Textual", "Measured", "Ranged", "Enumerated"))


@dataclass(slots=True)
class Component:
    """One placed part: its element, where it is in metres, and attributes beyond the standard."""

    element: Element
    location: tuple[float, float] | None = None
    attributes: list[tuple[str, str]] = field(default_factory=list)


class PinRef(NamedTuple):
    """A pin of a net and where it is named."""

    refdes: str
    number: str
    line: int
    column: int


@dataclass(slots=True)
class LogicalNet:
    """One net: its element, and its pins in short: a large board has a million."""

    element: Element
    pins: list[PinRef] = field(default_factory=list)


@dataclass(slots=True)
class Step:
    """One `Step` of the file: a board, or a panel of boards."""

    name: str
    components: list[Component] = field(default_factory=list)
    packages: dict[str, list[tuple[str, str]]] = field(default_factory=dict)
    nets: list[LogicalNet] = field(default_factory=list)


@dataclass(slots=True)
class Bom:
    """One bill of materials: the steps it is for, and its items."""

    name: str
    steps: list[str] = field(default_factory=list)
    items: list[BomItem] = field(default_factory=list)


class Gathered:
    """Takes the elements one by one. `unit` is that of lengths, in metres; `numbers` maps items to makers' numbers."""

    def __init__(self, file: str, limits: Limits) -> None:
        self.file = file
        self.steps: list[Step] = []
        self.boms: list[Bom] = []
        self.sides: dict[str, str] = {}
        self.numbers: dict[str, str] = {}
        self.unit = 1e-3
        self._limits = limits
        self._kept = 0
        self._pins = 0
        self._words: dict[str, str] = {}
        self._path: list[str] = []
        self._package: list[tuple[str, str]] | None = None
        self._sourced = ""

    def start(self, element: Element) -> None:
        """An element begins."""
        above = self._path[-1] if self._path else ""
        self._path.append(element.name)
        handler = _HANDLERS.get(element.name)
        if handler is not None:
            if element.name not in _UNCOUNTED:
                self._kept += 1
                if self._kept > self._limits.forms:
                    self._limits.check("forms", self._kept, self.place(element))
            handler(self, element, above)

    def end(self, name: str) -> None:
        """An element ends."""
        self._path.pop()
        if name == "Package":
            self._package = None

    def place(self, element: Element) -> Place:
        """Where an element begins."""
        return Place(self.file, element.line, element.column)

    def _word(self, element: Element, attribute: str) -> str:
        """An attribute's text; equal ones are the same object, since pins repeat their words."""
        found = text(element, attribute)
        return self._words.setdefault(found, found)

    def _unit(self, element: Element, _: str) -> None:
        self.unit = LENGTHS.get(text(element, "units").upper(), 1e-3)

    def _layer(self, element: Element, _: str) -> None:
        self.sides.setdefault(text(element, "name"), text(element, "side"))

    def _step(self, element: Element, _: str) -> None:
        self.steps.append(Step(text(element, "name")))

    def _package_start(self, element: Element, _: str) -> None:
        if self.steps:
            self._package = self.steps[-1].packages.setdefault(text(element, "name"), [])

    def _package_pin(self, element: Element, _: str) -> None:
        if self._package is not None:
            self._package.append((self._word(element, "number"), self._word(element, "name")))

    def _component(self, element: Element, _: str) -> None:
        if self.steps:
            self.steps[-1].components.append(Component(element))

    def _location(self, element: Element, above: str) -> None:
        if above == "Component" and self.steps and self.steps[-1].components:
            try:
                x, y = (float(element.attributes[axis]) * self.unit for axis in "xy")
            except (KeyError, ValueError):
                return
            if abs(x) < 1e3 and abs(y) < 1e3:  # and neither infinite nor no number
                self.steps[-1].components[-1].location = (x, y)

    def _nonstandard(self, element: Element, above: str) -> None:
        name, value = text(element, "name"), text(element, "value")
        if above == "Component" and name and value and self.steps and self.steps[-1].components:
            self.steps[-1].components[-1].attributes.append((name, value))

    def _net(self, element: Element, _: str) -> None:
        if self.steps:
            self.steps[-1].nets.append(LogicalNet(element))

    def _pin_ref(self, element: Element, above: str) -> None:
        if above == "LogicalNet" and self.steps and self.steps[-1].nets:
            self._pins += 1
            if self._pins > self._limits.pins:
                self._limits.check("pins", self._pins, self.place(element))
            refdes, number = self._word(element, "componentRef"), self._word(element, "pin")
            self.steps[-1].nets[-1].pins.append(PinRef(refdes, number, element.line, element.column))

    def _bom(self, element: Element, _: str) -> None:
        self.boms.append(Bom(text(element, "name")))

    def _step_ref(self, element: Element, above: str) -> None:
        if above == "BomHeader" and self.boms:
            self.boms[-1].steps.append(text(element, "name"))

    def _bom_item(self, element: Element, _: str) -> None:
        if self.boms:
            item = BomItem(text(element, "OEMDesignNumberRef"), element.line)
            item.attributes.extend(item_attributes(element))
            self.boms[-1].items.append(item)

    def _bom_refdes(self, element: Element, above: str) -> None:
        if above == "BomItem" and self.boms and self.boms[-1].items:
            self.boms[-1].items[-1].refdes.append(element)

    def _characteristic(self, element: Element, above: str) -> None:
        if above == "Characteristics" and self._path[-3:-2] == ["BomItem"] and self.boms and self.boms[-1].items:
            self.boms[-1].items[-1].attributes.extend(characteristic(element))

    def _sourced_item(self, element: Element, _: str) -> None:
        self._sourced = text(element, "OEMDesignNumber")

    def _maker_number(self, element: Element, _: str) -> None:
        if self._sourced and text(element, "name"):
            self.numbers.setdefault(self._sourced, text(element, "name"))


# Elements of which nothing new is kept, or that have a limit of their own.
_UNCOUNTED = frozenset(("CadHeader", "Location", "PinRef"))

_HANDLERS = {
    "CadHeader": Gathered._unit,
    "Layer": Gathered._layer,
    "Step": Gathered._step,
    "Package": Gathered._package_start,
    "Pin": Gathered._package_pin,
    "Component": Gathered._component,
    "Location": Gathered._location,
    "NonstandardAttribute": Gathered._nonstandard,
    "LogicalNet": Gathered._net,
    "PinRef": Gathered._pin_ref,
    "Bom": Gathered._bom,
    "StepRef": Gathered._step_ref,
    "BomItem": Gathered._bom_item,
    "RefDes": Gathered._bom_refdes,
    "AvlItem": Gathered._sourced_item,
    "AvlMpn": Gathered._maker_number,
    **dict.fromkeys(_CHARACTERISTICS, Gathered._characteristic),
}
