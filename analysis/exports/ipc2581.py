"""IPC-2581 revisions B and C: bill of materials, placement and the logical netlist."""

from __future__ import annotations

from dataclasses import dataclass, field

from reactance.analysis.design import Design, InputError, Pin, Place
from reactance.analysis.exports.collect import Collector, PartDraft, listed
from reactance.analysis.exports.ipc2581_items import (
    LENGTHS,
    BomItem,
    characteristic,
    item_attributes,
    side_of,
    text,
)
from reactance.analysis.exports.ipc2581_xml import Element, read_elements
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.sniff import stem
from reactance.analysis.parts.attributes import ALIASES, folded

FORMAT = "IPC-2581"

# Names of a `LogicalNet` that gathers the pins that are on no net, in lower case. Common practice, from memory.
UNCONNECTED = frozenset(("", "n/c", "no net", "$none$"))

_PACKAGE_NAMES = frozenset(folded(name) for name in ALIASES["package"])
_CHARACTERISTICS = frozenset(("Textual", "Measured", "Ranged", "Enumerated"))


@dataclass(slots=True)
class _Component:
    element: Element
    location: tuple[float, float] | None = None
    attributes: list[tuple[str, str]] = field(default_factory=list)


@dataclass(slots=True)
class _Net:
    element: Element
    pins: list[Element] = field(default_factory=list)


@dataclass(slots=True)
class _Step:
    """One `Step` of the file: a board, or a panel of boards."""

    name: str
    components: list[_Component] = field(default_factory=list)
    packages: dict[str, list[Element]] = field(default_factory=dict)
    nets: list[_Net] = field(default_factory=list)


@dataclass(slots=True)
class _Bom:
    name: str
    steps: list[str] = field(default_factory=list)
    items: list[BomItem] = field(default_factory=list)


def read_ipc2581(data: bytes, file: str, *, limits: Limits = DEFAULT_LIMITS) -> Design:
    """The design in an IPC-2581 file: parts with their characteristics, place and side, and the nets between them.

    Positions are in metres. Of several steps the one that a bill of materials names, else the first with nets, is
    read. Raises InputError for what is no well-formed IPC-2581, has no components and nets, or is beyond `limits`.
    """
    gathered = _Gathered(file, limits)
    read_elements(data, file, limits, gathered.start, gathered.end)
    return _Build(gathered, Collector(file, limits)).design()


class _Gathered:
    """What the file holds that matters, in its own words."""

    def __init__(self, file: str, limits: Limits) -> None:
        self.file = file
        self.steps: list[_Step] = []
        self.boms: list[_Bom] = []
        self.sides: dict[str, str] = {}
        self.unit = 1e-3
        self._limits = limits
        self._kept = 0
        self._path: list[str] = []
        self._package: list[Element] | None = None

    def start(self, element: Element) -> None:
        """An element begins."""
        above = self._path[-1] if self._path else ""
        self._path.append(element.name)
        handler = _HANDLERS.get(element.name)
        if handler is not None:
            handler(self, element, above)

    def end(self, name: str) -> None:
        """An element ends."""
        self._path.pop()
        if name == "Package":
            self._package = None

    def place(self, element: Element) -> Place:
        """Where an element begins."""
        return Place(self.file, element.line, element.column)

    def _count(self, element: Element) -> None:
        self._kept += 1
        # Each pin is one entry of a package or of a net, and each part one of the step and of the bill.
        if self._kept > self._limits.forms + 2 * self._limits.pins:
            self._limits.check("forms", self._kept, self.place(element))

    def _unit(self, element: Element, _: str) -> None:
        self.unit = LENGTHS.get(text(element, "units").upper(), 1e-3)

    def _layer(self, element: Element, _: str) -> None:
        self.sides.setdefault(text(element, "name"), text(element, "side"))

    def _step(self, element: Element, _: str) -> None:
        self.steps.append(_Step(text(element, "name")))

    def _package_start(self, element: Element, _: str) -> None:
        if self.steps:
            self._package = self.steps[-1].packages.setdefault(text(element, "name"), [])

    def _package_pin(self, element: Element, _: str) -> None:
        if self._package is not None:
            self._count(element)
            self._package.append(element)

    def _component(self, element: Element, _: str) -> None:
        if self.steps:
            self._count(element)
            self.steps[-1].components.append(_Component(element))

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
            self._count(element)
            self.steps[-1].nets.append(_Net(element))

    def _pin_ref(self, element: Element, above: str) -> None:
        if above == "LogicalNet" and self.steps and self.steps[-1].nets:
            self._count(element)
            self.steps[-1].nets[-1].pins.append(element)

    def _bom(self, element: Element, _: str) -> None:
        self.boms.append(_Bom(text(element, "name")))

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
            self._count(element)
            self.boms[-1].items[-1].refdes.append(element)

    def _characteristic(self, element: Element, above: str) -> None:
        if above == "Characteristics" and self._path[-3:-2] == ["BomItem"] and self.boms and self.boms[-1].items:
            self._count(element)
            self.boms[-1].items[-1].attributes.extend(characteristic(element))


