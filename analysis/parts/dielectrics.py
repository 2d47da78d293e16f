"""Dielectric codes of ceramic capacitors, and film materials.

Class I: EIA-198-1-F and IEC 60384-21. Classes II and III: EIA-198-1-F and IEC 60384-22.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Literal

# Class I, first letter: significant figure of the temperature coefficient, ppm/K.
CLASS1_FIGURE: dict[str, float] = {
    "C": 0.0,
    "B": 0.3,
    "L": 0.8,
    "A": 0.9,
    "M": 1.0,
    "P": 1.5,
    "R": 2.2,
    "S": 3.3,
    "T": 4.7,
    "V": 5.6,
    "U": 7.5,
}
# Class I, digit. Published tables disagree on 4 and 5 (some give +1 to 4, some to 5, one -10000 to 4): both
# are read as +1, and a board that relies on one is told so.
CLASS1_MULTIPLIER: dict[str, float] = {
    "0": -1.0,
    "1": -10.0,
    "2": -100.0,
    "3": -1000.0,
    "4": 1.0,
    "5": 1.0,
    "6": 10.0,
    "7": 100.0,
    "8": 1000.0,
}
CLASS1_DISPUTED = frozenset("45")
# Class I, last letter: tolerance of the coefficient, ppm/K.
CLASS1_TOLERANCE: dict[str, float] = {
    "G": 30.0,
    "H": 60.0,
    "J": 120.0,
    "K": 250.0,
    "L": 500.0,
    "M": 1000.0,
    "N": 2500.0,
}
CLASS1_RANGE = (-55.0, 125.0)

# Classes II and III: lowest and highest temperature in degC, greatest change in percent.
CLASS2_LOW: dict[str, float] = {"X": -55.0, "Y": -30.0, "Z": 10.0}
CLASS2_HIGH: dict[str, float] = {"4": 65.0, "5": 85.0, "6": 105.0, "7": 125.0, "8": 150.0, "9": 200.0}
CLASS2_CHANGE: dict[str, tuple[float, float]] = {
    "A": (-1.0, 1.0),
    "B": (-1.5, 1.5),
    "C": (-2.2, 2.2),
    "D": (-3.3, 3.3),
    "E": (-4.7, 4.7),
    "F": (-7.5, 7.5),
    "P": (-10.0, 10.0),
    "R": (-15.0, 15.0),
    "S": (-22.0, 22.0),
    "T": (-33.0, 22.0),
    "U": (-56.0, 22.0),
    "V": (-82.0, 22.0),
}
CLASS3_CHANGES = frozenset("TUV")  # EIA-198 counts the widest changes as class III; they behave as class II

# Ageing per decade of hours by the last letter (common practice); S, T and the tighter codes from memory.
AGEING: dict[str, float] = {"R": 0.025, "P": 0.025, "V": 0.07, "U": 0.07, "S": 0.05, "T": 0.05}
AGEING_OTHERWISE = 0.025
AGEING_BY_CODE: dict[str, float] = {"X5R": 0.05}

# Other names of class I codes. COG and NPO are the usual misspellings; the N and P names are the older
# industry ones (EIA-198, from memory).
SYNONYMS: dict[str, str] = {
    "NP0": "C0G",
    "NPO": "C0G",
    "COG": "C0G",
    "CG": "C0G",
    "COH": "C0H",
    "COJ": "C0J",
    "COK": "C0K",
    "P100": "M7G",
    "N033": "S1G",
    "N075": "U1G",
    "N150": "P2H",
    "N220": "R2H",
    "N330": "S2H",
    "N470": "T2H",
    "N750": "U2J",
    "N1500": "P3K",
    "N2200": "R3L",
}

# Film materials (ISO 1043-1 symbols and the usual type letters).
FILM: dict[str, str] = {
    "PP": "PP",
    "POLYPROPYLENE": "PP",
    "MKP": "PP",
    "FKP": "PP",
    "PET": "PET",
    "POLYESTER": "PET",
    "MKT": "PET",
    "MKS": "PET",
    "PEN": "PEN",
    "MKN": "PEN",
    "PPS": "PPS",
    "MKI": "PPS",
    "POLYSTYRENE": "PS",
}

_CLASS1 = re.compile(rf"([{''.join(CLASS1_FIGURE)}])([0-8])([{''.join(CLASS1_TOLERANCE)}])")
_CLASS2 = re.compile(rf"([XYZ])([4-9])([{''.join(CLASS2_CHANGE)}])")
# Class I codes that are met in descriptions; others would be confused with ordinary words there.
COMMON_CLASS1 = frozenset(
    (
        *("C0G", "C0H", "C0J", "C0K", "NP0", "NPO", "COG", "COH", "COJ", "COK", "U2J", "U2K", "T2H"),
        *("S2H", "R2H", "P2H", "S2L", "P3K", "R3L", "M7G", "S1G", "U1G"),
    )
)


@dataclass(frozen=True, slots=True)
class Dielectric:
    """A dielectric: `family` 1, 2 or 3 for ceramics, 0 for film. `limits` in degC where known.

    Class I has `coefficient` (low, nominal, high) in 1/K; classes II and III `change` (low, high) as
    fractions over the whole range, and `ageing` per decade of hours.
    """

    code: str
    family: Literal[0, 1, 2, 3]
    limits: tuple[float, float] | None = None
    coefficient: tuple[float, float, float] = (0.0, 0.0, 0.0)
    change: tuple[float, float] = (0.0, 0.0)
    ageing: float = 0.0
    disputed: bool = False


def parse_dielectric(text: str) -> Dielectric | None:
    """The dielectric behind a code such as `X7R`, `NP0`, `U2J` or `PP`, or None."""
    code = text.strip().upper()
    code = SYNONYMS.get(code, code)
    if code in FILM:
        return Dielectric(FILM[code], 0)
    match = _CLASS2.fullmatch(code)
    if match:
        low, high = CLASS2_CHANGE[match[3]]
        ageing = AGEING_BY_CODE.get(code, AGEING.get(match[3], AGEING_OTHERWISE))
        limits = CLASS2_LOW[match[1]], CLASS2_HIGH[match[2]]
        family: Literal[2, 3] = 3 if match[3] in CLASS3_CHANGES else 2
        return Dielectric(code, family, limits, change=(low / 100, high / 100), ageing=ageing)
    match = _CLASS1.fullmatch(code)
    if match:
        nominal = CLASS1_FIGURE[match[1]] * CLASS1_MULTIPLIER[match[2]]
        spread = CLASS1_TOLERANCE[match[3]]
        coefficient = ((nominal - spread) * 1e-6, nominal * 1e-6, (nominal + spread) * 1e-6)
        return Dielectric(code, 1, CLASS1_RANGE, coefficient, disputed=match[2] in CLASS1_DISPUTED)
    return None
