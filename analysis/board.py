"""A design resolved with its brief: part models, merged nets, rails, described pins, amplifiers.

Names in the brief are looked up here and nowhere else, so that one that the design lacks has one message.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from pathlib import PurePosixPath
from types import MappingProxyType
from typing import Any, TypeVar

from reactance.analysis.brief import Brief
from reactance.analysis.brief_tables import AmplifierTable, PinTable, RailTable
from reactance.analysis.design import Design, InputError, Part, Pin, Place, Problem
from reactance.analysis.files import BoardFiles as BoardFiles
from reactance.analysis.files import wanted_files as wanted_files
from reactance.analysis.net_kinds import NetClass, classify_nets
from reactance.analysis.parts.alike import Alike
from reactance.analysis.parts.knowledge import Knowledge, KnowledgeRow, validate_knowledge, validate_settings
from reactance.analysis.parts.models import CapacitorModel, Conditions, PartModel, ResistorModel
from reactance.analysis.parts.sections import sections, through

_T = TypeVar("_T")
CELSIUS_DEFAULT = 25.0


@dataclass(frozen=True, slots=True)
class Section:
    """One two-terminal element of a fitted R, C, L or bead, between two merged nets.

    `name` is the refdes, with `:2` and so on appended for further sections of one part.
    """

    name: str
    refdes: str
    model: PartModel
    a: str
    b: str
    pin_a: str
    pin_b: str


@dataclass(frozen=True, slots=True)
class DescribedPin:
    """A pin that the brief describes: its part, its merged net, its table, the net its resistance returns to."""

    at: str
    refdes: str
    number: str
    net: str
    toward: str | None
    table: PinTable


@dataclass(frozen=True, slots=True)
class PlacedAmplifier:
    """An amplifier of the brief with the merged nets of its three pins."""

    name: str
    plus: str
    minus: str
    out: str
    table: AmplifierTable


@dataclass(frozen=True)
class Board:
    """A design with its brief applied. Nets are named by their representative where 0 Ω parts join several.

    `samples` is how many Monte Carlo samples each measure takes beside its band.
    """

    design: Design
    brief: Brief
    conditions: Conditions
    models: Mapping[str, PartModel]
    nets: Mapping[str, NetClass]
    merged: Mapping[str, str]
    sections: tuple[Section, ...]
    pins: tuple[DescribedPin, ...]
    amplifiers: tuple[PlacedAmplifier, ...]
    rail_tables: Mapping[str, RailTable]
    problems: tuple[Problem, ...]
    samples: int = 0

    @cached_property
    def sections_by_net(self) -> Mapping[str, tuple[Section, ...]]:
        """The sections on each net."""
        return _index((net, section) for section in self.sections for net in {section.a, section.b})

    @cached_property
    def pins_by_net(self) -> Mapping[str, tuple[DescribedPin, ...]]:
        """The described pins on each net."""
        return _index((pin.net, pin) for pin in self.pins)

    @cached_property
    def pins_toward(self) -> Mapping[str, tuple[DescribedPin, ...]]:
        """The described input resistances that return to each net."""
        return _index(
            (pin.toward, pin)
            for pin in self.pins
            if pin.toward is not None and pin.table.drives is None and pin.table.resistance is not None
        )

    @cached_property
    def amplifiers_by_out(self) -> Mapping[str, tuple[PlacedAmplifier, ...]]:
        """The amplifiers that drive each net."""
        return _index((amplifier.out, amplifier) for amplifier in self.amplifiers)

    @cached_property
    def terminals_by_net(self) -> Mapping[str, tuple[tuple[Part, Pin], ...]]:
        """Pins of fitted parts that are no R, C, L or bead, on each net."""
        return _index(
            (self.merged[pin.net], (part, pin))
            for part in self.design.parts
            if self.models[part.refdes].kind == "other" and self.models[part.refdes].fitted
            for pin in part.pins
            if pin.net is not None
        )

    def is_ground(self, net: str) -> bool:
        """Whether the net is a ground."""
        return self.nets[net].kind == "ground"

    def volts(self, net: str) -> float | None:
        """The voltage of a ground (0) or of a rail whose voltage is known, else None."""
        entry = self.nets[net]
        return 0.0 if entry.kind == "ground" else entry.volts if entry.kind == "rail" else None

    def capacitors(self) -> tuple[Section, ...]:
        """The sections that are capacitors."""
        return tuple(section for section in self.sections if isinstance(section.model, CapacitorModel))


def _index(pairs: Iterable[tuple[str, _T]]) -> Mapping[str, tuple[_T, ...]]:
    table: dict[str, list[_T]] = {}
    for net, item in pairs:
        table.setdefault(net, []).append(item)
    return MappingProxyType({net: tuple(items) for net, items in table.items()})


class ModelMemory:
    """Part models by part: a part that is the same object under the same knowledge has the same model.

    Readers keep the objects of unchanged parts from save to save. Not thread-safe.
    """

    def __init__(self) -> None:
        self._under: tuple[Knowledge, Conditions] | None = None
        self._known: dict[int, tuple[Part, PartModel]] = {}

    def resolve(self, parts: Iterable[Part], knowledge: Knowledge, conditions: Conditions) -> dict[str, PartModel]:
        """The model of each part by reference designator; forgets parts that are no longer there."""
        before = self._known if self._under == (knowledge, conditions) else {}
        alike = Alike(knowledge, conditions)
        self._under, self._known = (knowledge, conditions), {}
        models: dict[str, PartModel] = {}
        for part in parts:
            found = before.get(id(part))
            if found is None or found[0] is not part:
                found = (part, alike.resolve(part))
            self._known[id(part)] = found
            models[part.refdes] = found[1]
        return models


def resolve_board(
    design: Design, brief: Brief, knowledge_files: Mapping[str, bytes], memory: ModelMemory | None = None
) -> Board:
    """Apply `brief` and the team's part knowledge to `design`. `memory` spares parts that are as they were.

    Raises `InputError` where the brief names what the design lacks, or where part knowledge cannot be read.
    """
    conditions = _conditions(brief)
    knowledge = gather_knowledge(brief, knowledge_files)
    models = (memory or ModelMemory()).resolve(design.parts, knowledge, conditions)
    joined = _join_nets(design, models)
    rails = {rail.net: rail.voltage for rail in brief.tables.rail}
    _known_nets(design, brief)
    classes = classify_nets(
        [net.name for net in design.nets],
        ground=brief.tables.board.ground,
        rails={design.nets_by_name[net].name: volts for net, volts in rails.items()},
    )
    merged, nets, problems = _merge(joined, classes)
    lookup = _Lookup(design, brief, merged)
    return Board(
        design=design,
        brief=brief,
        conditions=conditions,
        models=MappingProxyType(models),
        nets=MappingProxyType(nets),
        merged=MappingProxyType(merged),
        sections=tuple(_sections(design, models, merged)),
        pins=tuple(lookup.pins()),
        amplifiers=tuple(lookup.amplifiers()),
        rail_tables=MappingProxyType(
            {merged[design.nets_by_name[rail.net].name]: rail for rail in brief.tables.rail}
        ),
        problems=design.problems + tuple(problems) + tuple(p for m in models.values() for p in m.problems),
    )


def _conditions(brief: Brief) -> Conditions:
    board = brief.tables.board
    temperature = board.temperature
    return Conditions(
        temperature_low=float(temperature.low) if temperature else CELSIUS_DEFAULT,
        temperature_high=float(temperature.high) if temperature else CELSIUS_DEFAULT,
        hours=board.service_life / 3600,
        mounting_inductance=float(board.mounting_inductance),
    )


def gather_knowledge(brief: Brief, files: Mapping[str, bytes]) -> Knowledge:
    """The brief's `[[part]]` rows, then those of the team's tables in the order given.

    Raises `InputError` naming file, table and key where a row cannot be used.
    """
    rows = [
        _row(row, Place(brief.file, None), index, f"{PurePosixPath(brief.file).name} [[part]] {index + 1}")
        for index, row in enumerate(brief.tables.part)
    ]
    for path, data in files.items():
        if path.endswith(".toml"):
            rows += _team_rows(path, data)
    for row in rows:
        validate_knowledge(row)
    knowledge = Knowledge(
        rows=tuple(rows),
        aliases=brief.tables.attributes,
        derating={key: float(value) for key, value in brief.tables.board.derating.items()},
        files=files,
    )
    validate_settings(knowledge, Place(brief.file, None))
    return knowledge


def _team_rows(path: str, data: bytes) -> list[KnowledgeRow]:
    try:
        document = tomllib.loads(data.decode("utf-8-sig"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, RecursionError) as problem:
        raise InputError(f"not valid TOML: {problem}", Place(path), "mend the file of part knowledge") from None
    listed = document.get("part", [])
    others = sorted(set(document) - {"part"})
    if others or not isinstance(listed, list):
        what = f"[{others[0]}]" if others else "[part]"
        raise InputError(f"{what}: a part table holds [[part]] tables only", Place(path), "move it to the brief")
    name = PurePosixPath(path).name
    return [_row(row, Place(path), index, f"{name} [[part]] {index + 1}") for index, row in enumerate(listed)]


def _row(row: Any, place: Place, index: int, source: str) -> KnowledgeRow:
    if not isinstance(row, dict):
        raise InputError(f"[[part]] {index + 1}: expected a table", place, "write [[part]] and its keys")
    match = row.get("match", {})
    if not isinstance(match, dict) or not all(isinstance(value, str) for value in match.values()):
        remedy = 'write match = { refdes = "C1*" }'
        raise InputError(f"[[part]] {index + 1}, match: expected a table of texts", place, remedy)
    attributes = {key: value for key, value in row.items() if key != "match"}
    return KnowledgeRow(match=match, attributes=attributes, place=place, source=source)


def _join_nets(design: Design, models: Mapping[str, PartModel]) -> dict[str, str]:
    """A parent for each net name (union-find, compressed), joined over fitted 0 Ω parts and feed-throughs."""
    parent = {net.name: net.name for net in design.nets}

    def root(net: str) -> str:
        while parent[net] != net:
            parent[net] = parent[parent[net]]
            net = parent[net]
        return net

    for part in design.parts:
        model = models[part.refdes]
        if not model.fitted:
            continue
        short = isinstance(model, ResistorModel) and model.is_short
        for one, other in sections(model, part) if short else through(model, part):
            a, b = _net_of(part, one), _net_of(part, other)
            if a is not None and b is not None:
                parent[root(a)] = root(b)
    return {net: root(net) for net in parent}


def _merge(
    joined: Mapping[str, str], classes: Mapping[str, NetClass]
) -> tuple[dict[str, str], dict[str, NetClass], list[Problem]]:
    """Choose each group's representative: a ground before a rail before a signal, then the first in the file."""
    groups: dict[str, list[str]] = {}
    for net, root in joined.items():
        groups.setdefault(root, []).append(net)
    rank = {"ground": 0, "rail": 1, "signal": 2}
    merged: dict[str, str] = {}
    nets: dict[str, NetClass] = {}
    problems: list[Problem] = []
    for members in groups.values():
        chosen = min(members, key=lambda net: (rank[classes[net].kind], classes[net].volts is None))
        entry = classes[chosen]
        for net in members:
            merged[net] = chosen
            other = classes[net]
            clash = other.kind == "rail" and other.volts not in (None, entry.volts)
            if net != chosen and (clash or (other.kind == "rail" and entry.kind == "ground")):
                message = f"a 0 Ω part joins {net} to {chosen}, whose voltage is another"
                problems.append(Problem("caution", net, message))
        nets[chosen] = entry
    return merged, nets, problems


