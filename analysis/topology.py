"""The board seen as branches between nets: what the recognition of duties works on.

0 Ω joins are already merged and parts that are not fitted left out. Ground and rails are called fixed nets here:
their potential is given, so a signal does not pass through them.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Literal, TypeVar

from reactance.analysis.report import NetKind

BranchKind = Literal["capacitor", "resistor", "inductor", "bead"]
_T = TypeVar("_T")


@dataclass(frozen=True, slots=True)
class Branch:
    """A two-terminal part between nets `a` and `b`; `value` in SI units, None where not known."""

    refdes: str
    kind: BranchKind
    value: float | None
    a: str
    b: str

    def other(self, net: str) -> str:
        """The net at the other end."""
        return self.b if net == self.a else self.a


@dataclass(frozen=True, slots=True)
class Terminal:
    """A pin of any other part, on a net."""

    refdes: str
    prefix: str
    number: str
    name: str
    direction: str
    net: str
    cell: str = ""

    @property
    def label(self) -> str:
        """REFDES.PIN, with the pin's name where it has one of its own."""
        named = f" ({self.name})" if self.name and self.name != self.number else ""
        return f"{self.refdes}.{self.number}{named}"


@dataclass(frozen=True)
class Topology:
    """Branches, terminals, the kind of each net, and the brief's amplifiers as (plus, minus, out) nets."""

    branches: tuple[Branch, ...]
    terminals: tuple[Terminal, ...]
    kinds: Mapping[str, NetKind]
    amplifiers: tuple[tuple[str, str, str], ...] = ()

    def is_ground(self, net: str) -> bool:
        """Whether the net is a ground."""
        return self.kinds.get(net) == "ground"

    def is_fixed(self, net: str) -> bool:
        """Whether the net is a ground or a rail."""
        return self.kinds.get(net, "signal") != "signal"

    @cached_property
    def branches_by_net(self) -> Mapping[str, tuple[Branch, ...]]:
        """Branches on each net; a branch with both ends on one net stands once."""
        return _grouped((net, branch) for branch in self.branches for net in dict.fromkeys((branch.a, branch.b)))

    @cached_property
    def terminals_by_net(self) -> Mapping[str, tuple[Terminal, ...]]:
        """Terminals on each net."""
        return _grouped((terminal.net, terminal) for terminal in self.terminals)

    @cached_property
    def terminals_by_part(self) -> Mapping[str, tuple[Terminal, ...]]:
        """Terminals of each part."""
        return _grouped((terminal.refdes, terminal) for terminal in self.terminals)

    @cached_property
    def amplifiers_by_net(self) -> Mapping[str, tuple[tuple[str, str, str], ...]]:
        """The amplifiers that have a pin on each net."""
        return _grouped((net, pins) for pins in self.amplifiers for net in dict.fromkeys(pins))

    @cached_property
    def islands(self) -> Mapping[str, str]:
        """For each signal net on a resistor, inductor or bead: a name that all nets share which those join.

        Fixed nets join nothing here: two signals biased from one rail are two islands.
        """
        parent: dict[str, str] = {}

        def root(net: str) -> str:
            parent.setdefault(net, net)
            while parent[net] != net:
                parent[net] = parent[parent[net]]
                net = parent[net]
            return net

        for branch in self.branches:
            if branch.kind != "capacitor" and not self.is_fixed(branch.a) and not self.is_fixed(branch.b):
                parent[root(branch.a)] = root(branch.b)
        return MappingProxyType({net: root(net) for net in tuple(parent)})

    def on(self, net: str) -> tuple[Branch, ...]:
        """The branches on a net."""
        return self.branches_by_net.get(net, ())

    def pins(self, net: str) -> tuple[Terminal, ...]:
        """The terminals on a net."""
        return self.terminals_by_net.get(net, ())

    def series(self, net: str) -> tuple[Branch, ...]:
        """Resistors, inductors and beads from a net to another signal net."""
        return tuple(
            b for b in self.on(net) if b.kind != "capacitor" and b.a != b.b and not self.is_fixed(b.other(net))
        )

    def holding(self, net: str) -> tuple[Branch, ...]:
        """Resistors, inductors and beads from a net to ground or a rail."""
        return tuple(b for b in self.on(net) if b.kind != "capacitor" and self.is_fixed(b.other(net)))

    def joined_by_dc(self, one: str, other: str) -> bool:
        """Whether resistors and inductors lead from one signal net to the other."""
        return one == other or self.islands.get(one, one) == self.islands.get(other, other)

    def shared_parts(self, one: str, other: str) -> Iterator[tuple[Terminal, Terminal]]:
        """Pairs of terminals of one part, the first on net `one`, the second on net `other`.

        Begins at the net with fewer pins: the other may be a ground with thousands.
        """
        swapped = len(self.pins(one)) > len(self.pins(other))
        near, far = (other, one) if swapped else (one, other)
        for terminal in self.pins(near):
            for partner in self.terminals_by_part[terminal.refdes]:
                if partner.net == far:
                    yield (partner, terminal) if swapped else (terminal, partner)

    def neighbours(self, net: str) -> Iterator[str]:
        """Nets that a signal reaches from `net` over one branch, or through an amplifier in either direction."""
        for branch in self.on(net):
            yield branch.other(net)
        for plus, minus, out in self.amplifiers_by_net.get(net, ()):
            yield from (plus, minus) if net == out else (out,)


def _grouped(pairs: Iterable[tuple[str, _T]]) -> Mapping[str, tuple[_T, ...]]:
    table: dict[str, list[_T]] = {}
    for key, item in pairs:
        table.setdefault(key, []).append(item)
    return MappingProxyType({key: tuple(items) for key, items in table.items()})


def prefix_of(refdes: str) -> str:
    """The class letters of a reference designator (IEEE 315), in capitals: `U` of `U3` and of `probe/U3A`."""
    last = refdes.rpartition("/")[2]
    letters = 0
    while letters < len(last) and last[letters].isalpha():
        letters += 1
    return last[:letters].upper()


def nets_between(topology: Topology, start: str, end: str) -> frozenset[str]:
    """The nets on some path from `start` to `end` that visits no net twice and crosses no fixed net.

    Empty where no such path exists. Linear in the size of the signal network around `start`: the answer is the
    biconnected component of an added edge start–end (Hopcroft and Tarjan, Comm. ACM 16 (1973) 372).
    """
    if start == end:
        return frozenset({start})
    found = _component(topology, start, end)
    if len(found) == 2 and end not in topology.neighbours(start):
        return frozenset()
    return found


def _component(topology: Topology, start: str, end: str) -> frozenset[str]:
    """Depth first from `end`; nets that hang on one net alone are taken off again as soon as that is known."""
    order, low, place = {start: 0, end: 1}, {end: 1}, {end: 0}
    component = [end]
    work = [(end, start, topology.neighbours(end))]
    while work:
        net, parent, onward = work[-1]
        for following in onward:
            if following in order:
                low[net] = min(low[net], order[following])
            elif not topology.is_fixed(following):
                order[following] = low[following] = len(order)
                place[following] = len(component)
                component.append(following)
                work.append((following, net, topology.neighbours(following)))
                break
        else:
            work.pop()
            if net != end:
                low[parent] = min(low[parent], low[net])
                if low[net] >= order[parent]:
                    del component[place[net] :]
    return frozenset((*component, start))
