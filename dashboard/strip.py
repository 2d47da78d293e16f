"""The strip: one check over the last saves, one small cell per save, drawn on the server.

The height of a bar is the share of the limit that the figure uses; the limit is one line across the strip.
A check with no limit is measured against its baseline value instead. Above the line heights are compressed,
so that any excess stays inside the strip and more is always higher.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from markupsafe import Markup, escape

from reactance.analysis.report import Limit, Status
from reactance.daemon.history import StripCell

HEIGHT = 48
BASE = 39.0  # where bars stand
LINE = 15.0  # the limit
_UNIT = BASE - LINE
_HEADROOM = LINE - 1.0
_LEAST_EXCESS = 4.0  # a failing bar stands clear of the line, however small the excess
_PITCHES = ((8, 24), (16, 18), (30, 13), (45, 10))
_NARROWEST = 8


@dataclass(frozen=True, slots=True)
class Column:
    """One save, as all strips of a page share it. `edits` is what it changed, in words."""

    revision: int
    number: int
    when: str
    edits: str
    new_day: bool = False
    unjudged: bool = False
    shown: bool = False


@dataclass(frozen=True, slots=True)
class Drawn:
    """One cell. `top` and `tick` are heights in the strip's own units, None where there is no figure."""

    x: float
    width: float
    column: Column
    status: Status
    top: float | None
    tick: float | None
    worse: bool
    label: str
    href: str

    @property
    def height(self) -> float:
        """Height of the bar."""
        return 0.0 if self.top is None else round(BASE - self.top, 2)

    @property
    def middle(self) -> float:
        """The middle of the cell, where the notch hangs."""
        return self.x + self.width / 2


@dataclass(frozen=True, slots=True)
class Strip:
    """A check's strip, ready to be drawn: `label` says in words what it shows."""

    check: str
    label: str
    width: int
    pitch: int
    judged: bool
    cells: tuple[Drawn, ...]

    @property
    def failing_since(self) -> Column | None:
        """The save from which on the check fails without a break until now; None where it does not fail now."""
        found: Column | None = None
        for cell in reversed(self.cells):
            if cell.column.unjudged:
                continue
            if cell.status != "fail":
                break
            found = cell.column
        return found


def pitch(columns: int) -> int:
    """Width of one cell with its gap: few saves are drawn wider."""
    return next((wide for most, wide in _PITCHES if columns <= most), _NARROWEST)


def width(columns: int) -> int:
    """Width of a strip of that many saves."""
    return max(columns, 1) * pitch(columns)


@dataclass(frozen=True, slots=True)
class Scale:
    """How figures of one check become heights: shares of its limit, or of its baseline value."""

    limit: Limit | None
    baseline: float | None
    unit: str
    span: float

    def share(self, value: float) -> float:
        """1 on the line, 0 where nothing of the limit is used, above 1 beyond the limit."""
        if self.limit is None:
            return self._against_baseline(value)
        low, high = self.limit.min, self.limit.max
        if low is not None and high is not None:
            half = (high - low) / 2
            return abs(value - (low + high) / 2) / half if half > 0 else (0.0 if value == low else math.inf)
        if high is not None:
            return value / high if high > 0 else 1 + (value - high) / self.span
        assert low is not None
        if low > 0:
            return low / value if value > 0 else math.inf
        return 1 - (value - low) / self.span

    def _against_baseline(self, value: float) -> float:
        if self.baseline is None:
            return 1.0
        if self.unit == "dB":
            return float(10 ** (min(value - self.baseline, 200.0) / 20))
        if self.baseline != 0 and value / self.baseline >= 0:
            return value / self.baseline
        return max(0.0, 1 + (value - self.baseline) / self.span)


def scale_of(cells: Sequence[StripCell], limit: Limit | None, unit: str, baseline: float | None) -> Scale:
    """The scale for a check's cells; where a limit is 0, the widest figure of the strip is one unit."""
    figures = [abs(value) for cell in cells for value in (cell.nominal, cell.low, cell.high) if value is not None]
    finite = [value for value in figures if math.isfinite(value)]
    return Scale(limit, baseline, unit, max(finite, default=0.0) or 1.0)


def y_of(share: float) -> float:
    """Where a share of the limit lies in the strip: straight below the line, compressed above it."""
    if math.isnan(share):
        return BASE
    if share <= 1:
        return round(BASE - _UNIT * max(share, 0.0), 2)
    return round(LINE - _HEADROOM * (1 - share**-3), 2)


def draw(
    check: str,
    name: str,
    cells: Sequence[StripCell],
    columns: Sequence[Column],
    scale: Scale,
    figures: Mapping[int, str],
    hrefs: Mapping[int, str],
) -> Strip:
    """The strip of one check over the page's columns; `figures` and `hrefs` are the cells' labels and links."""
    by_revision = {cell.revision: cell for cell in cells}
    step = pitch(len(columns))
    drawn = tuple(
        _cell(by_revision.get(column.revision), column, index * step, step, scale, figures, hrefs)
        for index, column in enumerate(columns)
    )
    return Strip(check, _summary(name, drawn), width(len(columns)), step, scale.limit is not None, drawn)


