"""Duties that the network around a capacitor tells: supplies, paths of the brief, snubbers, couplings, filters."""

from __future__ import annotations

from reactance.analysis import pin_roles
from reactance.analysis.duty_of_pins import pin_named
from reactance.analysis.duty_view import BriefedPath, Found, View
from reactance.analysis.duty_words import listing, series_words, what_holds
from reactance.analysis.topology import Branch, Topology


def overruled(capacitor: Branch, view: View) -> Found | None:
    refdes = capacitor.refdes
    kind = view.overrules.get(refdes) or view.overrules.get(refdes.partition(":")[0])
    return Found(kind, "the brief says so") if kind else None


def short(capacitor: Branch, view: View) -> Found | None:
    if capacitor.a == capacitor.b:
        return Found("unassigned", f"both its ends are on {capacitor.a}")
    return None


def supply(capacitor: Branch, view: View) -> Found | None:
    a, b, topology = capacitor.a, capacitor.b, view.topology
    if not (topology.is_fixed(a) and topology.is_fixed(b)):
        return None
    if topology.is_ground(a) and topology.is_ground(b):
        return Found("unassigned", f"it bridges two grounds, {a} and {b}")
    if topology.is_ground(a) or topology.is_ground(b):
        rail, ground = (b, a) if topology.is_ground(a) else (a, b)
        return Found("decoupling", f"from rail {rail} to ground {ground}", f"rail:{rail}")
    return Found("decoupling", f"between the rails {a} and {b}")


def in_briefed_path(capacitor: Branch, view: View) -> Found | None:
    for table in (view.paths_by_net, view.stubs_by_net):
        for path in table.get(capacitor.a, ()) + table.get(capacitor.b, ()):
            where = f"{path.kind} {path.name!r} of the brief, from {path.from_net} to {path.to_net}"
            if path.kind == "coupling" and _passes(capacitor, path, view):
                return Found("coupling", f"in series in the {where}{_with(capacitor, view)}", f"coupling:{path.name}")
            if path.kind == "filter" and _shapes(capacitor, path, view):
                return Found("filter", f"in the {where}{_with(capacitor, view)}", f"filter:{path.name}")
    return None


def _with(capacitor: Branch, view: View) -> str:
    """The resistors and inductors next to the capacitor, in words."""
    ends = [net for net in (capacitor.a, capacitor.b) if not view.topology.is_fixed(net)]
    beside = [branch.refdes for net in ends for branch in view.topology.on(net) if branch.kind != "capacitor"]
    return f", with {listing(beside)}" if beside else ""


def _passes(capacitor: Branch, path: BriefedPath, view: View) -> bool:
    """Whether the capacitor blocks DC on the way of a briefed coupling."""
    a, b, topology = capacitor.a, capacitor.b, view.topology
    both = path in view.paths_by_net.get(a, ()) and path in view.paths_by_net.get(b, ())
    across_amplifier = any({a, b} <= set(pins) for pins in topology.amplifiers_by_net.get(a, ()))
    return both and not across_amplifier and not topology.joined_by_dc(a, b)


def _shapes(capacitor: Branch, path: BriefedPath, view: View) -> bool:
    """Whether both ends lie in a briefed filter, or one does and the other is held by a supply or an amplifier."""
    for net in (capacitor.a, capacitor.b):
        inside = path in view.paths_by_net.get(net, ()) or path in view.stubs_by_net.get(net, ())
        if not inside and not view.topology.is_fixed(net):
            return False
    return True


def snubber(capacitor: Branch, view: View) -> Found | None:
    topology = view.topology
    for middle, end in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        resistor = _only_resistor(middle, capacitor, topology)
        if resistor is None:
            continue
        start = resistor.other(middle)
        if start != end and (across := _damped(start, end, topology)):
            return Found("snubber", f"in series with {resistor.refdes} from {start} to {end}, across {across}")
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(far) and not topology.is_fixed(net) and (node := _switch_node(net, topology)):
            return Found("snubber", f"from {node} to {far}")
    return None


