"""What a capacitor is worth, against hand calculation in exact arithmetic."""

from __future__ import annotations

import math
from fractions import Fraction
from types import MappingProxyType

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.design import Part, Pin, Place
from reactance.analysis.parts.capacitor import ageing_factor, discharge_time, stored_energy
from reactance.analysis.parts.knowledge import Knowledge, KnowledgeRow
from reactance.analysis.parts.models import CapacitorModel, Conditions
from reactance.analysis.parts.resolve import resolve_part

ROOM = Conditions()
FIELD = Conditions(temperature_low=-20.0, temperature_high=60.0)


def capacitor(
    attributes: dict[str, str],
    conditions: Conditions = ROOM,
    known: dict[str, object] | None = None,
    pins: tuple[Pin, ...] = (Pin("1"), Pin("2")),
    derating: dict[str, float] | None = None,
) -> CapacitorModel:
    rows = (KnowledgeRow({"refdes": "C1"}, known, Place("board.brief.toml"), "board.brief.toml [[part]] 1"),)
    knowledge = Knowledge(rows=rows if known else (), derating=MappingProxyType(derating or {}))
    model = resolve_part(Part("C1", pins, attributes), knowledge, conditions)
    assert isinstance(model, CapacitorModel)
    return model


def figures(model: CapacitorModel, volts: float) -> tuple[float, float, float]:
    band = model.effective(volts)
    return band.nominal, band.low, band.high


def exactly(*wanted: Fraction | mpmath.mpf | float) -> object:
    return pytest.approx(tuple(float(value) for value in wanted), rel=1e-13)


def test_class_i_over_temperature() -> None:
    """C0G ±30 ppm/K, ±5 %, -20 to 60 degC: the farthest temperature is 45 K away from 25 degC."""
    model = capacitor({"VALUE": "1n", "DIELECTRIC": "C0G", "TOL": "5%"}, FIELD)
    drift = Fraction(30, 10**6) * 45
    nominal = Fraction(1, 10**9)
    low, high = nominal * Fraction(95, 100) * (1 - drift), nominal * Fraction(105, 100) * (1 + drift)
    assert figures(model, 50.0) == exactly(nominal, low, high)
    assert model.dielectric_range == (-55.0, 125.0)
    assert not model.bias_matters(50.0)


def test_class_i_with_a_slope() -> None:
    """U2J: -750 ±120 ppm/K; hot, the steepest slope loses most; cold, it gains most."""
    model = capacitor({"VALUE": "100p", "DIELECTRIC": "U2J", "TOL": "5%"}, FIELD)
    steepest = Fraction(870, 10**6)
    nominal = Fraction(100, 10**12)
    low = nominal * Fraction(95, 100) * (1 - steepest * 35)
    high = nominal * Fraction(105, 100) * (1 + steepest * 45)
    assert figures(model, 0.0) == exactly(nominal, low, high)


def test_class_i_below_10_pf() -> None:
    model = capacitor({"VALUE": "4p7", "DIELECTRIC": "NP0", "TOL": "C"})
    assert figures(model, 0.0) == exactly(4.7e-12, 4.45e-12, 4.95e-12)


@pytest.mark.parametrize(
    ("code", "low", "high"), [("X7R", 85, 115), ("Y5V", 18, 122), ("X7S", 78, 122), ("X7T", 67, 122)]
)
def test_class_ii_takes_its_whole_envelope(code: str, low: int, high: int) -> None:
    """As soon as the range is more than 25 degC alone, however little more."""
    attributes = {"VALUE": "100n", "DIELECTRIC": code, "TOL": "10%"}
    warm = capacitor(attributes, Conditions(temperature_low=25.0, temperature_high=26.0))
    nominal = Fraction(100, 10**9)
    wanted = nominal * Fraction(9, 10) * Fraction(low, 100), nominal * Fraction(11, 10) * Fraction(high, 100)
    assert figures(warm, 0.0) == exactly(nominal, *wanted)
    at_25 = capacitor(attributes, ROOM)
    assert figures(at_25, 0.0) == exactly(nominal, nominal * Fraction(9, 10), nominal * Fraction(11, 10))


