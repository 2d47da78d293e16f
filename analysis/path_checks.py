"""The checks of every coupling and filter: its networks solved, or taken from what is known, and judged."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board
from reactance.analysis.brief_tables import CouplingTable, FilterTable
from reactance.analysis.checks import judge
from reactance.analysis.circuit.network import CircuitError
from reactance.analysis.couplings import coupling_limits, coupling_names, solve_coupling
from reactance.analysis.dc import dc_band
from reactance.analysis.filters import filter_limits, solve_filter
from reactance.analysis.likeness import likeness
from reactance.analysis.measures import find_measure
from reactance.analysis.paths import PathError, SignalNetworks, SignalPath
from reactance.analysis.region import TooLargeError
from reactance.analysis.rejection import solve_rejections
from reactance.analysis.report import Check
from reactance.analysis.reuse import Results, Solved
from reactance.analysis.values import Value, banded, exactly, unknown


@dataclass(frozen=True)
class PathStudy:
    """One coupling or filter: its networks, its checks, and why it could not be solved, if it could not."""

    path: SignalPath
    networks: SignalNetworks
    checks: tuple[Check, ...]
    failure: str = ""


def study_paths(board: Board, bias: Bias, solved: Solved, paths: Iterable[SignalPath]) -> Iterable[PathStudy]:
    """Solve and judge each path."""
    for path in paths:
        networks = SignalNetworks(board, bias, path)
        failure = ""
        try:
            results = _solve(networks, solved)
        except (PathError, TooLargeError, CircuitError) as problem:
            failure = str(problem)
            results = _unsolved(path, failure)
        yield PathStudy(path, networks, tuple(_judged(board, networks, results)), failure)


def _solve(networks: SignalNetworks, solved: Solved) -> Results:
    path = networks.path
    key, names = likeness(networks)
    solver = solve_coupling if path.kind == "coupling" else solve_filter
    results = names.back(solved.get(key, lambda: names.without(solver(networks) | solve_rejections(networks))))
    if path.kind == "coupling":
        results = {"dc": _dc(networks, solved), **results}
    return results


def _dc(networks: SignalNetworks, solved: Solved) -> Value:
    board, path = networks.board, networks.path
    volts = networks.local_volts
    a, b = volts.get(path.from_net), volts.get(path.to_net)
    if a is None or b is None:
        missing = " and ".join(net for net, known in ((path.from_net, a), (path.to_net, b)) if known is None)
        return unknown("V", f"the DC potential of {missing} is not defined by what export and brief say")
    if networks.needs_level:
        return exactly(a - b, "V", f"an ideal source at 0 V stands in for what drives {path.from_net}")
    band = dc_band(board, networks.bias, solved, path.from_net, path.to_net)
    return banded(band.nominal, band.low, band.high, "V", band.note, "")


def _unsolved(path: SignalPath, why: str) -> Results:
    if path.kind == "coupling":
        names = coupling_names(path.table if isinstance(path.table, CouplingTable) else None)
    else:
        names = ("gain", *filter_limits(path.table if isinstance(path.table, FilterTable) else None, {}))
    return {name: unknown(find_measure(path.kind, name.partition("@")[0]).unit, why) for name in names}


def _judged(board: Board, networks: SignalNetworks, results: Results) -> Iterable[Check]:
    path = networks.path
    if path.kind == "coupling":
        limits = coupling_limits(board, networks)
    else:
        limits = filter_limits(path.table if isinstance(path.table, FilterTable) else None, results)
        results = results | {
            name: unknown(find_measure("filter", name.partition("@")[0]).unit, "the response has no such figure")
            for name in limits
            if name not in results and name != "rejection"
        }
    for name, value in results.items():
        measure = name.partition("@")[0]
        limit = limits.get(name, limits.get(measure) if measure == "rejection" else None)
        yield judge(f"{path.prefix}:{name}", path.kind, measure, value, limit)
