"""Values as the trade writes them, both ways.

Reading accepts SI prefixes with or without a space, a decimal comma, the infix notation of IEC 60062
(`4k7`, `2u2`, `R47`), and the spellings that exports and briefs really contain. A text that could mean two
things is refused with both meanings named; it is never guessed.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from decimal import Decimal
from typing import Literal

Unit = Literal["F", "H", "ohm", "V", "A", "s", "Hz", "degC", "dB", "fraction", "m", "ppm/K", "1"]

HOURS_PER_YEAR = 8766.0
KELVIN_AT_ZERO_CELSIUS = 273.15


class QuantityError(ValueError):
    """A text that is no quantity of the wanted unit; the message says what was read and what was expected."""


@dataclass(frozen=True, slots=True)
class _Kind:
    """How one unit is written: its name in messages, an example, its spellings, whether mega makes sense."""

    noun: str
    example: str
    spellings: tuple[str, ...]
    mega: bool = False
    prefixed: bool = True


_KINDS: dict[str, _Kind] = {
    "F": _Kind("capacitance", "4.7 uF", ("farads", "farad", "fd", "f")),
    "H": _Kind("inductance", "10 uH", ("henries", "henrys", "henry", "h")),
    "ohm": _Kind("resistance", "4.7 kohm", ("ohms", "ohm", "r"), mega=True),
    "V": _Kind("voltage", "3.3 V", ("volts", "volt", "vrms", "v rms", "vdc", "v dc", "v")),
    "A": _Kind("current", "800 mA", ("amperes", "ampere", "amps", "amp", "adc", "a")),
    "Hz": _Kind("frequency", "1.6 kHz", ("hertz", "hz"), mega=True),
    "m": _Kind("length", "1.6 mm", ("metres", "meters", "metre", "meter", "m")),
    "s": _Kind("time", "10 ns", ("seconds", "second", "secs", "sec", "s")),
    "1": _Kind("plain number", "2.5", (), mega=True),
    "degC": _Kind("temperature", "-20 degC", ("degc", "deg c", "°c", "° c", "c"), prefixed=False),
    "dB": _Kind("level", "35 dB", ("db",), prefixed=False),
    "fraction": _Kind("fraction", "10 %", ("%", "percent", "pct"), prefixed=False),
    "ppm/K": _Kind(
        "temperature coefficient",
        "100 ppm/K",
        ("ppm/k", "ppm/°c", "ppm/degc", "ppm/deg c", "ppm/c", "ppm"),
        prefixed=False,
    ),
}

# SI Brochure, 9th edition, table 7. Capital P, N, U and K come from exports that know only capitals; M stays
# mega and m milli (IEC 60062). `meg` is common practice.
_PREFIXES: dict[str, float] = {
    "": 1.0,
    "a": 1e-18,
    "f": 1e-15,
    "p": 1e-12,
    "P": 1e-12,
    "n": 1e-9,
    "N": 1e-9,
    "u": 1e-6,
    "U": 1e-6,
    "m": 1e-3,
    "k": 1e3,
    "K": 1e3,
    "M": 1e6,
    "meg": 1e6,
    "Meg": 1e6,
    "MEG": 1e6,
    "G": 1e9,
    "T": 1e12,
}

_TIMES: dict[str, float] = {
    "min": 60.0,
    "mins": 60.0,
    "minute": 60.0,
    "minutes": 60.0,
    "h": 3600.0,
    "hr": 3600.0,
    "hrs": 3600.0,
    "hour": 3600.0,
    "hours": 3600.0,
    "d": 86400.0,
    "day": 86400.0,
    "days": 86400.0,
    "week": 604800.0,
    "weeks": 604800.0,
    "month": HOURS_PER_YEAR / 12 * 3600.0,
    "months": HOURS_PER_YEAR / 12 * 3600.0,
    "a": HOURS_PER_YEAR * 3600.0,
    "y": HOURS_PER_YEAR * 3600.0,
    "yr": HOURS_PER_YEAR * 3600.0,
    "yrs": HOURS_PER_YEAR * 3600.0,
    "year": HOURS_PER_YEAR * 3600.0,
    "years": HOURS_PER_YEAR * 3600.0,
}

# Whole words that scale, by unit. MFD for microfarad and MMFD for picofarad are common practice of old lists.
_WORDS: dict[str, dict[str, float]] = {
    "s": _TIMES,
    "fraction": {"%": 0.01, "percent": 0.01, "pct": 0.01, "ppm": 1e-6},
    "1": {"%": 0.01, "percent": 0.01, "ppm": 1e-6},
    "F": {"mfd": 1e-6, "mfds": 1e-6, "mmfd": 1e-12, "uufd": 1e-12, "uuf": 1e-12},
}

_NUMBER = re.compile(
    r"(?P<number>[+-]?(?:\d+(?:[.,]\d*)?|[.,]\d+)(?:[eE][+-]?\d{1,3})?)\s*(?P<suffix>\D*)", re.ASCII
)
_INFIX = re.compile(
    r"(?P<sign>[+-]?)(?P<whole>\d*)(?P<letter>[A-Za-z])(?P<part>\d+)\s*(?P<suffix>[A-Za-z]*)", re.ASCII
)
_PLAIN = {"\u2212": "-", "\u00a0": " ", "\u202f": " ", "\u2009": " ", "\u00b5": "u", "\u03bc": "u"}
_PLAIN |= {"\u03a9": "ohm", "\u2126": "ohm", "\u2103": "°C", "\u00ba": "°"}
_TRANSLATION = str.maketrans(_PLAIN)


def parse_quantity(text: str | int | float, unit: Unit) -> float:
    """The value of `text` in SI base units.

    Temperatures come in degrees Celsius, `fraction` as a fraction (`"10 %"` is 0.1), `ppm/K` in ppm/K. A bare
    number is taken to be in that unit already. A year is 8766 h.

    Raises QuantityError with what was read and what was expected.
    """
    if isinstance(text, bool):
        raise _refusal(text, unit)
    if isinstance(text, int | float):
        return _finite(float(text), text, unit)
    plain = " ".join(text.translate(_TRANSLATION).split())
    match = _NUMBER.fullmatch(plain)
    if match and unit == "ohm" and re.fullmatch(r"\d+E\d", plain):
        raise _refusal(text, unit, "E could be a power of ten or the decimal point; write R for the point")
    if match:
        number = Decimal(match["number"].replace(",", "."))
        return _finite(_scaled(number, match["suffix"], unit, text), text, unit)
    match = _INFIX.fullmatch(plain)
    if match and _KINDS[unit].prefixed:
        return _finite(_infix(match, unit, text), text, unit)
    raise _refusal(text, unit)


def _finite(value: float, text: object, unit: str) -> float:
    if not math.isfinite(value):
        raise _refusal(text, unit)
    return value


def _refusal(text: object, unit: str, why: str = "") -> QuantityError:
    kind = _KINDS[unit]
    reason = f": {why}" if why else ""
    return QuantityError(f'{text!r} is not a {kind.noun}{reason}; expected something like "{kind.example}"')


def _scaled(number: Decimal, suffix: str, unit: str, text: str) -> float:
    """`number` with the unit and prefix written in `suffix`, in the base unit."""
    special = _special(number, suffix, unit)
    if special is not None:
        return special
    kind = _KINDS[unit]
    folded = suffix.casefold()
    for spelling in (*kind.spellings, ""):
        if not folded.endswith(spelling):
            continue
        head = suffix[: len(suffix) - len(spelling)].strip()
        if not kind.prefixed:
            if not head:
                return float(number)
            continue
        if head in _PREFIXES and (head or spelling or not suffix):
            return _times(number, _PREFIXES[_checked_prefix(head, spelling, unit, text)])
    raise _refusal(text, unit)


def _times(number: Decimal, scale: float) -> float:
    """The float nearest to the product in decimals: `2n2` is exactly what 2.2e-9 is."""
    return float(number * Decimal(repr(scale)))


def _special(number: Decimal, suffix: str, unit: str) -> float | None:
    """Suffixes that are no prefix and unit: long times, percent, kelvin, `100E`, and the old `MFD`."""
    if unit == "degC" and suffix == "K":
        return float(number - Decimal(repr(KELVIN_AT_ZERO_CELSIUS)))
    if unit == "ohm" and suffix == "E":
        return float(number)
    factor = _WORDS.get(unit, {}).get(suffix.casefold())
    if factor is None:
        return None
    return _times(number, factor)


def _checked_prefix(head: str, spelling: str, unit: str, text: str) -> str:
    kind = _KINDS[unit]
    if head == "M" and not kind.mega:
        raise _refusal(text, unit, "a capital M is mega, which cannot be meant; write m or u")
    if unit == "s" and head == "m" and not spelling:
        raise _refusal(text, unit, "it could be minutes or milliseconds; write min or ms")
    if head in ("a", "f") and not spelling:
        raise _refusal(text, unit, f"{head} alone is no unit here")
    return head


def _infix(match: re.Match[str], unit: str, text: str) -> float:
    """The notation of IEC 60062, in which a letter stands for the decimal point."""
    letter, suffix = match["letter"], match["suffix"]
    number = Decimal(f"{match['sign']}{match['whole'] or '0'}.{match['part']}")
    kind = _KINDS[unit]
    if letter.casefold() in kind.spellings and unit not in ("m",):
        if suffix:
            raise _refusal(text, unit)
        return float(number)
    if letter not in _PREFIXES or (suffix and suffix.casefold() not in kind.spellings):
        raise _refusal(text, unit)
    return _times(number, _PREFIXES[_checked_prefix(letter, suffix or unit, unit, text)])


_STEPS = tuple(zip(range(12, -16, -3), ("T", "G", "M", "k", "", "m", "µ", "n", "p", "f"), strict=True))
_SYMBOLS = {"ohm": "Ω", "degC": "°C", "1": "", "fraction": "%"}
_UNPREFIXED = frozenset({"degC", "dB", "fraction", "ppm/K", "1", "K"})


def format_quantity(value: float, unit: str, digits: int = 3) -> str:
    """`value` (SI; a fraction for `fraction`) for people, to `digits` significant digits.

    Engineering notation with SI prefixes, without trailing zeros: `4.7 µF`, `164 mV`, `1.59 kHz`. Long times
    come in minutes, hours or years. Infinite values read `∞`, undefined ones `unknown`.
    """
    symbol = _SYMBOLS.get(unit, unit)
    if math.isnan(value):
        return "unknown"
    if math.isinf(value):
        return _joined("∞" if value > 0 else "−∞", symbol)
    if unit == "s" and abs(value) >= 600.0:
        return _long_time(value, digits)
    if unit in _UNPREFIXED:
        return _joined(_significant(value * 100.0 if unit == "fraction" else value, digits), symbol)
    exponent = _rounded_exponent(value, digits)
    if not -16 < exponent < 15:
        return _joined(f"{value:.{digits - 1}e}" if value else "0", symbol)
    for power, prefix in _STEPS:
        if exponent >= power or power == -15:
            mantissa = value / 10.0**power if power >= 0 else value * 10.0**-power
            return _joined(_significant(mantissa, digits), prefix + symbol)
    raise AssertionError("every exponent has a step")


def _joined(number: str, symbol: str) -> str:
    return f"{number} {symbol}" if symbol else number


def _rounded_exponent(value: float, digits: int) -> int:
    """The power of ten of the first digit after rounding, so that 999.9 mV becomes 1 V."""
    return int(f"{value:.{digits - 1}e}".partition("e")[2]) if value else 0


def _significant(value: float, digits: int) -> str:
    """To `digits` significant digits without trailing zeros; no digit before the point is lost."""
    exponent = _rounded_exponent(value, digits)
    if value and (exponent < -4 or exponent > 14):
        return f"{value:.{digits - 1}e}"
    text = f"{value:.{max(0, digits - 1 - exponent)}f}"
    if "." in text:
        text = text.rstrip("0").rstrip(".")
    return "0" if text == "-0" else text


def _long_time(value: float, digits: int) -> str:
    hours = value / 3600.0
    if abs(hours) >= HOURS_PER_YEAR:
        years = _significant(hours / HOURS_PER_YEAR, digits)
        return f"{years} year" if years == "1" else f"{years} years"
    if abs(hours) >= 2.0:
        return f"{_significant(hours, digits)} h"
    return f"{_significant(value / 60.0, digits)} min"
