"""The checks of every rail: its network solved, or taken from what is known, and judged."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board
from reactance.analysis.checks import judge
from reactance.analysis.circuit.network import CircuitError
from reactance.analysis.elements import node
from reactance.analysis.likeness import block_likeness
from reactance.analysis.measures import find_measure
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.rail_network import RailNetwork, rail_network
from reactance.analysis.rails import Demand, bypass, demand, limits, measured, rail_capacitance, solve_rail
from reactance.analysis.region import TooLargeError
from reactance.analysis.report import Check, Limit
from reactance.analysis.reuse import Results, Solved
from reactance.analysis.values import unknown


@dataclass(frozen=True)
class RailStudy:
    """One rail: what is asked of it, its network (None where it could not be cut out), its checks."""

    net: str
    asked: Demand
    network: RailNetwork | None
    checks: tuple[Check, ...]


def rails_to_study(board: Board) -> tuple[str, ...]:
    """Every rail that the brief names or that has a capacitor."""
    return tuple(
        net
        for net, entry in board.nets.items()
        if entry.kind == "rail" and (net in board.rail_tables or _has_capacitor(board, net))
    )


def study_rails(board: Board, bias: Bias, solved: Solved, nets: Iterable[str]) -> Iterable[RailStudy]:
    """Solve and judge each rail of `nets`."""
    for net in nets:
        yield _study_rail(board, bias, solved, net)


def _has_capacitor(board: Board, net: str) -> bool:
    return any(isinstance(section.model, CapacitorModel) for section in board.sections_by_net.get(net, ()))


def _study_rail(board: Board, bias: Bias, solved: Solved, net: str) -> RailStudy:
    table = board.rail_tables.get(net)
    asked = demand(table, board.volts(net)) if table else Demand(None, None, None, None, None)
    network: RailNetwork | None = None
    results: Results = {}
    if measured(asked):
        try:
            cut = network = rail_network(board, bias, net)
            key, names = block_likeness(cut.block, [node(board, net)], "rail", cut.fed, asked)
            results = names.back(solved.get(key, lambda: names.without(solve_rail(board, net, cut, asked))))
        except (TooLargeError, CircuitError) as problem:
            results = {name: unknown(find_measure("rail", name).unit, str(problem)) for name in measured(asked)}
    bounds = limits(asked)
    checks = [
        judge(f"rail:{net}:{name}", "rail", name, value, bounds.get(name)) for name, value in results.items()
    ]
    checks.append(judge(f"rail:{net}:capacitance", "rail", "capacitance", rail_capacitance(board, bias, net), None))
    per_pin = bypass(board, net)
    if per_pin is not None:
        limit = Limit(min=table.bypass) if table and table.bypass is not None else None
        checks.append(judge(f"rail:{net}:bypass", "rail", "bypass", per_pin, limit))
    return RailStudy(net, asked, network, tuple(checks))
