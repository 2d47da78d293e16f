"""What each net is: ground, a supply rail and its voltage, or a signal; and because of what.

The brief decides where it speaks. Elsewhere the name does, by the habits of the trade collected in the tables
below (all of them common practice). A name that could mean two things is not guessed: a rail whose digits are
ambiguous has no voltage, and a net about a supply (`3V3_PG`, `V_SENSE_5V`) is a signal.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from fnmatch import fnmatchcase
from functools import lru_cache

from reactance.analysis.report import NetKind


@dataclass(frozen=True, slots=True)
class NetClass:
    """What a net is; `volts` where its voltage is known (0 for a ground); `because` in words."""

    kind: NetKind
    volts: float | None
    because: str


def _words(text: str) -> frozenset[str]:
    return frozenset(text.split())


# A net with one of these words says something about a supply, or serves its converter; it is none.
_ABOUT_A_SUPPLY = _words(
    """EN ENA ENABLE NEN ENN ENB ON OFF ONOFF PG PGOOD NPG PWRGD PWROK POK GOOD OK FAIL FLT NFLT FAULT NFAULT ALERT
    FB VFB FEEDBACK SENSE SNS SEN VSENSE VSNS ISENSE ISNS KELVIN MON MONITOR IMON VMON MEAS DET DETECT NDET DIV
    DIVIDED SCALED CTRL CTL CONTROL PWM GATE GDRV DRV SHDN NSHDN SHUTDOWN STATUS STAT RST RESET NRST NRESET SEL
    SELECT TRIM ADJ SET VSET ISET ILIM ILIMIT COMP BST BOOT BOOTST LX PH PHASE SS TRK TRACK SYNC TEMP NTC THERM
    CHG CHARGE WAKE REQ ACK LEVEL LVL CMP THR"""
)
# These make a signal of a net that does not call itself a supply outright (`+`, VCC, VDD).
_INTERFACE = _words(
    """CLK CLOCK SCL SDA SCK SCLK MOSI MISO SDI SDO TX RX TXD RXD DATA GPIO INT NINT IRQ NIRQ BUTTON BTN KEY SW LED
    UART SIGNAL SIG LOGIC"""
)
# What reads a voltage; a supply for a converter only where the voltage could be one.
_READERS = _words("ADC AIN AN")
_GREATEST_READER_SUPPLY = 5.5

_GROUND_WORD = re.compile(r"(?:[A-FH-UW-Z]|SIG|PWR|ISO|DIG|ANA|CHASSIS|SHIELD)?GND[A-Z]{0,3}\d*|GROUND\d*|MASSE")
_GROUND_NAME = re.compile(r"[AD]?VSS(?:[AD]|IO|Q|PLL)?\d*|EARTH|PE|CHASSIS|CHASSISGND|0|0V|0\.0V|0V0|RTN|PWR_?RTN")

# The bodies of supply names; letters after VCC, VDD and their like name the consumer (VDDA, VCCIO).
_SUPPLY_PIN = re.compile(r"(?P<body>[ADP]?V(?:CC|DD|EE|BB|PP|AA|TT))(?P<tail>[A-Z]{0,6})(?P<digits>\d*)")
_SUPPLY_NAME = re.compile(
    r"V(?:BAT|BATT|BATTERY|BUS|SYS|SUP|SUPPLY|SUPP|CORE|PWR|MAIN|RAW|RTC|IO|NEG|POS|MOT|MOTOR)\d*"
    r"|BATT?\+|\+BATT?|\+VBATT?|V[+]|V-|VS[+]|VS-|\+?PWR|\+VS"
)
# What may stand before or after the figure inside one word: P3V3, N12V, VDD1V8, A5V, USB5V; 3V3A, 5VSB, 12VIN.
_BEFORE = re.compile(r"|V|P|VP|N|VN|NEG|A|D|USB|BAT|SYS|RF|IO|[ADP]?V(?:CC|DD|EE)[A-Z]{0,3}")
_AFTER = re.compile(r"|A|D|AN|AUX|IN|OUT|SB|STBY|SW|IO|USB|RF|DC|RAW|MAIN|BUS|SYS|ISO")
_FIGURE = re.compile(
    r"(?P<before>[A-Z]*?)"
    r"(?:(?P<a>\d{1,3})V(?P<b>\d{1,2})|(?P<c>\d{1,3}(?:[.,]\d{1,3})?)V|(?P<d>\d{1,2})P(?P<e>\d{1,2})V?)"
    r"(?P<after>[A-Z]*)"
)
_BARE_DECIMAL = re.compile(r"(?P<c>\d{1,2}\.\d{1,2})")
_SIGNED_NUMBER = re.compile(r"[+-](?P<c>\d{1,2}(?:\.\d{1,2})?)")
# A sign and a bare number is a rail only at a voltage that supplies really have.
_USUAL_VOLTS = frozenset({1.2, 1.5, 1.8, 2.5, 3.0, 3.3, 5.0, 6.0, 9.0, 10.0, 12.0, 15.0, 18.0, 24.0, 28.0, 36.0, 48.0})
_MINUS = {"N", "VN", "NEG"}
_MINUS_WORDS = {"NEG", "MINUS", "NEGATIVE"}
_SPLIT = re.compile(r"[_\s:;/|{}()<>\[\]]+|(?<=\w)-(?=\w)")
_UNDERSCORE_POINT = re.compile(r"^([+-]?(?:V|P|[AD]?VCC|[AD]?VDD)?_?\d)_(\d)V(?=_|$)")


def classify_nets(
    names: Iterable[str], *, ground: Sequence[str] = (), rails: Mapping[str, float | None] | None = None
) -> dict[str, NetClass]:
    """The class of each net in `names`.

    `ground`: names or glob patterns from the brief; empty means the usual ground names. `rails`: voltage in volts
    by net name, from the brief; None where the brief names a rail without one, which then comes from the name.
    """
    given = rails or {}
    exact = frozenset(ground)
    patterns = tuple(pattern for pattern in ground if any(sign in pattern for sign in "*?["))
    table: dict[str, NetClass] = {}
    for name in names:
        if name in given:
            table[name] = _briefed_rail(name, given[name])
        elif name in exact or any(fnmatchcase(name, pattern) for pattern in patterns):
            table[name] = NetClass("ground", 0.0, "the brief lists it as a ground")
        else:
            table[name] = _by_name_beside(name, bool(ground))
    return table


def class_by_name(name: str) -> NetClass:
    """What the name alone says of a net; also good for the name of a supply pin."""
    return _class_by_name(name)


def _briefed_rail(name: str, volts: float | None) -> NetClass:
    if volts is not None:
        return NetClass("rail", float(volts), "the brief lists it as a rail with this voltage")
    named = _class_by_name(name)
    if named.kind == "rail" and named.volts is not None:
        return NetClass("rail", named.volts, "the brief lists it as a rail; its name states the voltage")
    return NetClass("rail", None, "the brief lists it as a rail; neither brief nor name states its voltage")


def _by_name_beside(name: str, grounds_listed: bool) -> NetClass:
    named = _class_by_name(name)
    if named.kind == "ground" and grounds_listed:
        return NetClass("signal", None, "named like a ground, but the brief lists the grounds and not this one")
    return named


@lru_cache(maxsize=65536)
def _class_by_name(name: str) -> NetClass:
    last = name.rstrip("/").rpartition("/")[2] or name
    text = last.strip().upper().replace("−", "-").rstrip("!")
    words = [word for word in _SPLIT.split(_UNDERSCORE_POINT.sub(r"\1.\2V", text)) if word]
    about = next((word for word in words if _stem(word) in _ABOUT_A_SUPPLY), None)
    if about is not None:
        return NetClass("signal", None, f"{about} in its name makes it a signal, whatever voltage it mentions")
    if _is_ground(text, words):
        return NetClass("ground", 0.0, "its name is a usual ground's")
    return _rail_by_name(text, words) or NetClass("signal", None, "neither its name nor the brief makes it a supply")


def _stem(word: str) -> str:
    """The word without a count at its end and without marks of active-low signals."""
    return word.strip("~!#+-*").rstrip("0123456789")


def _is_ground(text: str, words: list[str]) -> bool:
    if _GROUND_NAME.fullmatch(text) or any(_GROUND_WORD.fullmatch(word) for word in words):
        return "VIRTUAL" not in words
    first = words[0] if words else ""
    if _GROUND_NAME.fullmatch(first) and first != "0":
        return len(words) == 1 or first not in {"PE", "RTN"}
    feed = words[:-1]
    return bool(feed) and words[-1] in {"RTN", "RETURN"} and _rail_by_name("_".join(feed), feed) is not None


def _rail_by_name(text: str, words: list[str]) -> NetClass | None:
    if not words:
        return None
    outright = text.startswith("+") or _supply_pin(words[0]) is not None
    stems = {_stem(word) for word in words}
    if stems & _INTERFACE and not outright and _figure(words[0]) is None:
        return None
    if stems & (_INTERFACE - {"SW", "LED"}) and not outright:
        return None
    volts = {value for word in words if (value := _figure(word)) is not None}
    if not volts and _supply_pin(words[0]) is not None:
        volts = {float(word) for word in words[1:] if _BARE_DECIMAL.fullmatch(word)}
    if not volts and (number := _SIGNED_NUMBER.fullmatch(text)) and float(number["c"]) in _USUAL_VOLTS:
        volts = {float(number["c"])}
    if len(volts) > 1:
        return None
    if volts:
        return _rail_with_voltage(volts.pop(), text, words, stems)
    return _rail_without_voltage(text, words, stems)


def _rail_with_voltage(volts: float, text: str, words: list[str], stems: set[str]) -> NetClass | None:
    if text.endswith("-") or not 0 < abs(volts) <= 999:
        return None
    if stems & _READERS and abs(volts) > _GREATEST_READER_SUPPLY:
        return None
    negative = text.startswith("-") or bool(_MINUS_WORDS & set(words)) or any(w.startswith("-") for w in words)
    if any(word.startswith(("VEE", "AVEE")) for word in words) and not negative and volts > 0:
        return NetClass("rail", None, "its name is a supply's; whether its voltage is negative is not told")
    signed = -abs(volts) if negative else volts
    return NetClass("rail", signed, f"its name states {signed:g} V".replace("-", "−"))


def _rail_without_voltage(text: str, words: list[str], stems: set[str]) -> NetClass | None:
    pin = _supply_pin(words[0])
    if pin is not None:
        digits = pin["digits"]
        unread = f"; what its digits {digits} say is not certain" if digits else ""
        return NetClass("rail", None, f"its name is a supply's, its voltage is not stated{unread}")
    named = _SUPPLY_NAME.fullmatch(text) or _SUPPLY_NAME.fullmatch(words[0])
    if named and not stems & _READERS:
        return NetClass("rail", None, "its name is a supply's, its voltage is not stated")
    return None


def _supply_pin(word: str) -> re.Match[str] | None:
    found = _SUPPLY_PIN.fullmatch(word.lstrip("+-"))
    return found if found and found["tail"] not in _ABOUT_A_SUPPLY and found["tail"] not in _READERS else None


def _figure(word: str) -> float | None:
    """The voltage that one word of a name states, negative for N12V, else None."""
    found = _FIGURE.fullmatch(word.lstrip("+-").rstrip("+"))
    if not found or not _BEFORE.fullmatch(found["before"]) or not _AFTER.fullmatch(found["after"]):
        return None
    if found["a"]:
        value = float(f"{found['a']}.{found['b']}")
    elif found["c"]:
        value = float(found["c"].replace(",", "."))
    else:
        if not (found["before"] or word.startswith(("+", "-")) or word.endswith("V")):
            return None
        value = float(f"{found['d']}.{found['e']}")
    return -value if found["before"] in _MINUS else value
