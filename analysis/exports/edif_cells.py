"""Libraries, cells and views of one EDIF file, put together from its declarations."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from types import MappingProxyType

from reactance.analysis.design import Direction
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_names import Name, flattened, member_names
from reactance.analysis.exports.edif_names import name as name_of
from reactance.analysis.exports.edif_scan import Container, Entry
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_values import Attribute

NO_SCALES: Mapping[str, Decimal] = MappingProxyType({})


@dataclass(slots=True)
class PortBit:
    """One terminal of a cell."""

    number: str
    name: str
    direction: Direction = ""


@dataclass(slots=True)
class PortGroup:
    """What a port's name stands for: one or more terminals, by position in the interface."""

    bits: tuple[int, ...]
    size: tuple[int, ...] = ()
    inner: dict[str, PortGroup] = field(default_factory=dict)


@dataclass(slots=True)
class Interface:
    """A view's terminals, the names that lead to them, and which of them the cell itself joins."""

    bits: list[PortBit] = field(default_factory=list)
    groups: dict[str, PortGroup] = field(default_factory=dict)
    joined: list[tuple[says.Ref, ...]] = field(default_factory=list)

    def group(self, path: tuple[str, ...]) -> PortGroup | None:
        """The terminals that a port's name, or a path through bundles, stands for."""
        group = self.groups.get(path[0].lower())
        for step in path[1:]:
            group = group.inner.get(step.lower()) if group else None
        return group

    def bits_of(self, ref: says.PortRef) -> tuple[int, ...]:
        """The terminals that `ref` means; none where there is no such port or member."""
        group = self.group(ref.port)
        if group is None or not ref.member:
            return group.bits if group else ()
        member = flattened(ref.member, group.size or (len(group.bits),))
        return () if member is None else (group.bits[member],)

    def add(self, number: str, name: str, direction: Direction = "") -> int:
        """A new terminal; its position."""
        self.bits.append(PortBit(number or name, name, direction))
        return len(self.bits) - 1


@dataclass(slots=True)
class Scope:
    """One page, or the part of the contents outside pages: instances and nets in the file's order."""

    name: str
    entries: list[Entry]


@dataclass(slots=True)
class View:
    """One view of a cell. `scopes` is None where it has no contents."""

    key: str
    kind: str
    cell: Cell
    interface: Interface
    scopes: list[Scope] | None
    attributes: list[Attribute]
    prefix: str = ""

    @property
    def hierarchical(self) -> bool:
        """Whether there is anything inside."""
        wanted = ("instance", "net", "netbundle")
        return self.scopes is not None and any(
            entry.keyword in wanted for scope in self.scopes for entry in scope.entries
        )

    @property
    def holds_instances(self) -> bool:
        """Whether instances stand inside."""
        return self.scopes is not None and any(
            entry.keyword == "instance" or (isinstance(entry.value, says.Net) and entry.value.instances)
            for scope in self.scopes
            for entry in scope.entries
        )


@dataclass(slots=True)
class Cell:
    """One cell with its views by key, in the file's order."""

    name: Name
    library: Library
    start: int
    kind: str = "generic"
    views: dict[str, View] = field(default_factory=dict)
    attributes: list[Attribute] = field(default_factory=list)
    annotations: list[says.Annotation] = field(default_factory=list)
    prefix: str = ""

    def contents(self, view: View | None = None) -> View | None:
        """The view whose contents stand for the cell: the one asked for, a netlist, else a schematic, else any."""
        inside = [each for each in self.views.values() if each.hierarchical]
        if view is not None and view in inside:
            return view
        for kind in ("netlist", "schematic"):
            for each in inside:
                if each.kind == kind:
                    return each
        return inside[0] if inside else None


@dataclass(slots=True)
class Library:
    """One library, its cells by key, and what its units are worth in SI."""

    key: str
    external: bool
    scales: Mapping[str, Decimal] = field(default_factory=lambda: NO_SCALES)
    cells: dict[str, Cell] = field(default_factory=dict)


