"""The lists of a report that say what the board is made of and what was assumed about it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board
from reactance.analysis.cautions import cautions
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.report import (
    AssumptionEntry,
    CapacitorEntry,
    Check,
    Duty,
    Effective,
    NetEntry,
    PartEntry,
    ProblemEntry,
)
from reactance.analysis.roles import Roles

if TYPE_CHECKING:
    from reactance.analysis.path_checks import PathStudy
    from reactance.analysis.rail_checks import RailStudy


def net_entries(board: Board, bias: Bias) -> tuple[NetEntry, ...]:
    """Every net of the export, also those that a 0 Ω part joins to another."""
    entries = []
    for net in board.design.nets:
        home = board.merged[net.name]
        entries.append(NetEntry(net.name, board.nets[home].kind, bias.volts.get(home)))
    return tuple(entries)


def part_entries(board: Board) -> tuple[PartEntry, ...]:
    """Every part as understood."""
    return tuple(
        PartEntry(m.refdes, m.kind, m.value, m.tolerance, m.package, m.fitted, m.text) for m in board.models.values()
    )


def capacitor_entries(board: Board, bias: Bias, roles: Roles) -> tuple[CapacitorEntry, ...]:
    """Every capacitor, fitted or not; one that is not fitted has no figures of the network."""
    kinds = {duty.refdes: duty.kind for duty in roles.duties}
    sections = {section.name: section for section in board.capacitors()}
    entries = []
    for part in board.design.parts:
        model = board.models[part.refdes]
        if not isinstance(model, CapacitorModel):
            continue
        section = sections.get(part.refdes)
        nets = tuple(pin.net for pin in part.pins if pin.net is not None)
        dc = bias.across(section) if section else None
        effective = None
        if model.value is not None:
            band = model.effective(abs(dc or 0.0))
            effective = Effective(band.nominal, band.low, band.high)
        entries.append(
            CapacitorEntry(
                refdes=part.refdes,
                nets=(section.a, section.b) if section else nets,
                value=model.value,
                technology=model.technology,
                dielectric=model.dielectric,
                rated_voltage=model.rated_voltage,
                dc=dc,
                duty=kinds.get(part.refdes, "unassigned"),
                effective=effective,
                esr=model.esr,
                esl=model.esl,
            )
        )
    return tuple(entries)


def duty_entries(board: Board, roles: Roles) -> tuple[Duty, ...]:
    """Duties, one entry for all capacitors that share one; coupling and filter entries name the path's ends."""
    nets = {section.refdes: (section.a, section.b) for section in board.capacitors()}
    ends = {path.prefix: (path.from_net, path.to_net) for path in roles.paths}
    groups: dict[str, list[int]] = {}
    for position, duty in enumerate(roles.duties):
        groups.setdefault(duty.id, []).append(position)
    entries = []
    for duty_id, positions in groups.items():
        members = [roles.duties[position] for position in positions]
        touched = [net for duty in members for net in nets.get(duty.refdes, ())]
        because = "; ".join(dict.fromkeys(duty.because for duty in members))
        entries.append(
            Duty(
                duty_id,
                members[0].kind,
                tuple(duty.refdes for duty in members),
                tuple(dict.fromkeys((*ends.get(duty_id, ()), *touched))),
                because,
            )
        )
    return tuple(entries)


def gathered_assumptions(
    board: Board, bias: Bias, rails: Sequence[RailStudy], paths: Sequence[PathStudy]
) -> tuple[AssumptionEntry, ...]:
    """Everything used that neither export nor brief states; equal ones of several parts stand once."""
    groups: dict[tuple[str, str, str], list[str]] = {}
    for model in board.models.values():
        if model.fitted:
            for entry in model.assumptions:
                groups.setdefault((entry.attribute, entry.value, entry.because), []).append(entry.about)
    found = [AssumptionEntry(listed(about), *what) for what, about in groups.items()]
    found += _network_assumptions(board, bias, rails, paths)
    return tuple(found)


def _network_assumptions(
    board: Board, bias: Bias, rails: Sequence[RailStudy], paths: Sequence[PathStudy]
) -> Iterable[AssumptionEntry]:
    lossy = [s.refdes for s in board.capacitors() if isinstance(s.model, CapacitorModel) and s.model.loss_tangent]
    if lossy:
        because = "dielectric loss only damps, so leaving it out errs on the safe side"
        yield AssumptionEntry(listed(lossy), "time response", "R_s alone", because)
    unknown = [
        section.refdes
        for section in board.capacitors()
        if isinstance(section.model, CapacitorModel) and section.model.needs_curve and bias.across(section) is None
    ]
    if unknown:
        because = "the DC voltage across them is not defined by what export and brief say"
        yield AssumptionEntry(listed(unknown), "bias", "0 V", because)
    for path in paths:
        if not path.failure and path.networks.needs_level:
            because = "no [[pin]] says what drives it, and nothing biases it"
            yield AssumptionEntry(path.path.from_net, "source", "an ideal source at 0 V", because)
    for rail in rails:
        for note in rail.network.block.notes if rail.network else ():
            yield AssumptionEntry(rail.net, "network", note, "keeps the network of the rail to what moves it")


def listed(names: Iterable[str]) -> str:
    """Names in one line, each once."""
    return ", ".join(dict.fromkeys(names))


def gathered_problems(board: Board, bias: Bias, checks: Sequence[Check]) -> tuple[ProblemEntry, ...]:
    """What the reading and the models complained of, and the cautions about stored charge and polarity."""
    found = [*board.problems, *bias.problems, *cautions(board, bias, checks)]
    return tuple(ProblemEntry(p.severity, p.where, p.message) for p in dict.fromkeys(found))