@pytest.mark.parametrize(("code", "per_decade"), [("X7R", "0.025"), ("X5R", "0.05"), ("Y5V", "0.07"), ("Z5U", "0.07")])
def test_ageing(code: str, per_decade: str) -> None:
    """Nominal and low have aged, high has not: 1 - a log10(43830/1000)."""
    model = capacitor({"VALUE": "1u", "DIELECTRIC": code, "TOL": "10%"}, Conditions(hours=5 * 8766.0))
    with mpmath.workdps(30):
        k = 1 - mpmath.mpf(per_decade) * mpmath.log10(mpmath.mpf(43830) / 1000)
        wanted = k * mpmath.mpf("1e-6"), k * mpmath.mpf("0.9e-6"), mpmath.mpf("1.1e-6")
    assert figures(model, 0.0) == exactly(*wanted)


def test_no_ageing_before_1000_hours_nor_in_class_i() -> None:
    assert ageing_factor(0.025, 10.0).is_exact
    assert capacitor({"VALUE": "1n", "DIELECTRIC": "C0G"}, Conditions(hours=1e6)).ageing.is_exact


def test_stated_ageing() -> None:
    model = capacitor({"VALUE": "1u", "DIELECTRIC": "X7R"}, Conditions(hours=1e5), {"ageing": "1 %"})
    assert (model.ageing.nominal, model.ageing.low, model.ageing.high) == exactly(0.98, 0.98, 1.0)


def test_stated_half_voltage() -> None:
    model = capacitor({"VALUE": "10u", "DIELECTRIC": "X7R", "TOL": "20%"}, ROOM, {"half_voltage": "4 V"})
    k = mpmath.mpf(1) / mpmath.cbrt(1 + 7 * (mpmath.mpf(10) / 4) ** 2)
    assert figures(model, 10.0) == exactly(1e-5 * k, 0.8e-5 * k, 1.2e-5 * k)
    assert figures(model, -10.0) == figures(model, 10.0)
    assert not model.needs_curve
    assert model.bias_matters(10.0)
    assert not model.bias_matters(0.0)


def test_stated_curve() -> None:
    curve: list[object] = [["0 V", 1.0], ["5 V", 0.62], ["10 V", "35 %"]]
    model = capacitor({"VALUE": "10u", "DIELECTRIC": "X7R", "TOL": "10%"}, ROOM, {"bias_curve": curve})
    assert figures(model, 5.0) == exactly(6.2e-6, 0.9 * 6.2e-6, 1.1 * 6.2e-6)
    assert figures(model, 12.0) == exactly(3.5e-6, 0.9 * 3.5e-6, 1.1 * 3.5e-6)
    assert not model.needs_curve
    assert any("stated curve, which ends at 10 V" in line for line in model.explain(12.0))


def test_a_curve_goes_before_a_half_voltage() -> None:
    known: dict[str, object] = {"bias_curve": [[0, 1.0], [5, 0.5]], "half_voltage": "1 V"}
    model = capacitor({"VALUE": "10u", "DIELECTRIC": "X7R", "PACKAGE": "0805"}, ROOM, known)
    assert model.bias_factor(5.0).nominal == 0.5


