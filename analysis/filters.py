"""A frequency response: gain, corners, attenuation, ripple; its step response; its thermal noise."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from reactance.analysis.brief_tables import FilterTable
from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.network import Capacitor, FloatArray, Network
from reactance.analysis.circuit.noise import integrated_noise
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.transient import TimeResponse
from reactance.analysis.gains import (
    Reference,
    corner_high,
    corner_low,
    dc_reference,
    decibels,
    filter_reference,
    greatest_gain,
    remembered,
    size_at,
    top_of_band,
)
from reactance.analysis.measuring import Measuring, band
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Limit
from reactance.analysis.reuse import Results
from reactance.analysis.values import Value, unknown

SETTLED = 0.01  # of the final value
SAMPLES, NARROWED = 200, 4  # a crossing is narrowed by that factor so many times
ZERO_CELSIUS = 273.15
LOWEST_AUDIBLE, HIGHEST_AUDIBLE = 10.0, 20e3  # Hz, of a rejection's band where no passband says otherwise


def frequency_label(frequency: float) -> str:
    """A frequency in Hz as check ids spell it: `100kHz`."""
    for size, prefix in ((1e9, "G"), (1e6, "M"), (1e3, "k")):
        if frequency >= size:
            return f"{frequency / size:.6g}{prefix}Hz"
    return f"{frequency:.6g}Hz"


def asked_frequency(table: FilterTable | None) -> float | None:
    """The frequency about which the brief asks, in Hz, None where it names none."""
    if table is None:
        return None
    bounds = [b for pair in (table.corner_low, table.corner_high) if pair for b in (pair.least, pair.most)]
    named = [f for f in (table.corner, *bounds, table.passband.to if table.passband else None) if f is not None]
    return max((float(f) for f in named), default=None)


def filter_limits(table: FilterTable | None, found: Results) -> dict[str, Limit]:
    """The limits by measure. `corner` is about the corner that exists; of two, about the nearer one."""
    limits: dict[str, Limit] = {}
    if table is None:
        return limits
    if table.corner is not None:
        limits[_corner_meant(float(table.corner), found)] = Limit(
            min=table.corner * (1 - table.tolerance), max=table.corner * (1 + table.tolerance)
        )
    for name, bounds in (("corner_low", table.corner_low), ("corner_high", table.corner_high)):
        if bounds is not None:
            limits[name] = Limit(
                min=None if bounds.least is None else float(bounds.least),
                max=None if bounds.most is None else float(bounds.most),
            )
    for entry in table.attenuation:
        if entry.least is not None:
            limits[f"attenuation@{frequency_label(entry.at)}"] = Limit(min=float(entry.least))
    if table.passband and table.passband.ripple is not None:
        limits["ripple"] = Limit(max=float(table.passband.ripple))
    if table.step and table.step.overshoot is not None:
        limits["overshoot"] = Limit(max=float(table.step.overshoot))
    if table.step and table.step.settle is not None:
        limits["settling"] = Limit(max=float(table.step.settle))
    if table.rejection is not None:
        limits["rejection"] = Limit(min=float(table.rejection))
    return limits


def _corner_meant(corner: float, found: Results) -> str:
    there = {
        name: value.nominal
        for name in ("corner_high", "corner_low")
        if (value := found.get(name)) is not None and value.nominal
    }
    return min(there, key=lambda name: abs(math.log(there[name] / corner)), default="corner_high")


def solve_filter(networks: SignalNetworks) -> Results:
    """All measures of a filter but `rejection`."""
    table = networks.path.table if isinstance(networks.path.table, FilterTable) else None
    seen = Measuring(networks.ac, networks.emf, networks.probe)
    nominal = seen.response(seen.nominal)
    top = top_of_band(nominal, asked_frequency(table))
    reference = filter_reference(nominal, top)
    if not reference.gain[0] > 0:
        return {"gain": unknown("dB", "nothing passes: |H| is 0 in the whole band")}
    found = _in_frequency(seen, top, reference, table)
    if reference.at_dc:
        found |= _in_time(seen)
    celsius = networks.board.conditions.temperature_high
    found["noise"] = _noise(seen, celsius)
    return found


def _noise(seen: Measuring, celsius: float) -> Value:
    """Capacitors without R_s and L_s: beyond their self-resonance these let through noise that no band would hold."""
    network = Network(
        tuple(replace(e, esr=0.0, esl=0.0) if isinstance(e, Capacitor) else e for e in seen.block.network.elements),
        seen.block.network.ground,
    )

    family = Family(network, seen.parameters)

    def noise(values: FloatArray) -> FloatArray:
        found = integrated_noise(
            network, seen.probe, celsius + ZERO_CELSIUS, parameters=seen.parameters, values=values, family=family
        )
        return np.asarray(found)

    missing = "the noise has no upper frequency limit: no capacitance bounds it"
    note = f"at {celsius:g} °C, R_s and L_s of capacitors left out"
    return band(noise, seen.parameters, "V rms", note, missing, samples=seen.block.samples)


def _in_frequency(seen: Measuring, top: float, nominal: Reference, table: FilterTable | None) -> Results:
    reference = remembered(lambda response: dc_reference(response) if nominal.at_dc else greatest_gain(response, top))

    def gain(response: Response) -> FloatArray:
        return decibels(reference(response).gain)

    def upper(response: Response) -> FloatArray:
        return corner_high(response, reference(response))

    def lower(response: Response) -> FloatArray:
        return corner_low(response, reference(response))

    where = "at DC" if nominal.at_dc else f"at {format_quantity(float(nominal.frequency[0]), 'Hz')}"
    found: Results = {"gain": seen.swept(gain, "dB", where, "nothing passes")}
    for name, corner in (("corner_low", lower), ("corner_high", upper)):
        if math.isfinite(float(corner(seen.response(seen.nominal))[0])):
            found[name] = seen.swept(corner, "Hz", "", "there is none")
    for entry in table.attenuation if table else ():
        at = float(entry.at)

        def attenuation(response: Response, at: float = at) -> FloatArray:
            return decibels(reference(response).gain / size_at(response, at))

        found[f"attenuation@{frequency_label(at)}"] = seen.swept(attenuation, "dB", "", "nothing passes there")
    if table and table.passband:
        found["ripple"] = _ripple(seen, table, nominal)
    return found


def passband(table: FilterTable | None, reference: Reference) -> tuple[float, float] | None:
    """The passband in Hz that the brief states; from DC for a low-pass, else from the reference's frequency."""
    if table is None or table.passband is None:
        return None
    start = float(reference.frequency[0]) if table.passband.from_ is None else float(table.passband.from_)
    return start, float(table.passband.to)


