"""Codes entry by entry against the published tables named beside them."""

from __future__ import annotations

import pytest

from reactance.analysis.parts.codes import (
    is_preferred,
    letter_tolerance,
    parse_tolerance,
    picofarad_code,
    series,
)
from reactance.analysis.parts.dielectrics import parse_dielectric
from reactance.analysis.parts.sizes import CHIP_SIZES, parse_size
from reactance.analysis.quantity import QuantityError, parse_quantity

# IEC 60063:2015, tables 1 and 2, as reprinted in resistor makers' catalogues.
E3 = "1.0 2.2 4.7"
E6 = "1.0 1.5 2.2 3.3 4.7 6.8"
E12 = "1.0 1.2 1.5 1.8 2.2 2.7 3.3 3.9 4.7 5.6 6.8 8.2"
E24 = "1.0 1.1 1.2 1.3 1.5 1.6 1.8 2.0 2.2 2.4 2.7 3.0 3.3 3.6 3.9 4.3 4.7 5.1 5.6 6.2 6.8 7.5 8.2 9.1"
E48 = """
100 105 110 115 121 127 133 140 147 154 162 169 178 187 196 205 215 226 237 249 261 274 287 301
316 332 348 365 383 402 422 442 464 487 511 536 562 590 619 649 681 715 750 787 825 866 909 953"""
E96 = """
100 102 105 107 110 113 115 118 121 124 127 130 133 137 140 143 147 150 154 158 162 165 169 174
178 182 187 191 196 200 205 210 215 221 226 232 237 243 249 255 261 267 274 280 287 294 301 309
316 324 332 340 348 357 365 374 383 392 402 412 422 432 442 453 464 475 487 499 511 523 536 549
562 576 590 604 619 634 649 665 681 698 715 732 750 768 787 806 825 845 866 887 909 931 953 976"""
E192 = """
100 101 102 104 105 106 107 109 110 111 113 114 115 117 118 120 121 123 124 126 127 129 130 132
133 135 137 138 140 142 143 145 147 149 150 152 154 156 158 160 162 164 165 167 169 172 174 176
178 180 182 184 187 189 191 193 196 198 200 203 205 208 210 213 215 218 221 223 226 229 232 234
237 240 243 246 249 252 255 258 261 264 267 271 274 277 280 284 287 291 294 298 301 305 309 312
316 320 324 328 332 336 340 344 348 352 357 361 365 370 374 379 383 388 392 397 402 407 412 417
422 427 432 437 442 448 453 459 464 470 475 481 487 493 499 505 511 517 523 530 536 542 549 556
562 569 576 583 590 597 604 612 619 626 634 642 649 657 665 673 681 690 698 706 715 723 732 741
750 759 768 777 787 796 806 816 825 835 845 856 866 876 887 898 909 920 931 942 953 965 976 988"""


@pytest.mark.parametrize(("n", "table"), [(3, E3), (6, E6), (12, E12), (24, E24)])
def test_series_to_e24(n: int, table: str) -> None:
    assert list(series(n)) == [float(value) for value in table.split()]  # type: ignore[arg-type]


@pytest.mark.parametrize(("n", "table"), [(48, E48), (96, E96), (192, E192)])
def test_series_to_e192(n: int, table: str) -> None:
    assert len(table.split()) == n
    assert list(series(n)) == [int(value) / 100 for value in table.split()]  # type: ignore[arg-type]


def test_preferred_in_any_decade() -> None:
    assert is_preferred(4.7e-6, 12)
    assert is_preferred(47e3, 3)
    assert is_preferred(100.0, 3)
    assert not is_preferred(5e3, 24)
    assert is_preferred(49.9e3, 96)
    assert not is_preferred(49.9e3, 24)


# IEC 60062:2016, clause 5: symmetric and asymmetric letters.
@pytest.mark.parametrize(
    ("letter", "low", "high"),
    [
        ("B", -0.001, 0.001),
        ("C", -0.0025, 0.0025),
        ("D", -0.005, 0.005),
        ("F", -0.01, 0.01),
        ("G", -0.02, 0.02),
        ("J", -0.05, 0.05),
        ("K", -0.10, 0.10),
        ("M", -0.20, 0.20),
        ("Z", -0.20, 0.80),
    ],
)
def test_tolerance_letters(letter: str, low: float, high: float) -> None:
    assert letter_tolerance(letter, None) == pytest.approx((low, high), rel=1e-15)
    assert parse_tolerance(letter.lower(), 1e-6) == pytest.approx((low, high), rel=1e-15)


@pytest.mark.parametrize(("letter", "picofarad"), [("B", 0.1), ("C", 0.25), ("D", 0.5), ("F", 1.0), ("G", 2.0)])
def test_tolerance_letters_below_10_pf(letter: str, picofarad: float) -> None:
    low, high = letter_tolerance(letter, 5e-12)
    assert (low * 5, high * 5) == pytest.approx((-picofarad, picofarad), rel=1e-12)
    assert letter_tolerance(letter, 10e-12) == letter_tolerance(letter, None)
    assert letter_tolerance("J", 5e-12) == (-0.05, 0.05)


