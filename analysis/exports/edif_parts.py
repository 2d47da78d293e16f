"""Instances of one view: their cell, refdes, attributes and pin numbers, before the hierarchy is flattened."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_cells import Catalogue, Cell, Interface, View, pin_numbers
from reactance.analysis.exports.edif_names import member_names, visible
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_values import Attribute, attribute_text

# Properties that carry a refdes where no designator does, without spaces and signs (in use; common practice).
_REFDES_PROPERTIES = frozenset(("refdes", "ref", "designator", "reference", "referencedesignator"))
_SIGNS = re.compile(r"[\W_]+")

# Words before a number that editors give to instances by themselves, so that `I12` is no refdes. From memory.
_AUTOMATIC = frozenset(
    ("i", "inst", "instance", "comp", "component", "sym", "symbol", "part", "id", "n", "uid", "xi")
)
_REFDES_LIKE = re.compile(r"([A-Za-z]+)[_-]?\d+[A-Za-z]?", re.ASCII)


@dataclass(slots=True)
class Target:
    """What an instance refers to. `inside` is the view with the contents where that is a hierarchical block;
    `plain` says that it is the cell of a component and gives its instances nothing but pins."""

    cell: Cell | None
    name: str
    interface: Interface
    inside: View | None
    prefix: str
    defaults: tuple[Attribute, ...]
    graphic: bool
    wiring: bool = False
    plain: bool = False


@dataclass(slots=True)
class LocalPart:
    """One instance in one view. `nodes` maps positions in its interface to the view's nodes.

    `refdes` is "" where only the instance's name is left. `numbers` overrides pin numbers; `symbol` says that this is
    drawing and no component.
    """

    key: str
    name: str
    start: int
    target: Target
    inside: View | None
    interface: Interface
    refdes: str
    attributes: Mapping[str, str]
    numbers: Mapping[int, str]
    symbol: bool
    nodes: dict[int, int] = field(default_factory=dict)


_NO_NUMBERS: Mapping[int, str] = MappingProxyType({})
_NO_ATTRIBUTES: Mapping[str, str] = MappingProxyType({})


class PartMaker:
    """Makes the local parts of one view."""

    def __init__(self, home: View, catalogue: Catalogue, source: Source) -> None:
        self._home, self._catalogue, self._source = home, catalogue, source
        self._longest = min(source.limits.name, source.limits.text)
        self._targets: dict[says.CellRef, Target] = {}
        self._notes: dict[str, list[says.Annotation]] = {}
        for note in home.cell.annotations:
            if len(note.path) == 1:
                self._notes.setdefault(note.path[0].lower(), []).append(note)

    def usual(self, instance: says.Instance, start: int) -> LocalPart | None:
        """The part of a usual instance of a cell without surprises, the short way for most; else None."""
        target = self._targets.get(instance.cells[0])
        if target is None or not target.plain or self._notes or instance.longest > self._longest:
            return None
        name, attributes = instance.name, instance.plain or _NO_ATTRIBUTES
        refdes, interface = instance.designator, target.interface
        return LocalPart(
            name.key, name.text, start, target, None, interface, refdes, attributes, _NO_NUMBERS, False
        )

    def parts(self, instance: says.Instance, start: int) -> Iterable[LocalPart]:
        """The part, or the part for each member of an array of instances."""
        notes = self._notes.get(instance.name.key, [])
        if not instance.name.size:
            return (self._part(instance, 0, instance.name.text, start, notes),)
        return [
            self._part(instance, member, shown, start, notes)
            for member, shown in enumerate(member_names(instance.name))
        ]

    def _part(
        self, instance: says.Instance, member: int, shown: str, start: int, notes: list[says.Annotation]
    ) -> LocalPart:
        ref = instance.cells[min(member, len(instance.cells) - 1)]
        designator = "" if instance.name.size else instance.designator
        target = self._target(ref)
        if target.cell is None:
            library = f" of library {ref.library}" if ref.library else ""
            message = (
                f"instance {shown}: there is no cell {ref.cell}{library}; its pins are taken from the nets"
            )
            self._source.problem("caution", start, message)
        inside = target.inside
        if inside is not None and instance.designator and not inside.holds_instances:
            inside = None  # a part whose cell holds nothing but wires
        attributes = self._attributes(instance, notes, target, start)
        refdes = _refdes(instance, designator, notes, shown, target.prefix)
        self._source.check("name", len(refdes), start)
        numbers = _NO_NUMBERS
        if instance.numbers or notes:
            given = [*instance.numbers, *(number for note in notes for number in note.numbers)]
            numbers = self._numbers(given, target.interface, shown, start)
        symbol = target.wiring or (target.graphic and not refdes)
        key, interface = instance.name.key, target.interface
        return LocalPart(key, shown, start, target, inside, interface, refdes, attributes, numbers, symbol)

    def _target(self, ref: says.CellRef) -> Target:
        target = self._targets.get(ref)
        if target is None:
            cell = self._catalogue.find(ref, self._home.cell.library)
            target = self._targets[ref] = Target(None, visible(ref.cell), Interface(), None, "", (), False)
            if cell is not None:
                view = cell.views.get(ref.view.lower()) or next(iter(cell.views.values()), None)
                target.cell, target.name = cell, cell.name.text
                target.inside = cell.contents(view)
                target.prefix = (view.prefix if view else "") or cell.prefix
                target.defaults = (*cell.attributes, *(view.attributes if view else ()))
                target.interface = view.interface if view else target.interface
                target.wiring = cell.kind in ("tie", "ripper")
                target.plain = not (target.wiring or target.inside or target.defaults)
                target.graphic = view is not None and view.kind == "graphic"
        return target

    def _attributes(
        self, instance: says.Instance, notes: list[says.Annotation], target: Target, start: int
    ) -> Mapping[str, str]:
        """Defaults of the cell, then the instance's own, then back-annotation; each by its visible name."""
        if instance.plain is not None and not notes and not target.defaults:
            merged = instance.plain
        else:
            scales = self._home.cell.library.scales
            texts: dict[str, tuple[str, str]] = {}
            for attribute in target.defaults:
                own = target.cell.library.scales if target.cell else scales
                texts[attribute.key] = (attribute.name, attribute_text(attribute, own))
            given = (*instance.attributes, *(each for note in notes for each in note.attributes))
            for attribute in given:
                texts[attribute.key] = (attribute.name, attribute_text(attribute, scales))
            merged = MappingProxyType(dict(texts.values()))
        if instance.longest <= self._longest and not target.defaults:
            return merged
        return self._cut(merged, start)

    def _cut(self, merged: Mapping[str, str], start: int) -> Mapping[str, str]:
        limits = self._source.limits
        if all(len(key) <= limits.name and len(text) <= limits.text for key, text in merged.items()):
            return merged
        for key, text in merged.items():
            if len(text) > limits.text:
                message = (
                    f"property {key[:40]}: {len(text):,} characters, cut to {limits.text:,} (limit `text`)"
                )
                self._source.problem("caution", start, message)
            self._source.check("name", len(key), start)
        return MappingProxyType({key: text[: limits.text] for key, text in merged.items()})

    def _numbers(
        self, given: list[says.PinNumber], interface: Interface, shown: str, start: int
    ) -> Mapping[int, str]:
        numbers: dict[int, str] = {}
        for ref, number in given:
            bits = interface.bits_of(ref)
            if not bits:
                message = f"instance {shown}: there is no port {'.'.join(ref.port)} to number"
                self._source.problem("caution", start, message)
                continue
            names = [interface.bits[bit].number for bit in bits]
            numbers.update(zip(bits, pin_numbers(number, names), strict=True))
        return MappingProxyType(numbers)