def _cell(
    cell: StripCell | None,
    column: Column,
    x: float,
    step: int,
    scale: Scale,
    figures: Mapping[int, str],
    hrefs: Mapping[int, str],
) -> Drawn:
    gap = max(2, round(step / 4))
    href = hrefs.get(column.revision, "")
    place = f"save {column.number}, {column.when}"
    if cell is None:
        why = "could not be judged" if column.unjudged else "not on the board"
        return Drawn(x + gap / 2, step - gap, column, "unknown", None, None, False, f"{place}: {why}", href)
    scale = replace(scale, limit=_limit_then(cell, scale.limit))
    top = None if cell.nominal is None else y_of(scale.share(cell.nominal))
    if top is not None and cell.status == "fail":
        top = min(top, LINE - _LEAST_EXCESS)
    tick = _worst(cell, scale)
    label = f"{place}: {figures.get(cell.revision, '')}"
    return Drawn(x + gap / 2, step - gap, column, cell.status, top, tick, cell.verdict == "worse", label, href)


def _limit_then(cell: StripCell, limit: Limit | None) -> Limit | None:
    """The limit that the cell was judged by. Its margin tells where it was another one than today's.

    A margin is (limit − worst)/|limit|, so a single positive bound follows from it.
    """
    ends = [end for end in (cell.nominal, cell.low, cell.high) if end is not None]
    if limit is None or cell.margin is None or not ends or (limit.min is None) == (limit.max is None):
        return limit
    if limit.max is not None:
        then = max(ends) / (1 - cell.margin) if cell.margin < 1 else 0.0
        return Limit(max=then) if then > 0 and limit.max > 0 else limit
    then = min(ends) / (1 + cell.margin) if cell.margin > -1 else 0.0
    return Limit(min=then) if then > 0 and limit.min else limit


def _worst(cell: StripCell, scale: Scale) -> float | None:
    """The end of the band that uses most of the limit; none where the band is a point."""
    ends = [end for end in (cell.low, cell.high) if end is not None]
    if not ends or cell.nominal is None or all(end == cell.nominal for end in ends):
        return None
    worst = min(y_of(scale.share(end)) for end in ends)
    crosses = cell.status == "marginal"
    return min(worst, LINE - _LEAST_EXCESS) if crosses else worst


def _summary(name: str, drawn: Sequence[Drawn]) -> str:
    worse = sum(cell.worse for cell in drawn)
    failing = sum(cell.status == "fail" for cell in drawn)
    parts = [f"{name} over {len(drawn)} save{'' if len(drawn) == 1 else 's'}"]
    if worse:
        parts.append(f"got worse {worse} time{'' if worse == 1 else 's'}")
    if failing:
        parts.append(f"fails in {failing}")
    return ", ".join(parts)


def svg(strip: Strip) -> Markup:
    """The strip as a drawing in the page. Shapes carry the meaning: hatching, tick, notch; colour repeats it."""
    last = len(strip.cells) - 1
    cells = "".join(_cell_svg(cell, strip.pitch, 0 if place == last else -1) for place, cell in enumerate(strip.cells))
    unlimited = "" if strip.judged else " unlimited"
    return Markup(
        f'<svg class="strip{unlimited}" width="{strip.width}" height="{HEIGHT}" viewBox="0 0 {strip.width} {HEIGHT}" '
        f'preserveAspectRatio="none" role="group" aria-label="{escape(strip.label)}">'
        f'{cells}<path class="limit" d="M0 {LINE:g}H{strip.width}"/></svg>'
    )


def _cell_svg(cell: Drawn, pitch: int, tab: int) -> str:
    left = cell.x - (pitch - cell.width) / 2
    day = f'<path class="day" d="M{left:g} {BASE:g}V{HEIGHT}"/>' if cell.column.new_day else ""
    if cell.top is None:
        drawn = f'<path class="none" d="M{cell.middle:g} {BASE:g}v-6"/>'
    else:
        drawn = "" if cell.tick is None else _tick_svg(cell, cell.tick, cell.top)
        # The fill stands here because a style sheet would look for the pattern in itself.
        hatch = ' fill="url(#hatch)"' if cell.status == "fail" else ""
        high = max(cell.height, 1.0)
        drawn += f'<path class="bar" d="M{cell.x:g} {BASE:g}v-{high:g}h{cell.width:g}v{high:g}z"{hatch}/>'
    notch = f'<path class="notch" d="M{cell.middle:g} {BASE + 2:g}l4 6h-8z"/>' if cell.worse else ""
    shown = " shown" if cell.column.shown else ""
    return (
        f'<a class="cell {cell.status}{shown}" href="{escape(cell.href)}" tabindex="{tab}">'
        f"<title>{escape(cell.label)}</title>"
        f'<path class="ground" d="M{left:g} 0h{pitch}v{HEIGHT}h-{pitch}z"/>{day}{drawn}{notch}</a>'
    )


def _tick_svg(cell: Drawn, tick: float, top: float) -> str:
    return f'<path class="tick" d="M{cell.x:g} {tick:g}h{cell.width:g}M{cell.middle:g} {tick:g}V{top:g}"/>'
