"""Which pins the sections of a part join, where pins and attributes make it plain."""

from __future__ import annotations

import pytest

from reactance.analysis.design import Part, Pin
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import CapacitorModel, Conditions
from reactance.analysis.parts.resolve import resolve_part
from reactance.analysis.parts.sections import sections, through


def pins(text: str) -> tuple[Pin, ...]:
    """`1:IN=A` is pin 1 with the port name IN on net A."""
    found = []
    for word in text.split():
        label, _, net = word.partition("=")
        number, _, name = label.partition(":")
        found.append(Pin(number, name, net or number))
    return tuple(found)


@pytest.mark.parametrize(
    ("refdes", "attributes", "pin_text", "joined"),
    [
        ("C1", {"VALUE": "1u"}, "1 2", (("1", "2"),)),
        ("C1", {"VALUE": "1u"}, "A K", (("A", "K"),)),
        ("C1", {"VALUE": "1u"}, "1", ()),
        ("U1", {}, "1 2", ()),
        # Two pads of one terminal.
        ("C1", {"VALUE": "100u"}, "1=A 2=B 3=B", (("1", "2"),)),
        ("R1", {"VALUE": "1k"}, "1=A 1=A 2=B", (("1", "2"),)),
        # Chip arrays count around the body.
        ("RN1", {"VALUE": "10k"}, "1 2 3 4 5 6 7 8", (("1", "8"), ("2", "7"), ("3", "6"), ("4", "5"))),
        ("R7", {"VALUE": "33R", "DESCRIPTION": "RES ARRAY 33R 5%"}, "1 2 3 4", (("1", "4"), ("2", "3"))),
        ("CN1", {"VALUE": "100nF"}, "1 2 3 4", (("1", "4"), ("2", "3"))),
        # Names in pairs say it themselves.
        ("R7", {"VALUE": "33R"}, "1:1A 2:2A 3:2B 4:1B", (("1", "4"), ("2", "3"))),
        ("R7", {"VALUE": "33R"}, "1:R1.1 2:R2.1 3:R2.2 4:R1.2", (("1", "4"), ("2", "3"))),
        # A common pin.
        ("RN1", {"VALUE": "10k"}, "1:COM 2:R1 3:R2 4:R3", (("1", "2"), ("1", "3"), ("1", "4"))),
        (
            "RN1",
            {"VALUE": "10k", "DESCRIPTION": "bussed"},
            "1 2 3 4 5",
            (("1", "2"), ("1", "3"), ("1", "4"), ("1", "5")),
        ),
        # Feed-through: the capacitor goes from the conductor to ground.
        ("C3", {"VALUE": "1u"}, "1:IN 2:GND 3:OUT", (("1", "2"),)),
        ("C3", {"VALUE": "1u"}, "1:IN 2:GND 3:OUT 4:GND", (("1", "2"),)),
        # Not plain.
        ("R1", {"VALUE": "10k"}, "1 2 3", ()),
        ("R1", {"VALUE": "10m"}, "1 2 3 4", ()),
        ("RN1", {"VALUE": "10k"}, "1 2 3 4 5", ()),
    ],
)
def test_sections(refdes: str, attributes: dict[str, str], pin_text: str, joined: tuple[tuple[str, str], ...]) -> None:
    part = Part(refdes, pins(pin_text), attributes)
    model = resolve_part(part, Knowledge(), Conditions())
    assert sections(model, part) == joined
    told = any("not plain" in problem.message for problem in model.problems)
    assert told == (not joined and len(part.pins) > 2)


def test_a_feed_through_conducts() -> None:
    part = Part("C3", pins("1:IN 2:GND 3:OUT"), {"VALUE": "1u"})
    model = resolve_part(part, Knowledge(), Conditions())
    assert through(model, part) == (("1", "3"),)
    plain = Part("C1", pins("1 2"), {"VALUE": "1u"})
    assert through(resolve_part(plain, Knowledge(), Conditions()), plain) == ()


def test_the_elements_of_an_array_share_its_body() -> None:
    """V_half goes as the square root of the volume: four elements in one body have half of a single one's."""
    attributes = {"VALUE": "100nF", "DIELECTRIC": "X7R", "PACKAGE": "1206"}
    single = resolve_part(Part("C1", pins("1 2"), attributes), Knowledge(), Conditions())
    array = resolve_part(Part("CN1", pins("1 2 3 4 5 6 7 8"), attributes), Knowledge(), Conditions())
    assert isinstance(single, CapacitorModel)
    assert isinstance(array, CapacitorModel)
    assert array.bias_factor(10.0).nominal == pytest.approx(single.bias_factor(20.0).nominal, rel=1e-12)
