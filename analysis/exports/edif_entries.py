"""What single EDIF entries declare: instances, nets, ports, properties, back-annotation.

Each declaration depends on the text of its form alone, so that it can be remembered by it (`edif_build` makes them).
"""

from __future__ import annotations

from collections.abc import Mapping
from decimal import Decimal
from typing import NamedTuple, TypeAlias

from reactance.analysis.design import Direction
from reactance.analysis.exports.edif_names import Name
from reactance.analysis.exports.edif_values import Attribute


class CellRef(NamedTuple):
    """Where a cell is to be found, as written; "" for what was left out."""

    view: str
    cell: str
    library: str


class PortRef(NamedTuple):
    """A port: of the instance at `instance` (innermost last), or the cell's own where that is empty.

    `port` leads from the outermost bundle to the port. Indices are empty where the whole is meant.
    """

    port: tuple[str, ...]
    member: tuple[int, ...] = ()
    instance: tuple[str, ...] = ()
    instance_index: tuple[int, ...] = ()


class PortList(NamedTuple):
    """Ports in order, as one bus."""

    refs: tuple[Ref, ...]


class GlobalRef(NamedTuple):
    """A net that is one over the whole design."""

    name: str


Ref: TypeAlias = "PortRef | PortList | GlobalRef"


class PinNumber(NamedTuple):
    """A designator given to a port."""

    port: PortRef
    number: str


class Instance(NamedTuple):
    """`(instance …)`; `faults` are parts of it that could not be understood.

    `plain` are its attributes by visible name where none needs the library's units; `longest` is the length of the
    longest name or text in it; `usual` says that it is one instance with a refdes and plain attributes, no more.
    """

    name: Name
    cells: tuple[CellRef, ...]
    designator: str
    attributes: tuple[Attribute, ...]
    numbers: tuple[PinNumber, ...]
    faults: tuple[str, ...]
    plain: Mapping[str, str] | None
    longest: int
    usual: bool


class Port(NamedTuple):
    """`(port …)` or `(portBundle …)`, the latter with the ports in it."""

    name: Name
    direction: Direction
    number: str
    inner: tuple[Port, ...] = ()
    bundle: bool = False


class Net(NamedTuple):
    """`(net …)`, with what it joins, the nets in it and instances drawn inside it.

    `plain` is what it joins as (port, instance), both as keys, where that is all there is to it: the usual case.
    """

    name: Name
    refs: tuple[Ref, ...]
    inner: tuple[Net, ...] = ()
    instances: tuple[Instance, ...] = ()
    faults: tuple[str, ...] = ()
    plain: tuple[tuple[str, str], ...] | None = None


class NetBundle(NamedTuple):
    """`(netBundle …)`: several nets under one name."""

    name: Name
    nets: tuple[Net, ...]
    faults: tuple[str, ...]


class OffPage(NamedTuple):
    """`(offPageConnector …)`: where a net goes on on another page."""

    name: Name


class Joined(NamedTuple):
    """`(joined …)` in an interface: ports that the cell itself connects."""

    refs: tuple[Ref, ...]


class Annotation(NamedTuple):
    """What back-annotation says of one instance; `path` is innermost last."""

    path: tuple[str, ...]
    designator: str
    attributes: tuple[Attribute, ...]
    numbers: tuple[PinNumber, ...]


class ViewMap(NamedTuple):
    """`(viewMap …)`."""

    annotations: tuple[Annotation, ...]
    faults: tuple[str, ...]


class Properties(NamedTuple):
    """The attributes of one `(property …)` or `(parameter …)`."""

    attributes: tuple[Attribute, ...]


class Technology(NamedTuple):
    """What one unit of the library is worth in SI."""

    scales: Mapping[str, Decimal]


class Word(NamedTuple):
    """An entry that says one thing: a name, a designator, a type."""

    name: Name


class DesignRef(NamedTuple):
    """`(design …)`: the name of the whole and its top cell."""

    name: Name
    cell: CellRef


class Version(NamedTuple):
    """`(edifVersion 2 0 0)`."""

    numbers: tuple[str, ...]


class Bad(NamedTuple):
    """An entry that could not be understood."""

    message: str
