"""Reading an export again when only attributes of some instances have changed: the usual save.

What a design connects depends on what its entries declare and on how they are nested, and on nothing else in the
file. Where both are as before, the parts and nets are as before; they are taken over, with their places brought
up to date, and the changed instances' parts get their new attributes.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import TypeVar

from reactance.analysis.design import Design, Net, Part, Problem
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_flatten import Flat
from reactance.analysis.exports.edif_parts import gives_refdes
from reactance.analysis.exports.edif_scan import Container, Entry
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_values import Attribute
from reactance.analysis.exports.limits import Limits

_Placed = TypeVar("_Placed", Part, Net)


@dataclass(frozen=True, slots=True)
class LastReading:
    """A design and what it was made from.

    `part_entries` and `net_entries` give the position among `values` of the entry that each part and net is from.
    `scanned` are the problems that were noted before anything was put together. Problems name places, so where
    there are any, `places` holds those of all containers and entries.
    """

    limits: Limits
    nesting: list[tuple[str, str, int, int]]
    values: list[object]
    design: Design
    part_entries: list[int]
    net_entries: list[int]
    scanned: tuple[Problem, ...]
    places: list[tuple[int, int]]


def _containers(top: Container) -> list[Container]:
    """All containers in order."""
    found: list[Container] = []
    waiting = [top]
    while waiting:
        container = waiting.pop()
        found.append(container)
        waiting.extend(reversed(container.inner))
    return found


def _nesting(top: Container) -> list[tuple[str, str, int, int]]:
    """Keyword and bare name of each container, how many entries and how many containers are in it."""
    return [(each.keyword, each.head, len(each.entries), len(each.inner)) for each in _containers(top)]


def _places(source: Source, top: Container, entries: Sequence[Entry]) -> list[tuple[int, int]]:
    at = source.line_and_column
    return [at(each.start) for each in _containers(top)] + [at(entry.start) for entry in entries]


def last_reading(
    source: Source, top: Container, entries: Sequence[Entry], flat: Flat, scanned: tuple[Problem, ...]
) -> LastReading | None:
    """What to remember of a reading; None where the short way could not be taken from it."""
    if len(flat.part_starts) != len(flat.design.parts):
        return None
    position = {entry.start: number for number, entry in enumerate(entries)}
    return LastReading(
        source.limits,
        _nesting(top),
        [entry.value for entry in entries],
        flat.design,
        [position[start] for start in flat.part_starts],
        [position[start] for start in flat.net_starts],
        scanned,
        _places(source, top, entries) if flat.design.problems else [],
    )


def same_but_attributes(
    last: LastReading, source: Source, top: Container, entries: Sequence[Entry]
) -> LastReading | None:
    """The reading, where its design differs from the last one in attributes and places alone; else None."""
    if source.limits != last.limits or source.problems() != last.scanned or len(entries) != len(last.values):
        return None
    changed = _changed(last, entries, source.limits)
    if changed is None or _nesting(top) != last.nesting:
        return None
    if last.design.problems and _places(source, top, entries) != last.places:
        return None
    parts = _placed(last.design.parts, last.part_entries, entries, source)
    for index, number in enumerate(last.part_entries) if changed else ():
        if number in changed:
            before, after = changed[number]
            if parts[index].attributes is not before.plain or after.plain is None:
                return None
            parts[index] = replace(parts[index], attributes=after.plain)
    nets = _placed(last.design.nets, last.net_entries, entries, source)
    design = replace(last.design, parts=tuple(parts), nets=tuple(nets))
    return replace(last, values=[entry.value for entry in entries], design=design)


def _changed(
    last: LastReading, entries: Sequence[Entry], limits: Limits
) -> dict[int, tuple[says.Instance, says.Instance]] | None:
    """The instances of other attributes, by position; None where anything else is another."""
    changed: dict[int, tuple[says.Instance, says.Instance]] = {}
    for number, (before, entry) in enumerate(zip(last.values, entries, strict=True)):
        after = entry.value
        if after is before:
            continue
        if not isinstance(before, says.Instance) or not isinstance(after, says.Instance):
            return None
        if not _same_part(before, after, limits):
            return None
        changed[number] = (before, after)
    return changed


def _same_part(before: says.Instance, after: says.Instance, limits: Limits) -> bool:
    """Whether two declarations of an instance differ in attributes alone, none of which gives the refdes."""
    return (
        before.name == after.name
        and before.cells == after.cells
        and before.designator == after.designator
        and before.numbers == after.numbers
        and not before.faults
        and not after.faults
        and max(before.longest, after.longest) <= min(limits.name, limits.text)
        and _refdes_properties(before) == _refdes_properties(after)
    )


def _refdes_properties(instance: says.Instance) -> list[Attribute]:
    return [each for each in instance.attributes if gives_refdes(each)]


def _placed(
    things: Iterable[_Placed], numbers: list[int], entries: Sequence[Entry], source: Source
) -> list[_Placed]:
    """The same with the places that their entries have now."""
    at = source.line_and_column
    result: list[_Placed] = []
    for thing, number in zip(things, numbers, strict=True):
        line, column = at(entries[number].start)
        place = thing.place
        if place is None or place.line != line or place.column != column:
            thing = replace(thing, place=source.place(entries[number].start))  # noqa: PLW2901
        result.append(thing)
    return result
