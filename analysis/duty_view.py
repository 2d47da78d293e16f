"""What the rules for duties look at: the topology with the brief's paths laid over it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Literal

from reactance.analysis.report import DutyKind
from reactance.analysis.topology import Topology, nets_between

PathKind = Literal["coupling", "filter"]


@dataclass(frozen=True, slots=True)
class BriefedPath:
    """A coupling or filter of the brief; `nets`: those it leads over, empty for `nets_between` its ends."""

    name: str
    kind: PathKind
    from_net: str
    to_net: str
    nets: frozenset[str] = frozenset()


@dataclass(frozen=True, slots=True)
class Found:
    """What a rule says about a capacitor; `id` where it shares its duty with others."""

    kind: DutyKind
    because: str
    id: str = ""


@dataclass(frozen=True)
class View:
    """What the rules look at: the topology, the brief's paths and its overrules."""

    topology: Topology
    briefed: tuple[BriefedPath, ...]
    overrules: Mapping[str, DutyKind]

    @cached_property
    def paths_by_net(self) -> Mapping[str, tuple[BriefedPath, ...]]:
        """The briefed paths that lead over each net."""
        return _by_net((path, nets) for path, nets in self._nets_of_paths)

    @cached_property
    def stubs_by_net(self) -> Mapping[str, tuple[BriefedPath, ...]]:
        """The briefed filters that each net hangs on without a pin of its own."""
        return _by_net((path, self._stubs(nets)) for path, nets in self._nets_of_paths if path.kind == "filter")

    @cached_property
    def _nets_of_paths(self) -> tuple[tuple[BriefedPath, frozenset[str]], ...]:
        return tuple(
            (path, ends | (path.nets or nets_between(self.topology, path.from_net, path.to_net)))
            for path in self.briefed
            for ends in (frozenset((path.from_net, path.to_net)),)
        )

    def _stubs(self, nets: frozenset[str]) -> frozenset[str]:
        found: set[str] = set()
        work = [net for net in nets if not self.topology.is_fixed(net)]
        while work:
            for branch in self.topology.on(work.pop()):
                for net in (branch.a, branch.b):
                    known = net in nets or net in found or self.topology.is_fixed(net)
                    if not known and not self.topology.pins(net) and net not in self.topology.amplifiers_by_net:
                        found.add(net)
                        work.append(net)
        return frozenset(found)


def _by_net(
    paths: Iterable[tuple[BriefedPath, frozenset[str]]],
) -> Mapping[str, tuple[BriefedPath, ...]]:
    table: dict[str, list[BriefedPath]] = {}
    for path, nets in paths:
        for net in nets:
            table.setdefault(net, []).append(path)
    return MappingProxyType({net: tuple(found) for net, found in table.items()})
