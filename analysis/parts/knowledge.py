"""What a team knows about its parts: `[[part]]` tables of the brief and of `parts.toml`."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal, cast

from reactance.analysis.design import InputError, Place
from reactance.analysis.parts import reading
from reactance.analysis.parts.attributes import ALIASES
from reactance.analysis.parts.base import Kind
from reactance.analysis.parts.claims import Claim, toml_text
from reactance.analysis.quantity import QuantityError


@dataclass(frozen=True, slots=True)
class KnowledgeRow:
    """One `[[part]]` table: which parts it is about, and its attributes as raw TOML values.

    `match` holds glob patterns under `refdes`, `value` and `number`; all that are given must match. `source`
    is how the table is named where a value is shown with its origin (`board.brief.toml [[part]] 2`).
    """

    match: Mapping[str, str]
    attributes: Mapping[str, object]
    place: Place
    source: str = "[[part]]"


@dataclass(frozen=True, slots=True)
class Knowledge:
    """All rows in order of precedence (the brief's first), and what else the brief says about parts.

    `aliases` adds raw attribute names to canonical ones; `derating` maps a technology to its greatest stress;
    `files` maps the name of a Touchstone file, as written in a row, to its content.
    """

    rows: tuple[KnowledgeRow, ...] = ()
    aliases: Mapping[str, tuple[str, ...]] = field(default_factory=lambda: MappingProxyType({}))
    derating: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))
    files: Mapping[str, bytes] = field(default_factory=lambda: MappingProxyType({}))


Connection = Literal["shunt", "series", "one-port"]
CONNECTIONS: tuple[Connection, ...] = ("shunt", "series", "one-port")
_MATCH_KEYS = ("refdes", "value", "number")
_VALUE_KINDS: tuple[Kind, ...] = ("capacitor", "resistor", "inductor", "bead")


def _any_value(claim: Claim) -> object:
    """A value of some kind of part; which kind is known only once it meets one."""
    for kind in _VALUE_KINDS:
        try:
            return reading.value(kind)(claim)
        except QuantityError:
            continue
    raise QuantityError(f'{claim.text!r} is no value; expected something like "10 uF", "4.7 kohm" or "2.2 uH"')


def _any_curve(claim: Claim) -> object:
    try:
        return reading.bias_curve("V")(claim)
    except QuantityError:
        return reading.bias_curve("A")(claim)


def touchstone(claim: Claim) -> tuple[str, Connection]:
    """The file and the connection of `touchstone = { file = "c10u.s2p", connection = "shunt" }`."""
    table = claim.raw
    if not isinstance(table, dict) or not set(table) <= {"file", "connection"} or "file" not in table:
        raise QuantityError('expected { file = "c10u.s2p", connection = "shunt" }')
    file, connection = table["file"], table.get("connection", "one-port")
    if not isinstance(file, str) or connection not in CONNECTIONS:
        raise QuantityError(f"file must be a text and connection one of {', '.join(CONNECTIONS)}")
    return file, cast(Connection, connection)


def _package(claim: Claim) -> object:
    if not isinstance(claim.raw, str):
        raise QuantityError(f'{claim.text!r} is no package; expected a text such as "0805"')
    return claim.text


_READERS: dict[str, Callable[[Claim], object]] = {
    "value": _any_value,
    "tolerance": reading.tolerance(1e-9),
    "technology": reading.technology,
    "dielectric": reading.dielectric,
    "rated_voltage": reading.positive("V"),
    "package": _package,
    "polarised": reading.switch,
    "fitted": reading.switch,
    "esr": reading.quantity("ohm"),
    "esl": reading.quantity("H"),
    "leakage_resistance": reading.positive("ohm"),
    "leakage_current": reading.quantity("A"),
    "half_voltage": reading.positive("V"),
    "bias_curve": _any_curve,
    "ageing": reading.quantity("fraction", greatest=1.0),
    "temperature_coefficient": reading.coefficient,
    "touchstone": touchstone,
    "dcr": reading.quantity("ohm"),
    "self_resonance": reading.positive("Hz"),
    "saturation_current": reading.positive("A"),
    "resistance": reading.positive("ohm"),
    "inductance": reading.positive("H"),
    "capacitance": reading.quantity("F"),
}


def validate_knowledge(row: KnowledgeRow) -> None:
    """Check a `[[part]]` table; raises InputError naming the file, the table and the key at fault."""
    table = row.source[row.source.find("[[") :] if "[[" in row.source else row.source
    unknown = sorted(set(row.match) - set(_MATCH_KEYS))
    if unknown or not row.match:
        what = f"unknown key {unknown[0]!r}" if unknown else "nothing to match"
        raise InputError(f"{table}, match: {what}", row.place, f"give any of {', '.join(_MATCH_KEYS)}")
    for key, value in row.attributes.items():
        reader = _READERS.get(key)
        if reader is None:
            remedy = f"the attributes are {', '.join(_READERS)}"
            raise InputError(f"{table}: unknown attribute {key!r}", row.place, remedy)
        try:
            reader(Claim(toml_text(value), row.source, value))
        except QuantityError as problem:
            raise InputError(f"{table}, {key}: {problem}", row.place) from None


def validate_settings(knowledge: Knowledge, place: Place) -> None:
    """Check the aliases and deratings that a brief adds; raises InputError naming file, table and key."""
    for canonical in knowledge.aliases:
        if canonical not in ALIASES:
            remedy = f"the attributes are {', '.join(ALIASES)}"
            raise InputError(f"[attributes]: unknown attribute {canonical!r}", place, remedy)
    for technology, share in knowledge.derating.items():
        if technology not in reading.TECHNOLOGIES:
            remedy = f"the technologies are {', '.join(sorted(reading.TECHNOLOGIES))}"
            raise InputError(f"[board] derating: unknown technology {technology!r}", place, remedy)
        if not 0.0 < share <= 1.0:
            raise InputError(f"[board] derating, {technology}: {share:g} is no share between 0 and 1", place)
