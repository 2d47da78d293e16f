"""Who does what on a board: the duty of each capacitor, and the couplings and filters to measure."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from reactance.analysis.board import Board, end_net
from reactance.analysis.duties import Assigned, BriefedPath
from reactance.analysis.duties import duties as assign_duties
from reactance.analysis.paths import SignalPath
from reactance.analysis.signal_paths import shown_paths
from reactance.analysis.topology import Branch, Terminal, Topology, prefix_of


@dataclass(frozen=True)
class Roles:
    """Duties of the capacitors, the paths to measure (the brief's first), nets of crystal load capacitors."""

    duties: tuple[Assigned, ...]
    paths: tuple[SignalPath, ...]
    crystal_nets: frozenset[str]


def topology_of(board: Board) -> Topology:
    """The board as branches and terminals between merged nets."""
    return Topology(
        branches=tuple(
            Branch(section.refdes, section.model.kind, section.model.value, section.a, section.b)
            for section in board.sections
            if section.model.kind != "other"
        ),
        terminals=tuple(
            Terminal(part.refdes, prefix_of(part.refdes), pin.number, pin.name, pin.direction, net, part.cell)
            for net, terminals in board.terminals_by_net.items()
            for part, pin in terminals
        ),
        kinds={net: entry.kind for net, entry in board.nets.items()},
        amplifiers=tuple((a.plus, a.minus, a.out) for a in board.amplifiers),
    )


def briefed_paths(board: Board) -> Iterable[SignalPath]:
    """The couplings and filters of the brief, with their nets looked up. Raises `InputError` for unknown ones."""
    tables = board.brief.tables
    for index, coupling in enumerate(tables.coupling):
        start, start_name = end_net(board, coupling.from_, "coupling", index, "from")
        end, end_name = end_net(board, coupling.to, "coupling", index, "to")
        if start == end:
            raise board.brief.error("coupling", index, "to", f"{start_name} is `from` as well", "name two nets")
        anchor = coupling.name or f"{start_name}>{end_name}"
        yield SignalPath("coupling", anchor, start, end, coupling, "the brief names it")
    for index, table in enumerate(tables.filter):
        start, start_name = end_net(board, table.from_, "filter", index, "from")
        end, end_name = end_net(board, table.to, "filter", index, "to")
        if start == end:
            raise board.brief.error("filter", index, "to", f"{start_name} is `from` as well", "name two nets")
        anchor = table.name or f"{start_name}>{end_name}"
        yield SignalPath("filter", anchor, start, end, table, "the brief names it")


def assign_roles(board: Board) -> Roles:
    """Work out duties and paths; what the brief says comes before what the design shows."""
    topology = topology_of(board)
    paths = list(briefed_paths(board))
    briefed = [BriefedPath(path.anchor, path.kind, path.from_net, path.to_net) for path in paths]
    overrules = {duty.capacitor: duty.is_ for duty in board.brief.tables.duty}
    duties = assign_duties(topology, briefed, overrules)
    known = {frozenset((path.from_net, path.to_net)) for path in paths}
    claimed = {duty.refdes for duty in duties if duty.id.startswith(("coupling:", "filter:"))}
    for shown in shown_paths(topology, claimed, duties):
        ends = frozenset((shown.from_net, shown.to_net))
        if ends not in known:
            known.add(ends)
            anchor = f"{shown.from_net}>{shown.to_net}"
            paths.append(SignalPath(shown.kind, anchor, shown.from_net, shown.to_net, None, shown.because))
    loads = {duty.refdes for duty in duties if duty.kind == "load"}
    crystal_nets = {net for section in board.sections if section.refdes in loads for net in (section.a, section.b)}
    return Roles(duties, tuple(paths), frozenset(crystal_nets))
