"""A signal across two bias points: gain, corner and loss, DC, and how its output settles when power comes on."""

from __future__ import annotations

import numpy as np

from reactance.analysis.board import Board
from reactance.analysis.brief_tables import CouplingTable
from reactance.analysis.circuit.modal import PoleResidue
from reactance.analysis.circuit.network import FloatArray
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.transient import step
from reactance.analysis.gains import corner_low, decibels, greatest_gain, remembered, size_at, top_of_band
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
    top = top_of_band(seen.response(seen.nominal), lowest)
    found = _in_frequency(seen, top, lowest)
    if table is not None and table.tilt is not None:
        found["tilt"] = _tilt(seen, float(table.tilt.pulse))
    return found | start_measures(networks, table.settle if table else None)


def _in_frequency(seen: Measuring, top: float, lowest: float | None) -> Results:
    reference_of = remembered(lambda response: greatest_gain(response, top))

    def gain(response: Response) -> FloatArray:
        return decibels(reference_of(response).gain)

    def corner(response: Response) -> FloatArray:
        return corner_low(response, reference_of(response))

    reference = greatest_gain(seen.response(seen.nominal), top)
    if not reference.gain[0] > 0:
        why = "nothing passes: |H| is 0 in the whole band"
        return {name: unknown(unit, why) for name, unit in (("gain", "dB"), ("corner", "Hz"), ("loss", "dB"))}
    at = format_quantity(float(reference.frequency[0]), "Hz")
    found: Results = {
        "gain": seen.swept(gain, "dB", f"at {at}", "nothing passes"),
        "corner": seen.swept(corner, "Hz", "", "it passes DC: there is no lower corner"),
    }
    if lowest is not None:

        def loss(response: Response) -> FloatArray:
            return decibels(reference_of(response).gain / size_at(response, lowest))

        found["loss"] = seen.swept(loss, "dB", f"at {format_quantity(lowest, 'Hz')}", "nothing passes there")
    return found


def _tilt(seen: Measuring, pulse_width: float) -> Value:
    def tilt(modes: PoleResidue) -> FloatArray:
        return sag(modes, pulse_width)

    note = f"pulse of {format_quantity(pulse_width, 's')}"
    return seen.modal(tilt, "1", note, "the output does not jump")


def sag(modes: PoleResidue, pulse_width: float) -> FloatArray:
    """How far the output (V,) has sagged from its jump at the end of a rectangular pulse, over the jump.

    The jump is the greatest excursion during the pulse: with an ideal source, that just after the edge.
    """
    response = step(modes)
    jump = during(modes, pulse_width)
    end = np.atleast_2d(response.value([pulse_width]))[:, 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(1.0 - end / jump)


def during(modes: PoleResidue, width: float) -> FloatArray:
    """The value of the step response farthest from 0 for 0 ≤ t ≤ `width`, with its sign: (V,)."""
    t = np.unique(np.concatenate([[0.0], np.geomspace(width * 1e-9, width, 400), np.linspace(0.0, width, 200)]))
    values = np.atleast_2d(step(modes).value(t))
    return np.asarray(values[np.arange(len(values)), np.abs(values).argmax(axis=1)])
