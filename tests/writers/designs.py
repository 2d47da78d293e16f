"""Designs to write: generated ones, and one board of a greenhouse data logger (invented). For tests only."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from hypothesis import strategies as st

from reactance.analysis.design import Design, Net, Part, Pin
from reactance.analysis.exports.tables_columns import COLUMNS, COUNTING
from reactance.analysis.parts.attributes import folded

REFDES_PROPERTIES = ("refdes", "ref", "designator", "reference")
"""Properties that carry a refdes where no designator does, in lower case."""


@dataclass(frozen=True)
class Content:
    """What a design says, whatever order and format it was written in."""

    attributes: Mapping[str, Mapping[str, str]]
    pins: Mapping[str, Mapping[str, str | None]]
    nets: Mapping[str, frozenset[tuple[str, str]]]


def content(design: Design, words: Mapping[str, str] = MappingProxyType({})) -> Content:
    """Parts, attributes, pins and nets of a design. `words` maps attribute names back to the ones first written.

    A property that carries the refdes says nothing more than the refdes.
    """
    back = {word: name for name, word in words.items()}
    return Content(
        {
            part.refdes: {
                back.get(name, name): text
                for name, text in part.attributes.items()
                if name.lower() not in REFDES_PROPERTIES
            }
            for part in design.parts
        },
        {part.refdes: {pin.number: pin.net for pin in part.pins} for part in design.parts},
        {net.name: frozenset(net.pins) for net in design.nets},
    )


def pin_words(design: Design) -> Mapping[str, Mapping[str, tuple[str, str]]]:
    """Name and direction of each pin; a pin without a name is called by its number."""
    return {
        part.refdes: {pin.number: (pin.name or pin.number, pin.direction) for pin in part.pins} for part in design.parts
    }


def design_of(parts: Sequence[Part], name: str = "board") -> Design:
    """The parts with the nets that their pins are on."""
    nets: dict[str, list[tuple[str, str]]] = {}
    for part in parts:
        for pin in part.pins:
            if pin.net is not None:
                nets.setdefault(pin.net, []).append((part.refdes, pin.number))
    return Design(name, "written", "written", tuple(parts), tuple(Net(net, tuple(pins)) for net, pins in nets.items()))


_LETTERS = st.sampled_from("ABCDEFGHJKLMPQRSTUVWXYZ")
_PRINTABLE = st.characters(min_codepoint=32, max_codepoint=0x17F, exclude_categories=("Cc", "Cf", "Zl", "Zp"))
_WORDS = st.text(_PRINTABLE | st.sampled_from("µΩ°±%\"'()<>&;,\t "), min_size=1, max_size=24).map(
    lambda text: " ".join(text.split()).strip()
)
_TEXTS = _WORDS.filter(bool)
_NOT_NETS = frozenset(("n/c", "no net", "$none$"))
_NOT_ATTRIBUTES = frozenset((*COUNTING, *REFDES_PROPERTIES, *COLUMNS["refdes"]))


_NUMBERS = [*map(str, range(1, 30)), *(f"{letter}{number}" for letter in "ABK" for number in (1, 2, 11))]


def _attribute_name(name: str) -> bool:
    return folded(name) not in _NOT_ATTRIBUTES and name.lower() not in REFDES_PROPERTIES


@st.composite
def designs(draw: st.DrawFn, most: int = 40, odd_refdes: bool = True) -> Design:
    """Designs of up to `most` parts, with hierarchy, unconnected pins, pin names and texts of all kinds.

    Refdes have at most six characters and pin numbers four, as the narrowest of the formats holds them.
    Without `odd_refdes` they are letters, a number and at most a letter more.
    """
    tails = st.sampled_from(("", "", "", "A", "_B", "-2", ".1") if odd_refdes else ("", "", "A"))
    refdes = st.builds(
        lambda letter, number, tail: f"{letter}{number}{tail}",
        _LETTERS,
        st.integers(1, 999),
        tails,
    )
    names = draw(st.lists(refdes, min_size=1, max_size=most, unique=True))
    nets = draw(
        st.lists(
            _TEXTS.filter(lambda net: net.lower() not in _NOT_NETS and "\t" not in net),
            min_size=1,
            max_size=12,
            unique_by=str.casefold,
        )
    )
    words = draw(st.lists(_TEXTS.filter(_attribute_name), max_size=5, unique_by=folded))
    numbers = st.sampled_from(_NUMBERS)
    blocks = st.sampled_from(((), (), ("POWER",), ("PROBE",), ("PROBE", "INPUT"), ("RADIO",)))
    net = st.sampled_from(nets) | st.none()
    parts = []
    for name in names:
        pins = tuple(
            Pin(
                number,
                draw(st.sampled_from(("", "IN", "OUT", "VDD"))) + ("" if draw(st.booleans()) else number),
                draw(net),
                draw(st.sampled_from(("", "input", "output", "inout"))),
            )
            for number in draw(st.lists(numbers, min_size=1, max_size=4, unique=True))
        )
        pins = tuple(
            Pin(pin.number, f"{pin.name}{index}" if pin.name else "", pin.net, pin.direction)
            for index, pin in enumerate(pins)
        )
        attributes = draw(st.dictionaries(st.sampled_from(words), _TEXTS, max_size=4)) if words else {}
        parts.append(Part(name, pins, MappingProxyType(attributes), "", draw(blocks)))
    if not any(pin.net for part in parts for pin in part.pins):
        first = parts[0]
        connected = (Pin(first.pins[0].number, first.pins[0].name, nets[0], first.pins[0].direction), *first.pins[1:])
        parts[0] = Part(first.refdes, connected, first.attributes, first.cell, first.path)
    return design_of(parts)


def logger_board() -> Design:
    """Fifty parts in five blocks: a supply, three equal soil probes, and a microphone for bats. Invented."""
    parts = [*_supply(), *_microphone()]
    for probe in (1, 2, 3):
        parts += _probe(probe)
    parts += _controller()
    return design_of(parts, "logger")


def _two(refdes: str, nets: tuple[str, str], path: tuple[str, ...], **attributes: str) -> Part:
    pins = (Pin("1", "A", nets[0], "inout"), Pin("2", "B", nets[1], "inout"))
    return Part(refdes, pins, MappingProxyType(attributes), refdes[0], path)


def _cap(refdes: str, net: str, other: str, path: tuple[str, ...], value: str = "100 nF") -> Part:
    more = {"VALUE": value, "TOLERANCE": "10 %", "VOLTAGE": "16 V", "DIELECTRIC": "X7R", "FOOTPRINT": "0603"}
    return _two(refdes, (net, other), path, **more)


def _res(refdes: str, net: str, other: str, path: tuple[str, ...], value: str) -> Part:
    return _two(refdes, (net, other), path, VALUE=value, TOLERANCE="1 %", FOOTPRINT="0603")


def _chip(refdes: str, path: tuple[str, ...], value: str, pins: Mapping[str, str | None]) -> Part:
    numbered = tuple(Pin(str(number), name, net) for number, (name, net) in enumerate(pins.items(), 1))
    return Part(refdes, numbered, MappingProxyType({"VALUE": value}), value, path)


def _supply() -> list[Part]:
    path = ("SUPPLY",)
    chip = {"IN": "VBAT", "GND": "GND", "OUT": "+3V3", "EN": "VBAT", "NC": None}
    return [
        _chip("U1", path, "GHL-REG", chip),
        _cap("C1", "VBAT", "GND", path, "10 uF"),
        _cap("C2", "VBAT", "GND", path),
        _cap("C3", "+3V3", "GND", path, "10 uF"),
        _cap("C4", "+3V3", "GND", path, "1 uF"),
        _two("L1", ("+3V3", "+3V3A"), path, VALUE="10 uH", FOOTPRINT="0805"),
        _cap("C5", "+3V3A", "GND", path, "10 uF"),
        _cap("C6", "+3V3A", "GND", path),
    ]


def _microphone() -> list[Part]:
    path = ("MICROPHONE",)
    amplifier = {"OUT": "BAT_OUT", "IN-": "FEEDBACK", "GND": "GND", "IN+": "BIASED", "V+": "+3V3A"}
    return [
        _chip("MK1", path, "GHL-MIC", {"OUT": "MIC", "GND": "GND", "VDD": "+3V3A"}),
        _cap("C10", "MIC", "BIASED", path, "10 nF"),
        _res("R10", "BIASED", "+3V3A", path, "100 kohm"),
        _res("R11", "BIASED", "GND", path, "100 kohm"),
        _chip("U3", path, "GHL-AMP", amplifier),
        _res("R12", "BAT_OUT", "FEEDBACK", path, "47 kohm"),
        _cap("C11", "BAT_OUT", "FEEDBACK", path, "22 pF"),
        _res("R13", "FEEDBACK", "FOOT", path, "1 kohm"),
        _cap("C12", "FOOT", "GND", path, "1 uF"),
        _cap("C13", "+3V3A", "GND", path),
    ]


def _probe(probe: int) -> list[Part]:
    path = ("PROBES", f"PROBE{probe}")
    own = f"PROBES/PROBE{probe}"
    base = 20 * probe
    return [
        _chip(f"J{probe}", path, "GHL-PROBE", {"SIG": f"{own}/RAW", "VDD": "+3V3", "GND": "GND"}),
        _res(f"R{base}", f"{own}/RAW", f"{own}/MIDDLE", path, "1 kohm"),
        _cap(f"C{base}", f"{own}/MIDDLE", "GND", path, "100 nF"),
        _res(f"R{base + 1}", f"{own}/MIDDLE", f"SOIL{probe}", path, "1 kohm"),
        _cap(f"C{base + 1}", f"SOIL{probe}", "GND", path, "10 nF"),
        _res(f"R{base + 2}", f"{own}/RAW", "+3V3", path, "10 kohm"),
        _cap(f"C{base + 2}", "+3V3", "GND", path, "100 nF"),
    ]


def _controller() -> list[Part]:
    pins = {
        "VDD1": "+3V3",
        "VDD2": "+3V3",
        "GND": "GND",
        "ADC0": "SOIL1",
        "ADC1": "SOIL2",
        "ADC2": "SOIL3",
        "ADC3": "BAT_OUT",
        "XIN": "XIN",
        "XOUT": "XOUT",
        "NRST": "NRST",
        "SPARE": None,
    }
    return [
        _chip("U2", (), "GHL-MCU", pins),
        *(_cap(f"C{number}", "+3V3", "GND", ()) for number in (90, 91, 92)),
        _cap("C93", "XIN", "GND", (), "12 pF"),
        _cap("C94", "XOUT", "GND", (), "12 pF"),
        _two("Y1", ("XIN", "XOUT"), (), VALUE="GHL-8M"),
        _res("R90", "NRST", "+3V3", (), "10 kohm"),
        _cap("C95", "NRST", "GND", (), "100 nF"),
        _two("BT1", ("VBAT", "GND"), (), VALUE="GHL-CELL"),
        _cap("C96", "VBAT", "GND", (), "47 uF"),
    ]
