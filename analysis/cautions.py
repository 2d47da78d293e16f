"""Where a result could hurt someone: stored charge, mains, reversed or overstressed electrolytic parts."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Sequence

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board, Section
from reactance.analysis.design import Problem
from reactance.analysis.parts.capacitor import discharge_time, stored_energy
from reactance.analysis.parts.models import CapacitorModel, ResistorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check

DANGEROUS_VOLTS = 60.0  # DC; above it IEC 62368-1 no longer counts a source among the harmless ones
_MAINS_NAMES = "MAINS|AC_?L(?:INE|IVE)?|AC_?N(?:EUTRAL)?|LINE_?AC|LIVE|NEUTRAL|2[23]0VAC|1[12]0VAC"
MAINS = re.compile(rf"(?:^|[_/\s-])(?:{_MAINS_NAMES})(?:$|[_/\s-])", re.IGNORECASE)
ADVICE = (
    "safety-rated parts, spacing and discharge are for the applicable local code (IEC 62368-1, IEC 60384-14 and "
    "their national forms) and a qualified person to decide"
)


def cautions(board: Board, bias: Bias, checks: Sequence[Check]) -> Iterable[Problem]:
    """The cautions of a board, one each for stored charge, mains, and parts that can vent or ignite."""
    for section in board.capacitors():
        model = section.model
        if isinstance(model, CapacitorModel) and model.value is not None:
            volts = abs(bias.across(section) or 0.0)
            if volts > DANGEROUS_VOLTS:
                yield _stored_charge(board, section, model.value, volts)
    for net in board.nets:
        if MAINS.search(net):
            yield Problem("caution", net, f"its name says that it carries mains; stored charge can injure; {ADVICE}")
    failing = {check.id for check in checks if check.status == "fail"}
    for section in board.capacitors():
        model = section.model
        if isinstance(model, CapacitorModel) and model.technology in ("aluminium", "tantalum", "polymer"):
            for what, words in (("polarity", "reversed"), ("stress", "overstressed")):
                if f"part:{section.refdes}:{what}" in failing:
                    message = f"{words}: {model.technology} capacitors that are {words} can vent or ignite"
                    yield Problem("caution", section.refdes, message)


def _stored_charge(board: Board, section: Section, capacitance: float, volts: float) -> Problem:
    energy = format_quantity(stored_energy(capacitance, volts), "J")
    resistance = discharge_resistance(board, section)
    time = discharge_time(capacitance, resistance, volts, DANGEROUS_VOLTS)
    path = (
        f"it falls below 60 V in {format_quantity(time, 's')} through {format_quantity(resistance, 'ohm')}"
        if math.isfinite(time)
        else "the design shows no discharge path"
    )
    message = (
        f"holds {format_quantity(volts, 'V')} DC and {energy} of stored charge, which can injure; {path}; {ADVICE}"
    )
    return Problem("caution", section.refdes, message)


def discharge_resistance(board: Board, section: Section) -> float:
    """The resistance in ohms through which the design lets a capacitor discharge once nothing feeds it.

    Resistors and leakage directly across it, and chains of resistors in series from one side to the other.
    Infinite where there is no such path.
    """
    conductance = 0.0
    for other in board.sections_by_net.get(section.a, ()):
        if other.name == section.name:
            continue
        chain = _chain(board, other, section.a, section.b)
        if chain:
            conductance += 1.0 / chain
    model = section.model
    if isinstance(model, CapacitorModel) and math.isfinite(model.leakage_resistance):
        conductance += 1.0 / model.leakage_resistance
    return 1.0 / conductance if conductance else math.inf


def _chain(board: Board, first: Section, start: str, end: str) -> float | None:
    """Total resistance of a series of resistors from `start` over `first` to `end`, None where it branches off."""
    total, section, net, met = 0.0, first, start, {first.name}
    while isinstance(section.model, ResistorModel) and section.model.value is not None:
        total += section.model.value
        net = section.b if section.a == net else section.a
        if net == end:
            return total
        if board.volts(net) is not None:
            return None
        onward = [
            other
            for other in board.sections_by_net.get(net, ())
            if other.name not in met and isinstance(other.model, ResistorModel)
        ]
        if len(onward) != 1:
            return None
        section = onward[0]
        met.add(section.name)
    return None
