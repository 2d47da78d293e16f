"""The strip: heights are shares of the limit, and shapes carry the meaning."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.report import Limit, Status, Verdict
from reactance.daemon.history import StripCell
from reactance.dashboard.strip import BASE, HEIGHT, LINE, Column, Strip, draw, pitch, scale_of, width, y_of


def cell(
    revision: int,
    nominal: float | None,
    status: Status = "pass",
    *,
    low: float | None = None,
    high: float | None = None,
    margin: float | None = None,
    verdict: Verdict | None = None,
) -> StripCell:
    return StripCell(revision, "rail:+3V3:droop", nominal, low, high, margin, status, verdict)


def column(number: int, *, unjudged: bool = False) -> Column:
    return Column(number, number, f"{number} May 12:00", "C14 100 nF → 10 nF", unjudged=unjudged)


def strip_of(cells: list[StripCell], limit: Limit | None, unit: str = "V", baseline: float | None = None) -> Strip:
    columns = [column(one.revision) for one in cells]
    scale = scale_of(cells, limit, unit, baseline)
    return draw("rail:+3V3:droop", "+3V3 droop", cells, columns, scale, {}, {})


def test_a_bar_is_the_share_of_a_greatest_value() -> None:
    half, full = strip_of([cell(1, 0.05), cell(2, 0.1)], Limit(max=0.1)).cells
    assert half.height == pytest.approx((BASE - LINE) / 2)
    assert full.top == LINE


def test_a_bar_is_the_share_of_a_least_value() -> None:
    """A filter that gives twice the attenuation that is asked uses half of its limit."""
    half, full = strip_of([cell(1, 70.0), cell(2, 35.0)], Limit(min=35.0), "dB").cells
    assert half.height == pytest.approx((BASE - LINE) / 2)
    assert full.top == LINE


def test_between_two_bounds_the_middle_uses_nothing() -> None:
    middle, quarter, edge = strip_of([cell(1, 1600.0), cell(2, 1640.0), cell(3, 1760.0)], Limit(1440.0, 1760.0)).cells
    assert middle.height == 0
    assert quarter.height == pytest.approx((BASE - LINE) / 4)
    assert edge.top == LINE


def test_a_limit_of_zero_has_its_line_too() -> None:
    inside, at, beyond = strip_of([cell(1, 2.0), cell(2, 0.0), cell(3, -0.5, "fail")], Limit(min=0.0)).cells
    assert inside.top is not None and beyond.top is not None
    assert inside.top > LINE
    assert at.top == LINE
    assert beyond.top < LINE


def test_without_a_limit_the_line_is_the_baseline_value() -> None:
    same, more = strip_of([cell(1, 2e-6, "watched"), cell(2, 3e-6, "watched")], None, "F", 2e-6).cells
    assert same.top == LINE
    assert more.top is not None and more.top < LINE


def test_decibels_are_compared_as_ratios() -> None:
    """6.02 dB less is half as much."""
    (cut,) = strip_of([cell(1, -20 - 20 * math.log10(2), "watched")], None, "dB", -20.0).cells
    assert cut.height == pytest.approx((BASE - LINE) / 2, abs=0.01)


def test_a_failure_stands_clear_of_the_line_however_slight() -> None:
    slight, none = strip_of([cell(1, 0.1650001, "fail"), cell(2, 0.1649999, "pass")], Limit(max=0.165)).cells
    assert slight.top is not None and none.top is not None
    assert slight.top <= LINE - 4
    assert none.top >= LINE


def test_the_tick_is_the_worst_end_of_the_band() -> None:
    greatest = strip_of([cell(1, 0.1, low=0.08, high=0.12)], Limit(max=0.2)).cells[0]
    least = strip_of([cell(1, 40.0, low=36.0, high=44.0)], Limit(min=35.0), "dB").cells[0]
    assert greatest.tick == y_of(0.12 / 0.2)
    assert least.tick == y_of(35 / 36)


def test_a_point_has_no_tick() -> None:
    assert strip_of([cell(1, 0.1, low=0.1, high=0.1)], Limit(max=0.2)).cells[0].tick is None


def test_a_marginal_tick_crosses_the_line() -> None:
    found = strip_of([cell(1, 0.16, "marginal", low=0.15, high=0.1651)], Limit(max=0.165)).cells[0]
    assert found.tick is not None and found.top is not None
    assert found.tick < LINE <= found.top


def test_an_older_cell_keeps_the_limit_that_it_was_judged_by() -> None:
    """80 mV to 90 mV of 100 mV had a margin of 0.1; today's limit of 200 mV does not change that bar."""
    older = cell(1, 0.08, low=0.07, high=0.09, margin=0.1)
    newer = cell(2, 0.08, low=0.07, high=0.09, margin=0.55)
    drawn = strip_of([older, newer], Limit(max=0.2)).cells
    assert drawn[0].top == pytest.approx(y_of(0.8), abs=0.01)
    assert drawn[1].top == pytest.approx(y_of(0.4), abs=0.01)


def test_only_a_worse_cell_has_a_notch() -> None:
    cells = [cell(1, 0.1), cell(2, 0.15, verdict="worse"), cell(3, 0.1, verdict="better")]
    assert [one.worse for one in strip_of(cells, Limit(max=0.2)).cells] == [False, True, False]


def test_a_save_that_was_not_judged_keeps_its_place_and_says_so() -> None:
    columns = [column(1), column(2, unjudged=True), column(3)]
    cells = [cell(1, 0.1), cell(3, 0.1)]
    drawn = draw("x", "x", cells, columns, scale_of(cells, Limit(max=0.2), "V", None), {}, {}).cells
    assert [one.top is None for one in drawn] == [False, True, False]
    assert "could not be judged" in drawn[1].label


def test_failing_since_looks_past_unjudged_saves() -> None:
    columns = [column(1), column(2), column(3, unjudged=True), column(4)]
    cells = [cell(1, 0.1), cell(2, 0.3, "fail"), cell(4, 0.3, "fail")]
    scale = scale_of(cells, Limit(max=0.2), "V", None)
    since = draw("x", "x", cells, columns, scale, {}, {}).failing_since
    assert since is not None and since.number == 2
    mended = [*cells[:2], replace(cells[2], status="pass")]
    assert draw("x", "x", mended, columns, scale, {}, {}).failing_since is None


@given(st.lists(st.floats(min_value=0, allow_infinity=True, allow_nan=False), min_size=2, max_size=20))
def test_more_is_never_lower_and_all_stays_inside(shares: list[float]) -> None:
    heights = [y_of(share) for share in sorted(shares)]
    assert all(0 <= y <= HEIGHT for y in heights)
    assert all(later <= earlier for earlier, later in pairwise(heights))


@given(
    st.floats(allow_nan=False, allow_infinity=True),
    st.sampled_from([Limit(max=0.1), Limit(min=0.1), Limit(-1.0, 1.0), Limit(max=0.0), Limit(min=-3.0), None]),
    st.sampled_from(["V", "dB"]),
)
def test_any_figure_can_be_drawn(value: float, limit: Limit | None, unit: str) -> None:
    found = strip_of([cell(1, value), cell(2, 1.0)], limit, unit, 1.0).cells[0]
    assert found.top is not None
    assert 0 <= found.top <= BASE


@pytest.mark.parametrize("columns", [0, 1, 16, 17, 60])
def test_all_columns_fit(columns: int) -> None:
    assert width(columns) >= columns * pitch(columns)
    assert width(60) <= 480
