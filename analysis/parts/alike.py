"""Parts that differ in nothing but their designator are read once: a board has few kinds of parts and many of each."""

from __future__ import annotations

from dataclasses import replace
from fnmatch import fnmatchcase

from reactance.analysis.design import Part
from reactance.analysis.parts.base import Conditions
from reactance.analysis.parts.kinds import class_letters
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import PartModel
from reactance.analysis.parts.resolve import resolve_part

MOST_PINS = 2  # of parts with more, the nets and the neighbours of each pin have a say


class Alike:
    """Resolves parts under one knowledge and one set of conditions. Not thread-safe."""

    def __init__(self, knowledge: Knowledge, conditions: Conditions) -> None:
        self._knowledge, self._conditions = knowledge, conditions
        self._patterns = tuple(row.match["refdes"].strip() for row in knowledge.rows if "refdes" in row.match)
        self._known: dict[tuple[object, ...], PartModel] = {}

    def resolve(self, part: Part) -> PartModel:
        """What `resolve_part` gives for `part`."""
        if len(part.pins) > MOST_PINS:
            return resolve_part(part, self._knowledge, self._conditions)
        key = (
            class_letters(part.refdes),
            tuple(fnmatchcase(part.refdes.strip(), pattern) for pattern in self._patterns),
            part.cell,
            tuple((pin.number, pin.name) for pin in part.pins),
            tuple(part.attributes.items()),
        )
        found = self._known.get(key)
        if found is None:
            found = self._known[key] = resolve_part(part, self._knowledge, self._conditions)
        return found if found.refdes == part.refdes else renamed(found, part.refdes)


def renamed(model: PartModel, refdes: str) -> PartModel:
    """The model of an equal part under another designator."""
    return replace(
        model,
        refdes=refdes,
        assumptions=tuple(replace(entry, about=refdes) for entry in model.assumptions),
        problems=tuple(replace(entry, where=refdes) for entry in model.problems),
    )
