"""Values as the trade writes them, both ways."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.quantity import QuantityError, Unit, format_quantity, parse_quantity

READ: tuple[tuple[str | int | float, Unit, float], ...] = (
    ("4.7 uF", "F", 4.7e-6),
    ("4.7uF", "F", 4.7e-6),
    ("4u7", "F", 4.7e-6),
    ("4µ7", "F", 4.7e-6),
    ("4\u03bc7", "F", 4.7e-6),
    ("4,7 µF", "F", 4.7e-6),
    ("10MFD", "F", 10e-6),
    ("10 mfd", "F", 10e-6),
    ("100PF", "F", 100e-12),
    ("100 MMFD", "F", 100e-12),
    ("2n2F", "F", 2.2e-9),
    ("1e-7", "F", 1e-7),
    (4.7e-6, "F", 4.7e-6),
    ("0.5 nH", "H", 0.5e-9),
    ("2u2", "H", 2.2e-6),
    ("4k7", "ohm", 4700.0),
    ("R47", "ohm", 0.47),
    ("0R1", "ohm", 0.1),
    ("1M0", "ohm", 1e6),
    ("1Meg", "ohm", 1e6),
    ("10 M", "ohm", 1e7),
    ("10 m", "ohm", 0.01),
    ("20 mohm", "ohm", 0.02),
    ("20 mΩ", "ohm", 0.02),
    ("20 m\u2126", "ohm", 0.02),
    ("100E", "ohm", 100.0),
    (0, "ohm", 0.0),
    ("165 mV", "V", 0.165),
    ("3V3", "V", 3.3),
    ("-0.3 V", "V", -0.3),
    ("\u22120.3 V", "V", -0.3),
    ("16 VDC", "V", 16.0),
    ("0.8 A", "A", 0.8),
    ("20 nA", "A", 20e-9),
    ("10 ns", "s", 10e-9),
    ("500 ms", "s", 0.5),
    ("3 min", "s", 180.0),
    ("2 h", "s", 7200.0),
    ("1000 hours", "s", 3.6e6),
    ("5 years", "s", 5 * 8766 * 3600.0),
    ("1 year", "s", 8766 * 3600.0),
    ("1.6 kHz", "Hz", 1600.0),
    ("10 MHZ", "Hz", 1e7),
    ("10 mHz", "Hz", 0.01),
    ("-20 degC", "degC", -20.0),
    ("85 °C", "degC", 85.0),
    ("85\u2103", "degC", 85.0),
    ("25", "degC", 25.0),
    ("298.15 K", "degC", 25.0),
    ("35 dB", "dB", 35.0),
    ("10 %", "fraction", 0.1),
    ("10%", "fraction", 0.1),
    ("0.5 percent", "fraction", 0.005),
    (0.1, "fraction", 0.1),
    ("100 ppm", "fraction", 1e-4),
    ("1.6 mm", "m", 1.6e-3),
    ("1 m", "m", 1.0),
    ("100 ppm/K", "ppm/K", 100.0),
    ("-750ppm/°C", "ppm/K", -750.0),
    ("2.5", "1", 2.5),
    ("100k", "1", 1e5),
    ("1\u00a0kHz", "Hz", 1000.0),
)


@pytest.mark.parametrize(("text", "unit", "value"), READ)
def test_reads(text: str | float, unit: Unit, value: float) -> None:
    assert parse_quantity(text, unit) == value


REFUSED: tuple[tuple[object, Unit], ...] = (
    ("", "F"),
    ("abc", "F"),
    ("4.7 uH", "F"),
    ("4.7 uF 25V", "F"),
    ("5MF", "F"),
    ("165 MV", "V"),
    ("10 m", "s"),
    ("4E7", "ohm"),
    ("1.2.3 V", "V"),
    ("1,000,000", "ohm"),
    ("nan", "V"),
    ("inf", "V"),
    ("1e999", "V"),
    (math.nan, "V"),
    (math.inf, "V"),
    (True, "V"),
    ("10 V", "fraction"),
    ("10 degC", "V"),
    ("10 k", "degC"),
    ("--1", "V"),
)


@pytest.mark.parametrize(("text", "unit"), REFUSED)
def test_refuses_and_says_what_was_read(text: str, unit: Unit) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, unit)
    assert repr(text) in str(caught.value)
    assert "expected something like" in str(caught.value)


WRITTEN: tuple[tuple[float, str, str], ...] = (
    (4.7e-6, "F", "4.7 µF"),
    (0.1637, "V", "164 mV"),
    (1590.0, "Hz", "1.59 kHz"),
    (0.99996, "V", "1 V"),
    (999.96e-9, "F", "1 µF"),
    (100e-9, "F", "100 nF"),
    (4700.0, "ohm", "4.7 kΩ"),
    (-0.164, "V", "-164 mV"),
    (0.0, "V", "0 V"),
    (1.5e-4, "V rms", "150 µV rms"),
    (12.34, "K", "12.3 K"),
    (-20.0, "degC", "-20 °C"),
    (35.123, "dB", "35.1 dB"),
    (0.1234, "fraction", "12.3 %"),
    (1234567.0, "1", "1234567"),
    (0.98, "1", "0.98"),
    (2e-9, "s", "2 ns"),
    (5 * 8766 * 3600.0, "s", "5 years"),
    (8766 * 3600.0, "s", "1 year"),
    (7200.0, "s", "2 h"),
    (900.0, "s", "15 min"),
    (math.inf, "ohm", "∞ Ω"),
    (-math.inf, "V", "−∞ V"),
    (math.nan, "V", "unknown"),
    (100.0, "ppm/K", "100 ppm/K"),
)


@pytest.mark.parametrize(("value", "unit", "text"), WRITTEN)
def test_writes(value: float, unit: str, text: str) -> None:
    assert format_quantity(value, unit) == text


PREFIXED: tuple[Unit, ...] = ("F", "H", "ohm", "V", "A", "Hz")


@given(
    st.floats(min_value=1e-14, max_value=9e13, allow_nan=False),
    st.sampled_from(PREFIXED),
    st.integers(min_value=2, max_value=15),
    st.booleans(),
)
def test_round_trip(value: float, unit: Unit, digits: int, negative: bool) -> None:
    limit = {"F": 9e5, "H": 9e5, "V": 9e5, "A": 9e5}.get(unit, 9e13)
    value = min(value, limit) * (-1 if negative else 1)
    back = parse_quantity(format_quantity(value, unit, digits), unit)
    assert back == pytest.approx(value, rel=0.5001 * 10.0 ** (1 - digits))


@given(st.floats(min_value=1e-14, max_value=1e12), st.integers(min_value=2, max_value=12))
def test_long_times_round_trip(value: float, digits: int) -> None:
    assert parse_quantity(format_quantity(value, "s", digits), "s") == pytest.approx(value, rel=10.0 ** (1 - digits))


@given(st.integers(min_value=1, max_value=999), st.sampled_from("pnum"), st.integers(min_value=0, max_value=999))
def test_infix_is_the_decimal_point(whole: int, prefix: str, part: int) -> None:
    """IEC 60062, clause 4: the letter of the multiplier stands in the place of the decimal point."""
    assert parse_quantity(f"{whole}{prefix}{part}", "F") == parse_quantity(f"{whole}.{part} {prefix}F", "F")


@given(st.text(max_size=12), st.sampled_from(("F", "ohm", "s", "degC", "fraction", "ppm/K", "1")))
def test_any_text_gives_a_number_or_a_message(text: str, unit: Unit) -> None:
    try:
        assert math.isfinite(parse_quantity(text, unit))
    except QuantityError as problem:
        assert repr(text) in str(problem)