def _net_of(part: Part, number: str) -> str | None:
    pin = part.pin(number)
    return pin.net if pin else None


def _sections(design: Design, models: Mapping[str, PartModel], merged: Mapping[str, str]) -> Iterable[Section]:
    for part in design.parts:
        model = models[part.refdes]
        if model.kind == "other" or not model.fitted:
            continue
        if isinstance(model, ResistorModel) and model.is_short:
            continue
        for order, (one, other) in enumerate(sections(model, part), 1):
            a, b = _net_of(part, one), _net_of(part, other)
            if a is not None and b is not None:
                name = part.refdes if order == 1 else f"{part.refdes}:{order}"
                yield Section(name, part.refdes, model, merged[a], merged[b], one, other)


def _known_nets(design: Design, brief: Brief) -> None:
    for index, rail in enumerate(brief.tables.rail):
        if design.net(rail.net) is None:
            raise brief.error("rail", index, "net", f"the design has no net {rail.net!r}", _near(design, rail.net))
    for index, duty in enumerate(brief.tables.duty):
        if design.part(duty.capacitor) is None:
            message = f"the design has no part {duty.capacitor!r}"
            raise brief.error("duty", index, "capacitor", message, "correct the reference")


def _near(design: Design, name: str) -> str:
    """A remedy that names a net or part spelled nearly like `name`."""
    import difflib

    known = [*design.nets_by_name, *design.parts_by_refdes]
    close = difflib.get_close_matches(name, known, 1, 0.6)
    return f"is it {close[0]!r}?" if close else "correct the name"