@pytest.mark.parametrize(
    ("text", "low", "high"),
    [
        ("10 %", -0.1, 0.1),
        ("±10%", -0.1, 0.1),
        ("+/-5 %", -0.05, 0.05),
        ("+-5%", -0.05, 0.05),
        ("5", -0.05, 0.05),
        ("+80/-20%", -0.2, 0.8),
        ("-20/+80 %", -0.2, 0.8),
        ("+80% -20%", -0.2, 0.8),
        ("-0+100%", 0.0, 1.0),
        ("0,5 %", -0.005, 0.005),
        ("±0.5 pF", -0.05, 0.05),
    ],
)
def test_tolerance_texts(text: str, low: float, high: float) -> None:
    assert parse_tolerance(text, 10e-12) == pytest.approx((low, high), abs=1e-15)


@pytest.mark.parametrize("text", ["", "0.1", "x", "E", "10 V", "150"])
def test_tolerance_refused(text: str) -> None:
    with pytest.raises(QuantityError, match="tolerance"):
        parse_tolerance(text, 1e-6)


# IEC 60062:2016, clause 4, examples of the letter and digit code.
@pytest.mark.parametrize(
    ("code", "ohms"),
    [
        ("R10", 0.1),
        ("R332", 0.332),
        ("1R0", 1.0),
        ("3R32", 3.32),
        ("10R", 10.0),
        ("33R2", 33.2),
        ("100R", 100.0),
        ("1K0", 1e3),
        ("3K32", 3.32e3),
        ("10K", 10e3),
        ("33K2", 33.2e3),
        ("100K", 100e3),
        ("1M0", 1e6),
        ("3M32", 3.32e6),
        ("10M", 10e6),
        ("1G0", 1e9),
        ("1T0", 1e12),
    ],
)
def test_resistance_code(code: str, ohms: float) -> None:
    assert parse_quantity(code, "ohm") == ohms


@pytest.mark.parametrize(
    ("code", "farad"),
    [
        ("p10", 0.1e-12),
        ("p332", 0.332e-12),
        ("1p0", 1e-12),
        ("3p32", 3.32e-12),
        ("10p", 10e-12),
        ("33p2", 33.2e-12),
        ("n10", 0.1e-9),
        ("1n0", 1e-9),
        ("3n32", 3.32e-9),
        ("100n", 100e-9),
        ("1µ0", 1e-6),
        ("3µ32", 3.32e-6),
        ("33µ2", 33.2e-6),
        ("1m0", 1e-3),
    ],
)
def test_capacitance_code(code: str, farad: float) -> None:
    assert parse_quantity(code, "F") == farad


# EIA-198-1-F: two significant figures and a power of ten, in picofarad; 8 is -2 and 9 is -1.
@pytest.mark.parametrize(
    ("digits", "farad"),
    [
        ("100", 10e-12),
        ("101", 100e-12),
        ("102", 1e-9),
        ("103", 10e-9),
        ("104", 100e-9),
        ("105", 1e-6),
        ("475", 4.7e-6),
        ("226", 22e-6),
        ("107", 100e-6),
        ("229", 2.2e-12),
        ("478", 0.47e-12),
    ],
)
def test_picofarad_code(digits: str, farad: float) -> None:
    assert picofarad_code(digits) == farad


# EIA-198-1-F, class I: significant figure, multiplier, tolerance, each in all combinations.
FIGURES = {"C": 0.0, "B": 0.3, "L": 0.8, "A": 0.9, "M": 1.0, "P": 1.5, "R": 2.2, "S": 3.3, "T": 4.7, "V": 5.6, "U": 7.5}
MULTIPLIERS = {"0": -1, "1": -10, "2": -100, "3": -1000, "6": 10, "7": 100, "8": 1000}
SPREADS = {"G": 30, "H": 60, "J": 120, "K": 250, "L": 500, "M": 1000, "N": 2500}


@pytest.mark.parametrize("figure", FIGURES)
def test_class_i(figure: str) -> None:
    for digit, multiplier in MULTIPLIERS.items():
        for letter, spread in SPREADS.items():
            dielectric = parse_dielectric(figure + digit + letter)
            assert dielectric is not None
            assert dielectric.family == 1
            assert dielectric.limits == (-55.0, 125.0)
            slope = FIGURES[figure] * multiplier
            wanted = ((slope - spread) * 1e-6, slope * 1e-6, (slope + spread) * 1e-6)
            assert dielectric.coefficient == pytest.approx(wanted, rel=1e-12, abs=1e-18)
            assert not dielectric.disputed


@pytest.mark.parametrize("digit", "45")
def test_the_multipliers_on_which_tables_disagree_are_marked(digit: str) -> None:
    dielectric = parse_dielectric(f"M{digit}G")
    assert dielectric is not None
    assert dielectric.disputed
    assert dielectric.coefficient[1] == pytest.approx(1e-6)