def _only_resistor(net: str, capacitor: Branch, topology: Topology) -> Branch | None:
    """The resistor that shares `net` with the capacitor and with nothing else."""
    branches = topology.on(net)
    if topology.is_fixed(net) or len(branches) != 2 or topology.pins(net) or net in topology.amplifiers_by_net:
        return None
    other = branches[0] if branches[1] is capacitor else branches[1]
    return other if other.kind == "resistor" and other.a != other.b else None


def _damped(start: str, end: str, topology: Topology) -> str:
    """What a series RC from `start` to `end` lies across, in words; empty where it is nothing that rings."""
    if topology.is_fixed(start) and topology.is_fixed(end):
        return "" if topology.is_ground(start) and topology.is_ground(end) else "the supply"
    signal, far = (end, start) if topology.is_fixed(start) else (start, end)
    for branch in topology.on(signal):
        if branch.kind == "inductor" and branch.other(signal) == far:
            return branch.refdes
    for one, other in topology.shared_parts(signal, far):
        if one.prefix in pin_roles.SWITCHED_LOADS and one.number != other.number:
            return one.refdes
    return _switch_node(start, topology) or _switch_node(end, topology)


def _switch_node(net: str, topology: Topology) -> str:
    if topology.is_fixed(net):
        return ""
    if pin_roles.words(net) & pin_roles.SWITCH_WORDS and not topology.holding(net):
        return f"the switch node {net}"
    pin = pin_named(topology, net, pin_roles.SWITCH_WORDS)
    return f"the switch node at {pin.label}" if pin else ""


def between_signals(capacitor: Branch, view: View) -> Found | None:
    a, b, topology = capacitor.a, capacitor.b, view.topology
    if topology.is_fixed(a) or topology.is_fixed(b):
        return None
    beside = [branch for branch in topology.series(a) if branch.other(a) == b]
    if beside:
        return Found("filter", f"in parallel with {listing(x.refdes for x in beside)} from {a} to {b}")
    if topology.joined_by_dc(a, b):
        return Found("filter", f"it bridges the resistors or inductors that lead from {a} to {b}")
    if pin_roles.are_a_pair(a, b) or _across_inputs(a, b, topology):
        return Found("filter", f"across the pair {a} and {b}")
    for net in (a, b):
        if len(topology.on(net)) == 1 and not topology.pins(net) and net not in topology.amplifiers_by_net:
            return Found("unassigned", f"its net {net} leads nowhere else")
    sides = f"{a} ({what_holds(topology, a)}) and {b} ({what_holds(topology, b)})"
    return Found("coupling", f"in series between {sides}, which no resistor or inductor joins")


def _across_inputs(a: str, b: str, topology: Topology) -> bool:
    return any(
        pin_roles.are_a_pair(one.name, other.name) and pin_roles.role(one) != "driver"
        for one, other in topology.shared_parts(a, b)
    )


def low_pass(capacitor: Branch, view: View) -> Found | None:
    topology = view.topology
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(net) or not topology.is_fixed(far):
            continue
        onward = topology.series(net)
        if onward:
            return Found("filter", f"from {net} to {far} behind {series_words(topology, net, onward)}")
        from_rails = [b for b in topology.holding(net) if not topology.is_ground(b.other(net))]
        if from_rails:
            return Found("filter", f"from {net} to {far} behind {series_words(topology, net, from_rails)}")
        tank = [b for b in topology.holding(net) if b.kind == "inductor" and b.other(net) == far]
        if tank:
            return Found("filter", f"in parallel with {tank[0].refdes} from {net} to {far}")
    return None


def unsettled(capacitor: Branch, view: View) -> Found:
    topology = view.topology
    net, far = (capacitor.b, capacitor.a) if topology.is_fixed(capacitor.a) else (capacitor.a, capacitor.b)
    pins, beside = topology.pins(net), topology.holding(net)
    if not pins and not beside and len(topology.on(net)) == 1:
        return Found("unassigned", f"its net {net} leads nowhere else")
    what = f"it lies from {net} to {far}"
    if beside:
        what += f", in parallel with {listing(b.refdes for b in beside)}"
    at = f" at {listing(pin.label for pin in pins)}" if pins else ""
    return Found("unassigned", f"{what}{at}, and nothing in series with it shows what for")