class _Lookup:
    """Finds what the brief names."""

    def __init__(self, design: Design, brief: Brief, merged: Mapping[str, str]) -> None:
        self.design, self.brief, self.merged = design, brief, merged

    def pin(self, at: str, table: str, index: int, key: str) -> tuple[Part, Pin, str]:
        found = self.design.pin(at)
        if found is None:
            raise self.brief.error(
                table, index, key, f"the design has no pin {at!r}", "write REFDES.PIN of a part in the design"
            )
        part, pin = found
        if pin.net is None:
            raise self.brief.error(table, index, key, f"the pin {at} is on no net", "name a connected pin")
        return part, pin, self.merged[pin.net]

    def pins(self) -> Iterable[DescribedPin]:
        for index, table in enumerate(self.brief.tables.pin):
            toward = None
            if table.toward is not None:
                net = self.design.net(table.toward)
                if net is None:
                    message = f"the design has no net {table.toward!r}"
                    raise self.brief.error("pin", index, "toward", message, _near(self.design, table.toward))
                toward = self.merged[net.name]
            for at in table.places:
                part, pin, home = self.pin(at, "pin", index, "at")
                yield DescribedPin(at, part.refdes, pin.number, home, toward, table)

    def amplifiers(self) -> Iterable[PlacedAmplifier]:
        for index, table in enumerate(self.brief.tables.amplifier):
            plus, minus, out = (
                self.pin(getattr(table, key), "amplifier", index, key)[2] for key in ("plus", "minus", "out")
            )
            yield PlacedAmplifier(f"amplifier {table.out}", plus, minus, out, table)


def end_net(board: Board, at: str, table: str, index: int, key: str) -> tuple[str, str]:
    """The net that a coupling's or filter's `from` or `to` names: (merged net, the net's own name).

    `at` is a net or `REFDES.PIN`. Raises `InputError` where the design has neither.
    """
    net = board.design.net(at)
    if net is not None:
        return board.merged[net.name], net.name
    found = board.design.pin(at)
    if found is not None and found[1].net is not None:
        return board.merged[found[1].net], found[1].net
    message = f"the design has no net or pin {at!r}"
    raise board.brief.error(table, index, key, message, _near(board.design, at))
