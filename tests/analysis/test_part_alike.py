"""A part read as one of many equal ones is what it is when read alone."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.design import Part, Pin, Place
from reactance.analysis.parts import alike
from reactance.analysis.parts.alike import Alike
from reactance.analysis.parts.base import Conditions
from reactance.analysis.parts.knowledge import Knowledge, KnowledgeRow
from reactance.analysis.parts.resolve import resolve_part

_ATTRIBUTES = st.sampled_from(
    (
        {"VALUE": "10uF", "DIELECTRIC": "X5R", "VOLTAGE": "6.3V", "PACKAGE": "0603"},
        {"VALUE": "10uF"},
        {"VALUE": "10uF", "VAL": "1uF", "VOLTAGE": "often"},
        {"VALUE": "4k7", "TOLERANCE": "1%"},
        {"VALUE": "600R@100MHz"},
        {"VALUE": "DNP"},
        {"VALUE": ""},
    )
)
_PINS = st.sampled_from(
    (
        (Pin("1", "A", "ONE"), Pin("2", "B", "TWO")),
        (Pin("1", "+", "ONE"), Pin("2", "-", "TWO")),
        (Pin("A", "", None),),
        (Pin("1", "1A", "ONE"), Pin("2", "1B", "TWO"), Pin("3", "2A", "ONE"), Pin("4", "2B", "TWO")),
    )
)
_REFDES = st.sampled_from(("C1", "C2", "C17", "C170", "CP1", "R1", "R17", "L1", "FB2", "XYZ", "PSU/C17"))
_PARTS = st.builds(Part, _REFDES, _PINS, _ATTRIBUTES, st.sampled_from(("CAP", "POLARISED")))
_KNOWLEDGE = Knowledge(
    rows=(
        KnowledgeRow({"refdes": "C17*"}, {"dielectric": "X7R", "esr": "5 mohm"}, Place("b.toml"), "[[part]] 1"),
        KnowledgeRow({"value": "10uF"}, {"tolerance": "20 %"}, Place("b.toml"), "[[part]] 2"),
    )
)


@given(st.lists(_PARTS, max_size=12))
def test_each_part_of_many_is_what_it_is_alone(parts: list[Part]) -> None:
    conditions = Conditions(-20.0, 60.0, 50_000.0)
    together = Alike(_KNOWLEDGE, conditions)
    for part in parts:
        assert together.resolve(part) == resolve_part(part, _KNOWLEDGE, conditions)


def test_equal_parts_are_read_once(monkeypatch: pytest.MonkeyPatch) -> None:
    read: list[str] = []

    def counted(part: Part, knowledge: Knowledge, conditions: Conditions) -> object:
        read.append(part.refdes)
        return resolve_part(part, knowledge, conditions)

    monkeypatch.setattr(alike, "resolve_part", counted)
    together = Alike(Knowledge(), Conditions())
    pins = (Pin("1", "", "A"), Pin("2", "", "B"))
    for number in range(50):
        together.resolve(Part(f"C{number}", pins, {"VALUE": "10nF"}, "CAP"))
    together.resolve(Part("C50", pins, {"VALUE": "22nF"}, "CAP"))
    assert read == ["C0", "C50"]
