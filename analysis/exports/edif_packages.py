"""Parts of the flattened design: one refdes each, sections of one package put together."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, replace
from types import MappingProxyType

from reactance.analysis.design import Part, Pin
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_parts import LocalPart
from reactance.analysis.exports.edif_source import Source


def flat_part(
    local: LocalPart, path: tuple[str, ...], called: list[str], notes: list[says.Annotation], source: Source
) -> Part:
    """The instance `local` under `path`, by its refdes or name alone.

    `called` names the net of each of the view's nodes; `notes` is what is said of this place only.
    """
    refdes = local.refdes or local.name
    attributes, numbers = local.attributes, local.numbers
    for note in notes:
        if note.designator and not note.designator.endswith("?"):
            refdes = note.designator
        attributes = MappingProxyType({**attributes, **{each.name: each.text for each in note.attributes}})
        given = [(local.interface.bits_of(ref), number) for ref, number in note.numbers]
        numbers = {**numbers, **{bits[0]: number for bits, number in given if len(bits) == 1}}
    on = local.nodes
    pins = tuple(
        [
            Pin(
                numbers.get(bit, port.number) if numbers else port.number,
                port.name,
                called[on[bit]] if bit in on else None,
                port.direction,
            )
            for bit, port in enumerate(local.interface.bits)
        ]
    )
    return Part(refdes, pins, attributes, local.target.name, path, source.place(local.start))


_MOST_ASKED = (
    8  # of several parts with one refdes, the first so many are asked whether another is a section of them
)


@dataclass(slots=True)
class _Candidate:
    """A part whose refdes is also another's; `named` where it is more than the name of an instance.

    `pins` are its pins by number and `sections` the instances that were found to be one package with it.
    """

    part: Part
    local: LocalPart
    named: bool
    pins: dict[str, Pin]
    sections: list[Part]

    def whole(self) -> Part:
        """The part with the pins and attributes of all its sections; the first one's word counts."""
        if not self.sections:
            return self.part
        attributes: dict[str, str] = {}
        for section in (self.part, *self.sections):
            for name, text in section.attributes.items():
                attributes.setdefault(name, text)
        return replace(self.part, pins=tuple(self.pins.values()), attributes=MappingProxyType(attributes))


def packages(parts: list[Part], locals_: list[LocalPart], source: Source) -> tuple[Part, ...]:
    """One Part for each component, each under a refdes of its own, in the order of their first sections.

    Sections of one package (the same designator, other pins) are one part. Without a designator the plain name
    of the instance counts where it is unique in the design, else `PATH/NAME`; so also for designators in a cell
    that is used several times.
    """
    counts = Counter([part.refdes for part in parts])
    if len(counts) == len(parts):
        return tuple(parts)
    candidates = [
        _Candidate(
            part,
            local,
            bool(local.refdes) or part.refdes != local.name,
            {pin.number: pin for pin in part.pins},
            [],
        )
        for part, local in zip(parts, locals_, strict=True)
    ]
    return _own_names(_sections(candidates, counts), source)


def _own_names(candidates: list[_Candidate], source: Source) -> tuple[Part, ...]:
    """The parts with a refdes for each, no two alike."""
    counts = Counter([each.part.refdes for each in candidates])
    top = {each.part.refdes for each in candidates if not each.part.path}
    used: set[str] = set()
    tried: Counter[str] = Counter()
    written = 0
    parts: list[Part] = []
    for each in candidates:
        part = each.part
        name = part.refdes
        if counts[name] > 1 and part.path:
            name = "/".join((*part.path, name))
            written += len(name)
            source.check("paths", written, each.local.start)
            if each.named:
                message = f"{counts[part.refdes]} parts have the designator {part.refdes}; this one is read as {name}"
                source.problem("caution", each.local.start, message)
        if name in used or (part.path and name in top):
            wanted = name
            while name in used or name in top:
                tried[wanted] += 1
                name = f"{wanted}#{tried[wanted] + 1}"
            message = f"two parts are called {wanted}; this one is read as {name}"
            source.problem("error", each.local.start, message)
        used.add(name)
        parts.append(part if name == part.refdes else replace(part, refdes=name))
    return tuple(parts)


def _sections(candidates: list[_Candidate], counts: Mapping[str, int]) -> list[_Candidate]:
    """The parts with the sections of each package put together."""
    by_refdes: dict[str, list[_Candidate]] = {}
    kept: list[_Candidate] = []
    for each in candidates:
        if each.named and counts[each.part.refdes] > 1:
            same = by_refdes.setdefault(each.part.refdes, [])
            package = next((other for other in same if _one_package(other, each)), None)
            if package is not None:
                package.sections.append(each.part)
                for number, pin in each.pins.items():
                    if number not in package.pins or package.pins[number].net is None:
                        package.pins[number] = pin
                continue
            if len(same) < _MOST_ASKED:
                same.append(each)
        kept.append(each)
    for each in kept:
        each.part = each.whole()
    return kept


def _one_package(one: _Candidate, other: _Candidate) -> bool:
    """Whether two instances of equal designator are sections: they share no pin, or only some, each on one net."""
    if one.local is other.local or not one.pins or not other.pins:
        return False
    common = [(one.pins[number].net, pin.net) for number, pin in other.pins.items() if number in one.pins]
    if len(common) == len(other.pins) == len(one.pins):
        return False
    return all(before == after or before is None or after is None for before, after in common)