def test_the_estimate_joins_the_band() -> None:
    """10 uF X7R 0805 ±10 % at 5 V, all four effects together, worked with mpmath."""
    attributes = {"VALUE": "10u", "DIELECTRIC": "X7R", "TOL": "10%", "PACKAGE": "0805"}
    conditions = Conditions(temperature_low=-20.0, temperature_high=60.0, hours=5 * 8766.0)
    model = capacitor(attributes, conditions)
    with mpmath.workdps(30):
        c = mpmath.mpf("10e-6")
        volume = mpmath.mpf("2e-3") * mpmath.mpf("1.25e-3") ** 2
        thickness = mpmath.sqrt(mpmath.mpf("8.8541878128e-12") * 1500 * volume / c)
        k = [1 / mpmath.cbrt(1 + 7 * (5 / (mpmath.mpf(field) * thickness)) ** 2) for field in ("4e6", "1.6e6", "8.5e6")]
        aged = 1 - mpmath.mpf("0.025") * mpmath.log10(mpmath.mpf("43.83"))
        nominal = c * k[0] * aged
        low = c * mpmath.mpf("0.9") * mpmath.mpf("0.85") * k[1] * aged
        high = c * mpmath.mpf("1.1") * mpmath.mpf("1.15") * k[2]
    assert figures(model, 5.0) == exactly(nominal, low, high)


def test_a_smaller_case_of_the_same_value_is_worth_less() -> None:
    large = capacitor({"VALUE": "10u", "DIELECTRIC": "X5R", "PACKAGE": "0805", "VOLTAGE": "6.3V"})
    small = capacitor({"VALUE": "10u", "DIELECTRIC": "X5R", "PACKAGE": "0402", "VOLTAGE": "6.3V"})
    assert small.effective(3.3).nominal < 0.7 * large.effective(3.3).nominal


def test_without_a_package_the_loss_is_said_to_be_unknown() -> None:
    model = capacitor({"VALUE": "10u", "DIELECTRIC": "X7R"})
    assert model.needs_curve
    assert model.bias_factor(10.0).is_exact
    assert any(assumption.attribute == "bias loss" for assumption in model.assumptions)
    assert any("not known" in line for line in model.explain(10.0))


@given(st.floats(min_value=-200, max_value=200), st.sampled_from(("X7R", "X5R", "Y5V", "C0G", "U2J")))
def test_the_band_is_in_order(volts: float, code: str) -> None:
    model = capacitor({"VALUE": "1u", "DIELECTRIC": code, "PACKAGE": "0603"}, Conditions(-40.0, 85.0, 1e5))
    band = model.effective(volts)
    assert 0.0 < band.low <= band.nominal <= band.high


def test_charge_and_capacitance_are_vectorised_and_aged() -> None:
    model = capacitor({"VALUE": "10u", "DIELECTRIC": "X7R"}, Conditions(hours=1e5), {"half_voltage": "4 V"})
    volts = np.linspace(-10.0, 10.0, 21)
    c, q = model.capacitance_at(volts), model.charge(volts)
    assert c.shape == q.shape == (21,)
    assert c[20] == pytest.approx(model.effective(10.0).nominal, rel=1e-14)
    with mpmath.workdps(30):
        area = mpmath.quad(lambda v: 1 / mpmath.cbrt(1 + 7 * (v / 4) ** 2), mpmath.linspace(0, 10, 20))
    assert q[20] == pytest.approx(float(area * mpmath.mpf("10e-6") * mpmath.mpf("0.95")), rel=1e-13)
    plain = capacitor({"VALUE": "1n", "DIELECTRIC": "C0G"})
    assert plain.charge(volts) == pytest.approx(volts * 1e-9, rel=1e-15)