# Well-known class I codes and their older names (EIA-198 annex; ppm/K).
@pytest.mark.parametrize(
    ("name", "code", "slope", "spread"),
    [
        ("NP0", "C0G", 0, 30),
        ("NPO", "C0G", 0, 30),
        ("COG", "C0G", 0, 30),
        ("P100", "M7G", 100, 30),
        ("N750", "U2J", -750, 120),
        ("N470", "T2H", -470, 60),
        ("N330", "S2H", -330, 60),
        ("N220", "R2H", -220, 60),
        ("N150", "P2H", -150, 60),
        ("N1500", "P3K", -1500, 250),
    ],
)
def test_class_i_names(name: str, code: str, slope: float, spread: float) -> None:
    dielectric = parse_dielectric(name)
    assert dielectric is not None
    assert dielectric.code == code
    wanted = ((slope - spread) * 1e-6, slope * 1e-6, (slope + spread) * 1e-6)
    assert dielectric.coefficient == pytest.approx(wanted, abs=1e-12)


# EIA-198-1-F, classes II and III.
LOWS = {"X": -55, "Y": -30, "Z": 10}
HIGHS = {"4": 65, "5": 85, "6": 105, "7": 125, "8": 150, "9": 200}
CHANGES = {
    "A": (-1, 1),
    "B": (-1.5, 1.5),
    "C": (-2.2, 2.2),
    "D": (-3.3, 3.3),
    "E": (-4.7, 4.7),
    "F": (-7.5, 7.5),
    "P": (-10, 10),
    "R": (-15, 15),
    "S": (-22, 22),
    "T": (-33, 22),
    "U": (-56, 22),
    "V": (-82, 22),
}


@pytest.mark.parametrize("change", CHANGES)
def test_class_ii_and_iii(change: str) -> None:
    for low, lowest in LOWS.items():
        for high, highest in HIGHS.items():
            dielectric = parse_dielectric(low + high + change)
            assert dielectric is not None
            assert dielectric.family == (3 if change in "TUV" else 2)
            assert dielectric.limits == (lowest, highest)
            share = tuple(percent / 100 for percent in CHANGES[change])
            assert dielectric.change == pytest.approx(share, rel=1e-15)


# Ageing per decade (common practice).
@pytest.mark.parametrize(
    ("code", "ageing"),
    [("X7R", 0.025), ("X6R", 0.025), ("X7P", 0.025), ("X5R", 0.05), ("Y5V", 0.07), ("Z5U", 0.07)],
)
def test_ageing(code: str, ageing: float) -> None:
    dielectric = parse_dielectric(code)
    assert dielectric is not None
    assert dielectric.ageing == ageing


@pytest.mark.parametrize("text", ["", "X7", "X3R", "W7R", "X7Q", "CAP", "1206", "C9G", "D0G"])
def test_no_dielectric(text: str) -> None:
    assert parse_dielectric(text) is None


# EIA-481 inch and metric codes with the bodies behind them (length by width in mm).
@pytest.mark.parametrize(
    ("inch", "metric", "length", "width"),
    [
        ("01005", "0402", 0.4, 0.2),
        ("0201", "0603", 0.6, 0.3),
        ("0402", "1005", 1.0, 0.5),
        ("0603", "1608", 1.6, 0.8),
        ("0805", "2012", 2.0, 1.25),
        ("1206", "3216", 3.2, 1.6),
        ("1210", "3225", 3.2, 2.5),
        ("1808", "4520", 4.5, 2.0),
        ("1812", "4532", 4.5, 3.2),
        ("2010", "5025", 5.0, 2.5),
        ("2220", "5750", 5.7, 5.0),
        ("2512", "6332", 6.3, 3.2),
    ],
)
def test_sizes(inch: str, metric: str, length: float, width: float) -> None:
    for text in (
        inch,
        f"C{inch}",
        f"R-{inch}",
        f"SMD_{inch}",
        f"{metric}M",
        f"CAPC{metric}X50N",
        f"{inch} ({metric} metric)",
    ):
        size = parse_size(text)
        assert size is not None, text
        assert size.code == inch
        assert (size.length * 1e3, size.width * 1e3) == pytest.approx((length, width), rel=1e-12)
    assert parse_size(inch).height == parse_size(inch).width  # type: ignore[union-attr]


def test_height_of_a_land_pattern() -> None:
    """IPC-7351: the number behind the X is the greatest height in hundredths of a millimetre."""
    size = parse_size("CAPC1608X90N")
    assert size is not None
    assert size.code == "0603"
    assert size.height == pytest.approx(0.9e-3, rel=1e-12)
    assert size.volume == pytest.approx(1.6e-3 * 0.8e-3 * 0.9e-3, rel=1e-12)


@pytest.mark.parametrize("text", ["", "SOT23", "3216-18", "CAPMP3216X180N", "QFN1608", "D6.3x5.4", "10000", "radial"])
def test_no_chip(text: str) -> None:
    assert parse_size(text) is None


def test_every_metric_code_is_one_size() -> None:
    metrics = [metric for metric, _, _ in CHIP_SIZES.values()]
    assert len(metrics) == len(set(metrics))
