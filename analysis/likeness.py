"""Circuits that differ in nothing but names are solved once: the channels of a board are often the same circuit.

A circuit's key counts its elements and nodes in the order in which they are met; results are kept with those counts in
place of names and read back with the names of whoever asks.
"""

from __future__ import annotations

import hashlib
import re
from collections.abc import Iterable
from dataclasses import fields
from itertools import chain

import msgspec

from reactance.analysis.blocks import MODEL_VERSION, Block
from reactance.analysis.circuit.network import Element, Measured
from reactance.analysis.elements import GROUND
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.paths import SignalNetworks
from reactance.analysis.reuse import Results
from reactance.analysis.values import Value

REJECTION = "rejection@"


class Names:
    """Names of elements and nodes, counted in the order met."""

    def __init__(self) -> None:
        self._counts: dict[str, int] = {GROUND: 0}

    def count(self, name: str) -> int:
        """The number of a name; the next free one where it is new."""
        return self._counts.setdefault(name, len(self._counts))

    def without(self, results: Results) -> Results:
        """Results with numbers in place of names."""

        def plain(text: str) -> str:
            if not text:
                return text
            names = "|".join(re.escape(name) for name in sorted(self._counts, key=len, reverse=True))
            return re.sub(rf"(?<!\w)(?:{names})(?!\w)", lambda found: f"\0{self._counts[found[0]]}\0", text)

        def value(found: Value) -> Value:
            matters = tuple((str(self.count(name)), share) for name, share in found.matters)
            return msgspec.structs.replace(found, matters=matters, missing=plain(found.missing))

        return {self._measure(name): value(found) for name, found in results.items()}

    def _measure(self, name: str) -> str:
        net = name.removeprefix(REJECTION)
        return name if net == name else f"{REJECTION}{self.count(net)}"

    def back(self, results: Results) -> Results:
        """Results of `without` with names again: these ones."""
        names = list(self._counts)

        def words(text: str) -> str:
            pieces = text.split("\0")
            return "".join(names[int(piece)] if order % 2 else piece for order, piece in enumerate(pieces))

        def value(found: Value) -> Value:
            matters = tuple((names[int(number)], share) for number, share in found.matters)
            return msgspec.structs.replace(found, matters=matters, missing=words(found.missing))

        def measure(name: str) -> str:
            number = name.removeprefix(REJECTION)
            return name if number == name else f"{REJECTION}{names[int(number)]}"

        return {measure(name): value(found) for name, found in results.items()}


def likeness(networks: SignalNetworks) -> tuple[str, Names]:
    """A key that equal circuits with equal questions share, and the names of this one.

    Raises `PathError`, `TooLargeError` or `CircuitError` where the networks cannot be cut out.
    """
    path, names = networks.path, Names()
    blocks = [networks.ac] if path.kind == "filter" else [networks.ac, networks.start]
    sections = () if path.kind == "filter" else networks.start_region.sections
    laws = [
        (names.count(section.name), section.model.value, section.model.ageing, section.model.bias)
        for section in sections
        if isinstance(section.model, CapacitorModel)
    ]
    table = path.table and msgspec.structs.replace(path.table, name="", from_="", to="")
    asked = (
        path.kind,
        table,
        networks.board.conditions,
        [_content(block, names) for block in blocks],
        laws,
        names.count(networks.emf),
        names.count(networks.probe),
        [names.count(name) for name in chain.from_iterable(networks.rails())],
        bool(sections) and bool(networks.start_region.amplifiers),
    )
    return hashlib.sha256(f"{MODEL_VERSION} {asked!r}".encode()).hexdigest(), names


def block_likeness(block: Block, nodes: Iterable[str], *asked: object) -> tuple[str, Names]:
    """The same for one block and a question about some of its nodes; what else is `asked` holds no names."""
    names = Names()
    question = (_content(block, names), [names.count(name) for name in nodes], asked)
    return hashlib.sha256(f"{MODEL_VERSION} {question!r}".encode()).hexdigest(), names


def _content(block: Block, names: Names) -> tuple[object, ...]:
    elements = [_element(element, names) for element in block.network.elements]
    parameters = [(names.count(p.name), p.attribute, p.nominal, p.low, p.high) for p in block.parameters]
    return elements, parameters, block.samples


def _element(element: Element, names: Names) -> tuple[object, ...]:
    if isinstance(element, Measured):
        return element.name, element.a, element.b, element.fit
    values = (getattr(element, field.name) for field in fields(element))
    return type(element).__name__, *(names.count(v) if isinstance(v, str) else v for v in values)
