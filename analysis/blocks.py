"""A block: one network cut out of the board with what is asked of it, solved on its own and reusable.

Two blocks with equal `key` have equal results, whatever revision or board they come from.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board, DescribedPin, PlacedAmplifier, Section
from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.network import Element, Measured, Network, Parameter, VoltageSource
from reactance.analysis.elements import (
    GROUND,
    Placed,
    amplifier_element,
    certain,
    node,
    pin_elements,
    placed,
    rail_source,
)
from reactance.analysis.region import Region

MODEL_VERSION = "1"  # part of every key: raise it when the same block would give other figures


@dataclass(frozen=True)
class Block:
    """A network with its uncertain attributes, the parts and nets it is made of, and its content's key."""

    network: Network
    parameters: tuple[Parameter, ...]
    parts: tuple[str, ...]
    nets: tuple[str, ...]
    notes: tuple[str, ...] = ()
    samples: int = 0

    @cached_property
    def family(self) -> Family:
        """The network under sets of values of its uncertain attributes; all that is measured of it shares this."""
        return Family(self.network, self.parameters)

    def key(self, *asked: object) -> str:
        """SHA-256 of the network, its uncertain attributes and the question."""
        digest = hashlib.sha256(MODEL_VERSION.encode())
        for element in self.network.elements:
            digest.update(_identity(element).encode())
        digest.update(repr((self.parameters, self.notes, self.samples, asked)).encode())
        return digest.hexdigest()


def _identity(element: Element) -> str:
    if isinstance(element, Measured):
        return f"Measured({element.name!r},{element.a!r},{element.b!r},{element.fit!r})"
    return repr(element)


def place_sections(board: Board, bias: Bias, sections: Iterable[Section]) -> tuple[list[Placed], list[str]]:
    """The elements of `sections` at their operating point, and a note for each that has no usable value."""
    made: list[Placed] = []
    notes: list[str] = []
    for section in sections:
        item = placed(board, section, bias.across(section), bias.currents.get(section.name, 0.0))
        if item is None:
            notes.append(f"{section.refdes} has no usable value and is left out")
        else:
            made.append(item)
    return made, notes


def make_block(
    board: Board,
    bias: Bias,
    region: Region,
    *,
    extra: tuple[Element, ...] = (),
    free_rails: Iterable[str] = (),
    silent_pins: Iterable[DescribedPin] = (),
    silent_amplifiers: Iterable[PlacedAmplifier] = (),
) -> Block:
    """The network of `region`: its parts, its pins, its amplifiers, and a source for each rail at its edge.

    `extra` are the question's own sources. Pins and amplifiers given as silent are left out: `extra` stands for
    them. Rails in `free_rails` get no source here.
    """
    items, notes = place_sections(board, bias, region.sections)
    elements: list[Element] = list(extra)
    taken = {element.name for element in extra}
    free, silent = set(free_rails), {pin.at for pin in silent_pins}
    for net in region.edges:
        volts = board.volts(net)
        if volts is not None and not board.is_ground(net) and net not in free:
            source = rail_source(net, volts)
            if source.name not in taken:
                elements.append(source)
    elements += [item.element for item in items]
    for pin in region.pins:
        drive = pin.at not in silent and board.volts(pin.net) is None
        for element in pin_elements(board, pin, drive=drive):
            if not (pin.at in silent and isinstance(element, VoltageSource)):
                elements.append(element)
    quiet = {amplifier.name for amplifier in silent_amplifiers}
    elements += [amplifier_element(board, a) for a in region.amplifiers if a.name not in quiet]
    parameters = certain(parameter for item in items for parameter in item.parameters)
    network = Network(tuple(elements), GROUND)
    return Block(network, parameters, region.parts, region.nets + region.edges, tuple(notes), board.samples)


def probe_node(board: Board, net: str) -> str:
    """The node at which a net is observed."""
    return node(board, net)