@pytest.mark.parametrize(
    ("attributes", "esr", "loss", "esl"),
    [
        ({"VALUE": "1n", "DIELECTRIC": "C0G", "PACKAGE": "0402"}, 5e-3, 0.001, 0.35e-9),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "PACKAGE": "0201"}, 5e-3, 0.025, 0.3e-9),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "PACKAGE": "0603"}, 5e-3, 0.025, 0.5e-9),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "PACKAGE": "0805"}, 5e-3, 0.025, 0.6e-9),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "PACKAGE": "1206"}, 5e-3, 0.025, 0.8e-9),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "PACKAGE": "1210"}, 5e-3, 0.025, 0.9e-9),
        ({"VALUE": "100u", "TYPE": "Electrolytic"}, 0.15 / (2 * math.pi * 120 * 100e-6), 0.0, 10e-9),
        ({"VALUE": "10u", "TECHNOLOGY": "tantalum"}, 0.5, 0.0, 2e-9),
        ({"VALUE": "100u", "TECHNOLOGY": "polymer"}, 25e-3, 0.0, 2e-9),
        ({"VALUE": "100n", "DIELECTRIC": "PP"}, 5e-3, 0.005, 8e-9),
    ],
)
def test_parasitics_by_technology(attributes: dict[str, str], esr: float, loss: float, esl: float) -> None:
    model = capacitor(attributes, Conditions(mounting_inductance=0.7e-9))
    assert model.esr == pytest.approx(esr, rel=1e-14)
    assert model.loss_tangent == loss
    assert model.esl == pytest.approx(esl + 0.7e-9, rel=1e-12)
    assert {"esr", "esl"} <= {assumption.attribute for assumption in model.assumptions}


def test_stated_parasitics_stand_alone() -> None:
    model = capacitor({"VALUE": "1u", "DIELECTRIC": "X7R", "ESR": "12 mohm", "ESL": "0.4nH"})
    assert (model.esr, model.loss_tangent, model.esl) == (0.012, 0.0, pytest.approx(0.9e-9, rel=1e-12))
    assert not {"esr", "esl", "loss_tangent"} & {assumption.attribute for assumption in model.assumptions}


@pytest.mark.parametrize(
    ("attributes", "ohms"),
    [
        ({"VALUE": "100u", "TECHNOLOGY": "aluminium", "VOLTAGE": "35V"}, 1e6),
        ({"VALUE": "10u", "TECHNOLOGY": "tantalum"}, 1e7),
        ({"VALUE": "100u", "TECHNOLOGY": "polymer"}, math.inf),
        ({"VALUE": "1u", "DIELECTRIC": "X7R"}, math.inf),
        ({"VALUE": "1u", "DIELECTRIC": "X7R", "LEAKAGE_RESISTANCE": "500M"}, 5e8),
        ({"VALUE": "10u", "TECHNOLOGY": "tantalum", "VOLTAGE": "16V", "LEAKAGE": "1.6 uA"}, 1e7),
        ({"VALUE": "10u", "TECHNOLOGY": "aluminium", "LEAKAGE": "0"}, math.inf),
    ],
)
def test_leakage(attributes: dict[str, str], ohms: float) -> None:
    assert capacitor(attributes).leakage_resistance == pytest.approx(ohms, rel=1e-12)


@pytest.mark.parametrize(
    ("names", "positive"),
    [
        ((("1", "K"), ("2", "A")), "2"),
        ((("1", "-"), ("2", "+")), "2"),
        ((("1", "NEG"), ("2", "POS")), "2"),
        ((("1", ""), ("2", "")), "1"),
        ((("2", ""), ("1", "")), "1"),
        ((("P", ""), ("N", "")), "P"),
        ((("A1", "cathode"), ("A2", "anode")), "A2"),
        ((("5", "x"), ("6", "y")), "5"),
    ],
)
def test_positive_pin(names: tuple[tuple[str, str], ...], positive: str) -> None:
    pins = tuple(Pin(number, name) for number, name in names)
    assert capacitor({"VALUE": "10u", "TECHNOLOGY": "tantalum"}, pins=pins).positive_pin == positive


def test_polarity() -> None:
    assert capacitor({"VALUE": "1u", "DIELECTRIC": "X7R"}).positive_pin is None
    assert not capacitor({"VALUE": "22u", "DESCRIPTION": "ELEC BIPOLAR 25V"}).polarised
    assert capacitor({"VALUE": "22u", "POLARISED": "yes"}).technology == "aluminium"
    assert capacitor({"VALUE": "22u"}, pins=(Pin("1", "+"), Pin("2", "-"))).technology == "aluminium"


