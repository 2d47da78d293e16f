"""What the names of pins and nets tell: who drives, who receives, and which pins want a capacitor of their own.

All tables are common practice of pin naming. Names are compared in capitals, without marks of active-low pins and
without a channel's number or letter where that says nothing (`OUT1`, `OUTA`).
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from functools import lru_cache
from typing import Literal

from reactance.analysis.net_kinds import class_by_name
from reactance.analysis.topology import Terminal

Role = Literal["driver", "receiver", "connector", "part", "none"]


def _table(text: str) -> frozenset[str]:
    return frozenset(text.split())


# Class letters of IEEE 315 (and what stands beside it in use).
CONNECTORS = frozenset({"J", "P", "CN", "CON", "X", "XA", "XS", "XP", "JP", "TB", "USB", "H", "HDR", "K1"})
PROBES = frozenset({"TP", "TEST", "FID", "MP", "NT", "LOGO"})
CRYSTALS = frozenset({"Y", "XTAL", "XT", "X", "XC", "QZ", "CR"})
SOURCES = frozenset({"MK", "MIC", "BAT", "BT", "ANT", "AE", "G"})
SINKS = frozenset({"LS", "SPK", "HP", "M", "BZ"})
TRANSISTORS = frozenset({"Q", "T", "TR", "M", "VT"})
DIODES = frozenset({"D", "CR", "VD", "Z", "ZD", "TVS"})
SWITCHED_LOADS = frozenset({"K", "RL", "RLY", "M", "T", "Q", "D", "CR", "VT", "VD", "SCR", "TRIAC"})

_DRIVER_NAME = re.compile(
    r"(?:[AVL]?OUT|OUTPUT|[AV]O|DOUT|DACOUT|DAC)[PN+-]?|[1-8]?OUT|OUT[A-D]?[+-]?|SPK[PN+-]?|MICOUT"
)
_RECEIVER_NAME = re.compile(
    r"[+-]|[AVL]?IN|[AVL]?IN[A-D]?[PNM+-]|[+-]IN[A-D]?|[PNM]?IN[PNM]?|INPUT|[A-D]IN[PNM+-]?|[1-8]IN[+-]|INV|NINV|NONINV|MICIN|ADC|RFIN|IN[A-D]"
)
_INVERTING_NAME = re.compile(r"-|IN[A-D]?-|-IN[A-D]?|INV|IN[NM]|IN[A-D]?[NM]|NIN|[1-8]IN-|[A-D]IN-")
_CHANNEL = re.compile(r"[+-]?(?P<before>[A-D1-8])?[+-]?(?:V?IN|V?OUT)[+-]?(?P<after>[A-D1-8])?[PNM+-]?")
_CONTROL = {"B", "BASE", "G", "GATE"}
_CONTROLLED = {"C", "COLLECTOR", "D", "DRAIN"}

FEEDBACK_PINS = _table("FB VFB ADJ FBX VADJ SENSE VSENSE VOSNS VOS SNS FEEDBACK")
COMPENSATION_PINS = _table("COMP ITH VC EAO CMPN RC COMPENSATION EA EAOUT")
TIMING_PINS = _table(
    """
    RESET NRESET RESETN RST NRST RSTN MR NMR POR TIMER TMR CT CTIMER RTCT RT/CT SS SST TR TRK SS/TR SS/TRK
    SSTR TRACK SOFTSTART CSS DISCH DISCHARGE DIS THRES THRESHOLD THR TRIG TRIGGER DELAY DLY CD CDELAY CDLY
    TON TD TDLY CEXT RCEXT REXT/CEXT RX/CX CX WDT CWD CWT SRT CRST DVDT DV/DT SR CSLEW SLEW GATE_DELAY
    """
)
ENABLE_PINS = _table("EN ENABLE SHDN NSHDN SHUTDOWN ON ONOFF ON/OFF CE PWRUP RUN UVLO")
# Pins at which a part wants its own small supply held still, though the net is no rail.
HOLDING_PINS = _table(
    """
    VCAP CAP VREG REGOUT VREGOUT BYP BYPASS CBYP NR REF VREF REFOUT REFIN REFBUF REFCAP REFP VREFP VCOM VCM
    VMID DECOUP VDDCAP VCORE VINT INTVCC DVCAP AVCAP VBG BG LDO LDOOUT VLDO REFCOMP CREF
    """
)
BOOTSTRAP_PINS = _table("BST BOOT BOOTST CBOOT CBST VB HB BS BSTRAP")
SWITCH_WORDS = _table("SW LX PH PHASE SWN SWNODE VSW SWITCH HS")
_FLYING = re.compile(r"(?:C\d?|CAP\d?|CP|CF|CFLY\d?|FLY\d?|C\d?FLY)(?:[+-]|P|N|M)|[CV]\d[+-]|CP[12HL]|C\d[AB]")
TIMING_WORDS = _table(
    """
    RESET NRESET RESETN RST NRST RSTN TIMER CTIMER SOFTSTART DISCH THRES TRIG DELAY DLY CDELAY POR CEXT
    RCEXT
    """
)
REGULATOR_PINS = _table("EN ENABLE FB ADJ SW LX BST BOOT SHDN NR BYP PG COMP SENSE VFB ON")
_WORDS = re.compile(r"[_\s./:;{}()|-]+")


@lru_cache(maxsize=4096)  # a board has many pins and few names for them
def plain(name: str) -> str:
    """A pin's name in capitals, without marks of active-low pins."""
    text = name.strip().upper()
    if text.startswith("~{") and text.endswith("}"):
        text = text[2:-1]
    return text.strip("~!#*\\ ")


