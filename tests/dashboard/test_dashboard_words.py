"""Figures and limits in words."""

from __future__ import annotations

import pytest
from msgspec.structs import replace
from pagekit import make_check

from reactance.analysis.report import Edit, Limit
from reactance.dashboard import words


@pytest.mark.parametrize(
    ("id", "value", "unit", "limit", "says"),
    [
        ("rail:+3V3:droop", 0.164, "V", Limit(max=0.165), "164 mV of 165 mV"),
        ("filter:a:attenuation@100kHz", 41.0, "dB", Limit(min=35.0), "41 dB of at least 35 dB"),
        ("filter:a:corner_high", 1590.0, "Hz", Limit(1440.0, 1760.0), "1.59 kHz within 1.44 kHz to 1.76 kHz"),
        ("part:C1:stress", 0.66, "1", Limit(max=0.8), "66 % of 80 %"),
        ("rail:+3V3:capacitance", 1.23e-5, "F", None, "12.3 µF"),
        ("net:A:return", 1.0, "1", Limit(min=1.0), "a DC path"),
        ("net:A:return", 0.0, "1", Limit(min=1.0), "no DC path"),
        ("rail:+3V3:droop", None, "V", Limit(max=0.165), "no figure of 165 mV"),
    ],
)
def test_a_figure_against_its_limit(id: str, value: float | None, unit: str, limit: Limit | None, says: str) -> None:
    check = make_check(id, value, unit, None)
    assert words.check_words(replace(check, limit=limit)) == says


def test_a_band_that_is_a_point_is_none() -> None:
    assert words.band_words(0.1, 0.1, "V", "droop") == ""
    assert words.band_words(None, 0.1, "V", "droop") == ""
    assert words.band_words(0.1, 0.1000001, "V", "droop") == ""
    assert words.band_words(0.1, 0.2, "V", "droop") == "100 mV to 200 mV"


def test_tallies_put_failures_first_and_count_in_grammar() -> None:
    assert words.tally({"pass": 3, "fail": 1, "watched": 1}) == "1 fails, 3 hold, 1 is watched"
    assert words.tally({}) == "no checks"


def test_long_lists_end_in_a_number() -> None:
    assert words.listed(["a", "b"], 3) == "a, b"
    assert words.listed(["a", "b", "c", "d", "e"], 3) == "a, b, c and 2 more"


def test_a_check_of_which_only_the_id_is_left_has_a_name() -> None:
    assert words.id_words("coupling:A>B:startup_peak") == "A → B startup peak"
    assert words.id_words("odd") == "odd"


def test_the_same_edit_of_several_parts_is_one_line() -> None:
    edits = [Edit(part, "attribute changed", part, "VALUE", "22k", "47k") for part in ("R1", "R2")]
    edits += [Edit("C9", "part removed", "C9", None, "1u", None), Edit("b", "brief changed", None, "x", "1", "2")]
    lines = words.edit_lines(edits, None, None)
    assert lines == ("R1, R2 22k → 47k", "C9 removed (1u)", "brief, x, 1 → 2")
