"""From texts to models: names of attributes, precedence, kinds, what is not fitted, and what is told."""

from __future__ import annotations

import math
import subprocess
import sys
from types import MappingProxyType

import pytest

from reactance.analysis.design import InputError, Part, Pin, Place
from reactance.analysis.parts.attributes import ALIASES, NOT_FITTED, folded
from reactance.analysis.parts.knowledge import Knowledge, KnowledgeRow, validate_knowledge, validate_settings
from reactance.analysis.parts.models import (
    BeadModel,
    CapacitorModel,
    Conditions,
    InductorModel,
    PartModel,
    ResistorModel,
)
from reactance.analysis.parts.resolve import resolve_part

BRIEF, TEAM = Place("board.brief.toml"), Place("../parts.toml")


def part(refdes: str, **attributes: str) -> Part:
    return Part(refdes, (Pin("1", net="A"), Pin("2", net="B")), attributes)


def row(attributes: dict[str, object], place: Place = BRIEF, **match: str) -> KnowledgeRow:
    return KnowledgeRow(match, attributes, place, f"{place.file} [[part]] 1")


def resolve(one: Part, *rows: KnowledgeRow, conditions: Conditions | None = None) -> PartModel:
    return resolve_part(one, Knowledge(rows=rows), conditions or Conditions())


def test_importing_is_light() -> None:
    """A cold start pays for scipy and scikit-rf only where they are used."""
    code = "import sys, reactance.analysis.parts.resolve; print(sorted({'scipy', 'skrf', 'pandas'} & set(sys.modules)))"
    ran = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert ran.stdout.strip() == "[]"


@pytest.mark.parametrize(
    "names",
    [
        ("VALUE", "TOL", "VOLTAGE", "DIELECTRIC", "FOOTPRINT"),
        ("Comment", "Tolerance", "Voltage Rating", "TEMPCO", "PCB Footprint"),
        ("PART_VALUE", "tolerance", "RATED_VOLTAGE", "Temperature Coefficient", "PACKAGE"),
        ("Val", "Tol", "Rating", "Dielectric Material", "Case Size"),
        ("Capacitance", "TOLERANCE", "Voltage - Rated", "Temperature Characteristic", "Package / Case"),
    ],
)
def test_the_same_part_under_other_names(names: tuple[str, ...]) -> None:
    texts = dict(zip(names, ("10uF", "10%", "16V", "X5R", "C0805"), strict=True))
    model = resolve(part("C1", **texts))
    assert isinstance(model, CapacitorModel)
    assert (model.value, model.tolerance, model.rated_voltage) == (1e-5, (-0.1, 0.1), 16.0)
    assert (model.dielectric, model.package) == ("X5R", "0805")
    assert model.stated["value"].source == f"export {names[0]}"
    assert model.problems == ()


def test_the_same_part_as_one_description() -> None:
    apart = resolve(part("C1", VALUE="10uF", TOL="10%", VOLTAGE="16V", DIELECTRIC="X5R", PACKAGE="0805"))
    joined = resolve(part("C1", VALUE="10uF/16V/X5R/0805/10%"))
    described = resolve(part("C1", DESCRIPTION="CAP 10UF 16V 10% X5R 0805"))
    assert isinstance(apart, CapacitorModel)
    for other in (joined, described):
        assert isinstance(other, CapacitorModel)
        assert other.effective(3.3) == apart.effective(3.3)
        assert (other.esr, other.esl, other.rated_voltage) == (apart.esr, apart.esl, apart.rated_voltage)


def test_no_alias_names_two_things_by_mistake() -> None:
    """Only a temperature coefficient may be a code or a number; every other name has one meaning."""
    seen: dict[str, str] = {}
    for canonical, names in ALIASES.items():
        for name in map(folded, names):
            pair = {seen.setdefault(name, canonical), canonical}
            assert len(pair) == 1 or pair == {"dielectric", "temperature_coefficient"}, name


def test_the_brief_adds_aliases() -> None:
    knowledge = Knowledge(aliases=MappingProxyType({"rated_voltage": ("Nennspannung",), "value": ("Wert",)}))
    model = resolve_part(part("C1", WERT="1u", NENNSPANNUNG="25 V"), knowledge, Conditions())
    assert isinstance(model, CapacitorModel)
    assert (model.value, model.rated_voltage) == (1e-6, 25.0)


