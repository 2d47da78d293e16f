"""Net names of the trade (common practice), and what each is."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.net_kinds import class_by_name, classify_nets


def _words(text: str) -> list[str]:
    return text.split()


GROUNDS = _words(
    """
    GND AGND DGND PGND SGND GNDA GNDD GND1 GND2 GND_ISO ISO_GND GND_PWR GND-A AGND_ADC VSS AVSS VSSA DVSS 0V 0
    EARTH CHASSIS PE GROUND gnd Gnd SIG_GND PWRGND CHASSIS_GND probe/GND RTN 24V_RTN VSS_PLL GND_SW 0V_A
    """
)

VOLTS = {
    "+3V3": 3.3, "3V3": 3.3, "3.3V": 3.3, "+3.3V": 3.3, "3,3V": 3.3, "+5V": 5.0, "5V0": 5.0, "5V": 5.0, "+12V": 12.0,
    "-12V": -12.0, "−12V": -12.0, "VCC_3V3": 3.3, "VDD1V8": 1.8, "P3V3": 3.3, "N12V": -12.0, "V3P3": 3.3,
    "P3P3V": 3.3, "+1.8V_CORE": 1.8, "+3V3A": 3.3, "3V3_A": 3.3, "+5V_USB": 5.0, "USB_5V": 5.0, "5VSB": 5.0,
    "VCC5V": 5.0, "VDD_3.3": 3.3, "+5": 5.0, "-15": -15.0, "NEG_5V": -5.0, "MINUS_12V": -12.0, "0V9": 0.9,
    "VDDA_1V8": 1.8, "MCU_3V3": 3.3, "3V3_ADC": 3.3, "+3V3_CLK": 3.3, "3V3_SW": 3.3, "REF_2V5": 2.5, "VREF_2V5": 2.5,
    "1P8V": 1.8, "+12V_IN": 12.0, "12V+": 12.0, "3_3V": 3.3, "VCC_3_3V": 3.3, "+3v3": 3.3, "block/+2V5": 2.5,
    "A5V": 5.0,
    "-5V_A": -5.0, "+48V": 48.0, "350V": 350.0, "DDR_1V5": 1.5, "-3.3V": -3.3, "V3V3": 3.3, "AVDD_1V8": 1.8,
}  # fmt: skip

RAILS_WITHOUT_VOLTAGE = _words(
    """
    VCC VDD VBAT VBUS AVDD VEE VCCIO VDDQ VDDA VDD33 VCC1 VSYS VBATT +BATT BAT+ V+ V- VPP VTT VDD_CORE VBAT_IN
    VBUS_F +VBAT AVCC DVDD PVDD VCCINT VDD_ADC VCC_CLK VEE_5V
    """
)

SIGNALS = _words(
    """
    +IN -IN IN+ A5V_EN 3V3_PG V_SENSE_5V EN_3V3 EN5V 5V_EN PGOOD_1V8 5V_FB VBAT_SENSE VBUS_DET VBAT_ADC VBAT_DIV
    12V_ADC 12V_MON ~5V_FAULT SDA 3V3_TX GPIO_3V3 N12 N$5 N00123 NET_12 V1 V5 VIN VOUT VREF VMID SW LX SW_3V3
    LX_5V 230VAC 24VAC 12V_TO_5V 5V_3V3_SEL VIRTUAL_GND GND_SENSE GND_DET OUT LINE_IN ADC_IN0 RESET BAT_MIC VGND
    VCC_EN VDDMON 12V- +1 XTAL1 GATE_12V C1+ U1_5 P1 P12 A0 D3 PB5 3V3_SDA 0R1 VSSOP BST_5V 5V_IMON +5V_SENSE
    LED1 TX_3V3
    """
)


@pytest.mark.parametrize("name", GROUNDS)
def test_usual_grounds(name: str) -> None:
    assert class_by_name(name).kind == "ground"
    assert class_by_name(name).volts == 0.0


@pytest.mark.parametrize(("name", "volts"), VOLTS.items())
def test_voltage_in_the_name(name: str, volts: float) -> None:
    found = class_by_name(name)
    assert (found.kind, found.volts) == ("rail", pytest.approx(volts))


@pytest.mark.parametrize("name", RAILS_WITHOUT_VOLTAGE)
def test_rails_whose_name_states_no_voltage(name: str) -> None:
    found = class_by_name(name)
    assert (found.kind, found.volts) == ("rail", None)


@pytest.mark.parametrize("name", SIGNALS)
def test_signals(name: str) -> None:
    assert class_by_name(name).kind == "signal"


def test_the_brief_decides_before_the_name() -> None:
    found = classify_nets(
        ["A", "+5V", "VIN", "AGND", "M1_GND", "GND", "3V3_PG"],
        ground=["GND", "M?_GND"],
        rails={"+5V": 5.25, "VIN": 12.0, "3V3_PG": 3.3},
    )
    assert (found["+5V"].volts, found["VIN"].volts) == (5.25, 12.0)
    assert found["3V3_PG"].kind == "rail"
    assert [found[name].kind for name in ("GND", "M1_GND", "AGND", "A")] == ["ground", "ground", "signal", "signal"]
    assert "brief" in found["AGND"].because


def test_a_briefed_rail_without_voltage_takes_it_from_its_name() -> None:
    found = classify_nets(["+3V3", "VX"], rails={"+3V3": None, "VX": None})
    assert found["+3V3"].volts == 3.3
    assert (found["VX"].kind, found["VX"].volts) == ("rail", None)


def test_ambiguous_digits_are_named_and_not_read() -> None:
    assert "33" in class_by_name("VDD33").because


@given(st.integers(1, 99), st.integers(0, 9), st.sampled_from(["", "+", "-"]))
def test_infix_and_decimal_point_say_the_same(whole: int, tenth: int, sign: str) -> None:
    """IEC 60062 puts the unit where the decimal point stands."""
    infix, point = class_by_name(f"{sign}{whole}V{tenth}"), class_by_name(f"{sign}{whole}.{tenth}V")
    assert infix == point
    assert infix.volts == pytest.approx((-1 if sign == "-" else 1) * (whole + tenth / 10))


@given(st.text(max_size=20))
def test_every_text_has_a_class_and_a_reason(name: str) -> None:
    found = classify_nets([name])[name]
    assert found.because
    assert (found.volts is None) or found.kind != "signal"
