"""Which part and which net of one revision is which of another, though either may have a new name.

A part keeps its identity with its reference designator, unless another part of the newer revision sits in its place
with its attributes: then it was renumbered. A net keeps its identity with its name, or else with most of its pins.
Everything is found by hashing, so that the work grows with the number of pins.
"""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Callable, Hashable, Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType

from reactance.analysis.design import Design, Part

Attributes = tuple[tuple[str, str], ...]
Pair = tuple[Part, Part]
_ROUNDS = 2  # how far a net without a common name is told apart by what lies around it
_SHORT_CHAIN = 3
# Attributes that repeat the designator; they change with it and say nothing of their own.
_DESIGNATORS = frozenset({"refdes", "ref", "reference", "designator", "reference designator"})


@dataclass(frozen=True)
class Matching:
    """Parts and nets of an older design with their counterparts in a newer one.

    `parts`: pairs (older, newer). `nets`: newer name by older name, for nets that are still there.
    """

    older: Design
    newer: Design
    parts: tuple[Pair, ...]
    removed: tuple[Part, ...]
    added: tuple[Part, ...]
    nets: Mapping[str, str]

    @cached_property
    def renumbered(self) -> Mapping[str, str]:
        """Newer designator by older one, where they differ."""
        return {one.refdes: other.refdes for one, other in self.parts if one.refdes != other.refdes}

    @cached_property
    def renamed_nets(self) -> Mapping[str, str]:
        """Newer name by older one, where they differ."""
        return {one: other for one, other in self.nets.items() if one != other}


def natural(text: str) -> tuple[tuple[int, int, str], ...]:
    """A key that sorts C2 before C10."""
    pieces = re.findall(r"[0-9]+|[^0-9]+", text)
    return tuple((0, int(piece), "") if piece[0] in "0123456789" else (1, 0, piece) for piece in pieces)


def match_designs(older: Design, newer: Design) -> Matching:
    """Match parts by designator and place, then nets by the pins they share."""
    parts, removed, added = _match_parts(older, newer)
    return Matching(older, newer, parts, removed, added, _match_nets(parts))


def own_attributes(part: Part) -> Attributes:
    """The attributes without those that repeat the designator, names without regard to case."""
    return tuple(
        sorted(
            (name.casefold(), text)
            for name, text in part.attributes.items()
            if name.casefold() not in _DESIGNATORS and text != part.refdes
        )
    )


def _match_parts(older: Design, newer: Design) -> tuple[tuple[Pair, ...], tuple[Part, ...], tuple[Part, ...]]:
    before, after = dict(older.parts_by_refdes), dict(newer.parts_by_refdes)
    pairs: list[Pair] = []
    for refdes in [refdes for refdes in before if refdes in after and _same(before[refdes], after[refdes])]:
        pairs.append((before.pop(refdes), after.pop(refdes)))
    shuffled = before.keys() != after.keys() or _could_be_shuffled(before, after)
    signatures = _Signatures(older, newer) if shuffled else None
    if signatures:
        pairs += _take(_likely(_equals(before, after, signatures.full), before, after), before, after)
    pairs += _take([(part, after[refdes]) for refdes, part in before.items() if refdes in after], before, after)
    if signatures:
        pairs += _take(_equals(before, after, signatures.place, only_where_one=True), before, after)
    order = {part.refdes: position for position, part in enumerate(older.parts)}
    pairs.sort(key=lambda pair: order[pair[0].refdes])
    return tuple(pairs), tuple(before.values()), tuple(after.values())


def _same(one: Part, other: Part) -> bool:
    return one.pins == other.pins and one.cell == other.cell and one.attributes == other.attributes


def _could_be_shuffled(before: Mapping[str, Part], after: Mapping[str, Part]) -> bool:
    """Whether some part that differs from its namesake carries the attributes of another one."""
    texts = {own_attributes(part): refdes for refdes, part in before.items()}
    return any(texts.get(own_attributes(part), refdes) != refdes for refdes, part in after.items())


class _Signatures:
    """What identifies a part without its designator: its nets, and its nets with its attributes.

    Nets are known by name where both designs have the name; others by the parts around them.
    """

    def __init__(self, older: Design, newer: Design) -> None:
        common = {net.name for net in older.nets} & {net.name for net in newer.nets}
        self._colours = {id(part): colour for design in (older, newer) for part, colour in _coloured(design, common)}

    def place(self, part: Part) -> Hashable:
        """The part's cell and the nets of its pins."""
        return part.cell, self._colours[id(part)]

    def full(self, part: Part) -> Hashable:
        """The same with the attributes."""
        return part.cell, own_attributes(part), self._colours[id(part)]


