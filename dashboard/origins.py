"""Where a check's number comes from, with what each part was worth before beside what it is worth now."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from reactance.analysis.design import InputError
from reactance.analysis.report import AssumptionEntry, Origin, PartLine
from reactance.daemon.history import HistoryError, RevisionRow
from reactance.dashboard.archive import Archive


@dataclass(frozen=True, slots=True)
class FigureLine:
    """One figure of a part; `before` only where it differed."""

    name: str
    now: str
    before: str


@dataclass(frozen=True, slots=True)
class PartFigures:
    """One part as the check used it."""

    refdes: str
    text: str
    nets: str
    figures: tuple[FigureLine, ...]
    because: tuple[str, ...]
    changed: bool


@dataclass(frozen=True, slots=True)
class Provenance:
    """Model, parts and assumptions behind a number; `missing` says why they cannot be told."""

    model: tuple[str, ...] = ()
    parts: tuple[PartFigures, ...] = ()
    assumptions: tuple[AssumptionEntry, ...] = ()
    missing: str = ""

    @property
    def about(self) -> frozenset[str]:
        """Refdes and nets that the number depends on."""
        return frozenset(part.refdes for part in self.parts)


def provenance(archive: Archive, check_id: str, revision: RevisionRow, baseline: RevisionRow | None) -> Provenance:
    """The origin of a check in a revision, compared with its origin in the baseline."""
    try:
        now = archive.study(revision).origin(check_id)
    except (InputError, HistoryError) as error:
        return Provenance(missing=f"This version cannot analyse that save again: {error}")
    except KeyError:
        return Provenance(missing="An earlier version made this check; this one does not.")
    before = _before(archive, check_id, baseline)
    parts = [_part(line, before.get(line.refdes), bool(before)) for line in now.parts]
    gone = [_gone(line) for refdes, line in before.items() if refdes not in {line.refdes for line in now.parts}]
    ordered = sorted([*parts, *gone], key=lambda part: not part.changed)
    return Provenance(now.model, tuple(ordered), now.assumptions)


def _before(archive: Archive, check_id: str, baseline: RevisionRow | None) -> Mapping[str, PartLine]:
    if baseline is None:
        return {}
    try:
        origin: Origin = archive.study(baseline).origin(check_id)
    except (InputError, HistoryError, KeyError):
        return {}  # the check is new, or this version refuses that save: nothing to compare with
    return {line.refdes: line for line in origin.parts}


def _part(line: PartLine, before: PartLine | None, compared: bool) -> PartFigures:
    then = dict(before.figures) if before else {}
    figures = tuple(
        FigureLine(name, now, then[name] if name in then and then[name] != now else "") for name, now in line.figures
    )
    text = line.text
    if compared and before is None:
        text = f"{line.text}, new"
    elif before is not None and before.text != line.text:
        text = f"{before.text} → {line.text}"
    changed = compared and (before is None or text != line.text or any(figure.before for figure in figures))
    return PartFigures(line.refdes, text, " – ".join(line.nets), figures, line.because, changed)


def _gone(line: PartLine) -> PartFigures:
    figures = tuple(FigureLine(name, "gone", value) for name, value in line.figures)
    return PartFigures(line.refdes, f"{line.text}, no longer here", " – ".join(line.nets), figures, (), True)
