"""How little of a rail's ripple reaches a signal that hangs on it."""

from __future__ import annotations

import math

import numpy as np

from reactance.analysis.brief_tables import CouplingTable, FilterTable
from reactance.analysis.circuit.network import FloatArray
from reactance.analysis.circuit.response import Response
from reactance.analysis.filters import HIGHEST_AUDIBLE, LOWEST_AUDIBLE, asked_frequency
from reactance.analysis.gains import corner_high, decibels, filter_reference, size_at, top_of_band
from reactance.analysis.measuring import Measuring
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.reuse import Results


def rejection_band(networks: SignalNetworks, seen: Measuring) -> tuple[float, float]:
    """The passband in Hz: the brief's, else 10 Hz to the upper corner, or to 20 kHz where there is none."""
    table = networks.path.table
    if isinstance(table, FilterTable) and table.passband is not None:
        start = table.passband.from_ if table.passband.from_ is not None else LOWEST_AUDIBLE
        return min(float(start), float(table.passband.to)), float(table.passband.to)
    if isinstance(table, CouplingTable):
        asked = float(table.lowest_frequency) if table.lowest_frequency is not None else None
    else:
        asked = asked_frequency(table)
    response = seen.response(seen.nominal)
    top = top_of_band(response, asked)
    corner = float(corner_high(response, filter_reference(response, top))[0])
    high = corner if math.isfinite(corner) and corner > LOWEST_AUDIBLE else HIGHEST_AUDIBLE
    return LOWEST_AUDIBLE, high


def solve_rejections(networks: SignalNetworks) -> Results:
    """`rejection@NET` in dB for each rail that the path's network hangs on."""
    rails = networks.rails()
    if not rails:
        return {}
    low, high = rejection_band(networks, Measuring(networks.ac, networks.emf, networks.probe))
    note = f"{format_quantity(low, 'Hz')} to {format_quantity(high, 'Hz')}"
    found: Results = {}
    for net, source in rails:

        def rejection(response: Response) -> FloatArray:
            greatest = np.asarray(response.greatest(low, high)[1]) if low < high else size_at(response, low)
            return -decibels(greatest)

        seen = Measuring(networks.ac, source, networks.probe)
        if not np.isfinite(rejection(seen.response(seen.nominal))[0]):
            continue
        found[f"rejection@{net}"] = seen.swept(rejection, "dB", note, f"nothing of {net} reaches it")
    return found
