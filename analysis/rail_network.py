"""The network that a rail's load sees: the rail, what feeds it, and the rails and parts that hang on it."""

from __future__ import annotations

from collections import Counter, deque
from dataclasses import dataclass, replace

from reactance.analysis.bias import Bias
from reactance.analysis.blocks import Block, make_block
from reactance.analysis.board import Board, Section
from reactance.analysis.circuit.network import Capacitor, CurrentSource, Element, Network, Parameter, VoltageSource
from reactance.analysis.elements import GROUND, node, rail_source
from reactance.analysis.parts.models import BeadModel, CapacitorModel, InductorModel, ResistorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.region import Region, TooLargeError, grow, is_supply

JOINING_RESISTANCE = 10.0  # ohm: up to this a resistor between rails makes them one supply (common practice)
CUTOFFS = (float("inf"), 1e4, 1e3, 1e2)  # ohm: what hangs on the rail behind more is left out of a large network
MOST_OTHERS = 40  # parts besides capacitors from the rails to ground before a cutoff applies
MOST_FREE = 8  # uncertain attributes up to which each part is varied on its own
LOAD = "load"


@dataclass(frozen=True)
class RailNetwork:
    """The block of one rail, the rails in it, and whether anything in it feeds the rail at DC."""

    block: Block
    rails: tuple[str, ...]
    fed: bool
    region: Region


def joined_rails(board: Board, net: str) -> tuple[str, ...]:
    """Rails that beads, inductors and small resistors make one supply with `net`, itself first."""
    seen = {net}
    rails = [net]
    queue = deque([net])
    while queue:
        here = queue.popleft()
        for section in board.sections_by_net.get(here, ()):
            other = section.b if section.a == here else section.a
            if other in seen or board.is_ground(other) or not _joins(section):
                continue
            seen.add(other)
            queue.append(other)
            if is_supply(board, other):
                rails.append(other)
    return tuple(rails)


def _joins(section: Section) -> bool:
    model = section.model
    if isinstance(model, BeadModel | InductorModel):
        return True
    return isinstance(model, ResistorModel) and model.value is not None and model.value <= JOINING_RESISTANCE


def rail_network(board: Board, bias: Bias, net: str) -> RailNetwork:
    """The network seen from `net` with a load current source named `load` from it to ground.

    Raises `TooLargeError` where even the coarsest cutoff leaves too many parts.
    """
    rails = joined_rails(board, net)
    sources = {rail: table.source for rail in rails if (table := board.rail_tables.get(rail)) and table.source}
    free = set(rails) if sources else {net}
    notes: list[str] = []
    region = _region(board, net, free, notes)
    extra: list[Element] = [CurrentSource(LOAD, node(board, net), GROUND, 0.0)]
    for rail, source in sources.items():
        extra.append(rail_source(rail, board.volts(rail) or 0.0, float(source.resistance), float(source.inductance)))
    for rail in rails:
        if rail in region.edges:
            notes.append(f"{rail} has no stated source and counts as stiff")
    block = make_block(board, bias, region, extra=tuple(extra), free_rails=free)
    block = merge_equal(block)
    block = replace(block, notes=block.notes + tuple(notes))
    fed = bool(sources) or any(isinstance(e, VoltageSource) for e in block.network.elements)
    return RailNetwork(block, rails, fed, region)


def _region(board: Board, net: str, free: set[str], notes: list[str]) -> Region:
    def held(other: str) -> bool:
        return other not in free and is_supply(board, other)

    for cutoff in CUTOFFS:

        def through(section: Section, most: float = cutoff) -> bool:
            value = section.model.value
            return not (isinstance(section.model, ResistorModel) and value is not None and value >= most)

        try:
            region = grow(board, (net,), held, through)
        except TooLargeError:
            if cutoff == CUTOFFS[-1]:
                raise
            continue
        if cutoff == CUTOFFS[-1] or _others(board, region, free) <= MOST_OTHERS:
            if cutoff != CUTOFFS[0]:
                what = format_quantity(cutoff, "ohm")
                notes.append(f"what hangs on {net} behind {what} or more is left out")
            return region
    raise AssertionError("the last cutoff returns or raises")


def _others(board: Board, region: Region, free: set[str]) -> int:
    def plain(section: Section) -> bool:
        ends = {section.a, section.b}
        to_ground = any(board.is_ground(end) for end in ends)
        return isinstance(section.model, CapacitorModel) and to_ground and bool(ends & free)

    return sum(not plain(section) for section in region.sections)


def merge_equal(block: Block) -> Block:
    """Make one capacitor of n equal ones in parallel, where more than `MOST_FREE` attributes are uncertain.

    n equal series R-L-C branches in parallel are one branch with R/n, L/n and n·C. Their ranges are then taken
    together: what pulls all of them down is what makes a rail worst.
    """
    if len(block.parameters) <= MOST_FREE:
        return block
    ranges = {parameter.name: parameter for parameter in block.parameters if parameter.attribute == "capacitance"}

    def kind(element: Capacitor) -> tuple[object, ...]:
        band = ranges.get(element.name)
        ends = sorted((element.a, element.b))
        spread = (band.low, band.high) if band else None
        return (*ends, element.capacitance, element.esr, element.esl, element.loss_tangent, element.leakage, spread)

    counts = Counter(kind(e) for e in block.network.elements if isinstance(e, Capacitor))
    made: list[Element] = []
    parameters = [p for p in block.parameters if p.attribute != "capacitance"]
    seen: set[tuple[object, ...]] = set()
    for element in block.network.elements:
        if not isinstance(element, Capacitor):
            made.append(element)
            continue
        key = kind(element)
        if key in seen:
            continue
        seen.add(key)
        n = counts[key]
        name = element.name if n == 1 else f"{element.name}×{n}"
        made.append(_times(element, n, name))
        band = ranges.get(element.name)
        if band is not None:
            parameters.append(Parameter(name, "capacitance", band.nominal * n, band.low * n, band.high * n))
    return replace(block, network=Network(tuple(made), block.network.ground), parameters=tuple(parameters))


def _times(element: Capacitor, n: int, name: str) -> Capacitor:
    return replace(
        element,
        name=name,
        capacitance=element.capacitance * n,
        esr=element.esr / n,
        esl=element.esl / n,
        leakage=element.leakage / n,
    )
