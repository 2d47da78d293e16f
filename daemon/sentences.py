"""Sentences about what a save did, each with its figures."""

from __future__ import annotations

from collections import Counter

from reactance.analysis.report import Comparison, Edit, Movement, Report, Verdict
from reactance.daemon.outcome import Outcome
from reactance.daemon.text import plural

_MOST_SAID = 3
_ORDER: dict[Verdict, int] = {"worse": 0, "better": 1, "moved": 2}


def in_order(movements: tuple[Movement, ...]) -> list[Movement]:
    """What got worse first."""
    return sorted(movements, key=lambda movement: _ORDER[movement.verdict])


def movement_sentences(comparison: Comparison, older: Report, newer: Report) -> list[tuple[Verdict, str]]:
    """One sentence per movement, with its verdict."""
    from reactance.analysis.difference import sentence

    return [
        (movement.verdict, sentence(movement, comparison.edits, older, newer))
        for movement in in_order(comparison.movements)
    ]


def edit_sentence(edit: Edit) -> str:
    """An edit in words."""
    subject = " ".join(word for word in (edit.part, edit.attribute) if word)
    change = {
        (True, True): f"{edit.before} → {edit.after}",
        (True, False): f"{edit.before}",
        (False, True): f"{edit.after}",
        (False, False): "",
    }[edit.before is not None, edit.after is not None]
    return f"{edit.kind}: {subject} {change}".replace("  ", " ").rstrip(" :")


def save_line(outcome: Outcome) -> str:
    """One line about a save: which revision it made and what moved."""
    remarks = {
        "gone": "gone; its history is kept",
        "back": "back, unchanged",
        "same": "unchanged",
        "not stored": f"not stored: {outcome.message}",
        "broken": f"cannot be used: {outcome.message}",
    }
    if outcome.kind != "stored":
        return f"{outcome.name}: {remarks[outcome.kind]}"
    if outcome.comparison is None or outcome.older is None or outcome.report is None:
        return save_summary(outcome)
    said = [words for _, words in movement_sentences(outcome.comparison, outcome.older, outcome.report)]
    if not said:
        return save_summary(outcome)
    more = f"; and {len(said) - _MOST_SAID} more" if len(said) > _MOST_SAID else ""
    return f"{save_summary(outcome)}: {'; '.join(said[:_MOST_SAID])}{more}"


def save_summary(outcome: Outcome) -> str:
    """How much a stored save changed and moved, in numbers."""
    number = f" #{outcome.revision.id}" if outcome.revision else ""
    comparison = outcome.comparison
    if comparison is None:
        return f"{outcome.name}{number}: {_first(outcome.report)}"
    counts = Counter(movement.verdict for movement in comparison.movements)
    verdicts = ", ".join(f"{counts[verdict]} {verdict}" for verdict in _ORDER if counts[verdict])
    return f"{outcome.name}{number}: {plural(len(comparison.edits), 'edit')}, {verdicts or 'nothing moved'}"


def _first(report: Report | None) -> str:
    if report is None:
        return "stored"
    counts = Counter(check.status for check in report.checks)
    failing = f", {counts['fail']} failing" if counts["fail"] else ""
    return f"first revision: {plural(report.design.parts, 'part')}, {plural(len(report.checks), 'check')}{failing}"
