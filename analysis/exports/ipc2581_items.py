"""Bill of materials and placement of IPC-2581: characteristics as attribute texts, units, sides."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from reactance.analysis.exports.collect import Side
from reactance.analysis.exports.ipc2581_xml import Element
from reactance.analysis.exports.text import visible

# `CadHeader units` (IPC-2581 B, section on CadData), in metres.
LENGTHS: Mapping[str, float] = MappingProxyType({"MILLIMETER": 1e-3, "MICRON": 1e-6, "INCH": 25.4e-3})

# Words for units in `engineeringUnitOfMeasure`, without regard to case and a plural s, and how quantities write them.
# The attribute is free text in the standard; words from memory.
_UNITS: Mapping[str, str] = MappingProxyType(
    {
        "farad": "F",
        "microfarad": "uF",
        "nanofarad": "nF",
        "picofarad": "pF",
        "ohm": "ohm",
        "kiloohm": "kohm",
        "kilohm": "kohm",
        "megaohm": "Mohm",
        "megohm": "Mohm",
        "milliohm": "mohm",
        "henry": "H",
        "henrie": "H",
        "millihenry": "mH",
        "microhenry": "uH",
        "nanohenry": "nH",
        "volt": "V",
        "millivolt": "mV",
        "kilovolt": "kV",
        "ampere": "A",
        "amp": "A",
        "milliampere": "mA",
        "watt": "W",
        "milliwatt": "mW",
        "hertz": "Hz",
        "megahertz": "MHz",
        "percent": "%",
        "celsiu": "degC",
        "degreescelsiu": "degC",
        "second": "s",
    }
)


@dataclass(slots=True)
class BomItem:
    """One item of a bill: the refdes it is for, by line, and what is said of all of them."""

    name: str
    line: int
    refdes: list[Element] = field(default_factory=list)
    attributes: list[tuple[str, str]] = field(default_factory=list)


def text(element: Element, attribute: str) -> str:
    """An attribute's value as people may see it, "" where there is none."""
    return visible(element.attributes.get(attribute, "")).strip()


def item_attributes(item: Element) -> Iterator[tuple[str, str]]:
    """What the attributes of a `BomItem` itself tell of its parts."""
    for name in ("description", "internalPartNumber"):
        if text(item, name):
            yield name, text(item, name)


def characteristic(element: Element) -> Iterator[tuple[str, str]]:
    """Name and text of a `Textual`, `Measured`, `Ranged` or `Enumerated` characteristic."""
    kind = element.name.lower()
    name = text(element, f"{kind}CharacteristicName")
    if not name:
        return
    unit = _unit(text(element, "engineeringUnitOfMeasure"))
    if kind == "ranged":
        bounds = [text(element, f"rangedCharacteristic{end}Value") for end in ("Lower", "Upper")]
        value = " to ".join(_measured(bound, unit) for bound in bounds if bound)
    else:
        value = text(element, f"{kind}CharacteristicValue")
        value = _measured(value, unit) if kind == "measured" else value
    if value:
        yield name, value
    # Whether these are shares or quantities the standard leaves to the writer: kept under a name of their own.
    for end, sign in (("Positive", "+"), ("Negative", "-")):
        tolerance = text(element, f"engineering{end}Tolerance")
        if tolerance:
            yield f"{name} {sign}", tolerance


def _measured(value: str, unit: str) -> str:
    return f"{value} {unit}" if value and unit else value


def _unit(word: str) -> str:
    return _UNITS.get(word.lower().replace(" ", "").replace("_", "").removesuffix("s"), word)


def side_of(layer: str, sides: Mapping[str, str]) -> Side:
    """The side of the board that a layer is on: as its `Layer` says, else as its name tells."""
    said = sides.get(layer, "").upper()
    if said in ("TOP", "BOTTOM"):
        return "top" if said == "TOP" else "bottom"
    if said:
        return ""
    name = layer.lower()
    return "top" if "top" in name else "bottom" if "bot" in name else ""
