"""What the text of a value means on a part of a given kind."""

from __future__ import annotations

import re
from dataclasses import dataclass

from reactance.analysis.parts.base import Kind
from reactance.analysis.parts.codes import picofarad_code
from reactance.analysis.quantity import QuantityError, Unit, parse_quantity

UNIT_OF_KIND: dict[Kind, Unit] = {"capacitor": "F", "resistor": "ohm", "inductor": "H", "bead": "ohm"}

# Beyond these a value has been misread: `10K` on a capacitor is a tolerance gone astray, not 10 kF.
GREATEST: dict[Kind, float] = {"capacitor": 1e3, "resistor": 1e13, "inductor": 1e3, "bead": 1e5}

_CODE = re.compile(r"([1-9]\d\d)([BCDFGJKMZ]?)")
_R_POINT = re.compile(r"(\d*)R(\d+)([BCDFGJKM]?)", re.IGNORECASE)
_LETTER_BEHIND = re.compile(r"(.*(?:[A-Za-zµμΩ]\d*|\d[A-Za-z]))\s*([BCDFGJKMZ])")
_AT_FREQUENCY = re.compile(r"(?:Z\s*=\s*)?(.+?)\s*(?:@|\bat\b)\s*(.+)", re.IGNORECASE)
_PLAIN_NUMBER = re.compile(r"\+?\d*[.,]?\d+(?:[eE][+-]?\d+)?")


@dataclass(frozen=True, slots=True)
class Value:
    """A value in SI; the tolerance letter written behind it; what the reader should know about the reading."""

    value: float
    tolerance: str = ""
    remark: str = ""


def parse_value(text: str, kind: Kind) -> Value:
    """The value of a part of that `kind`; raises QuantityError where it is not understood."""
    plain = text.strip().strip("\"'")
    if kind == "capacitor":
        found = _capacitance(plain)
    elif kind == "bead":
        found = _impedance(plain)
    else:
        found = _with_letter(plain, kind)
        if kind == "inductor" and _PLAIN_NUMBER.fullmatch(plain):
            found = Value(_bare(plain, "H", 1.0))
    if not 0.0 <= found.value < GREATEST[kind] or (found.value == 0.0 and kind != "resistor"):
        raise QuantityError(f"{text!r} is out of range for a {kind}")
    return found


def _bare(plain: str, unit: Unit, below: float) -> float:
    """A number without unit, believed only where it can be nothing but SI (an export's 1e-7)."""
    value = parse_quantity(plain, unit)
    if not value < below or ("e" not in plain.casefold() and value > 1e-3):
        raise QuantityError(f"{plain!r} has no unit; write it with one, such as {plain}u")
    return value


def _capacitance(plain: str) -> Value:
    code = _CODE.fullmatch(plain)
    if code:
        remark = f"{plain!r} is read as a picofarad code" if code[1].endswith("0") else ""
        return Value(picofarad_code(code[1]), code[2], remark)
    point = _R_POINT.fullmatch(plain)
    if point:
        return Value(float(f"{point[1] or '0'}.{point[2]}e-12"), point[3].upper(), f"{plain!r} is read in picofarad")
    if _PLAIN_NUMBER.fullmatch(plain):
        return Value(_bare(plain, "F", 1e-1))
    return _with_letter(plain, "capacitor")


def _with_letter(plain: str, kind: Kind) -> Value:
    """A quantity, perhaps with a tolerance letter behind it (`4K7J`, `4n7K`)."""
    unit = UNIT_OF_KIND[kind]
    try:
        return Value(parse_quantity(plain, unit))
    except QuantityError as problem:
        behind = _LETTER_BEHIND.fullmatch(plain)
        if not behind:
            raise
        try:
            return Value(parse_quantity(behind[1], unit), behind[2])
        except QuantityError:
            raise problem from None  # the message is about the whole text


def _impedance(plain: str) -> Value:
    at = _AT_FREQUENCY.fullmatch(plain)
    if not at:
        return _with_letter(plain, "bead")
    frequency = parse_quantity(at[2], "Hz")
    if abs(frequency - 100e6) > 1e3:
        raise QuantityError(f"{plain!r}: a bead's impedance is understood at 100 MHz only")
    return Value(parse_quantity(at[1], "ohm"))