def test_the_first_matching_table_wins_key_by_key() -> None:
    rows = (
        row({"esr": "5 mohm"}, value="10uF"),
        row({"esr": "9 mohm", "esl": "0.2 nH", "dielectric": "X5R"}, TEAM, refdes="C*"),
        row({"esl": "9 nH"}, TEAM, refdes="C2"),
    )
    model = resolve(part("C1", VALUE="10 µF", DIELECTRIC="X7R", ESR="1 ohm"), *rows)
    assert isinstance(model, CapacitorModel)
    assert (model.esr, model.dielectric) == (0.005, "X5R")
    assert model.esl == pytest.approx(0.7e-9, rel=1e-12)
    assert model.stated["esr"].source == "board.brief.toml [[part]] 1"
    assert model.stated["esl"].source == model.stated["dielectric"].source == "../parts.toml [[part]] 1"
    assert model.stated["value"].source == "export VALUE"


@pytest.mark.parametrize(
    ("match", "meets"),
    [
        ({"refdes": "C1*"}, True),
        ({"refdes": "C1[0-3]"}, True),
        ({"refdes": "C2*"}, False),
        ({"value": "4u7"}, True),
        ({"value": "4.7 µF"}, True),
        ({"value": "4.7uF*"}, True),
        ({"value": "10uF"}, False),
        ({"number": "CAP-*-16"}, True),
        ({"number": "cap-0815-16"}, True),
        ({"number": "RES-*"}, False),
        ({"refdes": "C1*", "value": "4.7uF", "number": "CAP*"}, True),
        ({"refdes": "C1*", "value": "1uF"}, False),
        ({}, False),
    ],
)
def test_matching(match: dict[str, str], meets: bool) -> None:
    one = part("C12", VALUE="4.7 uF 16V", MPN="CAP-0815-16")
    model = resolve(one, row({"esr": "3 mohm"}, **match))
    assert isinstance(model, CapacitorModel)
    assert (model.esr == 0.003) == meets


def test_a_table_can_give_everything() -> None:
    known: dict[str, object] = {
        "value": "10 uF",
        "tolerance": 0.2,
        "package": "0805",
        "rated_voltage": 16,
        "dielectric": "X5R",
    }
    model = resolve(part("C1"), row(known, refdes="C1"))
    assert isinstance(model, CapacitorModel)
    assert (model.value, model.tolerance, model.package, model.rated_voltage) == (1e-5, (-0.2, 0.2), "0805", 16.0)
    assert model.text == "10 uF"


@pytest.mark.parametrize(
    ("refdes", "attribute", "useless"),
    [
        ("C1", "esr", False),
        ("C1", "dcr", True),
        ("R1", "esr", True),
        ("R1", "temperature_coefficient", False),
        ("L1", "half_voltage", True),
        ("FB1", "dcr", False),
        ("U1", "esr", False),
    ],
)
def test_an_attribute_of_another_kind_is_told(refdes: str, attribute: str, useless: bool) -> None:
    texts = {"C1": "1u", "L1": "1u", "R1": "1k", "FB1": "600R", "U1": ""}
    model = resolve(part(refdes, VALUE=texts[refdes]), row({attribute: 1}, refdes=refdes))
    assert any("no such attribute" in p.message and attribute in p.message for p in model.problems) == useless


def test_a_contradiction_inside_the_export_is_told() -> None:
    model = resolve(part("C1", VALUE="100n", DESCRIPTION="CAP CER 1UF 50V X7R"))
    assert model.value == 1e-7
    assert any("says 100 nF" in p.message and "says 1 µF" in p.message for p in model.problems)
    agreeing = resolve(part("C1", VALUE="100n", DESCRIPTION="CAP CER 0.1UF 50V X7R"))
    assert agreeing.problems == ()


def test_the_next_text_is_used_where_the_first_is_not_understood_and_that_is_told() -> None:
    model = resolve(part("C1", VALUE="see note", COMMENT="100n", TOL="about ten"))
    assert model.value == 1e-7
    assert any("about ten" in p.message and "TOL" in p.message for p in model.problems)
    assert any("see note" in p.message and "export COMMENT is used" in p.message for p in model.problems)


@pytest.mark.parametrize("name", [*NOT_FITTED, "DO_NOT_FIT", "Do Not Populate"])
def test_not_fitted_by_mark(name: str) -> None:
    model = resolve(part("C1", VALUE="1u", **{name: "yes"}))
    assert not model.fitted
    assert [p.severity for p in model.problems] == ["note"]
    assert "takes no part" in model.problems[0].message
    assert model.assumptions == ()
    assert resolve(part("C1", VALUE="1u", DIELECTRIC="X7R", **{name: "no"})).fitted


