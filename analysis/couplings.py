"""A signal across two bias points: gain, corner and loss, DC, and how its output settles when power comes on."""

from __future__ import annotations

import math

from reactance.analysis.board import Board
from reactance.analysis.brief_tables import CouplingTable
from reactance.analysis.circuit.sweep import Response
from reactance.analysis.circuit.transient import TimeResponse, step_response
from reactance.analysis.gains import corner_low, decibels, greatest_gain, top_of_band
from reactance.analysis.measuring import Measuring
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Limit
from reactance.analysis.reuse import Results
from reactance.analysis.starting import start_measures
from reactance.analysis.values import Value, unknown


def coupling_names(table: CouplingTable | None) -> tuple[str, ...]:
    """The measures of a coupling, in the order shown; those the brief asks for among them."""
    names = ["dc", "gain", "corner"]
    if table is not None and table.lowest_frequency is not None:
        names.append("loss")
    if table is not None and table.settle is not None:
        names.append("settling")
    names.append("startup_peak")
    if table is not None and table.tilt is not None:
        names.append("tilt")
    return tuple(names)


def coupling_limits(board: Board, networks: SignalNetworks) -> dict[str, Limit]:
    """The limits by measure: the brief's, and the voltage limits of pins on the `to` net for the start."""
    table = networks.path.table
    found: dict[str, Limit] = {}
    if isinstance(table, CouplingTable):
        if table.loss is not None:
            found["loss"] = Limit(max=float(table.loss))
        if table.settle is not None and table.settle.time is not None:
            found["settling"] = Limit(max=float(table.settle.time))
        if table.tilt is not None and table.tilt.most is not None:
            found["tilt"] = Limit(max=float(table.tilt.most))
        if table.rejection is not None:
            found["rejection"] = Limit(min=float(table.rejection))
    pins = [pin.table for pin in board.pins_by_net.get(networks.path.to_net, ())]
    least = [float(pin.least_voltage) for pin in pins if pin.least_voltage is not None]
    most = [float(pin.greatest_voltage) for pin in pins if pin.greatest_voltage is not None]
    if least or most:
        found["startup_peak"] = Limit(min=max(least, default=None), max=min(most, default=None))
    return found


def solve_coupling(networks: SignalNetworks) -> Results:
    """All measures of a coupling but `dc` and `rejection`."""
    table = networks.path.table if isinstance(networks.path.table, CouplingTable) else None
    seen = Measuring(networks.ac, networks.emf, networks.probe)
    lowest = float(table.lowest_frequency) if table and table.lowest_frequency is not None else None
    top = top_of_band(seen.nominal_response(), lowest)
    found = _in_frequency(seen, top, lowest)
    if table is not None and table.tilt is not None:
        found["tilt"] = _tilt(seen, float(table.tilt.pulse))
    return found | start_measures(networks, table.settle if table else None)


def _in_frequency(seen: Measuring, top: float, lowest: float | None) -> Results:
    def gain(response: Response) -> float:
        return decibels(greatest_gain(response, top).gain)

    def corner(response: Response) -> float:
        return corner_low(response, greatest_gain(response, top))

    reference = greatest_gain(seen.nominal_response(), top)
    if not reference.gain > 0:
        why = "nothing passes: |H| is 0 in the whole band"
        return {name: unknown(unit, why) for name, unit in (("gain", "dB"), ("corner", "Hz"), ("loss", "dB"))}
    found: Results = {
        "gain": seen.swept(gain, "dB", f"at {format_quantity(reference.frequency, 'Hz')}", "nothing passes"),
        "corner": seen.swept(corner, "Hz", "", "it passes DC: there is no lower corner"),
    }
    if lowest is not None:

        def loss(response: Response) -> float:
            return decibels(greatest_gain(response, top).gain / abs(response.at(lowest)))

        found["loss"] = seen.swept(loss, "dB", f"at {format_quantity(lowest, 'Hz')}", "nothing passes there")
    return found


def _tilt(seen: Measuring, pulse: float) -> Value:
    def tilt(modes: TimeResponse) -> float:
        return sag(modes, pulse)

    note = f"pulse of {format_quantity(pulse, 's')}"
    return seen.stepped(tilt, "1", note, "the output does not jump")


def sag(step: TimeResponse, pulse: float) -> float:
    """How far a step response has sagged at `pulse` (s) from its greatest value before, over that value."""
    _, jump = step.greatest(0.0, pulse)
    end = float(step.value([pulse])[0])
    return (abs(jump) - math.copysign(end, end * jump)) / abs(jump) if jump else math.nan


__all__ = ["coupling_limits", "coupling_names", "sag", "solve_coupling", "step_response"]
