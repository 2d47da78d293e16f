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


class TooLarge(Exception):
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
    Raises `TooLarge` beyond `MOST_SECTIONS`.
    """
    nets: dict[str, None] = {}
    edges: dict[str, None] = {}
    sections: dict[str, Section] = {}
    pins: dict[str, DescribedPin] = {}
    amplifiers: dict[str, PlacedAmplifier] = {}
    queue: deque[str] = deque()

    def reach(net: str) -> None:
        if net in nets or net in edges:
            return
        if held(net):
            edges[net] = None
        else:
            nets[net] = None
            queue.append(net)

    outs: dict[str, list[PlacedAmplifier]] = {}
    for amplifier in board.amplifiers:
        outs.setdefault(amplifier.out, []).append(amplifier)
    toward: dict[str, list[DescribedPin]] = {}
    for pin in board.pins:
        if pin.toward is not None and pin.table.drives is None and pin.table.resistance is not None:
            toward.setdefault(pin.toward, []).append(pin)
    for seed in seeds:
        reach(seed)
    while queue:
        net = queue.popleft()
        for section in board.sections_by_net.get(net, ()):
            if section.name in sections or section.a == section.b or not through(section):
                continue
            sections[section.name] = section
            if len(sections) > MOST_SECTIONS:
                raise TooLarge(f"more than {MOST_SECTIONS} parts reach each other through {_widest(board, nets)}")
            reach(section.a)
            reach(section.b)
        for pin in (*board.pins_by_net.get(net, ()), *toward.get(net, ())):
            pins[f"{pin.at}@{pin.net}"] = pin
            if pin.table.drives is None and pin.table.resistance is not None:
                reach(pin.net)
                if pin.toward is not None:
                    reach(pin.toward)
        for amplifier in outs.get(net, ()):
            amplifiers[amplifier.name] = amplifier
            reach(amplifier.plus)
            reach(amplifier.minus)
    for net in edges:
        for pin in board.pins_by_net.get(net, ()):
            if pin.table.drives is not None and not is_supply(board, net):
                pins[f"{pin.at}@{pin.net}"] = pin
        for amplifier in outs.get(net, ()):
            amplifiers.setdefault(amplifier.name, amplifier)
    return Region(
        tuple(nets), tuple(edges), tuple(sections.values()), tuple(pins.values()), tuple(amplifiers.values())
    )


def _widest(board: Board, nets: Iterable[str]) -> str:
    """The net of the region with the most sections: the likeliest one to lack a voltage."""
    widest = max(nets, key=lambda net: len(board.sections_by_net.get(net, ())))
    return f"{widest}; if it is a supply, state its voltage with [[rail]]"