@pytest.mark.parametrize(
    ("name", "text", "fitted"),
    [
        ("populate", "false", False),
        ("POPULATE", "NO", False),
        ("Populated", "0", False),
        ("FITTED", "not fitted", False),
        ("Assembly", "DNP", False),
        ("STUFF", "NOSTUFF", False),
        ("Mount", "N", False),
        ("Fitted", "yes", True),
        ("populate", "true", True),
        ("Assembly", "hand", True),
    ],
)
def test_not_fitted_by_switch(name: str, text: str, fitted: bool) -> None:
    for refdes in ("C1", "R1", "L1", "FB1", "U1"):
        assert resolve(part(refdes, **{name: text})).fitted == fitted


def test_the_brief_decides_what_is_fitted() -> None:
    assert resolve(part("C1", VALUE="1u", DNP="yes"), row({"fitted": True}, refdes="C1")).fitted
    assert not resolve(part("C1", VALUE="1u"), row({"fitted": False}, refdes="C1")).fitted


@pytest.mark.parametrize(
    ("refdes", "attributes", "kind"),
    [
        ("C1", {}, "capacitor"),
        ("C101A", {}, "capacitor"),
        ("PSU/C5", {}, "capacitor"),
        ("A1.C5", {}, "capacitor"),
        ("C?", {}, "capacitor"),
        ("c7", {}, "capacitor"),
        ("C5.1", {}, "capacitor"),
        ("PSU_C5", {}, "capacitor"),
        ("C_IN", {}, "capacitor"),
        ("CAP3", {}, "capacitor"),
        ("CIN", {"VALUE": "10uF"}, "capacitor"),
        ("CIN", {"VALUE": "whatever"}, "other"),
        ("RFB2", {"VALUE": "10k"}, "resistor"),
        ("REF1", {"VALUE": "2.5"}, "other"),
        ("RELAY1", {"VALUE": "5V"}, "other"),
        ("LOUT", {"VALUE": "2u2"}, "inductor"),
        ("CN1", {"VALUE": "header 2x5"}, "other"),
        ("CN1", {"VALUE": "4x100nF"}, "other"),
        ("CN1", {"VALUE": "100nF"}, "capacitor"),
        ("CON1", {"VALUE": "100nF"}, "other"),
        ("CP3", {"VALUE": "100uF"}, "capacitor"),
        ("R1", {}, "resistor"),
        ("RN1", {}, "resistor"),
        ("RV1", {"VALUE": "10k"}, "other"),
        ("RT1", {"VALUE": "10k"}, "other"),
        ("R5", {"VALUE": "10k NTC"}, "other"),
        ("R5", {"VALUE": "10k", "DESCRIPTION": "Thermistor NTC"}, "other"),
        ("L1", {"VALUE": "10uH"}, "inductor"),
        ("L1", {"VALUE": "600R@100MHz"}, "bead"),
        ("L1", {"VALUE": "600R", "DESCRIPTION": "Ferrite bead 600R"}, "bead"),
        ("L2", {"VALUE": "10uH", "DESCRIPTION": "Common mode choke"}, "other"),
        ("FB1", {"VALUE": "600R"}, "bead"),
        ("FB1", {"VALUE": "10uH"}, "inductor"),
        ("FB1", {}, "bead"),
        ("U1", {"VALUE": "100nF"}, "other"),
        ("Y1", {"VALUE": "8MHz"}, "other"),
        ("TP1", {}, "other"),
        ("I17", {"DESCRIPTION": "CAP CER 1UF 16V X7R"}, "capacitor"),
        ("X_3", {}, "other"),
        ("I18", {"DESCRIPTION": "RES 10K 1%"}, "resistor"),
        ("I19", {"VALUE": "mystery"}, "other"),
    ],
)
def test_kinds(refdes: str, attributes: dict[str, str], kind: str) -> None:
    """Class letters of IEEE 315, and common practice beside them."""
    assert resolve(part(refdes, **attributes)).kind == kind


FIELD = Conditions(temperature_low=-20.0, temperature_high=60.0)


def test_resistor() -> None:
    model = resolve(part("R1", VALUE="4k7", TOL="1%", TCR="100 ppm/K"), conditions=FIELD)
    assert isinstance(model, ResistorModel)
    band = model.resistance
    assert band.nominal == 4700.0
    assert (band.low, band.high) == pytest.approx((4700 * 0.99 * (1 - 45e-4), 4700 * 1.01 * (1 + 45e-4)), rel=1e-14)
    assert not model.is_short
    assert model.assumptions == ()


def test_resistor_with_a_signed_coefficient() -> None:
    model = resolve(part("R1", VALUE="1k", TOL="1%", TCR="+3850ppm/K"), conditions=FIELD)
    assert isinstance(model, ResistorModel)
    drift = model.drift.low, model.drift.high
    assert drift == pytest.approx((1 - 3850e-6 * 45, 1 + 3850e-6 * 35), rel=1e-14)


