"""The measures: what each one is, its unit, and which limit it can have. One table; the README is held to it."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Measure:
    """A measure: `scope` (rail, coupling, filter, part, net), name, SI unit, words, where its limit comes from."""

    scope: str
    name: str
    unit: str
    words: str
    limit: str = ""


MEASURES: tuple[Measure, ...] = (
    Measure("rail", "droop", "V", "greatest excursion of the rail after the load's step", "allowed"),
    Measure("rail", "resonant_droop", "V", "greatest excursion from the mean under a load that keeps switching "
            "at the worst rate", "allowed_rhythm"),
    Measure("rail", "impedance", "1", "greatest impedance over its target in the band", "1"),
    Measure("rail", "antiresonance", "Ω", "highest local maximum of the impedance in the band"),
    Measure("rail", "capacitance", "F", "effective capacitance from rail to ground"),
    Measure("rail", "bypass", "1", "capacitors to ground per supply pin of an IC", "bypass"),
    Measure("coupling", "dc", "V", "DC voltage from one end to the other"),
    Measure("coupling", "gain", "dB", "reference gain"),
    Measure("coupling", "corner", "Hz", "lower corner"),
    Measure("coupling", "loss", "dB", "loss at the lowest frequency", "loss"),
    Measure("coupling", "settling", "s", "time until the output has settled after power comes on", "settle.time"),
    Measure("coupling", "startup_peak", "V", "output farthest from zero while power comes on",
            "greatest_voltage, least_voltage of the pin"),
    Measure("coupling", "tilt", "1", "sag at the end of a rectangular pulse", "tilt.most"),
    Measure("coupling", "rejection", "dB", "least attenuation from a rail to the output", "rejection"),
    Measure("filter", "gain", "dB", "reference gain"),
    Measure("filter", "corner_low", "Hz", "lower corner", "corner, corner_low"),
    Measure("filter", "corner_high", "Hz", "upper corner", "corner, corner_high"),
    Measure("filter", "attenuation", "dB", "attenuation at one frequency", "attenuation.least"),
    Measure("filter", "ripple", "dB", "greatest minus least gain in the passband", "passband.ripple"),
    Measure("filter", "overshoot", "1", "overshoot of the step response", "step.overshoot"),
    Measure("filter", "rise_time", "s", "10 % to 90 % of the step response"),
    Measure("filter", "settling", "s", "step response stays within 1 % of its end", "step.settle"),
    Measure("filter", "noise", "V rms", "thermal noise of the resistances at the output"),
    Measure("filter", "rejection", "dB", "least attenuation from a rail to the output", "rejection"),
    Measure("part", "stress", "1", "DC voltage over rated voltage", "derating"),
    Measure("part", "polarity", "V", "voltage from the positive pin to the other", "0"),
    Measure("part", "range", "K", "distance of the board's temperatures from the edge of the dielectric's", "0"),
    Measure("net", "return", "1", "whether the net has a DC path to a defined potential", "1"),
)  # fmt: skip


def find_measure(scope: str, name: str) -> Measure:
    """The measure of that scope and name; raises KeyError where there is none."""
    for measure in MEASURES:
        if (measure.scope, measure.name) == (scope, name):
            return measure
    raise KeyError(f"{scope}:{name}")
