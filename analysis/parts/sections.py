"""Which pins the sections of a part join: two-terminal parts, arrays in one package, feed-through capacitors.

A section has the part's whole value: an array's value is that of each of its elements.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from reactance.analysis.design import Part, Pin
from reactance.analysis.parts.base import Kind, Model
from reactance.analysis.parts.capacitor import CapacitorModel
from reactance.analysis.parts.kinds import class_letters

PinPair = tuple[str, str]

_ARRAY_LETTERS = frozenset(("RN", "RP", "RA", "CN", "CA"))
_ARRAY_WORDS = re.compile(r"\b(?:ARRAYS?|NETWORKS?|NET|PACK|ISOLATED|\d\s*X\s*(?:0402|0603))\b|\bCAPCA|\bRESCA")
_BUSSED_WORDS = re.compile(r"\bBUSS?ED\b|\bCOMMON\s+PIN\b")
_COMMON_NAMES = frozenset(("COM", "COMMON", "CMN", "BUS"))
_GROUND_NAMES = frozenset(("G", "GND", "GROUND", "CASE", "SHIELD"))
_IN_NAMES = frozenset(("IN", "I", "IN1", "A", "INPUT"))
_OUT_NAMES = frozenset(("OUT", "O", "OUT1", "B", "OUTPUT"))
_ENDS = re.compile(r"(.*?)[._-]?(?:([AB])|([12]))")


def sections(model: Model, part: Part) -> tuple[PinPair, ...]:
    """The pins (by designator) that each section of a part joins; empty where that is not plain."""
    return sections_of(model.kind, part)


def sections_of(kind: Kind, part: Part) -> tuple[PinPair, ...]:
    """The pins that each section of a part of that `kind` joins."""
    pins = _distinct(part.pins)
    if kind == "other" or len(pins) < 2:
        return ()
    if len(pins) == 2:
        return ((pins[0].number, pins[1].number),)
    feed = _feed_through(pins) if kind == "capacitor" else None
    if feed is not None:
        return ((feed[0].number, feed[2].number),)
    return _array(part, pins) or _two_nets(pins)


def through(model: Model, part: Part) -> tuple[PinPair, ...]:
    """The pins that are one conductor inside a part: a feed-through capacitor's input and output."""
    pins = _distinct(part.pins)
    feed = _feed_through(pins) if isinstance(model, CapacitorModel) and len(pins) > 2 else None
    return ((feed[0].number, feed[1].number),) if feed else ()


def _distinct(pins: Iterable[Pin]) -> tuple[Pin, ...]:
    """Pins by designator, the first of equal ones."""
    table: dict[str, Pin] = {}
    for pin in pins:
        table.setdefault(pin.number, pin)
    return tuple(table.values())


def _named(pins: Iterable[Pin], names: frozenset[str]) -> list[Pin]:
    return [pin for pin in pins if pin.name.upper() in names or pin.number.upper() in names]


def _feed_through(pins: tuple[Pin, ...]) -> tuple[Pin, Pin, Pin] | None:
    """Input, output and ground of a three-terminal capacitor with pins named so, else None."""
    ground, rest = _named(pins, _GROUND_NAMES), len(pins)
    ins, outs = _named(pins, _IN_NAMES), _named(pins, _OUT_NAMES)
    if len(ins) == 1 and len(outs) == 1 and ground and len(ground) + 2 == rest:
        return ins[0], outs[0], ground[0]
    return None


def _array(part: Part, pins: tuple[Pin, ...]) -> tuple[PinPair, ...]:
    """The elements of an array: by pin names in pairs, by a common pin, or by opposite pins."""
    named = _pairs_by_name(pins)
    if named:
        return named
    texts = " ".join((part.cell, *part.attributes.values())).upper().replace("_", " ")
    common = _named(pins, _COMMON_NAMES)
    is_array = class_letters(part.refdes) in _ARRAY_LETTERS or _ARRAY_WORDS.search(texts)
    if len(common) == 1 and is_array:
        return tuple((common[0].number, pin.number) for pin in pins if pin is not common[0])
    numbered = {pin.number for pin in pins} == {str(n) for n in range(1, len(pins) + 1)}
    if not is_array or not numbered:
        return ()
    if _BUSSED_WORDS.search(texts):
        return tuple(("1", str(n)) for n in range(2, len(pins) + 1))
    if len(pins) % 2:
        return ()
    # Pins count around the body, so that an element joins opposite ones (common practice of chip arrays).
    return tuple((str(n), str(len(pins) + 1 - n)) for n in range(1, len(pins) // 2 + 1))


def _pairs_by_name(pins: tuple[Pin, ...]) -> tuple[PinPair, ...]:
    """Pins whose names are a stem and one of two ends: `1A` and `1B`, `R1.1` and `R1.2`."""
    stems: dict[str, list[tuple[str, str]]] = {}
    for pin in pins:
        match = _ENDS.fullmatch(pin.name.upper())
        if not match or not match[1]:
            return ()
        stems.setdefault(match[1], []).append((match[2] or match[3], pin.number))
    if any(sorted(end for end, _ in ends) not in (["A", "B"], ["1", "2"]) for ends in stems.values()):
        return ()
    return tuple((sorted(ends)[0][1], sorted(ends)[1][1]) for ends in stems.values())


def _two_nets(pins: tuple[Pin, ...]) -> tuple[PinPair, ...]:
    """One section where all pins lie on just two nets: extra pads of one two-terminal part."""
    first: dict[str, str] = {}
    for pin in pins:
        if pin.net is not None:
            first.setdefault(pin.net, pin.number)
    if len(first) != 2:
        return ()
    one, other = first.values()
    return ((one, other),)
