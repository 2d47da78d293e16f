"""From the claims about a resistor, an inductor or a ferrite bead to its model."""

from __future__ import annotations

from reactance.analysis.design import Part
from reactance.analysis.parts import defaults, reading
from reactance.analysis.parts.band import UNITY
from reactance.analysis.parts.base import Conditions, linear_drift
from reactance.analysis.parts.bead import BeadModel, inductance_from_impedance
from reactance.analysis.parts.claims import Claims
from reactance.analysis.parts.common import Common, read_common
from reactance.analysis.parts.inductor import InductorModel
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.measured import read_measured
from reactance.analysis.parts.resistor import SHORT_BELOW, ResistorModel
from reactance.analysis.quantity import format_quantity


def build_resistor(part: Part, claims: Claims, conditions: Conditions) -> ResistorModel:
    """The model of a resistor."""
    common = read_common(claims)
    link = common.value is not None and common.value < SHORT_BELOW
    tolerance = (0.0, 0.0) if link else _tolerance(claims, common, defaults.TOLERANCE_RESISTOR)
    coefficient = claims.take("temperature_coefficient", reading.coefficient)
    if coefficient is None:
        for claim in claims.of("temperature_coefficient")[:1]:
            claims.tell("caution", f"{claim.text!r} in {claim.source} is no temperature coefficient")
    if coefficient is None and conditions.beyond_reference and not link:
        claims.assume("temperature_coefficient", "0 ppm/K", "none is stated")
    drift = linear_drift(*coefficient, conditions) if coefficient else UNITY
    return ResistorModel(
        refdes=part.refdes,
        fitted=common.fitted,
        text=common.text,
        value=common.value,
        tolerance=tolerance,
        package=common.package,
        drift=drift,
        **claims.closing(used=common.used),
    )


def build_inductor(part: Part, claims: Claims, knowledge: Knowledge) -> InductorModel:
    """The model of an inductor."""
    common = read_common(claims)
    tolerance = _tolerance(claims, common, defaults.TOLERANCE_INDUCTOR)
    saturation = claims.take("saturation_current", reading.positive("A"))
    if saturation is not None:
        claims.assume("saturation", "30 % loss at the saturation current", "usual definition (common practice)")
    return InductorModel(
        refdes=part.refdes,
        fitted=common.fitted,
        text=common.text,
        value=common.value,
        tolerance=tolerance,
        package=common.package,
        dcr=_dcr(claims),
        self_resonance=claims.take("self_resonance", reading.positive("Hz")),
        saturation_current=saturation,
        measured=read_measured(claims, knowledge.files),
        **claims.closing(used=common.used),
    )


def build_bead(part: Part, claims: Claims, knowledge: Knowledge) -> BeadModel:
    """The model of a ferrite bead, from its impedance at 100 MHz or from stated R, L and C."""
    common = read_common(claims)
    tolerance = _tolerance(claims, common, defaults.TOLERANCE_BEAD)
    resistance = claims.take("resistance", reading.positive("ohm"))
    inductance = claims.take("inductance", reading.positive("H"))
    if resistance is None:
        resistance = common.value
    if inductance is None and resistance is not None:
        inductance = inductance_from_impedance(resistance)
        because = "R/(2π·25 MHz) from its impedance at 100 MHz (common practice)"
        claims.assume("inductance", format_quantity(inductance, "H"), because)
    return BeadModel(
        refdes=part.refdes,
        fitted=common.fitted,
        text=common.text,
        value=common.value if common.value is not None else resistance,
        tolerance=tolerance,
        package=common.package,
        dcr=_dcr(claims),
        nominal_resistance=resistance,
        nominal_inductance=inductance,
        capacitance=claims.take("capacitance", reading.quantity("F")) or 0.0,
        bias=claims.take("bias_curve", reading.bias_curve("A")),
        measured=read_measured(claims, knowledge.files),
        **claims.closing(used=common.fitted and resistance is not None),
    )


def _tolerance(claims: Claims, common: Common, usual: float) -> tuple[float, float] | None:
    stated = common.tolerance(claims)
    if stated is not None or common.value is None:
        return stated
    size = format_quantity(usual, "fraction")
    claims.assume("tolerance", f"±{size}", f"usual for {claims.kind}s (common practice)")
    return -usual, usual


def _dcr(claims: Claims) -> float:
    stated = claims.take("dcr", reading.quantity("ohm", greatest=reading.GREATEST_PARASITIC))
    if stated is None:
        claims.assume("dcr", "0 Ω", "none is stated")
        return 0.0
    return stated
