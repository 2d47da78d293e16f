"""What each capacitor does, as rows of a table."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import CapacitorEntry, Check, Duty, DutyKind, Report
from reactance.dashboard import words
from reactance.dashboard.rows import TONES, Tone, check_href

_ORDER: tuple[DutyKind, ...] = (
    "decoupling", "coupling", "filter", "feedback", "timing", "snubber", "load", "unassigned",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class CapacitorRow:
    """A capacitor: what it is there for and because of what, and what it is really worth."""

    refdes: str
    duty: str
    because: str
    nets: str
    effective: str
    band: str
    rated: str
    kept: float | None
    dc: str
    stress: str
    tone: Tone
    href: str


def capacitor_rows(board: int, report: Report) -> tuple[CapacitorRow, ...]:
    """All capacitors, by duty and within a duty in the report's order."""
    reasons: dict[tuple[str, str], Duty] = {}
    for duty in report.duties:
        for part in duty.parts:
            reasons.setdefault((duty.kind, part), duty)
    stress = {check.id: check for check in report.checks if check.measure == "stress"}
    place = {kind: order for order, kind in enumerate(_ORDER)}
    ordered = sorted(report.capacitors, key=lambda entry: place.get(entry.duty, len(place)))
    return tuple(_row(board, entry, reasons, stress.get(f"part:{entry.refdes}:stress")) for entry in ordered)


def _row(
    board: int, entry: CapacitorEntry, reasons: Mapping[tuple[str, str], Duty], check: Check | None
) -> CapacitorRow:
    duty = reasons.get((entry.duty, entry.refdes))
    effective, value = entry.effective, entry.value
    ends = words.band_words(effective.low, effective.high, "F", "") if effective else ""
    rated = f" of {format_quantity(entry.rated_voltage, 'V')}" if entry.rated_voltage is not None else ""
    return CapacitorRow(
        refdes=entry.refdes,
        duty=entry.duty,
        because=duty.because if duty else "",
        nets=" – ".join(entry.nets),
        effective=format_quantity(effective.nominal, "F") if effective else "unknown",
        band=ends,
        rated=format_quantity(value, "F") if value is not None else "unknown",
        kept=effective.nominal / value if effective and value else None,
        dc=f"{format_quantity(entry.dc, 'V')}{rated}" if entry.dc is not None else f"unknown{rated}",
        stress=words.STATUS[check.status] if check else "",
        tone=TONES.get(check.status, "watched") if check else "watched",
        href=check_href(board, check.id) if check else "",
    )
