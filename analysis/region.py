"""Which part of a board belongs to one question: the nets and parts that reach each other before a held net.

A net is held where its potential does not move with its neighbours: grounds, rails with a known voltage, nets
that an ideal source drives, and whatever the question itself holds.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from reactance.analysis.board import Board, DescribedPin, PlacedAmplifier, Section

MOST_SECTIONS = 600


class TooLargeError(Exception):
    """A region that grew past what one network may hold; the message says through which net."""


@dataclass(frozen=True)
class Region:
    """Nets (free ones), edge nets (held ones that the region touches), and the parts between them."""

    nets: tuple[str, ...]
    edges: tuple[str, ...]
    sections: tuple[Section, ...]
    pins: tuple[DescribedPin, ...]
    amplifiers: tuple[PlacedAmplifier, ...]

    @property
    def parts(self) -> tuple[str, ...]:
        """Reference designators, in the order met."""
        return tuple(dict.fromkeys(section.refdes for section in self.sections))


def is_supply(board: Board, net: str) -> bool:
    """Whether a net is a ground or a rail whose voltage is known."""
    return board.volts(net) is not None


def is_stiff(board: Board, net: str) -> bool:
    """Whether a net is a supply or is driven by a pin without source resistance."""
    return is_supply(board, net) or any(
        pin.table.drives is not None and not pin.table.resistance for pin in board.pins_by_net.get(net, ())
    )


def grow(
    board: Board,
    seeds: Iterable[str],
    held: Callable[[str], bool],
    through: Callable[[Section], bool] = lambda section: True,
) -> Region:
    """Everything that `seeds` reach through sections, described pins and amplifiers before held nets.

    `through` says which sections are followed at all; the others are left out. A held seed is an edge.
    Raises `TooLargeError` beyond `MOST_SECTIONS`.
    """
    growth = _Growth(board, held, through)
    for seed in seeds:
        growth.reach(seed)
    while growth.queue:
        growth.visit(growth.queue.popleft())
    for net in growth.edges:
        growth.take_drivers(net)
    return Region(
        tuple(growth.nets),
        tuple(growth.edges),
        tuple(growth.sections.values()),
        tuple(growth.pins.values()),
        tuple(growth.amplifiers.values()),
    )


class _Growth:
    """A region while it grows, breadth first."""

    def __init__(self, board: Board, held: Callable[[str], bool], through: Callable[[Section], bool]) -> None:
        self.board, self.held, self.through = board, held, through
        self.nets: dict[str, None] = {}
        self.edges: dict[str, None] = {}
        self.sections: dict[str, Section] = {}
        self.pins: dict[str, DescribedPin] = {}
        self.amplifiers: dict[str, PlacedAmplifier] = {}
        self.queue: deque[str] = deque()

    def reach(self, net: str) -> None:
        """Take in a net: as an edge if it is held, else to be visited."""
        if net in self.nets or net in self.edges:
            return
        if self.held(net):
            self.edges[net] = None
        else:
            self.nets[net] = None
            self.queue.append(net)

    def visit(self, net: str) -> None:
        """Follow what is on a free net."""
        for section in self.board.sections_by_net.get(net, ()):
            if section.name in self.sections or section.a == section.b or not self.through(section):
                continue
            self.sections[section.name] = section
            if len(self.sections) > MOST_SECTIONS:
                widest = _widest(self.board, self.nets)
                raise TooLargeError(f"more than {MOST_SECTIONS} parts reach each other through {widest}")
            self.reach(section.a)
            self.reach(section.b)
        for pin in (*self.board.pins_by_net.get(net, ()), *self.board.pins_toward.get(net, ())):
            self.pins[f"{pin.at}@{pin.net}"] = pin
            if pin.table.drives is None and pin.table.resistance is not None:
                self.reach(pin.net)
                if pin.toward is not None:
                    self.reach(pin.toward)
        for amplifier in self.board.amplifiers_by_out.get(net, ()):
            self.amplifiers[amplifier.name] = amplifier
            self.reach(amplifier.plus)
            self.reach(amplifier.minus)

    def take_drivers(self, net: str) -> None:
        """What drives an edge that is no supply belongs to the region too."""
        for pin in self.board.pins_by_net.get(net, ()):
            if pin.table.drives is not None and not is_supply(self.board, net):
                self.pins[f"{pin.at}@{pin.net}"] = pin


def _widest(board: Board, nets: Iterable[str]) -> str:
    """The net of the region with the most sections: the likeliest one to lack a voltage."""
    widest = max(nets, key=lambda net: len(board.sections_by_net.get(net, ())))
    return f"{widest}; if it is a supply, state its voltage with [[rail]]"
