"""The connections inside one view: which pin of which instance is on which local net."""

from __future__ import annotations

from dataclasses import dataclass, field

from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_cells import Catalogue, Interface, PortGroup, Scope, View
from reactance.analysis.exports.edif_names import Name, flattened, member_names, visible
from reactance.analysis.exports.edif_parts import LocalPart, PartMaker, is_mark
from reactance.analysis.exports.edif_scan import Entry
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_union import Nodes


@dataclass(slots=True)
class Netlist:
    """One view's connections. Nodes are numbered from 0; `names` lists the names of each, `starts` its place."""

    view: View
    parts: list[LocalPart] = field(default_factory=list)
    names: list[list[str]] = field(default_factory=list)
    starts: list[int] = field(default_factory=list)
    ports: dict[int, int] = field(default_factory=dict)
    globals: dict[str, tuple[str, int]] = field(default_factory=dict)
    pins: int = 0


@dataclass(frozen=True, slots=True)
class _End:
    """One terminal that a net reaches: a pin of a part, or a node (own port, off-page connector, global net)."""

    part: int = -1
    bit: int = -1
    node: int = -1


class Connector:
    """Builds the netlist of one view."""

    def __init__(self, view: View, catalogue: Catalogue, source: Source) -> None:
        self._view, self._source = view, source
        self._maker = PartMaker(view, catalogue, source)
        self._nodes = Nodes()
        self._names: list[str] = []  # of each node; "" for ports and connectors, which have none of their own
        self._starts: list[int] = []
        self._parts: list[LocalPart] = []
        self._scopes: list[dict[str, tuple[int, int, tuple[int, ...]]]] = []  # key -> first part, count, size
        self._by_name: dict[str, int] = {}  # nets by visible name
        self._by_key: dict[
            str, int
        ] = {}  # and, where they have no other, by identifier without regard to case
        self._named_in: dict[int, int] = {}  # the page on which each named node was first declared
        # Pins of instances other than usual ones, and ends of nets other than plain ones, against blow-ups.
        self._pin_count = self._end_count = 0
        self._ports: dict[int, int] = {}
        self._connectors: dict[str, int] = {}  # by identifier
        self._connectors_shown: dict[str, int] = {}  # by visible name
        self._globals: dict[str, tuple[str, int]] = {}

    def netlist(self) -> Netlist:
        """The connections; entries that could not be understood are among the problems."""
        scopes = self._view.scopes or []
        for scope in scopes:
            self._declare(scope)
        for position, scope in enumerate(scopes):
            self._source.check("parts", len(self._parts), self._view.cell.start)
            for entry in scope.entries:
                if isinstance(entry.value, says.Net):
                    if not self._plain_net(entry.value, position, entry.start):
                        self._net(entry.value, position, entry)
                elif isinstance(entry.value, says.NetBundle):
                    self._report(entry, entry.value.faults)
                    for net in entry.value.nets:
                        self._net(net, position, entry)
        self._join_rippers()
        return self._compressed()

    def _declare(self, scope: Scope) -> None:
        known: dict[str, tuple[int, int, tuple[int, ...]]] = {}
        self._scopes.append(known)
        for entry in scope.entries:
            value = entry.value
            if isinstance(value, says.Instance):
                self._instance(value, entry, known)
            elif isinstance(value, says.Net):
                for instance in value.instances:
                    self._instance(instance, entry, known)
            elif isinstance(value, says.OffPage):
                key, shown = value.name.key, value.name.text
                node = self._connectors_shown.get(shown, self._connectors.get(key))
                if node is None:
                    node = self._new_node("", entry.start)
                self._connectors_shown[shown] = self._connectors[key] = node

    def _instance(
        self, value: says.Instance, entry: Entry, known: dict[str, tuple[int, int, tuple[int, ...]]]
    ) -> None:
        name = value.name
        if value.usual and name.key not in known and (part := self._maker.usual(value, entry.start)):
            known[name.key] = (len(self._parts), 1, ())
            self._parts.append(part)
            return
        self._source.check("name", len(name.text), entry.start)
        if name.size:
            self._source.check("array", name.width, entry.start)
        if value.faults:
            self._report(entry, value.faults)
        if name.key in known:
            self._source.problem("error", entry.start, f"instance {name.text} stands twice; both are kept")
        first = len(self._parts)
        self._parts.extend(self._maker.parts(value, entry.start))
        self._source.check("parts", len(self._parts), entry.start)
        self._pin_count += sum([len(part.interface.bits) for part in self._parts[first:]])
        self._source.check("pins", self._pin_count, entry.start)
        known.setdefault(name.key, (first, len(self._parts) - first, name.size))

    def _new_node(self, name: str, start: int) -> int:
        self._names.append(name)
        self._starts.append(start)
        return self._nodes.add()

    def _net(self, net: says.Net, scope: int, entry: Entry) -> list[int]:
        """Take in a net and those nested in it; its nodes, one for each member."""
        if net.faults:
            self._report(entry, net.faults)
        self._source.check("name", len(net.name.text), entry.start)
        if net.name.size:
            self._source.check("array", net.name.width, entry.start)
        ends = [self._ends(ref, scope, net.name, entry) for ref in net.refs]
        self._end_count += sum(map(len, ends))
        self._source.check("pins", self._end_count, entry.start)
        width = net.name.width if net.name.size else self._bus_width(net, ends)
        nodes = self._net_nodes(net, width, scope, entry.start)
        for ref, reached in zip(net.refs, ends, strict=True):
            self._attach(nodes, reached, net, ref, entry)
        for inner in net.inner:
            self._nest(nodes, net, inner, scope, entry)
        return nodes

    def _plain_net(self, net: says.Net, scope: int, start: int) -> bool:
        """Take in a net that joins nothing but single free pins of single instances: the short way for nearly every
        net. False, and nothing done, where it is not so."""
        known, parts = self._scopes[scope], self._parts
        if net.plain is None or len(net.name.text) > self._source.limits.name:
            return False
        pins: list[tuple[dict[int, int], int]] = []
        for port, instance in net.plain:
            found = known.get(instance)
            if found is None or found[1] != 1:
                return False
            part = parts[found[0]]
            group = part.interface.groups.get(port)
            if group is None or len(group.bits) != 1 or group.bits[0] in part.nodes:
                return False
            pins.append((part.nodes, group.bits[0]))
        node = self._named(net.name.text, "" if net.name.renamed else net.name.key, scope, start)
        for on, bit in pins:
            on[bit] = node
        return True

    def _bus_width(self, net: says.Net, ends: list[list[_End]]) -> int:
        """How many conductors a net without stated members has.

        More than one where all that it joins is equally wide, and something says that this is a bus: an array or
        bundle of ports, or several lists of ports. A single list of ports on a plain net is that net.
        """
        widths = {len(reached) for reached in ends if reached}
        if len(widths) != 1 or widths == {1}:
            return 1
        buses = sum(not isinstance(ref, says.PortList) for ref in net.refs)
        return widths.pop() if buses or len(net.refs) > 1 else 1

    def _net_nodes(self, net: says.Net, width: int, scope: int, start: int) -> list[int]:
        name = net.name
        if width == 1 and not name.size:
            return [self._named(name.text, "" if name.renamed else name.key, scope, start)]
        members = member_names(Name(name.key, name.text, name.size or (width,)))
        nodes = [self._named(shown, "", scope, start) for shown in members]
        self._source.check("pins", len(self._nodes), start)
        return nodes

    def _named(self, shown: str, key: str, scope: int, start: int) -> int:
        """The node of that visible name, or identifier where the net has no other; the same on all pages."""
        node = self._by_name.get(shown)
        if node is None and key:
            node = self._by_key.get(key)
        if node is None:
            node = self._new_node(shown, start)
            self._named_in[node] = scope
            self._by_name[shown] = node
            if key:
                self._by_key[key] = node
        elif self._named_in[node] == scope:
            self._source.problem("caution", start, f"net {shown} stands twice; taken as one net")
        return node

    def _attach(
        self, nodes: list[int], reached: list[_End], net: says.Net, ref: says.Ref, entry: Entry
    ) -> None:
        if len(nodes) == 1 and len(reached) > 1:
            if not isinstance(ref, says.PortList):
                message = f"net {net.name.text} joins a bus of {len(reached)} to single ports; all are taken as one net"
                self._source.problem("caution", entry.start, message)
            nodes = nodes * len(reached)
        elif reached and len(nodes) != len(reached):
            message = f"net {net.name.text} has {len(nodes)} members but joins {len(reached)}; not connected"
            self._source.problem("error", entry.start, message)
            return
        shorts = [end for node, end in zip(nodes, reached, strict=False) if self._tie(node, end)]
        if shorts:
            part = self._parts[shorts[0].part]
            pin = f"{part.name}.{part.interface.bits[shorts[0].bit].name}"
            pins = f"pin {pin} stands" if len(shorts) == 1 else f"{len(shorts)} pins ({pin} and others) stand"
            message = f"{pins} in net {net.name.text} and in another; they are taken as one net"
            self._source.problem("caution", entry.start, message)

    def _tie(self, node: int, end: _End) -> bool:
        """Put the end on the node; whether it was on another net before, which is now one net with this."""
        if end.node >= 0:
            self._nodes.join(node, end.node)
            return False
        on = self._parts[end.part].nodes
        before = on.get(end.bit)
        on[end.bit] = node
        if before is None or self._nodes.root(before) == self._nodes.root(node):
            return False
        self._nodes.join(before, node)
        return True

    def _nest(self, nodes: list[int], net: says.Net, inner: says.Net, scope: int, entry: Entry) -> None:
        """A net within a net is a stretch of it: of the whole, or of the member that it names."""
        below = self._net(inner, scope, entry)
        if len(below) == len(nodes):
            for one, other in zip(nodes, below, strict=True):
                self._nodes.join(one, other)
        elif len(nodes) == 1:
            for other in below:
                self._nodes.join(nodes[0], other)
        elif not set(below) <= set(nodes):
            message = f"net {inner.name.text} in net {net.name.text} fits none of its members; kept as a net of its own"
            self._source.problem("caution", entry.start, message)

    def _ends(self, ref: says.Ref, scope: int, net: Name, entry: Entry) -> list[_End]:
        if isinstance(ref, says.PortRef):
            if ref.instance:
                return self._pins(ref, scope, net, entry)
            return self._own(ref, net, entry)
        if isinstance(ref, says.PortList):
            return [end for each in ref.refs for end in self._ends(each, scope, net, entry)]
        key = ref.name.lower()
        if key not in self._globals:
            self._globals[key] = (
                visible(ref.name.removeprefix("&") or ref.name),
                self._new_node("", entry.start),
            )
        return [_End(node=self._globals[key][1])]

    def _pins(self, ref: says.PortRef, scope: int, net: Name, entry: Entry) -> list[_End]:
        if len(ref.instance) > 1:
            path = "/".join(ref.instance)
            self._source.problem("error", entry.start, f"net {net.text}: it reaches into {path}; passed over")
            return []
        found = self._find_instance(ref.instance[0].lower(), scope)
        if found is None:
            message = f"net {net.text}: there is no instance {ref.instance[0]} in this cell; passed over"
            self._source.problem("error", entry.start, message)
            return []
        first, count, size = found
        members = range(first, first + count)
        if ref.instance_index:
            member = flattened(ref.instance_index, size)
            if member is None:
                message = f"net {net.text}: instance {ref.instance[0]} has no member {ref.instance_index}"
                self._source.problem("error", entry.start, message)
                return []
            members = range(first + member, first + member + 1)
        ends: list[_End] = []
        for part in members:
            bits = self._bits(ref, self._parts[part].interface, net, entry, self._parts[part].name)
            ends.extend(_End(part, bit) for bit in bits)
        return ends

    def _find_instance(self, key: str, scope: int) -> tuple[int, int, tuple[int, ...]] | None:
        found = self._scopes[scope].get(key)
        if found is None:
            others = [known[key] for known in self._scopes if key in known]
            found = others[0] if others else None
        return found

    def _bits(
        self, ref: says.PortRef, interface: Interface, net: Name, entry: Entry, owner: str
    ) -> tuple[int, ...]:
        group = interface.group(ref.port)
        shown = ".".join(ref.port)
        if group is None:
            message = f"net {net.text}: {owner} has no port {shown}; it is given one"
            self._source.problem("caution", entry.start, message)
            name = visible(ref.port[-1].removeprefix("&") or ref.port[-1])
            if ref.member:
                name += f"[{','.join(map(str, ref.member))}]"
            group = PortGroup((interface.add("", name),))
            if len(ref.port) == 1 and not ref.member:
                interface.groups[ref.port[0].lower()] = group
            return group.bits
        bits = interface.bits_of(ref)
        if not bits and ref.member:
            message = f"net {net.text}: port {shown} of {owner} has no member {ref.member}; passed over"
            self._source.problem("error", entry.start, message)
        return bits

    def _own(self, ref: says.PortRef, net: Name, entry: Entry) -> list[_End]:
        """A port of the cell itself, or an off-page connector."""
        interface = self._view.interface
        connector = self._connectors.get(ref.port[0].lower())
        if connector is not None and interface.group(ref.port) is None:
            return [_End(node=connector)]
        if interface.group(ref.port) is None:
            message = f"net {net.text}: cell {self._view.cell.name.text} has no port {'.'.join(ref.port)}; passed over"
            self._source.problem("error", entry.start, message)
            return []
        ends = []
        for bit in self._bits(ref, interface, net, entry, f"cell {self._view.cell.name.text}"):
            if bit not in self._ports:
                self._ports[bit] = self._new_node("", entry.start)
            ends.append(_End(node=self._ports[bit]))
        return ends

    def _join_rippers(self) -> None:
        """A ripper or tie joins nets through itself: it is wiring, no part."""
        for part in self._parts:
            if not part.target.wiring:
                continue
            for refs in part.interface.joined:
                groups = [part.interface.group(ref.port) for ref in refs if isinstance(ref, says.PortRef)]
                widths = {len(group.bits) for group in groups if group}
                if len(widths) != 1:
                    continue
                for bits in zip(*(group.bits for group in groups if group), strict=True):
                    touched = [part.nodes[bit] for bit in bits if bit in part.nodes]
                    for node in touched[1:]:
                        self._nodes.join(touched[0], node)

    def _report(self, entry: Entry, faults: tuple[str, ...]) -> None:
        for fault in faults:
            self._source.problem("error", entry.start, fault)

    def _compressed(self) -> Netlist:
        """Nodes renumbered without gaps."""
        nodes = self._nodes
        result = Netlist(
            self._view, self._parts, pins=sum([len(part.interface.bits) for part in self._parts])
        )
        number: dict[int, int] = {}
        renumbered: list[int] = []
        for node, name in enumerate(self._names):
            root = nodes.root(node) if nodes.joined else node
            new = number.get(root)
            if new is None:
                new = number[root] = len(result.names)
                result.names.append([name] if name else [])
                result.starts.append(self._starts[node])
            elif name:
                result.names[new].append(name)
            renumbered.append(new)
        for part in self._parts:
            if nodes.joined:
                part.nodes = {bit: renumbered[node] for bit, node in part.nodes.items()}
            if len(part.nodes) == 1 and not part.refdes:
                part.symbol = part.symbol or is_mark(part, result.names[next(iter(part.nodes.values()))])
        result.ports = {bit: renumbered[node] for bit, node in self._ports.items()}
        result.globals = {key: (name, renumbered[node]) for key, (name, node) in self._globals.items()}
        return result
