"""The edits between two revisions: what the designer did, in the export's own names and texts."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass

import msgspec

from reactance.analysis.brief_edits import brief_edits
from reactance.analysis.design import Design, Part
from reactance.analysis.net_kinds import class_by_name
from reactance.analysis.report import Edit
from reactance.analysis.same_parts import Matching, match_designs, natural

_VALUE_NAMES = ("value", "val", "part_value", "comment")  # the first of these tells a part best in a line


@dataclass(frozen=True)
class Changes:
    """All edits between two revisions, and what became of parts and nets."""

    edits: tuple[Edit, ...]
    matching: Matching


def find_changes(older: Design, newer: Design, older_brief: bytes | None, newer_brief: bytes | None) -> Changes:
    """Compare two revisions; the edits come in a fixed order, each with an id that is unique among them."""
    matching = match_designs(older, newer)
    briefs = b"\n".join(filter(None, (older_brief, newer_brief))).decode("utf-8", "replace")
    found = [
        *_changed(matching),
        *_removed(matching.removed),
        *_added(matching.added),
        *_renumbered(matching.renumbered),
        *_renamed_supplies(matching.renamed_nets, briefs),
        *brief_edits(older_brief, newer_brief),
    ]
    return Changes(tuple(_unique(found)), matching)


def _unique(edits: Iterable[Edit]) -> Iterator[Edit]:
    taken: dict[str, int] = {}
    for edit in edits:
        taken[edit.id] = count = taken.get(edit.id, 0) + 1
        yield edit if count == 1 else msgspec.structs.replace(edit, id=f"{edit.id} #{count}")


def _changed(matching: Matching) -> Iterator[Edit]:
    for one, other in sorted(matching.parts, key=lambda pair: natural(pair[1].refdes)):
        if one is not other:
            yield from _attributes(one, other)
            yield from _pins(one, other, matching.nets)


def _attributes(one: Part, other: Part) -> Iterator[Edit]:
    if one.cell != other.cell and one.cell and other.cell:
        yield _attribute(other.refdes, "cell", one.cell, other.cell)
    if one.attributes == other.attributes:
        return
    before, after = _by_folded_name(one), _by_folded_name(other)
    for folded in dict.fromkeys((*before, *after)):
        name_before, text_before = before.get(folded, (None, None))
        name_after, text_after = after.get(folded, (None, None))
        follows_the_designator = (text_before, text_after) == (one.refdes, other.refdes)
        if text_before != text_after and not follows_the_designator:
            yield _attribute(other.refdes, name_after or name_before or folded, text_before, text_after)


def _by_folded_name(part: Part) -> dict[str, tuple[str, str]]:
    return {name.casefold(): (name, text) for name, text in part.attributes.items()}


def _attribute(refdes: str, name: str, before: str | None, after: str | None) -> Edit:
    return Edit(f"{refdes}.{name}", "attribute changed", refdes, name, before, after)


def _pins(one: Part, other: Part, nets: Mapping[str, str]) -> Iterator[Edit]:
    """Pins whose net is no longer the net that it was, whatever the nets are called."""
    if one.pins == other.pins and all(pin.net is None or nets.get(pin.net) == pin.net for pin in one.pins):
        return
    before = {pin.number: pin.net for pin in one.pins}
    after = {pin.number: pin.net for pin in other.pins}
    for number in dict.fromkeys((*before, *after)):
        old, new = before.get(number), after.get(number)
        follows = old is not None and nets.get(old) == new
        if not follows and not (old is None and new is None):
            yield Edit(f"{other.refdes}.{number}@{new or ''}", "pin moved", other.refdes, f"pin {number}", old, new)


def _removed(parts: Iterable[Part]) -> Iterator[Edit]:
    for part in sorted(parts, key=lambda part: natural(part.refdes)):
        yield Edit(f"-{part.refdes}", "part removed", part.refdes, None, _gist(part), None)


def _added(parts: Iterable[Part]) -> Iterator[Edit]:
    for part in sorted(parts, key=lambda part: natural(part.refdes)):
        yield Edit(f"+{part.refdes}", "part added", part.refdes, None, None, _gist(part))


def _gist(part: Part) -> str:
    """The one text that tells the part best: its value as found, else its cell."""
    by_name = {name.casefold(): text for name, text in part.attributes.items()}
    return next((by_name[name] for name in _VALUE_NAMES if by_name.get(name)), part.cell)


def _renumbered(renumbered: Mapping[str, str]) -> Iterator[Edit]:
    for one, other in sorted(renumbered.items(), key=lambda pair: natural(pair[1])):
        yield Edit(f"{one}→{other}", "part renumbered", other, None, one, other)


def _renamed_supplies(renamed: Mapping[str, str], briefs: str) -> Iterator[Edit]:
    """Nets that kept their pins but not their name, where the name matters: a supply's, or one that a brief uses."""
    matters: Callable[[str], bool] = lambda name: f'"{name}"' in briefs or f"'{name}'" in briefs  # noqa: E731
    for one, other in renamed.items():
        kinds = class_by_name(one), class_by_name(other)
        if (kinds[0].kind, kinds[0].volts) != (kinds[1].kind, kinds[1].volts) or matters(one) or matters(other):
            yield Edit(f"net {one}→{other}", "attribute changed", None, f"name of net {one}", one, other)
