"""How each attribute's text or TOML value is read; the same for exports and `[[part]]` tables."""

from __future__ import annotations

import re
from collections.abc import Callable
from itertools import pairwise
from typing import cast

from reactance.analysis.parts.attributes import FALSE_WORDS, NOT_FITTED_WORDS, TRUE_WORDS, folded
from reactance.analysis.parts.base import Kind
from reactance.analysis.parts.bias import BiasCurve
from reactance.analysis.parts.capacitor import Technology
from reactance.analysis.parts.claims import Claim
from reactance.analysis.parts.codes import parse_tolerance
from reactance.analysis.parts.descriptions import TECHNOLOGY_WORDS, parse_description
from reactance.analysis.parts.dielectrics import Dielectric, parse_dielectric
from reactance.analysis.parts.values import GREATEST, UNIT_OF_KIND, Value, parse_value
from reactance.analysis.quantity import QuantityError, Unit, parse_quantity

TECHNOLOGIES = frozenset(("ceramic", "film", "aluminium", "tantalum", "polymer"))
GREATEST_PARASITIC = 1e3  # ohm: beyond it an ESR or DCR has been misread (MOHM for mohm)

_SIGNED = re.compile(r"\s*[-+\u2212](?!\s*/)")


def quantity(unit: Unit, least: float = 0.0, greatest: float = float("inf")) -> Callable[[Claim], float]:
    """A reader of quantities of `unit`, refusing what lies outside [least, greatest]."""

    def read(claim: Claim) -> float:
        number = claim.raw if isinstance(claim.raw, int | float) else claim.text
        found = parse_quantity(number, unit)
        if not least <= found <= greatest:
            raise QuantityError(f"{claim.text!r} is out of range")
        return found

    return read


def positive(unit: Unit) -> Callable[[Claim], float]:
    """A reader of quantities above zero."""
    return quantity(unit, least=5e-324)


def value(kind: Kind) -> Callable[[Claim], Value]:
    """A reader of a part's value."""

    def read(claim: Claim) -> Value:
        if isinstance(claim.raw, int | float) and not isinstance(claim.raw, bool):
            number = quantity(UNIT_OF_KIND[kind], 0.0 if kind == "resistor" else 5e-324, GREATEST[kind])(claim)
            return Value(number)
        return parse_value(claim.text, kind)

    return read


def tolerance(nominal: float | None) -> Callable[[Claim], tuple[float, float]]:
    """A reader of tolerances; a bare TOML number is a fraction. `nominal` in farad."""

    def read(claim: Claim) -> tuple[float, float]:
        if isinstance(claim.raw, int | float) and not isinstance(claim.raw, bool):
            low, high = -float(claim.raw), float(claim.raw)
        else:
            low, high = _tolerance_in(claim.text, nominal)
        if not -1.0 < low <= high:
            raise QuantityError(f"{claim.text!r} is no tolerance that a part can have")
        return low, high

    return read


def _tolerance_in(text: str, nominal: float | None) -> tuple[float, float]:
    """A tolerance alone or within other words (`±10 % (K)`)."""
    try:
        return parse_tolerance(text, nominal)
    except QuantityError:
        piece = parse_description(text, "other").get("tolerance")
        if piece is None:
            raise
        return parse_tolerance(piece, nominal)


def switch(claim: Claim) -> bool:
    """Yes or no, in the words of exports."""
    if isinstance(claim.raw, bool):
        return claim.raw
    word = folded(claim.text)
    if word in FALSE_WORDS or word in NOT_FITTED_WORDS or word == "notfitted":
        return False
    if word in TRUE_WORDS:
        return True
    raise QuantityError(f"{claim.text!r} is neither yes nor no")


def technology(claim: Claim) -> Technology:
    """One of the five technologies, or a trade word for one."""
    word = claim.text.strip().casefold()
    if word not in TECHNOLOGIES:
        word = TECHNOLOGY_WORDS.get(claim.text.strip().upper().replace("-", ""), "")
    if not word:
        found = parse_description(claim.text, "capacitor")
        word = found.get("technology", "")
    if not word:
        raise QuantityError(f"{claim.text!r} is none of {', '.join(sorted(TECHNOLOGIES))}")
    return cast(Technology, word)


def dielectric(claim: Claim) -> Dielectric:
    """A dielectric code, alone or within other words."""
    found = parse_dielectric(claim.text)
    if found is None:
        found = parse_dielectric(parse_description(claim.text, "capacitor").get("dielectric", ""))
    if found is None:
        raise QuantityError(f'{claim.text!r} is no dielectric code; expected something like "X7R"')
    return found


def rated_voltage(claim: Claim) -> float:
    """A rated voltage in V, alone or with words around it (`25 WVDC`, `16V DC`)."""
    read = positive("V")
    try:
        return read(claim)
    except QuantityError:
        piece = parse_description(claim.text, "capacitor").get("rated_voltage")
        if piece is None:
            raise
        return read(Claim(piece, claim.source))


def coefficient(claim: Claim) -> tuple[float, float]:
    """A temperature coefficient in 1/K as (low, high): `100 ppm/K` is ±100, `-750 ppm/K` is just that."""
    if isinstance(claim.raw, int | float) and not isinstance(claim.raw, bool):
        size = float(claim.raw)
        signed = size < 0
    else:
        plain = claim.text.strip()
        signed = bool(_SIGNED.match(plain))
        size = parse_quantity(re.sub(r"^(?:±|\+\s*/?\s*-)\s*", "", plain), "ppm/K")
    if abs(size) > 1e5:
        raise QuantityError(f"{claim.text!r} is out of range")
    return (size / 1e6, size / 1e6) if signed else (-size / 1e6, size / 1e6)


def bias_curve(unit: Unit) -> Callable[[Claim], BiasCurve]:
    """A reader of `[["0 V", 1.0], ["5 V", 0.62]]`, or in an export of `0 V: 1; 5 V: 0.62`."""

    def read(claim: Claim) -> BiasCurve:
        raw = claim.raw if claim.is_knowledge else [pair.split(":") for pair in re.split("[;,]", claim.text)]
        if not isinstance(raw, list) or not raw:
            raise QuantityError(f"{claim.text!r} is no bias curve; expected pairs of a voltage and a factor")
        points = tuple(_point(pair, unit) for pair in raw)
        if any(b[0] <= a[0] for a, b in pairwise(points)):
            raise QuantityError(f"{claim.text!r}: the steps of a bias curve must rise")
        return BiasCurve(points)

    return read


def _point(pair: object, unit: Unit) -> tuple[float, float]:
    if not isinstance(pair, list) or len(pair) != 2 or not all(isinstance(x, str | int | float) for x in pair):
        raise QuantityError(f"{pair!r} is no point of a bias curve; expected a voltage or current and a factor")
    at, factor = parse_quantity(pair[0], unit), parse_quantity(pair[1], "fraction")
    if at < 0.0 or not 0.0 < factor <= 2.0:
        raise QuantityError(f"{pair!r} is no point of a bias curve: out of range")
    return at, factor
