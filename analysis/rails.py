"""What a rail's load sees: impedance against its target, and how far the rail moves when the load steps."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board
from reactance.analysis.brief_tables import RailTable
from reactance.analysis.circuit.modal import PoleResidue
from reactance.analysis.circuit.network import FloatArray
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.rhythm import Rhythm
from reactance.analysis.circuit.transient import ramp
from reactance.analysis.elements import node
from reactance.analysis.measuring import Measuring
from reactance.analysis.parts.band import Band
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.rail_network import LOAD, RailNetwork
from reactance.analysis.report import Limit
from reactance.analysis.reuse import Results
from reactance.analysis.values import Value, exactly, unknown

LOWEST_FREQUENCY = 1e3  # Hz, of the band where the brief states none
KNEE = 0.35  # highest frequency of an edge is 0.35 over its rise time (common practice)


@dataclass(frozen=True, slots=True)
class Demand:
    """What the brief asks of a rail, in SI: the step, the greatest excursions, the band. None: not stated."""

    current: float | None
    rise: float | None
    allowed: float | None
    rhythm: float | None
    band: tuple[float, float] | None


def demand(table: RailTable, volts: float | None) -> Demand:
    """The demand of a rail's table; `volts` is what a share is taken of."""
    step, whole = table.step, volts or 0.0
    band = (float(table.band.low), float(table.band.high)) if table.band else None
    if band is None and step and step.rise > 0 and KNEE / step.rise > LOWEST_FREQUENCY:
        band = (LOWEST_FREQUENCY, KNEE / step.rise)
    return Demand(
        float(step.current) if step else None,
        float(step.rise) if step else None,
        table.allowed.volts(whole) if table.allowed else None,
        table.allowed_rhythm.volts(whole) if table.allowed_rhythm else None,
        band,
    )


def limits(asked: Demand) -> dict[str, Limit]:
    """The limits that a demand sets, by measure."""
    found = {"impedance": Limit(max=1.0)}
    if asked.allowed is not None:
        found["droop"] = Limit(max=asked.allowed)
    if asked.rhythm is not None:
        found["resonant_droop"] = Limit(max=asked.rhythm)
    return found


def measured(asked: Demand) -> tuple[str, ...]:
    """The measures that a demand calls for, whether or not they can be computed."""
    names = []
    if asked.current is not None:
        names += ["droop", "resonant_droop"]
    if asked.current is not None and asked.allowed is not None:
        names.append("impedance")
    if asked.band is not None:
        names.append("antiresonance")
    return tuple(names)


def solve_rail(board: Board, net: str, network: RailNetwork, asked: Demand) -> Results:
    """Droop, resonant droop, impedance over target, antiresonance: those that the demand allows."""
    seen = Measuring(network.block, LOAD, node(board, net), sign=-1.0)
    found: Results = {}
    if asked.current is not None and asked.rise is not None:
        found |= _in_time(seen, net, network.fed, asked, asked.current, asked.rise)
    if asked.band is not None:
        found |= _in_frequency(seen, asked, asked.band)
    elif asked.allowed is not None and asked.current is not None:
        found["impedance"] = unknown("1", "the band is not stated and does not follow from the step's rise")
    return {name: value for name, value in found.items() if name in measured(asked)}


def _in_time(seen: Measuring, net: str, fed: bool, asked: Demand, current: float, rise: float) -> Results:
    if not fed:
        why = f"nothing feeds {net} in the network: state source = {{ resistance, inductance }}"
        return {"droop": unknown("V", why), "resonant_droop": unknown("V", why)}
    amps, missing = format_quantity(current, "A"), "the rail's response does not settle"

    def droop(modes: PoleResidue) -> FloatArray:
        return np.asarray(ramp(modes, current, rise).peak().size)

    def roughly(modes: PoleResidue) -> FloatArray:
        return np.asarray(ramp(modes, current, rise).peak(rough=True).size)

    found = {"droop": seen.modal(droop, "V", f"{amps} in {format_quantity(rise, 's')}", missing, roughly)}
    if asked.band is None:
        found["resonant_droop"] = unknown("V", "the band is not stated and does not follow from the step's rise")
        return found
    low, high = asked.band

    nominal = seen.modes(seen.nominal)
    rhythm = Rhythm.of(nominal, current, rise, low, high)

    def excursion(modes: PoleResidue) -> FloatArray:
        return rhythm.worst(modes)[1]

    def rough_excursion(modes: PoleResidue) -> FloatArray:
        return rhythm.worst(modes, rough=True)[1]

    note = f"0 to {amps} and back, worst at {format_quantity(float(rhythm.worst(nominal)[0][0]), 'Hz')}"
    found["resonant_droop"] = seen.modal(excursion, "V", note, missing, rough_excursion)
    return found


def _in_frequency(seen: Measuring, asked: Demand, band: tuple[float, float]) -> Results:
    low, high = band
    found: Results = {}
    nominal = seen.response(seen.nominal)
    if asked.allowed is not None and asked.current:
        target = asked.allowed / asked.current

        def impedance(response: Response) -> FloatArray:
            return np.asarray(response.greatest(low, high)[1]) / target

        place = format_quantity(float(np.asarray(nominal.greatest(low, high)[0])[0]), "Hz")
        where = f"{format_quantity(low, 'Hz')} to {format_quantity(high, 'Hz')}"
        note = f"greatest at {place}; target {format_quantity(target, 'ohm')}, {where}"
        found["impedance"] = seen.swept(impedance, "1", note, "the impedance is not finite in the band")

    def antiresonance(response: Response) -> FloatArray:
        return np.asarray(response.greatest_local_maximum(low, high)[1])

    at, size = (np.asarray(found) for found in nominal.greatest_local_maximum(low, high))
    if math.isfinite(float(size[0])):
        note = f"at {format_quantity(float(at[0]), 'Hz')}"
        found["antiresonance"] = seen.swept(antiresonance, "Ω", note, "no local maximum in the band")
    return found


def rail_capacitance(board: Board, bias: Bias, net: str) -> Value:
    """Sum of effective capacitance from the rail to ground, in farads; the extremes are sums of extremes."""
    bands: list[Band] = []
    for section in board.sections_by_net.get(net, ()):
        other = section.b if section.a == net else section.a
        if isinstance(section.model, CapacitorModel) and board.is_ground(other) and section.model.value is not None:
            bands.append(section.model.effective(bias.across(section) or 0.0))
    count = len(bands)
    note = f"{count} capacitor{'' if count == 1 else 's'}"
    nominal, low, high = (sum(getattr(band, end) for band in bands) for end in ("nominal", "low", "high"))
    return Value(nominal, low, high, "F", note)


def bypass(board: Board, net: str) -> Value | None:
    """Capacitors from the rail to ground per IC pin on the rail; None where no IC has a pin there."""
    pins = sum(part.refdes[:1] in "UI" for part, _ in board.terminals_by_net.get(net, ()))
    if not pins:
        return None
    capacitors = sum(
        isinstance(section.model, CapacitorModel)
        and board.is_ground(section.b if section.a == net else section.a)
        for section in board.sections_by_net.get(net, ())
    )
    return exactly(capacitors / pins, "1", f"{capacitors} capacitors, {pins} IC pins")
