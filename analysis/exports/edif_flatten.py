"""From the netlists of the views to one flat list of parts and nets, names as people see them."""

from __future__ import annotations

from collections import Counter, defaultdict, deque
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from reactance.analysis.design import Design, Net, Part
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_cells import Interface, View
from reactance.analysis.exports.edif_connect import Netlist
from reactance.analysis.exports.edif_packages import flat_part, packages
from reactance.analysis.exports.edif_parts import LocalPart
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_union import Nodes


@dataclass(slots=True)
class _Block:
    """One place where a view stands in the design: its first node, the instances above it, and what
    back-annotation from above says of instances in it (paths from here)."""

    netlist: Netlist
    base: int
    path: tuple[str, ...]
    notes: list[says.Annotation]


@dataclass(slots=True)
class _FlatNet:
    """A net with every (path, name) it has, the highest first."""

    start: int
    names: list[tuple[tuple[str, ...], str]] = field(default_factory=list)
    called: str = ""


@dataclass(frozen=True, slots=True)
class Flat:
    """The flattened design, and the offsets of the entries that its nets and instances of its parts are from.

    Where sections of a package became one part there are more of these offsets than parts.
    """

    design: Design
    part_starts: list[int]
    net_starts: list[int]


def flatten(top: View, name: str, netlists: Mapping[int, Netlist], source: Source) -> Flat:
    """The design called `name` whose top view is `top`.

    A net goes by its name highest up; one that lives inside a block by its plain name where that is unique, else
    by `PATH/NAME`. The other names are its aliases. Raises InputError where a limit bites.
    """
    nodes = Nodes()
    blocks, shared = _blocks(top, netlists, nodes, source)
    nets = _nets(blocks, shared, nodes)
    _name_nets(nets, source)
    flat: list[Part] = []
    locals_: list[LocalPart] = []
    for block in blocks:
        count = len(block.netlist.names)
        called = [nets[nodes.root(node)].called for node in range(block.base, block.base + count)]
        for part in block.netlist.parts:
            if part.symbol or part.inside is not None:
                continue
            notes = block.notes and [note for note in block.notes if _is_about(note, part)]
            flat.append(flat_part(part, block.path, called, notes, source))
            locals_.append(part)
        source.check("parts", len(flat), block.netlist.view.cell.start)
    parts = packages(flat, locals_, source)
    design = Design(
        name, source.file, "EDIF 2 0 0", parts, _connected(nets, parts, source), source.problems()
    )
    starts = [net.start for net in nets.values() if net.called]
    return Flat(design, [part.start for part in locals_], starts)


def _blocks(
    top: View, netlists: Mapping[int, Netlist], nodes: Nodes, source: Source
) -> tuple[list[_Block], Mapping[str, tuple[str, int]]]:
    """Every block, those higher up first, with their nodes joined through ports and global nets."""
    first = netlists[id(top)]
    pins = 0
    waiting = deque([_Block(first, nodes.add(len(first.names)), (), _deep_notes(top))])
    blocks: list[_Block] = []
    shared: dict[str, tuple[str, int]] = {}
    maps: dict[tuple[int, int], Mapping[int, int]] = {}
    while waiting:
        block = waiting.popleft()
        blocks.append(block)
        source.check("blocks", len(blocks) + len(waiting), block.netlist.view.cell.start)
        for key, (name, node) in block.netlist.globals.items():
            _, known = shared.setdefault(key, (name, block.base + node))
            nodes.join(known, block.base + node)
        pins += block.netlist.pins
        source.check("pins", pins, block.netlist.view.cell.start)
        for part in block.netlist.parts:
            if part.inside is None:
                continue
            inside = netlists[id(part.inside)]
            base = nodes.add(len(inside.names))
            source.check("pins", len(nodes), part.start)
            ids = (id(part.interface), id(part.inside.interface))
            if ids not in maps:
                maps[ids] = _same_ports(part.interface, part.inside.interface)
            for bit, node in part.nodes.items():
                below = inside.ports.get(maps[ids].get(bit, -1))
                if below is not None:
                    nodes.join(block.base + node, base + below)
            notes = [
                note._replace(path=note.path[1:])
                for note in block.notes
                if len(note.path) > 1 and note.path[0].lower() == part.key
            ]
            waiting.append(_Block(inside, base, (*block.path, part.name), notes + _deep_notes(part.inside)))
    return blocks, MappingProxyType(shared)


def _is_about(note: says.Annotation, part: LocalPart) -> bool:
    return len(note.path) == 1 and note.path[0].lower() == part.key


def _deep_notes(view: View) -> list[says.Annotation]:
    """Back-annotation that a cell gives for instances further down."""
    return [note for note in view.cell.annotations if len(note.path) > 1]


def _same_ports(outer: Interface, inner: Interface) -> Mapping[int, int]:
    """Terminals of one view of a cell to those of another, by their names."""
    if outer is inner:
        return {bit: bit for bit in range(len(outer.bits))}
    found: dict[int, int] = {}
    for key, group in outer.groups.items():
        same = inner.groups.get(key)
        if same is not None:
            found.update(zip(group.bits, same.bits, strict=False))
    return found


def _nets(
    blocks: list[_Block], shared: Mapping[str, tuple[str, int]], nodes: Nodes
) -> Mapping[int, _FlatNet]:
    """The nets by the node that stands for each, with all their names, the highest first."""
    nets: dict[int, _FlatNet] = {}
    for block in blocks:
        netlist = block.netlist
        for node, names in enumerate(netlist.names):
            root = nodes.root(block.base + node)
            net = nets.get(root)
            if net is None:
                net = nets[root] = _FlatNet(netlist.starts[node])
            for name in names:
                net.names.append((block.path, name))
    for name, node in shared.values():
        net = nets[nodes.root(node)]
        if net.names and net.names[0][0] == ():
            net.names.append(((), name))
        else:
            net.names.insert(0, ((), name))
    return nets


def _name_nets(nets: Mapping[int, _FlatNet], source: Source) -> None:
    named = [net for net in nets.values() if net.names]
    plain = Counter(net.names[0][1] for net in named)
    used: set[str] = set()
    tried: Counter[str] = Counter()
    written = 0
    for net in sorted(named, key=lambda net: len(net.names[0][0]) > 0):
        path, name = net.names[0]
        net.called = name if not path or plain[name] == 1 else "/".join((*path, name))
        if path:
            written += len(net.called)
            source.check("paths", written, net.start)
        if net.called in used:
            first = net.called
            while net.called in used:
                tried[first] += 1
                net.called = f"{first}#{tried[first] + 1}"
            message = f"two nets are called {first}; this one is read as {net.called}"
            source.problem("caution", net.start, message)
        used.add(net.called)


def _connected(nets: Mapping[int, _FlatNet], parts: tuple[Part, ...], source: Source) -> tuple[Net, ...]:
    pins: defaultdict[str | None, list[tuple[str, str]]] = defaultdict(list)
    for part in parts:
        refdes = part.refdes
        for pin in part.pins:
            pins[pin.net].append((refdes, pin.number))
    taken = {net.called for net in nets.values()}
    written = 0
    result = []
    for net in nets.values():
        if not net.called:
            continue
        aliases: tuple[str, ...] = ()
        if len(net.names) > 1 or net.names[0][0]:
            written += sum(sum(map(len, path)) + len(path) for path, _ in net.names)
            source.check("paths", written, net.start)
            others = dict.fromkeys("/".join((*path, name)) for path, name in net.names)
            aliases = tuple(other for other in others if other not in taken)
        result.append(Net(net.called, tuple(pins.get(net.called, ())), aliases, source.place(net.start)))
    return tuple(result)
