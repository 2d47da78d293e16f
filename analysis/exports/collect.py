"""Gathers parts, pins and nets from formats that list them flat, within limits, and notes what does not fit."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

from reactance.analysis.design import Design, Net, Part, Pin, Place, Problem, Severity
from reactance.analysis.exports.limits import Limits

Side = Literal["", "top", "bottom"]


@dataclass(slots=True)
class PartDraft:
    """A part while its pins and attributes are still being found."""

    refdes: str
    place: Place
    cell: str = ""
    attributes: dict[str, str] = field(default_factory=dict)
    pins: dict[str, Pin] = field(default_factory=dict)
    position: tuple[float, float] | None = None
    side: Side = ""


class Collector:
    """The design of one export in the making. Names are stripped of what is unsafe by the caller."""

    def __init__(self, file: str, limits: Limits) -> None:
        self.file = file
        self.limits = limits
        self.parts: dict[str, PartDraft] = {}
        self._nets: dict[str, tuple[Place, dict[tuple[str, str], None]]] = {}
        self._pin_count = 0
        self._attribute_count = 0
        self._problems: list[Problem] = []
        self._passed_over = 0

    def problem(self, severity: Severity, place: Place, message: str) -> None:
        """Note something that does not stop the reading; the first `limits.problems` are kept."""
        if len(self._problems) < self.limits.problems:
            self._problems.append(Problem(severity, str(place), message))
        else:
            self._passed_over += 1

    def part(self, refdes: str, place: Place) -> PartDraft:
        """The part of that refdes, new where it was not met before. Raises InputError beyond the limits."""
        draft = self.parts.get(refdes)
        if draft is None:
            self._check_name(refdes, place)
            self.limits.check("parts", len(self.parts) + 1, place)
            draft = self.parts[refdes] = PartDraft(refdes, place)
        return draft

    def net(self, name: str, place: Place) -> None:
        """That net exists, with or without pins. Raises InputError beyond the limits."""
        if name not in self._nets:
            self._check_name(name, place)
            self.limits.check("forms", len(self._nets) + 1, place)
            self._nets[name] = (place, {})

    def net_names(self) -> tuple[str, ...]:
        """The nets met so far."""
        return tuple(self._nets)

    def pin(self, refdes: str, pin: Pin, place: Place) -> None:
        """A pin of a part is on a net, or on none. The same pin may be told of again; its first net counts.

        Raises InputError beyond the limits.
        """
        draft = self.parts.get(refdes) or self.part(refdes, place)
        known = draft.pins.get(pin.number)
        if known is None:
            self._new_pin(pin, place)
        elif pin.net is not None and known.net not in (None, pin.net):
            message = f"pin {refdes}.{pin.number} is on net {known.net} and on net {pin.net}; the first counts"
            self.problem("error", place, message)
            return
        else:
            net = pin.net if known.net is None else known.net
            pin = Pin(pin.number, known.name or pin.name, net, known.direction or pin.direction)
        draft.pins[pin.number] = pin
        if pin.net is not None:
            if pin.net not in self._nets:
                self.net(pin.net, place)
            self._nets[pin.net][1][refdes, pin.number] = None

    def _new_pin(self, pin: Pin, place: Place) -> None:
        self._pin_count += 1
        self._check_name(pin.number, place)
        self._check_name(pin.name, place)
        if self._pin_count > self.limits.pins:
            self.limits.check("pins", self._pin_count, place)

    def attribute(self, draft: PartDraft, name: str, text: str, place: Place) -> None:
        """An attribute of a part. The first of equal names counts; what is too long is cut, and noted.

        Raises InputError where there are more than the limit `forms`.
        """
        self._attribute_count += 1
        if self._attribute_count > self.limits.forms:
            self.limits.check("forms", self._attribute_count, place)
        if len(name) > self.limits.name or len(text) > self.limits.text:
            message = f"{draft.refdes}: attribute {name[:40]} has {len(text):,} characters, cut to "
            message += f"{self.limits.text:,} (limit `text`), its name to {self.limits.name:,} (limit `name`)"
            self.problem("caution", place, message)
            name, text = name[: self.limits.name], text[: self.limits.text]
        if draft.attributes.setdefault(name, text) != text:
            first = draft.attributes[name]
            message = f"{draft.refdes}: {name} is {first[:40]} and {text[:40]}; the first counts"
            self.problem("caution", place, message)

    def relabel(self, names: Mapping[str, str]) -> None:
        """Parts under other refdes; none of the new ones may be taken."""
        for old, new in names.items():
            self.parts[old].refdes = new
        self.parts = {draft.refdes: draft for draft in self.parts.values()}
        for _, pins in self._nets.values():
            renamed = {(names.get(refdes, refdes), number): None for refdes, number in pins}
            if renamed != pins:
                pins.clear()
                pins.update(renamed)

    def design(self, name: str, form: str) -> Design:
        """What was gathered, frozen."""
        parts = tuple(
            Part(
                draft.refdes,
                tuple(draft.pins.values()),
                MappingProxyType(draft.attributes),
                draft.cell,
                place=draft.place,
                position=draft.position,
                side=draft.side,
            )
            for draft in self.parts.values()
        )
        nets = tuple(Net(net, tuple(pins), place=place) for net, (place, pins) in self._nets.items())
        return Design(name, self.file, form, parts, nets, self._all_problems())

    def _all_problems(self) -> tuple[Problem, ...]:
        if not self._passed_over:
            return tuple(self._problems)
        most = self.limits.problems
        message = f"{self._passed_over:,} more problems are not listed; the limit is {most:,} (limit `problems`)"
        return (*self._problems, Problem("note", self.file, message))

    def _check_name(self, name: str, place: Place) -> None:
        if len(name) > self.limits.name:
            self.limits.check("name", len(name), place)


def listed(names: Iterable[str], most: int = 8) -> str:
    """Names for a message: the first few, and how many more there are."""
    every = list(names)
    shown = ", ".join(name[:40] for name in every[:most])
    return shown if len(every) <= most else f"{shown} and {len(every) - most:,} more"