def _refdes(
    instance: says.Instance, designator: str, notes: list[says.Annotation], name: str, prefix: str
) -> str:
    """The refdes, first that exists; "" where only the name of the instance is left."""
    if designator and not designator.endswith("?"):
        return designator
    for note in notes:
        if note.designator and not note.designator.endswith("?"):
            return note.designator
    if like_refdes(name, prefix):
        return ""
    for attribute in (*instance.attributes, *(each for note in notes for each in note.attributes)):
        if gives_refdes(attribute) and attribute.text and not attribute.text.endswith("?"):
            return attribute.text
    return ""


def gives_refdes(attribute: Attribute) -> bool:
    """Whether this property carries a refdes."""
    return any(_SIGNS.sub("", word).lower() in _REFDES_PROPERTIES for word in (attribute.key, attribute.name))


def like_refdes(name: str, prefix: str) -> bool:
    """Whether an instance's name is a refdes, so that no property need be asked.

    With a prefix (`C?`) in the cell it has to begin so; else letters and a number, unless editors number so.
    """
    match = _REFDES_LIKE.fullmatch(name)
    if match is None:
        return False
    letters = match[1].lower()
    wanted = prefix.rstrip("?").lower()
    return letters == wanted if wanted else letters not in _AUTOMATIC


def is_mark(part: LocalPart, net_names: list[str]) -> bool:
    """Whether a part without refdes is a mark on the drawing: one port, and a name that is none of a component's.

    Symbols of supplies carry the net's name (their cell is called as the net is); page connectors go by a name that an
    editor gave. A cell with a refdes prefix (`TP?`) is a component.
    """
    target = part.target
    if part.refdes or part.inside or target.cell is None or len(part.interface.bits) != 1 or target.prefix:
        return False
    if not like_refdes(part.name, ""):
        return True
    called = {target.name.lower(), part.interface.bits[0].name.lower()}
    return any(name.lower() in called for name in net_names)