@pytest.mark.parametrize(
    ("technology", "limit"),
    [("ceramic", 0.8), ("film", 0.8), ("polymer", 0.8), ("tantalum", 0.5), ("aluminium", 0.8)],
)
def test_derating(technology: str, limit: float) -> None:
    assert capacitor({"VALUE": "1u", "TECHNOLOGY": technology}).derating == limit
    assert capacitor({"VALUE": "1u", "TECHNOLOGY": technology}, derating={technology: 0.6}).derating == 0.6


@pytest.mark.parametrize(
    ("attributes", "share"),
    [
        ({"VALUE": "100p"}, 0.05),
        ({"VALUE": "1n"}, 0.05),
        ({"VALUE": "1.5n"}, 0.10),
        ({"VALUE": "10u", "TECHNOLOGY": "tantalum"}, 0.20),
        ({"VALUE": "10u", "TECHNOLOGY": "polymer"}, 0.20),
        ({"VALUE": "10u", "TECHNOLOGY": "aluminium"}, 0.20),
        ({"VALUE": "10n", "TECHNOLOGY": "film"}, 0.10),
    ],
)
def test_tolerance_where_none_is_stated(attributes: dict[str, str], share: float) -> None:
    model = capacitor(attributes)
    assert model.tolerance == (-share, share)
    assert any(assumption.attribute == "tolerance" for assumption in model.assumptions)


@pytest.mark.parametrize(
    ("value", "code"), [("100p", "C0G"), ("1n", "C0G"), ("1000pF", "C0G"), ("1.01n", "X7R"), ("10u", "X7R")]
)
def test_dielectric_where_none_is_stated(value: str, code: str) -> None:
    model = capacitor({"VALUE": value})
    assert model.dielectric == code
    assert [problem.severity for problem in model.problems] == ["note"]
    assert code in model.problems[0].message


def test_disputed_code_is_told() -> None:
    model = capacitor({"VALUE": "100p", "DIELECTRIC": "M4G"})
    assert any("disagree" in problem.message for problem in model.problems)


def test_technology_by_package() -> None:
    assert capacitor({"VALUE": "10u", "FOOTPRINT": "CAPMP3216X180N"}).technology == "tantalum"
    assert capacitor({"VALUE": "10u", "FOOTPRINT": "CAPAE660X540N"}).technology == "aluminium"
    assert capacitor({"VALUE": "220u", "FOOTPRINT": "CAPC3225X270N"}).technology == "ceramic"
    assert capacitor({"VALUE": "470u"}).technology == "aluminium"


def test_film_drifts_only_as_stated() -> None:
    attributes = {"VALUE": "10n", "DIELECTRIC": "PP", "TOL": "1%"}
    assert capacitor(attributes, FIELD).temperature.is_exact
    stated = capacitor(attributes | {"TCC": "-200 ppm/K"}, FIELD).temperature
    assert (stated.nominal, stated.low, stated.high) == exactly(1.0, 1 - 200e-6 * 35, 1 + 200e-6 * 45)


def test_explain_names_every_effect() -> None:
    attributes = {"VALUE": "10u", "DIELECTRIC": "X7R", "TOL": "10%", "PACKAGE": "0805"}
    lines = capacitor(attributes, Conditions(-20.0, 60.0, 43830.0)).explain(3.3)
    text = "\n".join(lines)
    for words in (
        "value 10 µF",
        "tolerance ±10 %",
        "temperature (X7R) ×0.85 to ×1.15",
        "bias at 3.3 V",
        "ageing",
        "R_s 5 mΩ",
    ):
        assert words in text


def test_stored_energy_and_discharge() -> None:
    """Half C V squared; R C ln(V/60) until 60 V."""
    assert stored_energy(100e-6, 400.0) == pytest.approx(8.0, rel=1e-15)
    assert discharge_time(100e-6, 1e6, 400.0) == pytest.approx(100.0 * math.log(400 / 60), rel=1e-15)
    assert discharge_time(100e-6, 1e6, 50.0) == 0.0
    assert discharge_time(100e-6, math.inf, 400.0) == math.inf
