"""Text for people: names from files made safe for a terminal, figures in the units of the trade, times."""

from __future__ import annotations

import time

from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Limit


def clean(text: str) -> str:
    """`text` with control characters shown, so that a name in a file cannot steer the terminal."""
    if text.isprintable():
        return text
    return "".join(char if char.isprintable() or char == "\n" else _shown(char) for char in text)


def _shown(char: str) -> str:
    return char.encode("unicode_escape").decode("ascii")


def figure(value: float | None, unit: str) -> str:
    """A value with its unit; a dash where there is none. A bare number (unit `1`) stays bare."""
    return "–" if value is None else format_quantity(value, unit)


def band(check: Check) -> str:
    """The extremes of a check, where they differ from its nominal."""
    if check.low is None or check.high is None or check.low == check.high:
        return ""
    return f"{figure(check.low, check.unit)} … {figure(check.high, check.unit)}"


def bounds(limit: Limit | None, unit: str) -> str:
    """A limit in words of arithmetic."""
    if limit is None:
        return ""
    least = f"≥ {figure(limit.min, unit)}" if limit.min is not None else ""
    most = f"≤ {figure(limit.max, unit)}" if limit.max is not None else ""
    return f"{least} {most}".strip()


def share(margin: float | None, check: Check) -> str:
    """A margin: a share of the limit in percent; where the limit is 0, a distance in the check's unit."""
    if margin is None:
        return ""
    limits = (check.limit.min, check.limit.max) if check.limit else ()
    if any(limit == 0 for limit in limits if limit is not None):
        return figure(margin, check.unit)
    return f"{margin * 100 + 0.0:.3g} %"  # + 0.0: no margin is no negative one


def moment(seconds: float) -> str:
    """A moment in the user's own time."""
    return time.strftime("%Y-%m-%d %H:%M:%S", time.localtime(seconds))


def plural(count: int, noun: str) -> str:
    """`1 part`, `2 parts`."""
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"
