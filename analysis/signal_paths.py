"""Couplings and filters that a design shows beyond doubt, without a brief.

A path is shown only where its direction is told by the parts at its ends: an output, an amplifier or a microphone on
one side, an input on the other, or a connector on one side. Where two readings are possible nothing is shown.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Literal

from reactance.analysis import pin_roles
from reactance.analysis.duties import Assigned, PathKind, duties, without_brief
from reactance.analysis.duty_words import listing, what_holds
from reactance.analysis.topology import Branch, Topology

Side = Literal["driver", "receiver", "connector", "part", "mixed", "none"]
_FARTHEST = 40  # nets looked at on one side of a capacitor; what is farther away settles nothing beyond doubt


@dataclass(frozen=True, slots=True)
class ShownPath:
    """A coupling or filter from one net to another; `parts` are the capacitors and what is in series with them."""

    kind: PathKind
    from_net: str
    to_net: str
    because: str
    parts: tuple[str, ...] = ()


def shown_paths(
    topology: Topology, claimed: Collection[str] = (), assigned: Sequence[Assigned] | None = None
) -> tuple[ShownPath, ...]:
    """The couplings, then the filters, each once, in the order of the design's parts.

    `claimed`: capacitors whose path the brief describes already; a path with one of them is not shown again.
    `assigned`: the duties under the brief, where they are known; what the brief says of them does not count here.
    """
    capacitors = [branch for branch in topology.branches if branch.kind == "capacitor"]
    kinds = without_brief(topology, duties(topology) if assigned is None else assigned)
    of_kind = {
        wanted: [capacitor for capacitor, kind in zip(capacitors, kinds, strict=True) if kind == wanted]
        for wanted in ("coupling", "filter")
    }
    found = (*_couplings(topology, of_kind["coupling"]), *_filters(topology, of_kind["filter"]))
    return tuple(path for path in found if not any(part in claimed for part in path.parts))


def side_of(topology: Topology, net: str) -> Side:
    """Who is on a net: a driver, a receiver, a connector, a part of unknown direction; `mixed` for several."""
    found = set(pin_roles.roles(topology.pins(net)))
    for _, _, out in topology.amplifiers_by_net.get(net, ()):
        found.discard("part")
        found.add("driver" if net == out else "receiver")
    if "driver" in found:
        return "mixed" if "connector" in found and len(found) > 2 else "driver"
    if "receiver" in found:
        return "mixed" if "connector" in found else "receiver"
    if len(found) > 1:
        return "mixed"
    return next(iter(found), "none")


def _couplings(topology: Topology, capacitors: list[Branch]) -> Iterator[ShownPath]:
    pairs: dict[frozenset[str], list[Branch]] = {}
    for capacitor in capacitors:
        pairs.setdefault(frozenset((capacitor.a, capacitor.b)), []).append(capacitor)
    seen: set[tuple[str, str]] = set()
    for parallel in pairs.values():
        shown = _coupling(topology, parallel)
        if shown is not None and (shown.from_net, shown.to_net) not in seen:
            seen.add((shown.from_net, shown.to_net))
            yield shown


def _coupling(topology: Topology, parallel: list[Branch]) -> ShownPath | None:
    a, b = parallel[0].a, parallel[0].b
    one, other = _nearest(topology, a), _nearest(topology, b)
    if one is None or other is None:
        return None
    if _drives(one[0], other[0]):
        start, end = one[1], other[1]
    elif _drives(other[0], one[0]):
        start, end = other[1], one[1]
    else:
        return None
    names = tuple(branch.refdes for branch in parallel)
    verb = "is" if len(names) == 1 else "are"
    because = (
        f"{listing(names)} {verb} in series from {start} ({_who(topology, start)}) to {end} ({_who(topology, end)})"
    )
    return ShownPath("coupling", start, end, because, names)


def _drives(one: Side, other: Side) -> bool:
    """Whether a signal can only go from side `one` to side `other`."""
    return (one == "driver" and other in ("receiver", "connector", "part")) or (
        one in ("connector", "part") and other == "receiver"
    )


def _nearest(topology: Topology, start: str) -> tuple[Side, str] | None:
    """Who is nearest to `start` over resistors, inductors and beads; None where that is not one.

    With it the net to measure at: where that one is, unless a capacitor loads the way there; then `start` itself.
    """
    layer, loaded = [start], {start: False}
    while layer and len(loaded) <= _FARTHEST:
        sides = [(side, net) for net in layer if (side := side_of(topology, net)) != "none"]
        if sides:
            side, net = sides[0]
            return (side, start if loaded[net] else net) if len(sides) == 1 and side != "mixed" else None
        following: list[str] = []
        for net in layer:
            for onward in (branch.other(net) for branch in topology.series(net)):
                if onward not in loaded:
                    loaded[onward] = loaded[net] or any(b.kind == "capacitor" for b in topology.on(onward))
                    following.append(onward)
        layer = following
    return None


def _who(topology: Topology, net: str) -> str:
    pins = [pin for pin in topology.pins(net) if pin_roles.role(pin) != "none"]
    return listing(pin.label for pin in pins) if pins else what_holds(topology, net)


def _filters(topology: Topology, capacitors: list[Branch]) -> Iterator[ShownPath]:
    """Ladders of series resistors or inductors with capacitors to ground, walked from their receiving end."""
    shunts: dict[str, list[str]] = {}
    for capacitor in capacitors:
        for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
            if topology.is_ground(far) and not topology.is_fixed(net):
                shunts.setdefault(net, []).append(capacitor.refdes)
    ends: dict[str, None] = {}
    for net in shunts:
        if side_of(topology, net) == "none":
            ends.update((branch.other(net), None) for branch in topology.series(net))
        else:
            ends[net] = None
    for end in ends:
        shown = _ladder(topology, end, shunts)
        if shown is not None:
            yield shown


def _ladder(topology: Topology, end: str, shunts: dict[str, list[str]]) -> ShownPath | None:
    """The low-pass that ends on net `end`, if there is one and its direction is told."""
    path = _walk_back(topology, end)
    if path is None or not _is_closed(topology, path):
        return None
    start, shunted = path[0], [net for net in path[1:] if net in shunts]
    if not shunted or not _leads(side_of(topology, start), side_of(topology, end), start in shunts):
        return None
    parts: list[str] = []
    for net, following in pairwise(path):
        parts += [branch.refdes for branch in topology.series(net) if branch.other(net) == following]
        parts += shunts.get(following, ())
    because = (
        f"{listing(parts)} form a low-pass from {start} ({_who(topology, start)}) to {end} ({_who(topology, end)})"
    )
    return ShownPath("filter", start, end, because, tuple(parts))


def _walk_back(topology: Topology, end: str) -> list[str] | None:
    """The nets from the nearest net with pins to `end`, each with one way on; None where the way forks or stops."""
    if side_of(topology, end) == "none":
        return None
    path = [end]
    while len(path) == 1 or side_of(topology, path[0]) == "none":
        onward = {branch.other(path[0]) for branch in topology.series(path[0])} - set(path[1:2])
        if len(onward) != 1 or onward & set(path):
            return None
        path.insert(0, onward.pop())
    return path


def _is_closed(topology: Topology, path: list[str]) -> bool:
    """Whether no capacitor leads from the path (its start left out) to a net that is neither on it nor fixed."""
    inside = set(path)
    return all(
        branch.other(net) in inside or topology.is_fixed(branch.other(net))
        for net in path[1:]
        for branch in topology.on(net)
        if branch.kind == "capacitor"
    )


def _leads(start: Side, end: Side, start_has_shunt: bool) -> bool:
    """Whether the signal can only go from `start` to `end`.

    A capacitor at the far side alone tells the direction too: one straight across a source would do nothing.
    """
    if start == "driver":
        return end in ("receiver", "connector", "part")
    if start == "connector":
        return end == "receiver" or (end == "part" and not start_has_shunt)
    return start == "part" and end == "receiver" and not start_has_shunt