class Catalogue:
    """All libraries of a file."""

    def __init__(self, source: Source) -> None:
        self._source = source
        self._pins = 0
        self._libraries: dict[str, Library] = {}
        self._everywhere: dict[str, Cell] = {}

    def cells(self) -> Iterator[Cell]:
        """Every cell, in the file's order."""
        for library in self._libraries.values():
            yield from library.cells.values()

    def find(self, ref: says.CellRef, home: Library | None) -> Cell | None:
        """The cell that `ref` names from within the library `home`.

        A cell that is not in the library named is taken from another that has it, a defined one before an external.
        """
        key = ref.cell.lower()
        library = self._libraries.get(ref.library.lower()) if ref.library else home
        cell = library.cells.get(key) if library else None
        if cell is not None and (cell.views or cell.library.external is False):
            return cell
        return self._everywhere.get(key, cell)

    def add_library(self, form: Container) -> None:
        """Take in one `(library …)` or `(external …)`."""
        name = self._name(form, "library")
        library = self._libraries.get(name.key)
        if library is None:
            library = self._libraries[name.key] = Library(name.key, form.keyword == "external")
        elif form.keyword == "library":
            library.external = False
        for entry in form.entries:
            if isinstance(entry.value, says.Technology):
                library.scales = entry.value.scales
        for inner in form.inner:
            self._add_cell(inner, library)

    def _add_cell(self, form: Container, library: Library) -> None:
        name = self._name(form, "cell")
        cell = Cell(name, library, form.start)
        known = library.cells.get(name.key)
        if known is not None and known.views:
            self._source.problem(
                "caution", form.start, f"cell {name.text} is defined twice; the first is used"
            )
            return
        for entry in form.entries:
            value = entry.value
            if isinstance(value, says.Properties):
                cell.attributes.extend(value.attributes)
            elif isinstance(value, says.ViewMap):
                cell.annotations.extend(value.annotations)
                self._faults(entry, value.faults)
            elif isinstance(value, says.Word) and entry.keyword == "celltype":
                cell.kind = value.name.key
            elif isinstance(value, says.Word) and entry.keyword == "designator":
                cell.prefix = value.name.text
        library.cells[name.key] = cell
        if (
            name.key not in self._everywhere
            or self._everywhere[name.key].library.external
            or not library.external
        ):
            self._everywhere[name.key] = cell
        for inner in form.inner:
            self._add_view(inner, cell)

    def _add_view(self, form: Container, cell: Cell) -> None:
        name = self._name(form, "view")
        view = View(name.key, "", cell, Interface(), None, [])
        for entry in form.entries:
            if isinstance(entry.value, says.Properties):
                view.attributes.extend(entry.value.attributes)
            elif isinstance(entry.value, says.Word) and entry.keyword == "viewtype":
                view.kind = entry.value.name.key
        for inner in form.inner:
            if inner.keyword == "interface":
                self._fill_interface(inner, view)
            else:
                pages = [Scope(self._name(page, "page").text, page.entries) for page in inner.inner]
                view.scopes = [*(view.scopes or ()), Scope("", inner.entries), *pages]
        if name.key in cell.views:
            message = f"view {name.text} of cell {cell.name.text} is defined twice; the first is used"
            self._source.problem("caution", form.start, message)
            return
        cell.views[name.key] = view

    def _fill_interface(self, form: Container, view: View) -> None:
        for entry in form.entries:
            value = entry.value
            if isinstance(value, says.Port):
                if value.name.key in view.interface.groups:
                    self._source.problem("caution", entry.start, f"port {value.name.text} stands twice")
                    continue
                view.interface.groups[value.name.key] = self._port(value, view.interface, entry)
            elif isinstance(value, says.Properties):
                view.attributes.extend(value.attributes)
            elif isinstance(value, says.Joined):
                view.interface.joined.append(value.refs)
            elif isinstance(value, says.Word) and entry.keyword == "designator":
                view.prefix = value.name.text
        numbers = Counter([bit.number for bit in view.interface.bits])
        if len(numbers) < len(view.interface.bits):
            twice = ", ".join([number for number, count in numbers.items() if count > 1][:5])
            message = f"cell {view.cell.name.text} has pin numbers more than once: {twice}"
            self._source.problem("caution", form.start, message)

    def _port(self, port: says.Port, interface: Interface, entry: Entry) -> PortGroup:
        if port.bundle:
            inner = {each.name.key: self._port(each, interface, entry) for each in port.inner}
            return PortGroup(tuple(bit for group in inner.values() for bit in group.bits), (), inner)
        self._source.check("array", port.name.width, entry.start)
        self._pins += port.name.width
        self._source.check("pins", self._pins, entry.start)
        names = member_names(port.name)
        numbers = pin_numbers(port.number, names)
        bits = [
            interface.add(number, name, port.direction) for number, name in zip(numbers, names, strict=True)
        ]
        return PortGroup(tuple(bits), port.name.size)

    def _name(self, form: Container, what: str) -> Name:
        declared: Name | None = None
        for entry in form.entries:
            if entry.keyword in ("rename", "name") and isinstance(entry.value, says.Word):
                declared = entry.value.name
                break
        if declared is None and form.head:
            declared = name_of(form.head)
        if declared is None:
            self._source.problem("caution", form.start, f"a {what} without a name")
            declared = Name("", f"({what} without a name)")
        self._source.check("name", len(declared.text), form.start)
        return declared

    def _faults(self, entry: Entry, faults: tuple[str, ...]) -> None:
        for fault in faults:
            self._source.problem("error", entry.start, fault)


def pin_numbers(number: str, names: list[str]) -> list[str]:
    """The pin number of each member of a port: one, a list of as many as there are members, or their names."""
    if len(names) == 1:
        return [number or names[0]]
    listed = number.replace(",", " ").split()
    return listed if len(listed) == len(names) else names
