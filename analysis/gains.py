"""Reference gain and corners of frequency responses, as couplings and filters both need them.

A corner is where |H| first falls through reference/√2, going up or down from the reference. Everything works on V
sets of values at once: gains and frequencies are arrays (V,).
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from reactance.analysis.circuit.network import FloatArray
from reactance.analysis.circuit.response import Response

LOWEST = 1e-4  # Hz: below this nothing on a board is asked about
LEAST_TOP = 1e6  # Hz: the band reaches at least so far
HIGHEST = 1e10  # Hz: corners are sought so far
BEYOND = 1e3  # ... and this many times the highest frequency that is asked about
HALF_POWER = 1 / math.sqrt(2)
PASSES_DC = 0.05  # a filter whose DC gain is above this share of its greatest gain passes DC


@dataclass(frozen=True, slots=True)
class Reference:
    """The gains (V,) that everything is compared with, and the frequencies (V,) in Hz where they are taken."""

    gain: FloatArray
    frequency: FloatArray

    @property
    def at_dc(self) -> bool:
        """Whether the first set of values has its reference at DC."""
        return bool(self.frequency[0] == 0.0)


def size_at(response: Response, frequency: float) -> FloatArray:
    """|H| at one frequency in Hz: (V,)."""
    return np.abs(np.atleast_2d(response.at([frequency])))[:, 0]


def top_of_band(nominal: Response, asked: float | None) -> float:
    """The upper end in Hz of the band in which the greatest gain is sought.

    Far above what is asked about, but not so far that parasitic resonances of parts count as the passband.
    """
    top = max(LEAST_TOP, BEYOND * (asked or 0.0))
    if asked is None:
        corner = float(corner_low(nominal, greatest_gain(nominal, top))[0])
        top = max(top, BEYOND * corner) if math.isfinite(corner) else top
    return top


def greatest_gain(response: Response, top: float) -> Reference:
    """The greatest |H| from 0.1 mHz to `top` (Hz)."""
    at, gain = response.greatest(LOWEST, top)
    return Reference(np.asarray(gain), np.asarray(at))


def remembered(find: Callable[[Response], Reference]) -> Callable[[Response], Reference]:
    """`find`, asked once for each response: several measures stand on the same reference."""
    known: dict[int, tuple[Response, Reference]] = {}

    def reference(response: Response) -> Reference:
        if id(response) not in known:
            known[id(response)] = (response, find(response))
        return known[id(response)][1]

    return reference


def dc_reference(response: Response) -> Reference:
    """The gain at DC."""
    gain = size_at(response, 0.0)
    return Reference(gain, np.zeros_like(gain))


def filter_reference(nominal: Response, top: float) -> Reference:
    """For a low-pass the gain at DC, for everything else the greatest |H| up to `top` (Hz)."""
    at_dc = dc_reference(nominal)
    greatest = greatest_gain(nominal, top)
    if at_dc.gain[0] > PASSES_DC * greatest.gain[0] and math.isfinite(corner_high(nominal, at_dc)[0]):
        return at_dc
    return greatest


def corner_high(response: Response, reference: Reference) -> FloatArray:
    """Upper corners in Hz (V,), NaN where there is none up to 10 GHz."""
    found = response.falls_through(reference.gain * HALF_POWER, reference.frequency, "up", HIGHEST)
    return np.asarray(found, float)


def corner_low(response: Response, reference: Reference) -> FloatArray:
    """Lower corners in Hz (V,), NaN where there is none."""
    if reference.at_dc:
        return np.full_like(reference.gain, math.nan)
    found = response.falls_through(reference.gain * HALF_POWER, reference.frequency, "down", LOWEST)
    return np.asarray(found, float)


def decibels(ratio: FloatArray) -> FloatArray:
    """20·log10 of ratios; −inf for 0."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(20 * np.log10(ratio))