def _ripple(seen: Measuring, table: FilterTable, reference: Reference) -> Value:
    edges = passband(table, reference)
    if edges is None or not edges[0] < edges[1]:
        return unknown("dB", "the passband is empty: state its `from`")
    low, high = edges

    def ripple(response: Response) -> FloatArray:
        return decibels(np.asarray(response.greatest(low, high)[1]) / np.asarray(response.least(low, high)[1]))

    note = f"{format_quantity(low, 'Hz')} to {format_quantity(high, 'Hz')}"
    return seen.swept(ripple, "dB", note, "nothing passes in a part of the passband")


def _in_time(seen: Measuring) -> Results:
    def settling(response: TimeResponse) -> FloatArray:
        return np.asarray(response.settling_time(SETTLED * np.abs(response.final)))

    why = "the step response does not settle"
    return {
        "overshoot": seen.stepped(step_overshoot, "1", "", why),
        "rise_time": seen.stepped(rise_time, "s", "10 % to 90 %", why),
        "settling": seen.stepped(settling, "s", "within 1 %", why),
    }


def step_overshoot(response: TimeResponse) -> FloatArray:
    """How far step responses go beyond their final value, over that value (V,); 0 where they do not."""
    final = np.asarray(response.final)
    beyond = np.where(final > 0, np.asarray(response.highest().size), np.asarray(response.lowest().size))
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(np.isfinite(final) & (final != 0), np.maximum(beyond / final - 1.0, 0.0), np.nan)


def rise_time(response: TimeResponse) -> FloatArray:
    """Times in s (V,) from 10 % to 90 % of the final value, on the rise that lasts.

    A capacitor's inductance lets the very first edge through for picoseconds; that spike is no rise.
    """
    final = np.asarray(response.final)
    low, high = np.asarray(response.first_crossing(0.1 * final)), np.asarray(response.first_crossing(0.9 * final))
    last_low = np.asarray(response.settling_time(0.9 * np.abs(final)))
    spiked = (high < last_low) & (step_overshoot(response) < 0.9)
    if not spiked.any():
        return np.asarray(high - low)
    end = np.asarray(response.settling_time(0.1 * np.abs(final)))
    found = high - low
    for row in np.flatnonzero(spiked):
        alone = TimeResponse(response.pieces.rows(slice(row, row + 1)), True)
        found[row] = _first_reached(alone, 0.9 * final[row], last_low[row], end[row]) - last_low[row]
    return np.asarray(found)


def _first_reached(response: TimeResponse, level: float, start: float, end: float) -> float:
    """The first time in [start, end] s at which a single response reaches `level`, which it has reached at `end`."""
    for _ in range(NARROWED):
        times = np.linspace(start, end, SAMPLES)
        values = response.value(times)[0]
        reached = values >= level if level > 0 else values <= level
        reached[-1] = True
        first = max(int(reached.argmax()), 1)
        start, end = float(times[first - 1]), float(times[first])
    return end
