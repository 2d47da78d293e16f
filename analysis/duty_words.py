"""Reasons in words: short lists of parts and what holds a net."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from reactance.analysis.topology import Branch, Topology

_NAMED = 3


def listing(names: Iterable[str]) -> str:
    """`R1`, `R1 and R2`, `R1, R2, R3 and 4 more`; each name once."""
    each = list(dict.fromkeys(names))
    if len(each) <= _NAMED:
        return " and ".join(filter(None, (", ".join(each[:-1]), *each[-1:])))
    return f"{', '.join(each[:_NAMED])} and {len(each) - _NAMED} more"


def what_holds(topology: Topology, net: str) -> str:
    """What gives a signal net its DC potential, or else what is on it."""
    holding = topology.holding(net)
    if holding:
        return listing(f"{branch.refdes} to {branch.other(net)}" for branch in holding)
    amplifiers = topology.amplifiers_by_net.get(net, ())
    if amplifiers:
        return f"an amplifier's {'output' if any(out == net for _, _, out in amplifiers) else 'input'}"
    onward = topology.series(net)
    if onward:
        return listing(f"{branch.refdes} from {branch.other(net)}" for branch in onward)
    pins = topology.pins(net)
    return listing(pin.label for pin in pins) if pins else "nothing else on it"


def series_words(topology: Topology, net: str, onward: Sequence[Branch]) -> str:
    """`R1 from SENSE_RAW`, for each of the branches that lead on from `net`."""
    return listing(f"{branch.refdes} from {branch.other(net)}" for branch in onward)
