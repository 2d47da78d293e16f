"""The curves of a check as arrays for the browser: newer over older, the band, the limits."""

from __future__ import annotations

import re
from functools import cached_property
from pathlib import Path
from typing import Literal

import msgspec

from reactance.analysis.report import Curve, LimitLine


class Axis(msgspec.Struct, frozen=True):
    """One axis; `unit` is the SI unit that tick labels carry with a prefix."""

    label: str
    unit: str
    log: bool


class Side(msgspec.Struct, frozen=True):
    """One revision's curve. `low` and `high` are empty where no band was computed."""

    name: str
    role: Literal["before", "after", "input"]
    x: tuple[float, ...]
    y: tuple[float, ...]
    low: tuple[float, ...] = ()
    high: tuple[float, ...] = ()


class Plot(msgspec.Struct, frozen=True):
    """Everything that the browser draws; `note` says why there is nothing, or not all, to draw."""

    title: str
    x: Axis | None
    y: Axis | None
    sides: tuple[Side, ...]
    limits: tuple[LimitLine, ...]
    note: str = ""


def plot(before: tuple[str, Curve] | None, after: tuple[str, Curve] | None, note: str = "") -> Plot:
    """One plot of the two revisions' curves, each with the name it goes by. Axes and limits are the newer one's."""
    lead = after or before
    if lead is None:
        return Plot("", None, None, (), (), note)
    curve = lead[1]
    sides: list[Side] = []
    if before is not None and before[1].x_unit == curve.x_unit:
        sides.append(_side(before, "before"))
    if after is not None:
        sides.append(_side(after, "after"))
    return Plot(
        curve.title,
        Axis(curve.x_label, curve.x_unit, curve.log_x),
        Axis(curve.y_label, curve.y_unit, curve.log_y),
        tuple(sides),
        curve.limits,
        note,
    )


def _side(named: tuple[str, Curve], role: Literal["before", "after"]) -> Side:
    name, curve = named
    return Side(name, role, curve.x, curve.nominal, curve.low, curve.high)


def sine_plot(before: tuple[str, Curve] | None, after: tuple[str, Curve]) -> Plot:
    """In and out over time: the curve's `low` is what goes in, the same for both revisions."""
    name, curve = after
    sides = [Side("in", "input", curve.x, curve.low)]
    if before is not None:
        sides.append(Side(before[0], "before", before[1].x, before[1].nominal))
    sides.append(Side(name, "after", curve.x, curve.nominal))
    return Plot(
        curve.title,
        Axis(curve.x_label, curve.x_unit, False),
        Axis(curve.y_label, curve.y_unit, False),
        tuple(sides),
        (),
        curve.title,
    )


class PlotScript:
    """The plotting script that comes inside the plotly package, served as it is."""

    @cached_property
    def path(self) -> Path:
        """Its file."""
        import plotly

        return Path(plotly.__file__).parent / "package_data" / "plotly.min.js"

    @cached_property
    def style_ids(self) -> tuple[str, ...]:
        """Ids of the style elements that it would add by itself, which the page's policy forbids.

        It leaves out an element whose id is there already, so a page that holds them empty stays without complaint.
        They belong to kinds of plots that are not drawn here.
        """
        text = self.path.read_text(encoding="utf-8")
        return tuple(dict.fromkeys(re.findall(r'getElementById\("([0-9a-f]{64})"\)', text)))