def _coloured(design: Design, common: set[str]) -> Iterable[tuple[Part, Hashable]]:
    """Each part with the colours of its nets by pin; nets outside `common` are coloured by their surroundings."""
    colours: dict[str | None, Hashable] = {name: name for name in common}
    colours[None] = None
    on_net: dict[str, list[tuple[Part, str]]] = {}
    for part in design.parts:
        for pin in part.pins:
            if pin.net is not None and pin.net not in common:
                on_net.setdefault(pin.net, []).append((part, pin.number))
    own = {id(part): hash((part.cell, own_attributes(part))) for part in design.parts}
    for _ in range(_ROUNDS):
        around = {
            net: hash(
                tuple(
                    sorted(
                        hash((own[id(part)], number, tuple(colours.get(pin.net, 0) for pin in part.pins)))
                        for part, number in pins
                    )
                )
            )
            for net, pins in on_net.items()
        }
        colours.update(around)
    for part in design.parts:
        yield part, tuple(sorted((pin.number, hash(colours.get(pin.net, 0))) for pin in part.pins))


def _equals(
    before: Mapping[str, Part],
    after: Mapping[str, Part],
    key: Callable[[Part], Hashable],
    only_where_one: bool = False,
) -> list[Pair]:
    """Pair parts with equal keys: namesakes first, then in the order of their designators."""
    buckets: dict[Hashable, tuple[dict[str, Part], dict[str, Part]]] = {}
    for part in before.values():
        buckets.setdefault(key(part), ({}, {}))[0][part.refdes] = part
    for part in after.values():
        found = buckets.get(key(part))
        if found is not None:
            found[1][part.refdes] = part
    pairs: list[Pair] = []
    for olders, newers in buckets.values():
        if only_where_one and (len(olders), len(newers)) != (1, 1):
            continue
        namesakes = [refdes for refdes in olders if refdes in newers]
        pairs += [(olders.pop(refdes), newers.pop(refdes)) for refdes in namesakes]
        ordered = (sorted(side.values(), key=lambda part: natural(part.refdes)) for side in (olders, newers))
        pairs += zip(*ordered, strict=False)
    return pairs


def _likely(pairs: list[Pair], before: Mapping[str, Part], after: Mapping[str, Part]) -> list[Pair]:
    """Without chains of renumberings that are likelier something else.

    A short chain whose first designator is given to a new part and whose last one loses its part explains nothing:
    the same designators with other values or pins are the simpler story.
    """
    onward = {one.refdes: other.refdes for one, other in pairs if one.refdes != other.refdes}
    unlikely: set[str] = set()
    for first in onward.keys() - set(onward.values()):
        chain = [first]
        while chain[-1] in onward:
            chain.append(onward[chain[-1]])
        if first in after and chain[-1] in before and len(chain) <= _SHORT_CHAIN:
            unlikely.update(chain[:-1])
    return [pair for pair in pairs if pair[0].refdes not in unlikely or pair[0].refdes == pair[1].refdes]


def _take(pairs: list[Pair], before: dict[str, Part], after: dict[str, Part]) -> list[Pair]:
    """The pairs, taken out of both tables."""
    for one, other in pairs:
        del before[one.refdes], after[other.refdes]
    return pairs


def _match_nets(parts: Iterable[Pair]) -> Mapping[str, str]:
    """For each older net the newer one that it became, each newer net once.

    A net that kept its name and a pin is the same net; others go with most of their pins.
    """
    votes: Counter[tuple[str, str]] = Counter()
    for one, other in parts:
        places = {pin.number: pin.net for pin in other.pins}
        for pin in one.pins:
            there = places.get(pin.number)
            if pin.net is not None and there is not None:
                votes[pin.net, there] += 1
    matched = {name: name for name, there in votes if name == there}
    taken = set(matched)
    for name, there in sorted((pair for pair in votes if pair[0] != pair[1]), key=lambda pair: (-votes[pair], pair)):
        if name not in matched and there not in taken:
            matched[name] = there
            taken.add(there)
    return MappingProxyType(matched)