@pytest.mark.parametrize("refdes", ["R1", "C1"])
def test_a_coefficient_that_is_not_understood_is_told(refdes: str) -> None:
    model = resolve(part(refdes, VALUE="1k" if refdes == "R1" else "1n", **{"Temperature Coefficient": "small"}))
    assert any("'small' in export Temperature Coefficient" in p.message for p in model.problems)


@pytest.mark.parametrize("text", ["0", "0R", "0 ohm", "0R0", "0.0"])
def test_a_link_is_a_short(text: str) -> None:
    model = resolve(part("R1", VALUE=text))
    assert isinstance(model, ResistorModel)
    assert model.is_short
    assert (model.resistance.low, model.resistance.high) == (0.0, 0.0)


def test_resistor_without_value() -> None:
    model = resolve(part("R1", VALUE="tbd"))
    assert isinstance(model, ResistorModel)
    assert model.value is None
    with pytest.raises(ValueError, match="R1"):
        _ = model.resistance


def test_inductor() -> None:
    model = resolve(part("L1", VALUE="10uH", TOL="20%", DCR="50 mohm", SRF="20 MHz", ISAT="2 A"))
    assert isinstance(model, InductorModel)
    assert (model.inductance.low, model.inductance.high) == pytest.approx((8e-6, 12e-6), rel=1e-14)
    assert model.dcr == 0.05
    assert model.parallel_capacitance == pytest.approx(1 / ((2 * math.pi * 20e6) ** 2 * 10e-6), rel=1e-14)
    assert model.inductance_at(2.0).nominal == pytest.approx(7e-6, rel=1e-14)
    assert model.inductance_at(-2.0) == model.inductance_at(2.0)
    assert model.inductance_at(0.0).nominal == 10e-6


def test_bead_by_its_impedance() -> None:
    model = resolve(part("FB1", VALUE="600R@100MHz", DCR="0.2R"))
    assert isinstance(model, BeadModel)
    assert (model.resistance.low, model.resistance.nominal, model.resistance.high) == (450.0, 600.0, 750.0)
    assert model.inductance.nominal == pytest.approx(600 / (2 * math.pi * 25e6), rel=1e-14)
    assert (model.capacitance, model.dcr) == (0.0, 0.2)


def test_bead_stated_in_full_with_bias() -> None:
    known: dict[str, object] = {
        "resistance": "500 ohm",
        "inductance": "2 uH",
        "capacitance": "1 pF",
        "bias_curve": [["0 A", 1.0], ["1 A", 0.4]],
    }
    model = resolve(part("FB1", VALUE="600R@100MHz", TOL="10%"), row(known, refdes="FB1"))
    assert isinstance(model, BeadModel)
    assert model.resistance_at(0.0).nominal == 500.0
    assert model.resistance_at(1.0).nominal == pytest.approx(200.0, rel=1e-14)
    assert model.inductance_at(5.0).high == pytest.approx(2e-6 * 0.4 * 1.1, rel=1e-14)
    assert model.capacitance == 1e-12
    assert not model.assumptions or {a.attribute for a in model.assumptions} == {"dcr"}


@pytest.mark.parametrize(
    ("name", "text", "attribute", "wanted"),
    [
        ("TOL", "±10 % (K)", "tolerance", (-0.1, 0.1)),
        ("TOL", "10% max", "tolerance", (-0.1, 0.1)),
        ("VOLTAGE", "16 V DC", "rated_voltage", 16.0),
        ("VOLTAGE", "25WV", "rated_voltage", 25.0),
        ("VOLTAGE", "50V max", "rated_voltage", 50.0),
        ("PACKAGE", "0603 (1608 Metric)", "package", "0603"),
        ("FOOTPRINT", "chips:C0805-2012M", "package", "0805"),
        ("DIELECTRIC", "Ceramic X7R", "dielectric", "X7R"),
        ("DIELECTRIC", "x5r", "dielectric", "X5R"),
        ("TYPE", "Tantalum, moulded", "technology", "tantalum"),
        ("ESR", "20m", "esr", 0.02),
    ],
)
def test_attributes_with_words_around_them(name: str, text: str, attribute: str, wanted: object) -> None:
    model = resolve(part("C1", VALUE="1uF", **{name: text}))
    assert getattr(model, attribute) == wanted
    assert not any(text in problem.message for problem in model.problems)


