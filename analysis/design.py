"""What an export says: parts, pins, nets, and where each of them came from.

A `Design` is frozen. It holds the export's own words: attribute names and texts as found. What they mean
electrically is decided later (`reactance.analysis.parts`), because the brief may add to it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Literal

Severity = Literal["error", "caution", "note"]
Direction = Literal["", "input", "output", "inout"]


@dataclass(frozen=True, slots=True)
class Place:
    """Where something was read: a file, and the line and column (from 1) where they are known."""

    file: str
    line: int | None = None
    column: int | None = None

    def __str__(self) -> str:
        parts = [self.file]
        if self.line is not None:
            parts.append(str(self.line))
            if self.column is not None:
                parts.append(str(self.column))
        return ":".join(parts)


class InputError(Exception):
    """An input that cannot be used: what is wrong, where, and what would mend it."""

    def __init__(self, message: str, place: Place, remedy: str = "") -> None:
        super().__init__(message)
        self.message = message
        self.place = place
        self.remedy = remedy

    def __str__(self) -> str:
        remedy = f" ({self.remedy})" if self.remedy else ""
        return f"{self.place}: {self.message}{remedy}"

    def __reduce__(self) -> tuple[type[InputError], tuple[str, Place, str]]:
        return InputError, (self.message, self.place, self.remedy)


@dataclass(frozen=True, slots=True)
class Problem:
    """Something to tell the designer that does not stop the reading."""

    severity: Severity
    where: str
    message: str


@dataclass(frozen=True, slots=True)
class Pin:
    """One terminal of a part. It answers to its `number` (the designator) and to its `name` (the port)."""

    number: str
    name: str = ""
    net: str | None = None
    direction: Direction = ""


@dataclass(frozen=True, slots=True)
class Part:
    """One fitted or unfitted component. `attributes` maps the export's own names to its own texts."""

    refdes: str
    pins: tuple[Pin, ...] = ()
    attributes: Mapping[str, str] = field(default_factory=lambda: MappingProxyType({}))
    cell: str = ""
    path: tuple[str, ...] = ()
    place: Place | None = field(default=None, compare=False)
    position: tuple[float, float] | None = None
    side: Literal["", "top", "bottom"] = ""

    def pin(self, label: str) -> Pin | None:
        """The pin that answers to `label`: designators first, then port names, then without regard to case."""
        folded = label.casefold()
        answers = (
            [pin for pin in self.pins if pin.number == label]
            or [pin for pin in self.pins if pin.name == label]
            or [pin for pin in self.pins if folded in (pin.number.casefold(), pin.name.casefold())]
        )
        return answers[0] if answers else None


@dataclass(frozen=True, slots=True)
class Net:
    """A net: the name people see, other names it answers to, and its pins as (refdes, pin number)."""

    name: str
    pins: tuple[tuple[str, str], ...] = ()
    aliases: tuple[str, ...] = ()
    place: Place | None = field(default=None, compare=False)


@dataclass(frozen=True)
class Design:
    """One export, read. `file` is the name it was read under; `format` the open format it was in."""

    name: str
    file: str
    format: str
    parts: tuple[Part, ...]
    nets: tuple[Net, ...]
    problems: tuple[Problem, ...] = ()

    @cached_property
    def parts_by_refdes(self) -> Mapping[str, Part]:
        """Parts by reference designator; the first of equal ones."""
        table: dict[str, Part] = {}
        for part in self.parts:
            table.setdefault(part.refdes, part)
        return MappingProxyType(table)

    @cached_property
    def nets_by_name(self) -> Mapping[str, Net]:
        """Nets by name and, where it does not hide a name, by alias."""
        table: dict[str, Net] = {net.name: net for net in self.nets}
        for net in self.nets:
            for alias in net.aliases:
                table.setdefault(alias, net)
        return MappingProxyType(table)

    @cached_property
    def _parts_by_path(self) -> Mapping[str, Part]:
        """Parts inside blocks by `PATH/REFDES`."""
        table: dict[str, Part] = {}
        for part in self.parts:
            if part.path:
                table.setdefault("/".join((*part.path, part.refdes)), part)
        return MappingProxyType(table)

    def part(self, refdes: str) -> Part | None:
        """The part of that reference designator, also as `PATH/REFDES` with the blocks it stands in, or None."""
        return self.parts_by_refdes.get(refdes) or self._parts_by_path.get(refdes)

    def net(self, name: str) -> Net | None:
        """The net that answers to `name` (its name or an alias), or None."""
        return self.nets_by_name.get(name)

    def pin(self, at: str) -> tuple[Part, Pin] | None:
        """The pin written `REFDES.PIN`, or None. A refdes may itself contain dots; the longest one wins."""
        for cut in range(len(at) - 1, 0, -1):
            if at[cut] == ".":
                part = self.part(at[:cut])
                pin = part.pin(at[cut + 1 :]) if part else None
                if part and pin:
                    return part, pin
        return None
