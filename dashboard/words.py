"""Figures, edits and names in the words that the pages use. Everything here is plain text."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from datetime import datetime

from reactance.analysis.movement_words import edit_words
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Edit, Limit, Report, Status, Verdict

PERCENT = frozenset({"stress", "tilt", "overshoot"})  # shares that people read as percentages

SCOPES: Mapping[str, str] = {
    "rail": "Supplies",
    "coupling": "Couplings",
    "filter": "Filters",
    "part": "Parts",
    "net": "Nets",
    "": "Other checks",
}
STATUS: Mapping[Status, str] = {
    "pass": "holds",
    "marginal": "marginal",
    "fail": "fails",
    "watched": "watched",
    "unknown": "unknown",
}
VERDICT: Mapping[Verdict, str] = {"worse": "worse", "better": "better", "moved": "moved"}


def id_words(check_id: str) -> str:
    """The name of a check of which only the id is left."""
    _, _, rest = check_id.partition(":")
    anchor, _, measure = rest.rpartition(":")
    return f"{anchor} {measure.replace('_', ' ')}".replace(">", " → ").strip() or check_id


def value_words(value: float | None, unit: str, measure: str) -> str:
    """One figure with its unit."""
    if value is None:
        return "no figure"
    if measure == "return":
        return "a DC path" if value >= 1 else "no DC path"
    if measure in PERCENT:
        return format_quantity(value, "fraction")
    return format_quantity(value, unit)


def limit_words(limit: Limit | None, unit: str, measure: str) -> str:
    """The limit as it follows a figure: `of 165 mV`, `of at least 35 dB`, `within 1.44 kHz to 1.76 kHz`."""
    if limit is None or measure == "return":
        return ""
    if limit.min is not None and limit.max is not None:
        return f"within {value_words(limit.min, unit, measure)} to {value_words(limit.max, unit, measure)}"
    if limit.max is not None:
        return f"of {value_words(limit.max, unit, measure)}"
    return f"of at least {value_words(limit.min, unit, measure)}"


def check_words(check: Check) -> str:
    """A check's figure against its limit: `164 mV of 165 mV`."""
    figure = value_words(check.nominal, check.unit, check.measure)
    limit = limit_words(check.limit, check.unit, check.measure)
    return f"{figure} {limit}" if limit else figure


def band_words(low: float | None, high: float | None, unit: str, measure: str) -> str:
    """The tolerance band: `74 mV to 97 mV`; nothing where it is no band."""
    if low is None or high is None or low == high or measure == "return":
        return ""
    ends = value_words(low, unit, measure), value_words(high, unit, measure)
    return "" if ends[0] == ends[1] else f"{ends[0]} to {ends[1]}"


def edit_lines(edits: Iterable[Edit], older: Report | None, newer: Report | None) -> tuple[str, ...]:
    """Edits in words, a line each; the same edit of several parts is one line that names them all."""
    parts: dict[str, list[str]] = {}
    for edit in edits:
        line = edit_words(edit, older, newer)
        same = edit.part is not None and line.startswith(f"{edit.part} ")
        key = line.removeprefix(edit.part or "") if same else f" {line}"
        parts.setdefault(key, []).append(edit.part or "" if same else "")
    return tuple(f"{', '.join(names)}{rest}".strip() for rest, names in parts.items())


def listed(texts: Iterable[str], most: int) -> str:
    """The first `most` texts joined, and how many more there are."""
    found = list(texts)
    more = f" and {len(found) - most} more" if len(found) > most else ""
    return ", ".join(found[:most]) + more


def moment(seconds: float) -> str:
    """A time of day in words, in this machine's time zone."""
    when = datetime.fromtimestamp(seconds)
    return f"{when.day} {when:%B %Y, %H:%M:%S}"


def short_moment(seconds: float) -> str:
    """The same, short: for labels in a strip."""
    when = datetime.fromtimestamp(seconds)
    return f"{when.day} {when:%b %H:%M}"


def machine_moment(seconds: float) -> str:
    """The same for a `datetime` attribute."""
    return datetime.fromtimestamp(seconds).astimezone().isoformat(timespec="seconds")


def count(number: int, one: str, many: str | None = None) -> str:
    """`1 check fails`, `3 checks fail`."""
    return f"{number} {one if number == 1 else many or one + 's'}"


def tally(status: Mapping[Status, int]) -> str:
    """How many checks stand how, in one line."""
    phrases: tuple[tuple[Status, str, str], ...] = (
        ("fail", "fails", "fail"),
        ("marginal", "is marginal", "are marginal"),
        ("pass", "holds", "hold"),
        ("watched", "is watched", "are watched"),
        ("unknown", "is unknown", "are unknown"),
    )
    found = [count(status[key], one, many) for key, one, many in phrases if status.get(key)]
    if not found:
        return "no checks"
    return ", ".join(found)
