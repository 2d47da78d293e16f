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


@dataclass(slots=True)
class FlatPart:
    """An instance of a leaf cell in one place of the design, before its refdes is settled."""

    local: LocalPart
    path: tuple[str, ...]
    called: str
    named: bool
    pins: tuple[Pin, ...]
    attributes: Mapping[str, str]


def flat_part(
    local: LocalPart, path: tuple[str, ...], reached: Mapping[int, str], notes: list[says.Annotation]
) -> FlatPart:
    """The instance `local` under `path`, its pins on the nets `reached`; `notes` is what is said of this place only."""
    called = local.refdes
    attributes = local.attributes
    numbers = local.numbers
    for note in notes:
        if note.designator and not note.designator.endswith("?"):
            called = note.designator
        if note.attributes:
            attributes = MappingProxyType({**attributes, **{each.name: each.text for each in note.attributes}})
        for ref, number in note.numbers:
            group = local.interface.group(ref.port)
            if group and len(group.bits) == 1:
                numbers = {**numbers, group.bits[0]: number}
    pins = tuple(
        Pin(numbers.get(bit, port.number), port.name, reached.get(bit), port.direction)
        for bit, port in enumerate(local.interface.bits)
    )
    if len({pin.number for pin in pins}) < len(pins):
        pins = tuple(dict.fromkeys(pins))
    return FlatPart(local, path, called or local.name, bool(called), pins, attributes)


def packages(flat: list[FlatPart], source: Source) -> tuple[Part, ...]:
    """One Part for each component, each under a refdes of its own, in the order of their first sections.

    Sections of one package (the same designator, other pins) are one part. Without a designator the plain name of the
    instance counts where it is unique in the design, else `PATH/NAME`; so also for designators in a cell that is
    used several times.
    """
    kept = _sections(flat)
    counts = Counter(each.called for each in kept)
    used: set[str] = set()
    result: dict[int, Part] = {}
    # Those that may keep their plain name come first, so that no other can take it from them.
    for each in sorted(kept, key=lambda part: counts[part.called] > 1 and bool(part.path)):
        refdes = each.called
        if counts[refdes] > 1 and each.path:
            refdes = "/".join((*each.path, refdes))
            if each.named:
                message = f"{counts[each.called]} parts have the designator {each.called}; this one is read as {refdes}"
                source.problem("caution", each.local.start, message)
        if refdes in used:
            first, count = refdes, 2
            while f"{first}#{count}" in used:
                count += 1
            refdes = f"{first}#{count}"
            message = f"two parts are called {first}; the second is read as {refdes}"
            source.problem("error", each.local.start, message)
        used.add(refdes)
        result[id(each)] = Part(
            refdes,
            each.pins,
            each.attributes,
            each.local.target.name,
            each.path,
            source.place(each.local.start),
        )
    return tuple(result[id(each)] for each in kept)


def _sections(flat: list[FlatPart]) -> list[FlatPart]:
    """The parts with the sections of each package put together."""
    by_refdes: dict[str, list[FlatPart]] = {}
    kept: list[FlatPart] = []
    for each in flat:
        if each.named:
            same = by_refdes.setdefault(each.called, [])
            whole = next((other for other in same if _one_package(other, each)), None)
            if whole is not None:
                _merge(whole, each)
                continue
            same.append(each)
        kept.append(each)
    return kept


def _one_package(one: FlatPart, other: FlatPart) -> bool:
    """Whether two instances of equal designator are sections: they share no pin, or only some, each on one net."""
    if one.local is other.local or not one.pins or not other.pins:
        return False
    pins = {pin.number: pin.net for pin in one.pins}
    common = [(pins[pin.number], pin.net) for pin in other.pins if pin.number in pins]
    if len(common) == len(other.pins) == len(one.pins):
        return False
    return all(before == after or before is None or after is None for before, after in common)


def _merge(whole: FlatPart, section: FlatPart) -> None:
    nets = {pin.number: pin.net for pin in section.pins}
    known = {pin.number for pin in whole.pins}
    filled = tuple(
        pin if pin.net is not None else replace(pin, net=nets.get(pin.number)) for pin in whole.pins
    )
    whole.pins = filled + tuple(pin for pin in section.pins if pin.number not in known)
    whole.attributes = MappingProxyType({**section.attributes, **whole.attributes})