@lru_cache(maxsize=4096)
def stem(name: str) -> str:
    """`plain` without a number at its end."""
    text = plain(name)
    return text.rstrip("0123456789") or text


def words(name: str) -> frozenset[str]:
    """The words of a net's name, in capitals, numbers at their ends taken off."""
    last = name.rpartition("/")[2]
    return frozenset(part.strip("~!#*").rstrip("0123456789") for part in _WORDS.split(last.upper()) if part)


def is_named(terminal: Terminal, table: frozenset[str]) -> bool:
    """Whether the pin's name, or the name without its number, stands in `table`; connectors' names do not count."""
    if terminal.prefix in CONNECTORS or terminal.prefix in PROBES:
        return False
    return plain(terminal.name) in table or stem(terminal.name) in table


def is_flying(terminal: Terminal) -> bool:
    """Whether the pin is one of a charge pump's, for the capacitor that is carried to and fro."""
    return terminal.prefix == "U" and _FLYING.fullmatch(plain(terminal.name)) is not None


def is_inverting(terminal: Terminal) -> bool:
    """Whether the pin is named as an inverting input."""
    return any(_INVERTING_NAME.fullmatch(text) for text in _spellings(terminal))


def channel(terminal: Terminal) -> str:
    """The amplifier of several in one package that a pin belongs to: `A` of OUTA, `2` of IN2+; empty if not told."""
    found = _CHANNEL.fullmatch(plain(terminal.name).replace("_", ""))
    return (found["after"] or found["before"] or "") if found else ""


def _spellings(terminal: Terminal) -> tuple[str, ...]:
    """The name without underscores, as it is and without a number at its end."""
    text = plain(terminal.name).replace("_", "")
    return text, text.rstrip("0123456789") or text


def is_supply(terminal: Terminal) -> bool:
    """Whether the pin is named as a supply pin (VDDA, VCCIO, INTVCC …), whatever net it is on."""
    if terminal.prefix in CONNECTORS | PROBES | TRANSISTORS | DIODES:
        return False
    named = class_by_name(plain(terminal.name))
    return named.kind == "rail" or is_named(terminal, HOLDING_PINS)


def role(terminal: Terminal) -> Role:
    """Who this pin is to a signal: `part` where neither direction nor name tells, `none` for test points."""
    if terminal.prefix in PROBES:
        return "none"
    if terminal.prefix in SOURCES:
        return "driver"
    if terminal.prefix in CONNECTORS:
        return "connector"
    if terminal.direction == "output":
        return "driver"
    if terminal.direction == "input":
        return "receiver"
    return _role_by_name(terminal)


def _role_by_name(terminal: Terminal) -> Role:
    name = plain(terminal.name)
    if terminal.prefix in TRANSISTORS and name in _CONTROL | _CONTROLLED:
        return "receiver" if name in _CONTROL else "driver"
    if terminal.prefix in SINKS:
        return "receiver"
    for text in _spellings(terminal):
        if _DRIVER_NAME.fullmatch(text):
            return "driver"
        if _RECEIVER_NAME.fullmatch(text):
            return "receiver"
    return "part"


def roles(terminals: Iterable[Terminal]) -> frozenset[Role]:
    """The roles present on a net, test points left out."""
    return frozenset(found for terminal in terminals if (found := role(terminal)) != "none")


_POLARITY = re.compile(r"^(?P<head>.*?)[_]?(?P<mark>[+]|-|P|N|M|POS|NEG)(?P<tail>\d*)$")
_LEADING = re.compile(r"^(?P<mark>[+]|-|P_|N_)(?P<head>.+)$")
_PLUS = {"+", "P", "POS", "P_"}


def are_a_pair(one: str, other: str) -> bool:
    """Whether two names differ by polarity alone: `IN+` and `IN-`, `SENSE_P` and `SENSE_N`, `D+` and `D-`."""
    for pattern in (_POLARITY, _LEADING):
        a, b = pattern.match(plain(one)), pattern.match(plain(other))
        if a and b and a["head"] == b["head"] and (a["mark"] in _PLUS) != (b["mark"] in _PLUS):
            return pattern is _LEADING or a["tail"] == b["tail"]
    return False
