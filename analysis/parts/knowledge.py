"""What a team knows about its parts: `[[part]]` tables of the brief and of `parts.toml`."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from reactance.analysis.design import Place


@dataclass(frozen=True, slots=True)
class KnowledgeRow:
    """One `[[part]]` table: which parts it is about, and its attributes as raw TOML values.

    `match` holds glob patterns under `refdes`, `value` and `number`; all that are given must match. `source`
    is how the table is named where a value is shown with its origin (`board.brief.toml [[part]] 2`).
    """

    match: Mapping[str, str]
    attributes: Mapping[str, object]
    place: Place
    source: str = "[[part]]"


@dataclass(frozen=True, slots=True)
class Knowledge:
    """All rows in order of precedence (the brief's first), and what else the brief says about parts.

    `aliases` adds raw attribute names to canonical ones; `derating` maps a technology to its greatest stress;
    `files` maps the name of a Touchstone file, as written in a row, to its content.
    """

    rows: tuple[KnowledgeRow, ...] = ()
    aliases: Mapping[str, tuple[str, ...]] = field(default_factory=lambda: MappingProxyType({}))
    derating: Mapping[str, float] = field(default_factory=lambda: MappingProxyType({}))
    files: Mapping[str, bytes] = field(default_factory=lambda: MappingProxyType({}))
