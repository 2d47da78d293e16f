"""The board at rest: the DC potential of every net, and whether a net has a DC path to a defined potential.

Capacitors are open but for their leakage, inductors and beads have their DC resistance, rails with a known
voltage and driving pins are sources, pins that nobody described are open.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from reactance.analysis.board import Board, Section
from reactance.analysis.circuit.network import CircuitError, Element, Network, Resistor
from reactance.analysis.circuit.operating_point import operating_point
from reactance.analysis.design import Problem
from reactance.analysis.elements import (
    GROUND,
    across,
    amplifier_element,
    node,
    pin_elements,
    placed,
    rail_source,
)
from reactance.analysis.parts.models import BeadModel, CapacitorModel, InductorModel


@dataclass(frozen=True)
class Bias:
    """DC potentials in volts by merged net: with rails at nominal, and with rails at their upper tolerance.

    None where a potential is not defined. `currents` holds the DC current through inductors and beads.
    `returns` maps the nets that a capacitor touches to the reason why they have a DC path, or None.
    """

    volts: Mapping[str, float | None]
    upper: Mapping[str, float | None]
    currents: Mapping[str, float]
    returns: Mapping[str, str | None]
    problems: tuple[Problem, ...]

    def across(self, section: Section) -> float | None:
        """The DC voltage V(a) − V(b) of a section, or None."""
        return across(self.volts, section)


def solve_bias(board: Board) -> Bias:
    """Solve the board's operating point, with rails at nominal and at their upper tolerance."""
    try:
        nominal, currents = _solve(board, upper=False)
        upper = nominal if not _has_tolerance(board) else _solve(board, upper=True)[0]
        problems: tuple[Problem, ...] = ()
    except CircuitError as problem:
        known = {net: board.volts(net) for net in board.nets}
        nominal, upper, currents = known, known, {}
        problems = (Problem("caution", "operating point", f"{problem}; only rails and ground are known"),)
    return Bias(
        MappingProxyType(nominal),
        MappingProxyType(upper),
        MappingProxyType(currents),
        MappingProxyType(_returns(board)),
        problems,
    )


def _has_tolerance(board: Board) -> bool:
    return any(rail.tolerance for rail in board.rail_tables.values())


def _rail_volts(board: Board, net: str, upper: bool) -> float | None:
    volts = board.volts(net)
    table = board.rail_tables.get(net)
    return volts if volts is None or not upper or table is None else volts * (1 + table.tolerance)


def dc_elements(board: Board, *, upper: bool = False) -> tuple[Element, ...]:
    """The elements of the whole board that carry DC."""
    held = {net for net in board.nets if board.volts(net) is not None}
    made: list[Element] = [
        rail_source(net, volts)
        for net in board.nets
        if not board.is_ground(net) and (volts := _rail_volts(board, net, upper)) is not None
    ]
    for section in board.sections:
        if (section.a in held and section.b in held) or section.a == section.b:
            continue
        if isinstance(section.model, CapacitorModel):
            leakage = section.model.leakage_resistance
            if leakage != float("inf"):
                made.append(Resistor(section.name, node(board, section.a), node(board, section.b), leakage))
            continue
        item = placed(board, section, None)
        if item is not None:
            made.append(item.element)
    for pin in board.pins:
        drive = pin.net not in held
        made += [e for e in pin_elements(board, pin, drive=drive) if not e.name.endswith(" capacitance")]
    made += [amplifier_element(board, amplifier) for amplifier in board.amplifiers]
    return tuple(made)


def _solve(board: Board, *, upper: bool) -> tuple[dict[str, float | None], dict[str, float]]:
    elements = dc_elements(board, upper=upper)
    point = operating_point(Network(elements, GROUND))
    floating = set(point.floating)
    volts: dict[str, float | None] = {}
    for net in board.nets:
        fixed = _rail_volts(board, net, upper)
        solved = None if net in floating else point.voltages.get(net)
        volts[net] = fixed if fixed is not None else solved
    currents = {
        section.name: point.currents.get(section.name, 0.0)
        for section in board.sections
        if isinstance(section.model, InductorModel | BeadModel)
    }
    return volts, currents


def _returns(board: Board) -> dict[str, str | None]:
    """Why each net that a capacitor touches has a DC path to a defined potential; None where it has none."""
    reason: dict[str, str] = {}
    for net, why in _defined(board):
        reason.setdefault(net, why)
    ends: dict[str, list[tuple[str, str]]] = {}
    for pin in board.pins:
        if pin.toward is not None and pin.table.drives is None and pin.table.resistance is not None:
            what = f"the input resistance of {pin.at}"
            ends.setdefault(pin.toward, []).append((pin.net, what))
            ends.setdefault(pin.net, []).append((pin.toward, what))
    queue = deque(reason)
    while queue:
        net = queue.popleft()
        onward = [
            (section.b if section.a == net else section.a, section.refdes)
            for section in board.sections_by_net.get(net, ())
            if not isinstance(section.model, CapacitorModel)
        ]
        for other, what in (*onward, *ends.get(net, ())):
            if other not in reason:
                reason[other] = f"through {what} to {net}"
                queue.append(other)
    touched = {net for section in board.capacitors() for net in (section.a, section.b)}
    return {net: reason.get(net) for net in board.nets if net in touched}


def _defined(board: Board) -> Iterator[tuple[str, str]]:
    """Nets whose potential something defines directly, and what does."""
    for net, entry in board.nets.items():
        if entry.kind != "signal":
            yield net, f"is {'a ground' if entry.kind == 'ground' else 'a supply rail'}"
    for pin in board.pins:
        if pin.table.drives is not None:
            yield pin.net, f"driven by {pin.at}"
        elif pin.table.resistance is not None and pin.toward is None:
            yield pin.net, f"through the input resistance of {pin.at}"
    for amplifier in board.amplifiers:
        yield amplifier.out, f"driven by {amplifier.name}"
    for net, terminals in board.terminals_by_net.items():
        for part, terminal in terminals:
            if terminal.direction == "output":
                yield net, f"driven by the output {part.refdes}.{terminal.number}"
