"""IPC-2581 revisions B and C: bill of materials, placement and the logical netlist."""

from __future__ import annotations

from reactance.analysis.design import Design, InputError, Pin, Place
from reactance.analysis.exports.collect import Collector, PartDraft, listed
from reactance.analysis.exports.ipc2581_gather import Bom, Component, Gathered, LogicalNet, Step
from reactance.analysis.exports.ipc2581_items import BomItem, side_of, text
from reactance.analysis.exports.ipc2581_xml import Element, read_elements
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.sniff import stem
from reactance.analysis.parts.attributes import ALIASES, folded

FORMAT = "IPC-2581"

# Names of a `LogicalNet` that gathers the pins that are on no net, in lower case. Common practice, from memory.
UNCONNECTED = frozenset(("", "n/c", "no net", "$none$"))

_PACKAGE_NAMES = frozenset(folded(name) for name in ALIASES["package"])
_NUMBER_NAMES = frozenset(folded(name) for name in ALIASES["number"])


def read_ipc2581(data: bytes, file: str, *, limits: Limits = DEFAULT_LIMITS) -> Design:
    """The design in an IPC-2581 file: parts with their characteristics, place and side, and the nets between them.

    Positions are in metres. Of several steps the one that a bill of materials names, else the first with nets, is
    read. Raises InputError for what is no well-formed IPC-2581, has no components and nets, or is beyond `limits`.
    """
    gathered = Gathered(file, limits)
    read_elements(data, file, limits, gathered.start, gathered.end)
    return _Build(gathered, Collector(file, limits)).design()


class _Build:
    """One step with its bill, on their way into a design."""

    def __init__(self, gathered: Gathered, collector: Collector) -> None:
        self._file = gathered
        self._collector = collector
        self._numbers: dict[str, dict[str, str]] = {}

    def design(self) -> Design:
        """The design. Raises InputError where the file has neither components nor nets."""
        bom, step = self._chosen()
        for component in step.components:
            self._add_component(component, step)
        for net in step.nets:
            self._add_net(net)
            net.pins.clear()  # a million of them need room
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

    def _chosen(self) -> tuple[Bom | None, Step]:
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

    def _add_component(self, component: Component, step: Step) -> None:
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
        for number, name in step.packages.get(text(element, "packageRef"), ()):
            if number:
                self._collector.pin(refdes, Pin(number, name), place)
                if name and name != number:
                    self._numbers.setdefault(refdes, {}).setdefault(name, number)

    def _add_net(self, net: LogicalNet) -> None:
        name = text(net.element, "name")
        connected = None if name.lower() in UNCONNECTED else name
        if connected is not None:
            self._collector.net(connected, self._file.place(net.element))
        for pin in net.pins:
            refdes, number, place = pin.refdes, pin.number, Place(self._file.file, pin.line, pin.column)
            if refdes and number:
                if refdes in self._numbers and number not in self._collector.parts[refdes].pins:
                    number = self._numbers[refdes].get(number, number)  # some writers refer to a pin by its name
                self._collector.pin(refdes, Pin(number, net=connected), place)
            else:
                message = f"a PinRef of net {name[:40]} without {'pin' if refdes else 'componentRef'} is left out"
                self._collector.problem("error", place, message)

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
            self._add_number(draft, item.name)
            self._add_fitting(draft, element)

    def _add_number(self, draft: PartDraft, item: str) -> None:
        """The maker's number from the list of sources, where no characteristic tells one."""
        number = self._file.numbers.get(item, "")
        if number and not any(folded(name) in _NUMBER_NAMES for name in draft.attributes):
            draft.attributes["MPN"] = number[: self._collector.limits.text]

    def _add_fitting(self, draft: PartDraft, element: Element) -> None:
        """Whether the part is fitted, and its package where no characteristic tells it."""
        place = self._file.place(element)
        if text(element, "populate").lower() in ("false", "0"):
            self._collector.attribute(draft, "populate", "false", place)
        package = text(element, "packageRef")
        if package and not any(folded(name) in _PACKAGE_NAMES for name in draft.attributes):
            draft.attributes["package"] = package[: self._collector.limits.name]
