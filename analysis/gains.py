"""Reference gain and corners of a frequency response, as couplings and filters both need them.

A corner is where |H| first falls through reference/√2, going up or down from the reference.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from reactance.analysis.circuit.sweep import Response

LOWEST = 1e-4  # Hz: below this nothing on a board is asked about
LEAST_TOP = 1e6  # Hz: the band reaches at least so far
BEYOND = 1e3  # ... and this many times the highest frequency that is asked about
HALF_POWER = 1 / math.sqrt(2)
PASSES_DC = 0.05  # a filter whose DC gain is above this share of its greatest gain passes DC


@dataclass(frozen=True, slots=True)
class Reference:
    """The gain that everything is compared with, and the frequency where it is taken."""

    gain: float
    frequency: float


def top_of_band(response: Response, asked: float | None) -> float:
    """The upper end in Hz of the band in which the greatest gain is sought.

    Far above what is asked about, but not so far that parasitic resonances of parts count as the passband.
    """
    top = max(LEAST_TOP, BEYOND * (asked or 0.0))
    if asked is None:
        at, gain = response.greatest(LOWEST, top)
        corner = response.falls_through(gain * HALF_POWER, at, "down", LOWEST)
        top = max(top, BEYOND * (corner or 0.0))
    return top


def greatest_gain(response: Response, top: float) -> Reference:
    """The greatest |H| from 0.1 mHz to `top` (Hz)."""
    at, gain = response.greatest(LOWEST, top)
    return Reference(gain, at)


def filter_reference(response: Response, top: float) -> Reference:
    """For a low-pass the gain at DC, for everything else the greatest |H| up to `top` (Hz)."""
    at_dc = abs(response.at_dc())
    greatest = greatest_gain(response, top)
    falls = at_dc > PASSES_DC * greatest.gain and response.falls_through(at_dc * HALF_POWER, 0.0, "up", top)
    return Reference(at_dc, 0.0) if falls else greatest


def corner_high(response: Response, reference: Reference, top: float) -> float:
    """Upper corner in Hz, not a number where there is none below `top`."""
    found = response.falls_through(reference.gain * HALF_POWER, reference.frequency, "up", top)
    return math.nan if found is None else found


def corner_low(response: Response, reference: Reference) -> float:
    """Lower corner in Hz, not a number where there is none."""
    if reference.frequency == 0.0:
        return math.nan
    found = response.falls_through(reference.gain * HALF_POWER, reference.frequency, "down", LOWEST)
    return math.nan if found is None else found


def decibels(ratio: float) -> float:
    """20·log10 of a ratio; −inf for 0."""
    return 20 * math.log10(ratio) if ratio > 0 else -math.inf
