"""Duties that the pins at a capacitor tell: feedback, compensation, crystal load, timing, supply pins."""

from __future__ import annotations

from reactance.analysis import pin_roles
from reactance.analysis.duty_view import Found, View
from reactance.analysis.duty_words import listing
from reactance.analysis.topology import Branch, Terminal, Topology


def converter_pins(capacitor: Branch, view: View) -> Found | None:
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


def feedback(capacitor: Branch, view: View) -> Found | None:
    return (
        _around_amplifier(capacitor, view)
        or _around_part(capacitor, view)
        or _into_own_input(capacitor, view)
        or _gain_leg(capacitor, view)
        or _feed_forward(capacitor, view)
    )


def _around_amplifier(capacitor: Branch, view: View) -> Found | None:
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


def _around_part(capacitor: Branch, view: View) -> Found | None:
    """Between output and inverting input of a part that the brief does not describe."""
    topology = view.topology
    near, far = (capacitor.b, capacitor.a) if topology.is_fixed(capacitor.a) else (capacitor.a, capacitor.b)
    beside = [branch for branch in topology.on(near) if branch.other(near) == far and branch.kind == "resistor"]
    for one, other in topology.shared_parts(near, far):
        if one.prefix in pin_roles.CONNECTORS | pin_roles.PROBES or pin_roles.are_a_pair(one.name, other.name):
            continue
        ends = {pin_roles.role(one), pin_roles.role(other)}
        inverting = pin_roles.is_inverting(one) or pin_roles.is_inverting(other)
        if beside and ends in ({"driver", "receiver"}, {"part"}, {"driver", "part"}):
            with_it = f"with {beside[0].refdes} in parallel"
            return Found("feedback", f"from {one.label} to {other.label}, {with_it}")
        if ends == {"driver", "receiver"} and inverting and _of_one_amplifier(one, other, topology):
            return Found("feedback", f"from output to inverting input: {one.label}, {other.label}")
    return None


def _of_one_amplifier(one: Terminal, other: Terminal, topology: Topology) -> bool:
    return _has_one_output(one, topology) or "" != pin_roles.channel(one) == pin_roles.channel(other)


def _gain_leg(capacitor: Branch, view: View) -> Found | None:
    """In series with a resistor, in either order, from an inverting input to ground or a rail."""
    topology = view.topology
    for middle, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(middle) or topology.pins(middle) or len(topology.on(middle)) != 2:
            continue
        others = [branch for branch in topology.on(middle) if branch is not capacitor]
        if [branch.kind for branch in others] != ["resistor"]:
            continue
        onward = others[0].other(middle)
        for inverting, end in ((onward, far), (far, onward)):
            if topology.is_fixed(end) and _is_inverting_input(inverting, topology):
                with_it = f"with {others[0].refdes} from the inverting input {inverting} to {end}"
                return Found("feedback", f"{with_it}: it sets the gain at low frequencies")
    return None


def _is_inverting_input(net: str, topology: Topology) -> bool:
    if topology.is_fixed(net):
        return False
    described = any(net == minus for _, minus, _ in topology.amplifiers_by_net.get(net, ()))
    return described or any(pin.prefix == "U" and pin_roles.is_inverting(pin) for pin in topology.pins(net))


def _into_own_input(capacitor: Branch, view: View) -> Found | None:
    """From an output over a resistor to an input of the same amplifier, as in an active filter with one amplifier."""
    topology = view.topology
    for near, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(near) or topology.is_fixed(far):
            continue
        outputs = [pin for pin in topology.pins(near) if pin.prefix == "U" and pin_roles.role(pin) == "driver"]
        for branch in topology.series(far) if outputs else ():
            for pin in topology.pins(branch.other(far)):
                for output in outputs:
                    if branch.other(far) != near and _is_input_of(pin, output, topology):
                        over = f"over {branch.refdes} to {pin.label}"
                        return Found("feedback", f"from {output.label} {over}, an input of the same amplifier")
    return None


def _is_input_of(pin: Terminal, output: Terminal, topology: Topology) -> bool:
    if pin.refdes != output.refdes or pin_roles.role(pin) != "receiver":
        return False
    channels = pin_roles.channel(pin), pin_roles.channel(output)
    return channels[0] == channels[1] and (bool(channels[0]) or _has_one_output(output, topology))


def _has_one_output(terminal: Terminal, topology: Topology) -> bool:
    pins = topology.terminals_by_part[terminal.refdes]
    return sum(pin_roles.role(pin) == "driver" for pin in pins) == 1


def _feed_forward(capacitor: Branch, view: View) -> Found | None:
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        pin = pin_named(view.topology, net, pin_roles.FEEDBACK_PINS)
        if pin is not None and not view.topology.is_ground(far):
            return Found("feedback", f"from {far} into the feedback pin {pin.label}")
    return None


def compensation(capacitor: Branch, view: View) -> Found | None:
    topology = view.topology
    for net in (capacitor.a, capacitor.b):
        if topology.is_fixed(net):
            continue
        pin = pin_named(topology, net, pin_roles.COMPENSATION_PINS)
        if pin is not None:
            return Found("feedback", f"it compensates the loop at {pin.label}")
        for branch in topology.series(net):
            pin = pin_named(topology, branch.other(net), pin_roles.COMPENSATION_PINS)
            if pin is not None and not topology.pins(net):
                return Found("feedback", f"with {branch.refdes} it compensates the loop at {pin.label}")
    return None


def crystal_load(capacitor: Branch, view: View) -> Found | None:
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


def timing(capacitor: Branch, view: View) -> Found | None:
    topology = view.topology
    for net, far in ((capacitor.a, capacitor.b), (capacitor.b, capacitor.a)):
        if topology.is_fixed(net):
            continue
        pin = pin_named(topology, net, pin_roles.TIMING_PINS)
        if pin is not None and (topology.is_fixed(far) or pin_named(topology, far, pin_roles.TIMING_PINS)):
            return Found("timing", f"from {pin.label} to {far}{_charged(net, topology)}")
        if not topology.is_fixed(far):
            continue
        if pin_roles.words(net) & pin_roles.TIMING_WORDS and (topology.pins(net) or topology.holding(net)):
            return Found("timing", f"from {net}, named as a timed net, to {far}{_charged(net, topology)}")
        pin = pin_named(topology, net, pin_roles.ENABLE_PINS)
        if pin is not None and (topology.holding(net) or topology.series(net)):
            return Found("timing", f"it delays {pin.label}{_charged(net, topology)}")
    return None


def _charged(net: str, topology: Topology) -> str:
    feeding = [b for b in topology.on(net) if b.kind == "resistor" and not topology.is_ground(b.other(net))]
    return f", charged over {listing(b.refdes for b in feeding)}" if feeding else ""


def held_pin(capacitor: Branch, view: View) -> Found | None:
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


def pin_named(topology: Topology, net: str, table: frozenset[str]) -> Terminal | None:
    if topology.is_fixed(net):
        return None
    return next((pin for pin in topology.pins(net) if pin_roles.is_named(pin, table)), None)
