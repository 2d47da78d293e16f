"""A frequency response: gain, corners, attenuation, ripple; its step response; its thermal noise."""

from __future__ import annotations

import math

from reactance.analysis.brief_tables import FilterTable
from reactance.analysis.circuit.noise import integrated_noise
from reactance.analysis.circuit.sweep import Response
from reactance.analysis.circuit.transient import TimeResponse
from reactance.analysis.gains import Reference, corner_high, corner_low, decibels, filter_reference, top_of_band
from reactance.analysis.measuring import Measuring
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Limit
from reactance.analysis.reuse import Results
from reactance.analysis.values import Value, unknown

SETTLED = 0.01  # of the final value
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
    top = top_of_band(seen.nominal_response(), asked_frequency(table))
    reference = filter_reference(seen.nominal_response(), top)
    if not reference.gain > 0:
        return {"gain": unknown("dB", "nothing passes: |H| is 0 in the whole band")}
    found = _in_frequency(seen, top, reference, table)
    if reference.frequency == 0.0:
        found |= _in_time(seen)
    kelvin = networks.board.conditions.temperature_high + ZERO_CELSIUS
    found["noise"] = seen.over_networks(
        lambda network: integrated_noise(network, networks.probe, kelvin),
        "V rms",
        f"at {networks.board.conditions.temperature_high:g} °C",
        "the noise has no upper frequency limit: no capacitance bounds it",
    )
    return found


def _in_frequency(seen: Measuring, top: float, nominal: Reference, table: FilterTable | None) -> Results:
    low_pass = nominal.frequency == 0.0

    def reference(response: Response) -> Reference:
        return Reference(abs(response.at_dc()), 0.0) if low_pass else filter_reference(response, top)

    def gain(response: Response) -> float:
        return decibels(reference(response).gain)

    def upper(response: Response) -> float:
        return corner_high(response, reference(response), top)

    def lower(response: Response) -> float:
        return corner_low(response, reference(response))

    where = "at DC" if low_pass else f"at {format_quantity(nominal.frequency, 'Hz')}"
    found: Results = {"gain": seen.swept(gain, "dB", where, "nothing passes")}
    for name, corner in (("corner_low", lower), ("corner_high", upper)):
        value = seen.swept(corner, "Hz", "", "there is none")
        if value.known:
            found[name] = value
    for entry in table.attenuation if table else ():
        at = float(entry.at)

        def attenuation(response: Response, at: float = at) -> float:
            return decibels(reference(response).gain / abs(response.at(at)))

        found[f"attenuation@{frequency_label(at)}"] = seen.swept(attenuation, "dB", "", "nothing passes there")
    if table and table.passband:
        found["ripple"] = _ripple(seen, table, nominal)
    return found


def passband(table: FilterTable | None, reference: Reference) -> tuple[float, float] | None:
    """The passband in Hz that the brief states; from DC for a low-pass, else from the reference's frequency."""
    if table is None or table.passband is None:
        return None
    start = table.passband.from_ if table.passband.from_ is not None else reference.frequency
    return float(start), float(table.passband.to)


def _ripple(seen: Measuring, table: FilterTable, reference: Reference) -> Value:
    band = passband(table, reference)
    if band is None or not band[0] < band[1]:
        return unknown("dB", "the passband is empty: state its `from`")
    low, high = band

    def ripple(response: Response) -> float:
        greatest, least = response.greatest(low, high)[1], response.least(low, high)[1]
        return decibels(greatest / least) if least > 0 else math.inf

    note = f"{format_quantity(low, 'Hz')} to {format_quantity(high, 'Hz')}"
    return seen.swept(ripple, "dB", note, "nothing passes in a part of the passband")


def _in_time(seen: Measuring) -> Results:
    def overshoot(step: TimeResponse) -> float:
        return step_overshoot(step)

    def rise(step: TimeResponse) -> float:
        return rise_time(step)

    def settling(step: TimeResponse) -> float:
        return step.settling_time(SETTLED * abs(step.final))

    why = "the step response does not settle"
    return {
        "overshoot": seen.stepped(overshoot, "1", "", why),
        "rise_time": seen.stepped(rise, "s", "10 % to 90 %", why),
        "settling": seen.stepped(settling, "s", "within 1 %", why),
    }


def step_overshoot(step: TimeResponse) -> float:
    """How far a step response goes beyond its final value, over that value; 0 where it does not."""
    if not step.final or not math.isfinite(step.final):
        return math.nan
    _, greatest = step.greatest_toward(step.final)
    return max(0.0, greatest / step.final - 1.0)


def rise_time(step: TimeResponse) -> float:
    """Time from the first crossing of 10 % to that of 90 % of the final value, in seconds."""
    low, high = step.first_crossing(0.1 * step.final), step.first_crossing(0.9 * step.final)
    return math.nan if low is None or high is None else high - low
