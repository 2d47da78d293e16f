"""Some three hundred values and descriptions in varied conventions give the attributes they state, and no others."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import pytest

from reactance.analysis.design import Part, Pin
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import (
    BeadModel,
    CapacitorModel,
    Conditions,
    InductorModel,
    PartModel,
    ResistorModel,
)
from reactance.analysis.parts.resolve import resolve_part

TEXTS = Path(__file__).with_name("part_texts.txt")
TECHNOLOGIES = {"ceramic", "film", "aluminium", "tantalum", "polymer"}
SIZE = re.compile(r"0\d{4}|\d{4}")


def rows() -> Iterator[tuple[str, str, str]]:
    for line in TEXTS.read_text(encoding="utf-8").splitlines():
        if line and not line.startswith("#"):
            letters, text, expected = (cell.strip() for cell in line.split(" | "))
            yield letters, text, expected


def understood(model: PartModel) -> dict[str, object]:
    """What a model says was stated, in the terms of the table."""
    found: dict[str, object] = {"fitted": model.fitted, "value": model.value}
    if "tolerance" in model.stated:
        found["tolerance"] = model.tolerance
    if "package" in model.stated:
        found["package"] = model.package
    if isinstance(model, CapacitorModel):
        if "technology" in model.stated:
            found["technology"] = model.technology
        if "dielectric" in model.stated:
            found["dielectric"] = model.dielectric
        if "polarised" in model.stated:
            found["polarised"] = model.polarised
        if "rated_voltage" in model.stated:
            found["rated_voltage"] = model.rated_voltage
        if "esr" in model.stated:
            found["esr"] = model.esr
    if isinstance(model, ResistorModel) and "temperature_coefficient" in model.stated:
        found["tc"] = pytest.approx((model.drift.high - 1) / 75e-6)
    if isinstance(model, InductorModel | BeadModel) and "dcr" in model.stated:
        found["dcr"] = model.dcr
    if isinstance(model, InductorModel):
        found |= {"srf": model.self_resonance} if model.self_resonance else {}
        found |= {"isat": model.saturation_current} if model.saturation_current else {}
    return found


def expectation(text: str) -> dict[str, object]:
    """The table's last column in the same terms."""
    wanted: dict[str, object] = {"fitted": True, "value": None}
    for word in text.split():
        name, equals, number = word.partition("=")
        asymmetric = re.fullmatch(r"(-\d+)\+(\d+)%", word)
        if equals:
            wanted[name] = float(number)
        elif word == "dnf":
            wanted["fitted"] = False
        elif word == "unpolarised":
            wanted["polarised"] = False
        elif asymmetric:
            wanted["tolerance"] = (float(asymmetric[1]) / 100, float(asymmetric[2]) / 100)
        elif word.endswith("%"):
            share = float(word[:-1]) / 100
            wanted["tolerance"] = pytest.approx((-share, share), rel=1e-12)
        elif word in TECHNOLOGIES:
            wanted["technology"] = word
        elif SIZE.fullmatch(word) and word != "1500" and "value" in wanted and wanted["value"] is not None:
            wanted["package"] = word
        elif word.endswith("V") and word[:-1].replace(".", "").isdigit():
            wanted["rated_voltage"] = float(word[:-1])
        elif word[0].isdigit():
            wanted["value"] = float(word)
        elif word != "none":
            wanted["dielectric"] = word
    return wanted


@pytest.mark.parametrize(("letters", "text", "expected"), list(rows()))
def test_text_is_understood(letters: str, text: str, expected: str) -> None:
    part = Part(f"{letters}1", (Pin("1", net="A"), Pin("2", net="B")), {"VALUE": text})
    model = resolve_part(part, Knowledge(), Conditions(temperature_high=100.0))
    assert understood(model) == expectation(expected)
    assert model.text == text


def test_a_text_not_understood_is_reported_as_found() -> None:
    reported = 0
    for letters, text, expected in rows():
        if expected == "none" and "NTC" not in text:
            part = Part(f"{letters}1", (), {"VALUE": text})
            problems = resolve_part(part, Knowledge(), Conditions()).problems
            assert any(text in problem.message for problem in problems), text
            reported += 1
    assert reported > 10


def test_the_table_is_large() -> None:
    assert len(list(rows())) >= 300
