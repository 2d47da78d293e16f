"""What kind of part a reference designator names."""

from __future__ import annotations

import re

from reactance.analysis.parts.base import Kind

# Class letters of IEEE 315-1975, clause 22, and what is common practice beside them (marked *).
CLASS_LETTERS: dict[str, Kind] = {
    "C": "capacitor",
    "R": "resistor",
    "L": "inductor",
    "FB": "bead",  # *
    "RN": "resistor",  # * resistor network
    "RP": "resistor",  # * resistor pack
    "RA": "resistor",  # * resistor array
    "CA": "capacitor",  # * capacitor array
    "BEAD": "bead",  # *
    "FER": "bead",  # *
    "CAP": "capacitor",  # *
    "RES": "resistor",  # *
    "IND": "inductor",  # *
}

OTHER_LETTERS = frozenset(
    (
        *("A", "AR", "AT", "B", "BT", "CB", "CN", "CON", "CONN", "CP", "CR", "D", "DL", "DS", "DZ", "E", "F", "FL"),
        *("FT", "G", "H", "HY", "IC", "J", "JP", "K", "LD", "LED", "LS", "M", "MG", "MH", "MK", "MOV", "MP", "MT"),
        *("P", "PS", "Q", "RE", "RLA", "RLY", "RT", "RV", "S", "SP", "SW", "T", "TB", "TC", "TP", "TR", "TVS", "U"),
        *("UN", "V", "VR", "W", "X", "XA", "XTAL", "Y", "Z", "ZD", "NTC", "PTC", "VAR", "POT", "BAT", "FID"),
    )
)

# Letters of other classes under which some authors draw capacitors: taken for one only if the value is one.
PERHAPS_CAPACITOR = frozenset(("CN", "CP", "TC", "FT", "FL", "CT", "CE", "CX", "CY", "EC"))

_LETTERS = re.compile(r"([A-Za-z]+)(?=[\d?*_]|$)")
_LAST_WORD = re.compile(r".*[_-]([A-Za-z]+)\d+[A-Za-z]?")


def class_letters(refdes: str) -> str:
    """The letters that a designator begins with, after any path: `PSU/C5`, `A1.C5`, `PSU_C5` and `C5A` give `C`."""
    for level in reversed(re.split(r"[/.:\\]", refdes.strip())):
        match = _LETTERS.match(level)
        if match:
            letters, word = match[1].upper(), _LAST_WORD.fullmatch(level)
            known = letters in CLASS_LETTERS or letters in OTHER_LETTERS
            return letters if known or not word else word[1].upper()
    return ""


def kind_by_refdes(refdes: str) -> Kind | None:
    """The kind that the class letters name; None where they are no known class."""
    letters = class_letters(refdes)
    if letters in CLASS_LETTERS:
        return CLASS_LETTERS[letters]
    return "other" if letters in OTHER_LETTERS else None
