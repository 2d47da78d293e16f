"""Figures, edits and names in the words that the pages use. Everything here is plain text."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime

from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import Check, Edit, Limit, Status, Verdict

PERCENT = frozenset({"stress", "tilt", "overshoot"})  # shares that people read as percentages

SCOPES: Mapping[str, str] = {
    "rail": "Supplies",
    "coupling": "Couplings",
    "filter": "Filters",
    "part": "Parts",
    "net": "Nets",
    "": "Other checks",
}
_MEASURES: Mapping[str, str] = {
    "corner_low": "lower corner",
    "corner_high": "upper corner",
    "startup_peak": "start-up peak",
    "impedance": "impedance over target",
    "dc": "DC difference",
    "stress": "voltage stress",
    "range": "temperature room",
    "return": "DC path",
    "bypass": "capacitors per supply pin",
}
STATUS: Mapping[Status, str] = {
    "pass": "holds",
    "marginal": "marginal",
    "fail": "fails",
    "watched": "watched",
    "unknown": "unknown",
}
VERDICT: Mapping[Verdict, str] = {"worse": "worse", "better": "better", "moved": "moved"}


@dataclass(frozen=True, slots=True)
class Name:
    """A check id taken apart: what it is about, which measure, and both in words."""

    scope: str
    anchor: str
    measure: str
    detail: str

    def __str__(self) -> str:
        words = _MEASURES.get(self.measure, self.measure.replace("_", " "))
        return f"{self.anchor} {words}{f' at {self.detail}' if self.detail else ''}"


def name_of(check_id: str, measure: str = "") -> Name:
    """The parts of a check id. Anchors and details may themselves hold colons; a known `measure` decides."""
    scope, _, rest = check_id.partition(":")
    cut = rest.rfind(f":{measure}") if measure else -1
    if cut < 0:
        at = rest.find("@")
        cut = rest.rfind(":", 0, at if at >= 0 else len(rest))
    anchor, tail = (rest[:cut], rest[cut + 1 :]) if cut >= 0 else (rest, "")
    found, _, detail = tail.partition("@")
    return Name(scope, anchor.replace(">", " → "), found, detail)


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
    """The limit as it follows a figure: `of 165 mV`, `at least 35 dB`, `within 1.44 kHz to 1.76 kHz`."""
    if limit is None or measure == "return":
        return ""
    if limit.min is not None and limit.max is not None:
        return f"within {value_words(limit.min, unit, measure)} to {value_words(limit.max, unit, measure)}"
    if limit.max is not None:
        return f"of {value_words(limit.max, unit, measure)}"
    return f"at least {value_words(limit.min, unit, measure)}"


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


def edit_words(edit: Edit) -> str:
    """One edit: `C14 value 100 nF → 10 nF`, `C14 removed`, `C14 is now C20`."""
    part, attribute = edit.part or "", edit.attribute or ""
    before, after = edit.before, edit.after
    match edit.kind:
        case "part added":
            return f"{part} added{f' ({after})' if after else ''}"
        case "part removed":
            return f"{part} removed{f' ({before})' if before else ''}"
        case "part renumbered":
            return f"{before or part} is now {after}"
        case "pin moved":
            return f"{part} {attribute}: {before or 'open'} → {after or 'open'}"
        case "brief changed":
            return f"brief: {attribute or part} {_change(before, after)}".strip()
    name = "" if attribute.casefold() == "value" else f" {attribute}"
    return f"{part}{name} {_change(before, after)}"


def _change(before: str | None, after: str | None) -> str:
    if before is None:
        return f"{after} stated" if after is not None else "changed"
    return f"{before} no longer stated" if after is None else f"{before} → {after}"


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
    phrases = (
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
