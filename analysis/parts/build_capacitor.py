"""From the claims about a capacitor to its model."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from reactance.analysis.design import Part
from reactance.analysis.parts import defaults, reading
from reactance.analysis.parts.band import UNITY, Band
from reactance.analysis.parts.base import Conditions, linear_drift
from reactance.analysis.parts.bias import (
    KEEPS_ALL,
    NOT_KNOWN,
    BiasLaw,
    HalfVoltage,
    estimated_half_voltage,
)
from reactance.analysis.parts.capacitor import CapacitorModel, Technology, ageing_factor
from reactance.analysis.parts.claims import Claims
from reactance.analysis.parts.common import Common, read_common
from reactance.analysis.parts.dielectrics import Dielectric, parse_dielectric
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.measured import read_measured
from reactance.analysis.parts.sections import sections_of
from reactance.analysis.parts.sizes import CHIP_INDUCTANCE, CHIP_INDUCTANCE_UNKNOWN
from reactance.analysis.quantity import format_quantity

# Names of land patterns and cases that give the technology away (IPC-7351 and EIA-535BAAC; common practice).
_PACKAGE_HINTS: tuple[tuple[re.Pattern[str], Technology], ...] = (
    (re.compile(r"CAPAE|CAPPRD|ELEC|ALUM|RADIAL.*(?:POL|EL)", re.IGNORECASE), "aluminium"),
    (re.compile(r"CAPMP|TANT|(?<!\d)(?:3216-1[08]|3528-(?:12|21)|6032-28|7343-\d\d)", re.IGNORECASE), "tantalum"),
    (re.compile(r"CAPC\d{4}", re.IGNORECASE), "ceramic"),
)
_POSITIVE_NAMES = ("+", "P", "POS", "A", "ANODE")
_NEGATIVE_NAMES = frozenset(("-", "N", "NEG", "K", "CATHODE"))
_POLARISED_TECHNOLOGIES = frozenset(("aluminium", "tantalum", "polymer"))


@dataclass(frozen=True, slots=True)
class _Nature:
    """What a capacitor is made of."""

    technology: Technology
    dielectric: Dielectric | None
    polarised: bool

    @property
    def is_class_i(self) -> bool:
        return self.dielectric is not None and self.dielectric.family == 1

    @property
    def is_class_ii(self) -> bool:
        return self.dielectric is not None and self.dielectric.family in (2, 3)


def build_capacitor(part: Part, claims: Claims, knowledge: Knowledge, conditions: Conditions) -> CapacitorModel:
    """The model of a capacitor from what is claimed about it, with assumptions where nothing is."""
    common = read_common(claims)
    nature = _nature(part, claims, common)
    tolerance = _tolerance(claims, common, nature)
    rated = claims.take("rated_voltage", reading.rated_voltage)
    esr, loss_tangent = _losses(claims, common, nature)
    esl = _inductance(claims, common, nature) + conditions.mounting_inductance
    measured = read_measured(claims, knowledge.files)
    if measured is not None:
        because = "a Touchstone file states no bias, temperature or age, so none is applied to its data"
        claims.assume("measured data", "as measured", because)
        claims.forget("esr", "esl", "loss_tangent")
        loss_tangent = 0.0
    return CapacitorModel(
        refdes=part.refdes,
        fitted=common.fitted,
        text=common.text,
        value=common.value,
        tolerance=tolerance,
        package=common.package,
        technology=nature.technology,
        dielectric=nature.dielectric.code if nature.dielectric else None,
        rated_voltage=rated,
        polarised=nature.polarised,
        positive_pin=positive_pin(part) if nature.polarised else None,
        esr=esr,
        esl=esl,
        loss_tangent=loss_tangent,
        leakage_resistance=_leakage(claims, common, nature, rated),
        dielectric_range=nature.dielectric.limits if nature.dielectric else None,
        derating=knowledge.derating.get(nature.technology, defaults.DERATING[nature.technology]),
        temperature=_temperature(claims, nature, conditions),
        ageing=_ageing(claims, nature, conditions),
        bias=_bias(claims, common, nature, len(sections_of("capacitor", part))),
        measured=measured,
        **claims.closing(used=common.used),
    )


def positive_pin(part: Part) -> str | None:
    """The designator of the positive pin: the one named +, P, POS, A or ANODE, else pin 1, else the first."""
    for name in _POSITIVE_NAMES:
        for pin in part.pins:
            if name in (pin.name.upper(), pin.number.upper()):
                return pin.number
    if any(pin.number == "1" for pin in part.pins):
        return "1"
    return part.pins[0].number if part.pins else None


def _nature(part: Part, claims: Claims, common: Common) -> _Nature:
    dielectric = claims.take("dielectric", reading.dielectric)
    technology = claims.take("technology", reading.technology)
    polarised = claims.take("polarised", reading.switch)
    if technology is None and dielectric is not None:
        technology = "film" if dielectric.family == 0 else "ceramic"
    if technology is None:
        technology = _hinted_technology(part, claims) or _assumed_technology(part, claims, common, polarised)
    if dielectric is not None and (dielectric.family == 0) != (technology == "film"):
        claims.tell("caution", f"dielectric {dielectric.code} does not go with {technology}; it is not used")
        claims.stated.pop("dielectric", None)
        dielectric = None
    if technology == "ceramic" and dielectric is None:
        dielectric = _assumed_dielectric(claims, common)
    if dielectric is not None and dielectric.disputed:
        claims.tell("caution", f"published tables disagree on the multiplier in {dielectric.code}; it is read as +1")
    if polarised is None:
        polarised = technology in _POLARISED_TECHNOLOGIES
    return _Nature(technology, dielectric, polarised)


def _hinted_technology(part: Part, claims: Claims) -> Technology | None:
    for claim in claims.of("package"):
        for pattern, technology in _PACKAGE_HINTS:
            if pattern.search(claim.text):
                claims.assume("technology", technology, f"its package is {claim.text}")
                return technology
    return None


def _assumed_technology(part: Part, claims: Claims, common: Common, polarised: bool | None) -> Technology:
    names = {name.upper() for pin in part.pins for name in (pin.name, pin.number)}
    marked = "+" in names or (names & {"P", "POS", "A", "ANODE"} and names & _NEGATIVE_NAMES)
    if polarised or (marked and polarised is None):
        claims.assume("technology", "aluminium", "it is polarised and nothing else is known")
        return "aluminium"
    if common.value is not None and common.value > defaults.ALUMINIUM_ABOVE and common.size is None:
        above = format_quantity(defaults.ALUMINIUM_ABOVE, "F")
        claims.assume("technology", "aluminium", f"none is stated and the value is above {above} (common practice)")
        return "aluminium"
    claims.assume("technology", "ceramic", "none is stated (common practice)")
    return "ceramic"


def _assumed_dielectric(claims: Claims, common: Common) -> Dielectric | None:
    if common.value is None:
        return None
    code = "C0G" if common.value <= defaults.CLASS_I_UP_TO * (1 + 1e-9) else "X7R"
    because = "no dielectric is stated: C0G up to 1 nF, X7R above (common practice)"
    claims.assume("dielectric", code, because)
    if common.fitted:
        claims.tell("note", f"no dielectric is stated, {code} is assumed")
    return parse_dielectric(code)


def _tolerance(claims: Claims, common: Common, nature: _Nature) -> tuple[float, float] | None:
    stated = common.tolerance(claims)
    if stated is not None or common.value is None:
        return stated
    if nature.technology == "ceramic":
        size = defaults.TOLERANCE_CLASS_I if nature.is_class_i else defaults.TOLERANCE_CLASS_II
        what = "class I ceramic" if nature.is_class_i else "class II ceramic"
    elif nature.technology == "film":
        size, what = defaults.TOLERANCE_FILM, "film"
    else:
        size, what = defaults.TOLERANCE_ELECTROLYTIC, nature.technology
    claims.assume("tolerance", f"±{format_quantity(size, 'fraction')}", f"usual for {what} (common practice)")
    return -size, size


def _losses(claims: Claims, common: Common, nature: _Nature) -> tuple[float, float]:
    """R_s in ohm and tan delta: a stated ESR stands alone, else both by technology."""
    stated = claims.take("esr", reading.quantity("ohm", greatest=reading.GREATEST_PARASITIC))
    if stated is not None:
        return stated, 0.0
    technology = nature.technology
    if technology == "aluminium":
        if common.value is None:
            return 0.0, 0.0
        esr = defaults.aluminium_resistance(common.value)
        because = "0.15/(2π·120 Hz·C), pessimistic above a few kHz (common practice)"
        claims.assume("esr", format_quantity(esr, "ohm"), because)
        return esr, 0.0
    esr = defaults.ESR[technology]
    claims.assume("esr", format_quantity(esr, "ohm"), f"usual for {technology} (common practice, from memory)")
    if technology == "ceramic":
        loss = defaults.LOSS_TANGENT_CLASS_II if nature.is_class_ii else defaults.LOSS_TANGENT_CLASS_I
    else:
        loss = defaults.LOSS_TANGENT[technology]
    if loss:
        claims.assume("loss_tangent", f"{loss:g}", f"usual for {technology} (common practice, from memory)")
    return esr, loss


def _inductance(claims: Claims, common: Common, nature: _Nature) -> float:
    """L_s of the part itself in henry, without mounting."""
    stated = claims.take("esl", reading.quantity("H"))
    if stated is not None:
        return stated
    if nature.technology != "ceramic":
        esl, because = defaults.ESL[nature.technology], f"usual for {nature.technology}"
    elif common.size is not None and common.size.code in CHIP_INDUCTANCE:
        esl, because = CHIP_INDUCTANCE[common.size.code], f"usual for {common.size.code}"
    else:
        esl, because = CHIP_INDUCTANCE_UNKNOWN, "no size code is known, as for 0805"
    claims.assume("esl", format_quantity(esl, "H"), f"{because} (common practice, from memory)")
    return esl


def _leakage(claims: Claims, common: Common, nature: _Nature, rated: float | None) -> float:
    """The leakage resistance in ohm, inf where there is none."""
    resistance = claims.take("leakage_resistance", reading.positive("ohm"))
    if resistance is not None:
        return resistance
    current = claims.take("leakage_current", reading.quantity("A"))
    if current is not None:
        if current == 0.0:
            return math.inf
        if rated is not None:
            return rated / current
        claims.tell("caution", "a leakage current needs a rated voltage at which it flows; it is not used")
    if nature.technology in ("aluminium", "tantalum") and common.value:
        resistance = 1.0 / (defaults.LEAKAGE_PER_CHARGE * common.value)
        because = f"usual for {nature.technology}, 0.01·C·V (common practice)"
        claims.assume("leakage_resistance", format_quantity(resistance, "ohm"), because)
        return resistance
    return math.inf


def _temperature(claims: Claims, nature: _Nature, conditions: Conditions) -> Band:
    coefficient = claims.take("temperature_coefficient", reading.coefficient)
    if coefficient is None and "dielectric" not in claims.stated:
        for claim in claims.of("temperature_coefficient")[:1]:
            claims.tell("caution", f"{claim.text!r} in {claim.source} is neither a dielectric code nor a coefficient")
    if not conditions.beyond_reference:
        return UNITY
    if coefficient is not None:
        return linear_drift(*coefficient, conditions)
    if nature.dielectric is None or nature.dielectric.family == 0:
        return UNITY
    if nature.is_class_i:
        low, _, high = nature.dielectric.coefficient
        return linear_drift(low, high, conditions)
    low, high = nature.dielectric.change
    return Band(1.0, 1.0 + low, 1.0 + high)


def _ageing(claims: Claims, nature: _Nature, conditions: Conditions) -> Band:
    stated = claims.take("ageing", reading.quantity("fraction", greatest=1.0))
    if stated is not None:
        return ageing_factor(stated, conditions.hours)
    if not nature.is_class_ii or nature.dielectric is None:
        return UNITY
    factor = ageing_factor(nature.dielectric.ageing, conditions.hours)
    if not factor.is_exact:
        share = format_quantity(nature.dielectric.ageing, "fraction")
        claims.assume("ageing", f"{share} per decade", f"usual for {nature.dielectric.code} (common practice)")
    return factor


def _bias(claims: Claims, common: Common, nature: _Nature, sections: int) -> BiasLaw:
    """The bias law; the sections of an array share the volume of its body."""
    curve = claims.take("bias_curve", reading.bias_curve("V"))
    if curve is not None:
        return curve
    half = claims.take("half_voltage", reading.positive("V"))
    if half is not None:
        return HalfVoltage(Band.exact(half))
    if not nature.is_class_ii or not common.value:
        return KEEPS_ALL
    if common.size is None:
        claims.assume("bias loss", "none", "no package, bias curve or half voltage is known to estimate it from")
        return NOT_KNOWN
    band = estimated_half_voltage(common.value, common.size.volume / max(sections, 1))
    low, high = format_quantity(band.low, "V"), format_quantity(band.high, "V")
    because = f"estimated from the geometry of {common.size.code}; a bias curve would narrow {low} to {high}"
    claims.assume("half_voltage", format_quantity(band.nominal, "V"), because)
    return HalfVoltage(band, common.size.code)