def test_a_parasitic_misread_by_capitals_is_refused() -> None:
    model = resolve(part("L1", VALUE="10uH", DCR="45MOHM"))
    assert isinstance(model, InductorModel)
    assert model.dcr == 0.0
    assert any("45MOHM" in p.message for p in model.problems)


@pytest.mark.parametrize(
    ("attributes", "words"),
    [
        ({"colour": "red"}, "unknown attribute 'colour'"),
        ({"esr": "5 mV"}, "esr"),
        ({"esr": -1}, "esr"),
        ({"esl": "5 ohm"}, "esl"),
        ({"value": "ten"}, "value"),
        ({"value": -1}, "value"),
        ({"tolerance": "lots"}, "tolerance"),
        ({"technology": "vacuum"}, "technology"),
        ({"dielectric": "X7Q"}, "dielectric"),
        ({"rated_voltage": "16 A"}, "rated_voltage"),
        ({"rated_voltage": 0}, "rated_voltage"),
        ({"package": 805}, "package"),
        ({"polarised": "perhaps"}, "polarised"),
        ({"half_voltage": "0 V"}, "half_voltage"),
        ({"bias_curve": []}, "bias_curve"),
        ({"bias_curve": [["0 V", 1.0], ["0 V", 0.9]]}, "bias_curve"),
        ({"bias_curve": [["0 V", 1.0], ["5 Hz", 0.9]]}, "bias_curve"),
        ({"bias_curve": [["0 V"]]}, "bias_curve"),
        ({"bias_curve": [["0 V", -1]]}, "bias_curve"),
        ({"ageing": "200 %"}, "ageing"),
        ({"touchstone": "c.s2p"}, "touchstone"),
        ({"touchstone": {"file": "c.s2p", "connection": "sideways"}}, "touchstone"),
        ({"touchstone": {"file": "c.s2p", "colour": "red"}}, "touchstone"),
        ({"self_resonance": "5 V"}, "self_resonance"),
        ({"temperature_coefficient": "5 V"}, "temperature_coefficient"),
    ],
)
def test_a_wrong_table_is_refused_by_file_table_and_key(attributes: dict[str, object], words: str) -> None:
    wrong = KnowledgeRow({"refdes": "C1"}, attributes, BRIEF, "board.brief.toml [[part]] 3")
    with pytest.raises(InputError) as caught:
        validate_knowledge(wrong)
    text = str(caught.value)
    assert text.startswith("board.brief.toml: [[part]] 3")
    assert words in text


@pytest.mark.parametrize("match", [{}, {"colour": "red"}])
def test_a_table_must_match_something(match: dict[str, str]) -> None:
    with pytest.raises(InputError, match="match"):
        validate_knowledge(KnowledgeRow(match, {"esr": 1}, BRIEF))


@pytest.mark.parametrize(
    ("aliases", "derating", "words"),
    [
        ({"colour": ("red",)}, {}, "unknown attribute 'colour'"),
        ({}, {"vacuum": 0.5}, "unknown technology 'vacuum'"),
        ({}, {"ceramic": 0.0}, "ceramic"),
        ({}, {"film": 1.5}, "film"),
    ],
)
def test_wrong_settings_are_refused(
    aliases: dict[str, tuple[str, ...]], derating: dict[str, float], words: str
) -> None:
    with pytest.raises(InputError, match=words):
        validate_settings(Knowledge(aliases=aliases, derating=derating), BRIEF)
    validate_settings(Knowledge(aliases={"value": ("Wert",)}, derating={"ceramic": 0.6}), BRIEF)


def test_a_right_table_is_accepted() -> None:
    known: dict[str, object] = {
        "value": "10 uF",
        "tolerance": "10 %",
        "technology": "ceramic",
        "dielectric": "X7R",
        "rated_voltage": "16 V",
        "package": "0805",
        "polarised": False,
        "fitted": True,
        "esr": "5 mohm",
        "esl": 0.6e-9,
        "leakage_resistance": "1 Gohm",
        "leakage_current": "1 uA",
        "half_voltage": "6 V",
        "bias_curve": [["0 V", 1.0], ["5 V", "62 %"], [10, 0.35]],
        "ageing": "2.5 %",
        "temperature_coefficient": "30 ppm/K",
        "touchstone": {"file": "c10u.s2p", "connection": "shunt"},
        "dcr": "50 mohm",
        "self_resonance": "20 MHz",
        "saturation_current": "2 A",
        "resistance": "600 ohm",
        "inductance": "2 uH",
        "capacitance": "1 pF",
    }
    validate_knowledge(KnowledgeRow({"refdes": "C1*", "value": "10uF", "number": "*"}, known, BRIEF))
