"""Tolerances, preferred values and short value codes: IEC 60062, IEC 60063."""

from __future__ import annotations

import re
from typing import Literal

from reactance.analysis.quantity import QuantityError, parse_quantity

# IEC 60062:2016, clause 5: tolerance letters in percent, (low, high).
TOLERANCE_PERCENT: dict[str, tuple[float, float]] = {
    "B": (-0.1, 0.1),
    "C": (-0.25, 0.25),
    "D": (-0.5, 0.5),
    "F": (-1.0, 1.0),
    "G": (-2.0, 2.0),
    "J": (-5.0, 5.0),
    "K": (-10.0, 10.0),
    "M": (-20.0, 20.0),
    "Z": (-20.0, 80.0),
}

# The same letters on capacitors below 10 pF, in picofarad (IEC 60062:2016, clause 5).
TOLERANCE_PICOFARAD: dict[str, float] = {"B": 0.1, "C": 0.25, "D": 0.5, "F": 1.0, "G": 2.0}
PICOFARAD_LETTERS_BELOW = 10e-12

# IEC 60063:2015: E24 is a list of its own; E192 is the rounded geometric series but for 9.20.
E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
E192 = tuple(920 if step == 185 else round(100 * 10 ** (step / 192)) for step in range(192))
Series = Literal[3, 6, 12, 24, 48, 96, 192]

_NUMBER = r"\d+(?:[.,]\d+)?"
_SYMMETRIC = re.compile(rf"(?:±|\+\s*/\s*-|\+-)?\s*(?P<size>{_NUMBER})\s*(?P<unit>%|pF|percent)", re.IGNORECASE)
_ASYMMETRIC = re.compile(
    rf"(?P<s1>[+-])\s*(?P<n1>{_NUMBER})\s*%?\s*[/,]?\s*(?P<s2>[+-])\s*(?P<n2>{_NUMBER})\s*%?", re.IGNORECASE
)


def series(n: Series) -> tuple[float, ...]:
    """The values of series E`n` in one decade, from 1 up (IEC 60063)."""
    if n <= 24:
        return tuple(value / 10 for value in E24[:: 24 // n])
    return tuple(value / 100 for value in E192[:: 192 // n])


def is_preferred(value: float, n: Series) -> bool:
    """Whether a positive `value` belongs to series E`n`, in any decade."""
    exponent = int(f"{value:.6e}".partition("e")[2])
    mantissa = value / 10.0**exponent
    return any(abs(mantissa - one) < 1e-6 for one in (*series(n), 10.0 * series(n)[0]))


def parse_tolerance(text: str, nominal: float | None) -> tuple[float, float]:
    """A tolerance as fractions (low, high): `10 %`, `±0.25 pF`, `K`, `+80/-20 %`.

    A bare number of 1 or more is percent (common practice). `nominal` in farad turns absolute tolerances
    into fractions, and decides what a letter means below 10 pF. Raises QuantityError.
    """
    plain = text.strip().replace("\u2212", "-")
    letter = plain.upper()
    if letter in TOLERANCE_PERCENT:
        return letter_tolerance(letter, nominal)
    match = _ASYMMETRIC.fullmatch(plain)
    if match and match["s1"] != match["s2"]:
        parts = sorted(float(match[s] + match[n].replace(",", ".")) / 100 for s, n in (("s1", "n1"), ("s2", "n2")))
        return parts[0], parts[1]
    match = _SYMMETRIC.fullmatch(plain)
    if match:
        return _symmetric(float(match["size"].replace(",", ".")), match["unit"], nominal, text)
    try:
        bare = parse_quantity(plain.lstrip("±"), "1")
    except QuantityError:
        bare = 0.0
    if not 1.0 <= bare < 100.0:
        raise QuantityError(f'{text!r} is not a tolerance; expected something like "10 %" or a letter such as K')
    return -bare / 100, bare / 100


def letter_tolerance(letter: str, nominal: float | None) -> tuple[float, float]:
    """What a tolerance letter means on a part of `nominal` farad, or on one whose value is no capacitance."""
    if nominal is not None and nominal < PICOFARAD_LETTERS_BELOW and letter in TOLERANCE_PICOFARAD:
        share = TOLERANCE_PICOFARAD[letter] * 1e-12 / nominal
        return -share, share
    low, high = TOLERANCE_PERCENT[letter]
    return low / 100, high / 100


def _symmetric(size: float, unit: str, nominal: float | None, text: str) -> tuple[float, float]:
    if unit.casefold() != "pf":
        return -size / 100, size / 100
    if not nominal:
        raise QuantityError(f"{text!r}: a tolerance in picofarad needs a capacitance to refer to")
    share = size * 1e-12 / nominal
    return -share, share


def picofarad_code(digits: str) -> float:
    """Three digits on a capacitor: two figures and a power of ten, in picofarad; returns farad.

    `104` is 100 nF. 8 and 9 stand for the powers -2 and -1 (EIA-198).
    """
    exponent = int(digits[2])
    power = {8: -2, 9: -1}.get(exponent, exponent)
    return float(f"{digits[:2]}e{power - 12}")
