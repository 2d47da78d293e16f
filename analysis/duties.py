"""What each capacitor is there for, and because of what.

The rules stand in one table, tried in order; the first that applies decides. Each looks at the capacitor's two nets
and their neighbourhood alone, so that the work grows with the number of parts. The rules are common practice; what
they do not settle stays `unassigned` with the reason, and the brief overrules everything.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType
from typing import Literal

from reactance.analysis import pin_roles
from reactance.analysis.duty_words import listing, series_words, what_holds
from reactance.analysis.report import DutyKind
from reactance.analysis.topology import Branch, Terminal, Topology, nets_between

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
class Assigned:
    """One capacitor's duty and the reason in words.

    Capacitors that do one job share its `id`: `rail:NET` on one rail, `coupling:NAME` or `filter:NAME` in one path of
    the brief; else it is `duty:REFDES`.
    """

    refdes: str
    kind: DutyKind
    because: str
    id: str


@dataclass(frozen=True, slots=True)
class Found:
    """What a rule says about a capacitor; `id` where it shares its duty with others."""

    kind: DutyKind
    because: str
    id: str = ""


@dataclass(frozen=True)
class _View:
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


def duties(
    topology: Topology, briefed: Sequence[BriefedPath] = (), overrules: Mapping[str, DutyKind] | None = None
) -> tuple[Assigned, ...]:
    """The duty of each capacitor of `topology`, in the order of its branches.

    `overrules`: duty by refdes, from the brief.
    """
    view = _View(topology, tuple(briefed), overrules or {})
    return tuple(_assign(branch, view) for branch in topology.branches if branch.kind == "capacitor")


def _assign(capacitor: Branch, view: _View) -> Assigned:
    found = next(found for rule in RULES if (found := rule(capacitor, view)) is not None)
    return Assigned(capacitor.refdes, found.kind, found.because, found.id or f"duty:{capacitor.refdes}")


def _overruled(capacitor: Branch, view: _View) -> Found | None:
    refdes = capacitor.refdes
    kind = view.overrules.get(refdes) or view.overrules.get(refdes.partition(":")[0])
    return Found(kind, "the brief says so") if kind else None


def _short(capacitor: Branch, view: _View) -> Found | None:
    if capacitor.a == capacitor.b:
        return Found("unassigned", f"both its ends are on {capacitor.a}")
    return None


def _supply(capacitor: Branch, view: _View) -> Found | None:
    a, b, topology = capacitor.a, capacitor.b, view.topology
    if not (topology.is_fixed(a) and topology.is_fixed(b)):
        return None
    if topology.is_ground(a) and topology.is_ground(b):
        return Found("unassigned", f"it bridges two grounds, {a} and {b}")
    if topology.is_ground(a) or topology.is_ground(b):
        rail, ground = (b, a) if topology.is_ground(a) else (a, b)
        return Found("decoupling", f"from rail {rail} to ground {ground}", f"rail:{rail}")
    return Found("decoupling", f"between the rails {a} and {b}")


def _in_briefed_path(capacitor: Branch, view: _View) -> Found | None:
    for table in (view.paths_by_net, view.stubs_by_net):
        for path in table.get(capacitor.a, ()) + table.get(capacitor.b, ()):
            where = f"{path.kind} {path.name!r} of the brief, from {path.from_net} to {path.to_net}"
            if path.kind == "coupling" and _passes(capacitor, path, view):
                return Found("coupling", f"in series in the {where}", f"coupling:{path.name}")
            if path.kind == "filter" and _shapes(capacitor, path, view):
                return Found("filter", f"in the {where}{_with(capacitor, view)}", f"filter:{path.name}")
    return None


def _with(capacitor: Branch, view: _View) -> str:
    """The resistors and inductors next to the capacitor, in words."""
    ends = [net for net in (capacitor.a, capacitor.b) if not view.topology.is_fixed(net)]
    beside = [branch.refdes for net in ends for branch in view.topology.on(net) if branch.kind != "capacitor"]
    return f", with {listing(beside)}" if beside else ""


def _passes(capacitor: Branch, path: BriefedPath, view: _View) -> bool:
    """Whether the capacitor blocks DC on the way of a briefed coupling."""
    a, b, topology = capacitor.a, capacitor.b, view.topology
    both = path in view.paths_by_net.get(a, ()) and path in view.paths_by_net.get(b, ())
    across_amplifier = any({a, b} <= set(pins) for pins in topology.amplifiers_by_net.get(a, ()))
    return both and not across_amplifier and not topology.joined_by_dc(a, b)


def _shapes(capacitor: Branch, path: BriefedPath, view: _View) -> bool:
    """Whether both ends lie in a briefed filter, or one does and the other is held by a supply or an amplifier."""
    for net in (capacitor.a, capacitor.b):
        inside = path in view.paths_by_net.get(net, ()) or path in view.stubs_by_net.get(net, ())
        if not inside and not view.topology.is_fixed(net):
            return False
    return True


def _converter_pins(capacitor: Branch, view: _View) -> Found | None:
    """Flying and bootstrap capacitors: between two pins of one part."""
    for one, other in view.topology.shared_parts(capacitor.a, capacitor.b):
        if pin_roles.is_flying(one) and pin_roles.is_flying(other):
            return Found("unassigned", f"it carries charge between {one.label} and {other.label} of a charge pump")
        for boost, switch in ((one, other), (other, one)):
            if pin_roles.is_named(boost, pin_roles.BOOTSTRAP_PINS) and not pin_roles.is_named(
                switch, pin_roles.BOOTSTRAP_PINS
            ):
                return Found("decoupling", f"it holds the floating supply at {boost.label} against {switch.label}")
    return None


def _feedback(capacitor: Branch, view: _View) -> Found | None:
    return _around_amplifier(capacitor, view) or _around_part(capacitor, view) or _feed_forward(capacitor, view)


def _around_amplifier(capacitor: Branch, view: _View) -> Found | None:
    topology = view.topology
    for out, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        for plus, minus, output in topology.amplifiers_by_net.get(out, ()):
            if output != out or topology.is_fixed(far):
                continue
            if far == minus:
                return Found("feedback", f"from the amplifier's output {out} to its inverting input {minus}")
            reached = next((b for b in topology.series(far) if b.other(far) in (plus, minus)), None)
            if reached is not None and reached.other(far) != out:
                target = reached.other(far)
                return Found(
                    "feedback", f"from the amplifier's output {out} over {reached.refdes} to its input {target}"
                )
    for near, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        for _, minus, output in topology.amplifiers_by_net.get(near, ()):
            over = next((b for b in topology.series(far) if b.other(far) == output), None) if near == minus else None
            if over is not None and output != near:
                return Found(
                    "feedback", f"from the amplifier's output {output} over {over.refdes} to its input {minus}"
                )
    return None


def _around_part(capacitor: Branch, view: _View) -> Found | None:
    """Between output and inverting input of a part that the brief does not describe."""
    topology = view.topology
    beside = [b for b in topology.series(capacitor.a) if b.other(capacitor.a) == capacitor.b and b.kind == "resistor"]
    for one, other in topology.shared_parts(capacitor.a, capacitor.b):
        if one.prefix in pin_roles.CONNECTORS | pin_roles.PROBES or pin_roles.are_a_pair(one.name, other.name):
            continue
        ends = {pin_roles.role(one), pin_roles.role(other)}
        inverting = pin_roles.is_inverting(one) or pin_roles.is_inverting(other)
        if beside and ends in ({"driver", "receiver"}, {"part"}, {"driver", "part"}):
            with_it = f"with {beside[0].refdes} in parallel"
            return Found("feedback", f"from {one.label} to {other.label}, {with_it}")
        if ends == {"driver", "receiver"} and inverting and _has_one_output(one, topology):
            return Found("feedback", f"from output to inverting input: {one.label}, {other.label}")
    return None


def _has_one_output(terminal: Terminal, topology: Topology) -> bool:
    pins = topology.terminals_by_part[terminal.refdes]
    return sum(pin_roles.role(pin) == "driver" for pin in pins) == 1


def _feed_forward(capacitor: Branch, view: _View) -> Found | None:
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        pin = _pin_named(view.topology, net, pin_roles.FEEDBACK_PINS)
        if pin is not None and not view.topology.is_ground(far):
            return Found("feedback", f"from {far} into the feedback pin {pin.label}")
    return None


def _pin_named(topology: Topology, net: str, table: frozenset[str]) -> Terminal | None:
    if topology.is_fixed(net):
        return None
    return next((pin for pin in topology.pins(net) if pin_roles.is_named(pin, table)), None)


def _compensation(capacitor: Branch, view: _View) -> Found | None:
    topology = view.topology
    for net in (capacitor.a, capacitor.b):
        if topology.is_fixed(net):
            continue
        pin = _pin_named(topology, net, pin_roles.COMPENSATION_PINS)
        if pin is not None:
            return Found("feedback", f"it compensates the loop at {pin.label}")
        for branch in topology.series(net):
            pin = _pin_named(topology, branch.other(net), pin_roles.COMPENSATION_PINS)
            if pin is not None and not topology.pins(net):
                return Found("feedback", f"with {branch.refdes} it compensates the loop at {pin.label}")
    return None


def _crystal_load(capacitor: Branch, view: _View) -> Found | None:
    topology = view.topology
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(net) or not topology.is_fixed(far):
            continue
        for pin in topology.pins(net):
            if pin.prefix in pin_roles.CRYSTALS and _is_crystal(pin, topology):
                return Found("load", f"from {pin.label} of the crystal to {far}")
    return None


def _is_crystal(pin: Terminal, topology: Topology) -> bool:
    """Two to four pins, none on a rail: an oscillator with a supply needs no load capacitor."""
    pins = topology.terminals_by_part[pin.refdes]
    signals = {other.net for other in pins if not topology.is_fixed(other.net)}
    on_rail = any(topology.is_fixed(other.net) and not topology.is_ground(other.net) for other in pins)
    sure = pin.prefix in {"Y", "XTAL"} or all(_has_capacitor_to_ground(net, topology) for net in signals)
    return len(pins) <= 4 and len(signals) == 2 and not on_rail and sure


def _has_capacitor_to_ground(net: str, topology: Topology) -> bool:
    return any(b.kind == "capacitor" and topology.is_ground(b.other(net)) for b in topology.on(net))


def _timing(capacitor: Branch, view: _View) -> Found | None:
    topology = view.topology
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(net):
            continue
        pin = _pin_named(topology, net, pin_roles.TIMING_PINS)
        if pin is not None and (topology.is_fixed(far) or _pin_named(topology, far, pin_roles.TIMING_PINS)):
            return Found("timing", f"from {pin.label} to {far}{_charged(net, topology)}")
        if not topology.is_fixed(far):
            continue
        if pin_roles.words(net) & pin_roles.TIMING_WORDS and (topology.pins(net) or topology.holding(net)):
            return Found("timing", f"from {net}, named as a timed net, to {far}{_charged(net, topology)}")
        pin = _pin_named(topology, net, pin_roles.ENABLE_PINS)
        if pin is not None and (topology.holding(net) or topology.series(net)):
            return Found("timing", f"it delays {pin.label}{_charged(net, topology)}")
    return None


def _charged(net: str, topology: Topology) -> str:
    feeding = [b for b in topology.on(net) if b.kind == "resistor" and not topology.is_ground(b.other(net))]
    return f", charged over {listing(b.refdes for b in feeding)}" if feeding else ""


def _snubber(capacitor: Branch, view: _View) -> Found | None:
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
    for one, other in topology.shared_parts(signal, far) if len(topology.pins(far)) < _MANY else ():
        if one.prefix in pin_roles.SWITCHED_LOADS and one.number != other.number:
            return one.refdes
    return _switch_node(start, topology) or _switch_node(end, topology)


_MANY = 200  # a net with more pins is a supply; which parts bridge it and a signal is found from the signal


def _switch_node(net: str, topology: Topology) -> str:
    if topology.is_fixed(net):
        return ""
    if pin_roles.words(net) & pin_roles.SWITCH_WORDS and not topology.holding(net):
        return f"the switch node {net}"
    pin = _pin_named(topology, net, pin_roles.SWITCH_WORDS)
    return f"the switch node at {pin.label}" if pin else ""


def _held_pin(capacitor: Branch, view: _View) -> Found | None:
    topology = view.topology
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(net) or not topology.is_ground(far):
            continue
        for pin in topology.pins(net):
            if pin_roles.is_supply(pin) or _is_regulator_port(pin, topology):
                return Found("decoupling", f"it holds the supply pin {pin.label} against {far}")
    return None


def _is_regulator_port(pin: Terminal, topology: Topology) -> bool:
    if pin.prefix != "U" or pin_roles.plain(pin.name) not in {"VIN", "PVIN", "AVIN", "IN", "VOUT", "OUT"}:
        return False
    names = {pin_roles.plain(other.name) for other in topology.terminals_by_part[pin.refdes]}
    return bool(names & pin_roles.REGULATOR_PINS) and bool(names & {"VIN", "PVIN", "IN"})


def _between_signals(capacitor: Branch, view: _View) -> Found | None:
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


def _low_pass(capacitor: Branch, view: _View) -> Found | None:
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


def _unsettled(capacitor: Branch, view: _View) -> Found:
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


Rule = Callable[[Branch, _View], Found | None]

RULES: tuple[Rule, ...] = (
    _overruled,
    _short,
    _supply,
    _in_briefed_path,
    _converter_pins,
    _feedback,
    _crystal_load,
    _compensation,
    _timing,
    _snubber,
    _held_pin,
    _between_signals,
    _low_pass,
    _unsettled,
)