_HANDLERS = {
    "CadHeader": _Gathered._unit,
    "Layer": _Gathered._layer,
    "Step": _Gathered._step,
    "Package": _Gathered._package_start,
    "Pin": _Gathered._package_pin,
    "Component": _Gathered._component,
    "Location": _Gathered._location,
    "NonstandardAttribute": _Gathered._nonstandard,
    "LogicalNet": _Gathered._net,
    "PinRef": _Gathered._pin_ref,
    "Bom": _Gathered._bom,
    "StepRef": _Gathered._step_ref,
    "BomItem": _Gathered._bom_item,
    "RefDes": _Gathered._bom_refdes,
    **dict.fromkeys(_CHARACTERISTICS, _Gathered._characteristic),
}


class _Build:
    """One step with its bill, on their way into a design."""

    def __init__(self, gathered: _Gathered, collector: Collector) -> None:
        self._file = gathered
        self._collector = collector

    def design(self) -> Design:
        """The design. Raises InputError where the file has neither components nor nets."""
        bom, step = self._chosen()
        for component in step.components:
            self._add_component(component, step)
        for net in step.nets:
            self._add_net(net)
        if not step.nets:
            message = "no LogicalNet: the pins of this board are on no net"
            self._collector.problem("error", Place(self._file.file), message)
        if bom is not None:
            for item in bom.items:
                self._add_item(item)
        else:
            message = "no Bom: the parts of this board have no values"
            self._collector.problem("caution", Place(self._file.file), message)
        file = self._file.file
        return self._collector.design(step.name or stem(file.replace("\\", "/").rsplit("/", 1)[-1]), FORMAT)

    def _chosen(self) -> tuple[_Bom | None, _Step]:
        boms, steps = self._file.boms, self._file.steps
        told = [step for step in steps if step.components or step.nets]
        if not told:
            message = "no Step has a Component or a LogicalNet; expected both"
            raise InputError(message, Place(self._file.file, 1, 1), "export with components and netlist")
        named = [name for bom in boms[:1] for name in bom.steps]
        first = next((step for step in told if step.nets and step.name in named), None)
        step = first or next((step for step in told if step.nets), told[0])
        for what, others in (("step", told), ("bill of materials", boms)):
            left = [each.name for each in others if each is not step and each is not next(iter(boms), None)]
            if left:
                message = f"more than one {what}; passed over: {listed(left)}"
                self._collector.problem("note", Place(self._file.file), message)
        return next(iter(boms), None), step

    def _add_component(self, component: _Component, step: _Step) -> None:
        element = component.element
        place = self._file.place(element)
        refdes = text(element, "refDes")
        if not refdes:
            self._collector.problem("error", place, "a Component without refDes is left out")
            return
        if refdes in self._collector.parts:
            self._collector.problem("error", place, f"a second Component {refdes[:40]}; the first counts")
            return
        draft = self._collector.part(refdes, place)
        draft.cell = text(element, "part")
        draft.position = component.location
        draft.side = side_of(text(element, "layerRef"), self._file.sides)
        for name, value in component.attributes:
            self._collector.attribute(draft, name, value, place)
        for pin in step.packages.get(text(element, "packageRef"), ()):
            if text(pin, "number"):
                self._collector.pin(refdes, Pin(text(pin, "number"), text(pin, "name")), place)

    def _add_net(self, net: _Net) -> None:
        name = text(net.element, "name")
        connected = None if name.lower() in UNCONNECTED else name
        if connected is not None:
            self._collector.net(connected, self._file.place(net.element))
        for pin in net.pins:
            refdes, number = text(pin, "componentRef"), text(pin, "pin")
            if refdes and number:
                self._collector.pin(refdes, Pin(number, net=connected), self._file.place(pin))
            else:
                message = f"a PinRef of net {name[:40]} without {'pin' if refdes else 'componentRef'} is left out"
                self._collector.problem("error", self._file.place(pin), message)

    def _add_item(self, item: BomItem) -> None:
        if not item.refdes:
            return
        for element in item.refdes:
            place, refdes = self._file.place(element), text(element, "name")
            if not refdes:
                self._collector.problem("error", place, "a RefDes without name is left out")
                continue
            draft = self._collector.part(refdes, place)
            draft.cell = draft.cell or item.name
            for name, value in item.attributes:
                self._collector.attribute(draft, name, value, place)
            self._add_fitting(draft, element)

    def _add_fitting(self, draft: PartDraft, element: Element) -> None:
        """Whether the part is fitted, and its package where no characteristic tells it."""
        place = self._file.place(element)
        if text(element, "populate").lower() in ("false", "0"):
            self._collector.attribute(draft, "populate", "false", place)
        package = text(element, "packageRef")
        if package and not any(folded(name) in _PACKAGE_NAMES for name in draft.attributes):
            draft.attributes["package"] = package[: self._collector.limits.name]
