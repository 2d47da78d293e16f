"""What changed between two revisions of a board and what that moved."""

from __future__ import annotations

from collections.abc import Mapping

from reactance.analysis.brief import read_brief
from reactance.analysis.brief_tables import BoardTable
from reactance.analysis.design import Design, InputError
from reactance.analysis.edits import find_changes
from reactance.analysis.movement_words import sentence
from reactance.analysis.movements import find_movements
from reactance.analysis.report import Comparison, Edit, Movement, Report

__all__ = ["allowed_drift", "compare", "edits", "movements", "sentence"]

Side = tuple[Design, Report, bytes | None]


def edits(
    older: Design, newer: Design, older_brief: bytes | None = None, newer_brief: bytes | None = None
) -> tuple[Edit, ...]:
    """The edits that lead from one revision to the other; empty where nothing that counts was changed."""
    return find_changes(older, newer, older_brief, newer_brief).edits


def movements(
    older: Report,
    newer: Report,
    share: float,
    *,
    briefs: tuple[bytes | None, bytes | None] = (None, None),
    parts: Mapping[str, str] | None = None,
    nets: Mapping[str, str] | None = None,
) -> tuple[Movement, ...]:
    """The checks that differ by more than `share` (0.05 is 5 %); see `find_movements`."""
    return find_movements(older, newer, share, briefs=briefs, parts=parts, nets=nets)


def compare(older: Side, newer: Side) -> Comparison:
    """Edits and movements between two sides, each a design with its report and its brief's bytes.

    How far an unjudged check may drift is what the newer brief says under `[board] movement`. Causes stay empty here.
    """
    changes = find_changes(older[0], newer[0], older[2], newer[2])
    moved = find_movements(
        older[1],
        newer[1],
        allowed_drift(newer[2]),
        briefs=(older[2], newer[2]),
        parts=changes.matching.renumbered,
        nets=changes.matching.renamed_nets,
    )
    return Comparison(changes.edits, moved)


def allowed_drift(brief: bytes | None) -> float:
    """`[board] movement` of the brief, as a fraction; the default where it cannot be read."""
    try:
        return float(read_brief(brief, "brief").tables.board.movement)
    except InputError:
        return float(BoardTable().movement)
