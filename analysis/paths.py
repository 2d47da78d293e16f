"""A signal's way from one net to another: its networks for frequency response, for a start, and for DC."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

from reactance.analysis.bias import Bias
from reactance.analysis.blocks import Block, make_block
from reactance.analysis.board import Board, DescribedPin
from reactance.analysis.brief_tables import CouplingTable, FilterTable
from reactance.analysis.circuit.network import VoltageSource
from reactance.analysis.circuit.operating_point import operating_point
from reactance.analysis.elements import GROUND, node, rail_source_name, source_name
from reactance.analysis.region import Region, grow, is_stiff

EMF = "EMF"


@dataclass(frozen=True)
class SignalPath:
    """A coupling or filter between two merged nets. `table` is None for one that the design itself shows."""

    kind: Literal["coupling", "filter"]
    anchor: str
    from_net: str
    to_net: str
    table: CouplingTable | FilterTable | None
    because: str = ""

    @property
    def prefix(self) -> str:
        """The start of its check ids."""
        return f"{self.kind}:{self.anchor}"


class PathError(Exception):
    """A path that cannot be analysed; the message says why."""


@dataclass(frozen=True)
class SignalNetworks:
    """The networks of one path on one board. `emf` names the source whose response is measured."""

    board: Board
    bias: Bias
    path: SignalPath

    @cached_property
    def driver(self) -> DescribedPin | None:
        """The pin that drives the `from` net, if one is described."""
        for pin in self.board.pins_by_net.get(self.path.from_net, ()):
            if pin.table.drives is not None:
                return pin
        return None

    @cached_property
    def _ideal(self) -> bool:
        """Whether an ideal source has to stand in for what drives the `from` net."""
        outs = {amplifier.out for amplifier in self.board.amplifiers}
        return self.driver is None and self.path.from_net not in outs

    @cached_property
    def region(self) -> Region:
        """What the path's frequency response depends on; raises `PathError` or `TooLarge`."""
        path, board = self.path, self.board
        if board.is_ground(path.to_net):
            raise PathError(f"{path.to_net} is a ground: nothing can be measured there")
        stiff_from = self._ideal or is_stiff(board, path.from_net)

        def held(net: str) -> bool:
            if net == path.from_net:
                return stiff_from
            return net != path.to_net and is_stiff(board, net)

        region = grow(board, (path.to_net,), held)
        if path.from_net not in region.nets + region.edges:
            raise PathError(f"nothing leads from {path.from_net} to {path.to_net}")
        return region

    @cached_property
    def ac(self) -> Block:
        """The network of the frequency response, its excitation named `emf`."""
        board, path = self.board, self.path
        extra: tuple[VoltageSource, ...] = ()
        silent = tuple(a for a in board.amplifiers if a.out == path.from_net) if self.driver is None else ()
        if silent:
            resistance = float(silent[0].table.output_resistance)
            extra = (VoltageSource(EMF, node(board, path.from_net), GROUND, 0.0, resistance),)
        elif self._ideal:
            extra = (VoltageSource(EMF, node(board, path.from_net), GROUND, 0.0),)
        return make_block(
            board, self.bias, self.region, extra=extra, free_rails=(path.from_net,), silent_amplifiers=silent
        )

    @property
    def emf(self) -> str:
        """The name of the source whose response is measured."""
        return EMF if self.driver is None else source_name(self.driver)

    @property
    def probe(self) -> str:
        """The node that is measured."""
        return node(self.board, self.path.to_net)

    @cached_property
    def start_region(self) -> Region:
        """What the path's DC levels and its start depend on."""
        board, path = self.board, self.path
        stands_in = self.needs_level
        return grow(
            board,
            (path.to_net, path.from_net),
            lambda net: is_stiff(board, net) or (stands_in and net == path.from_net),
        )

    @property
    def needs_level(self) -> bool:
        """Whether nothing defines the DC level of the `from` net, so that an ideal source at 0 V stands in."""
        return self._ideal and self.bias.volts.get(self.path.from_net) is None

    @cached_property
    def start(self) -> Block:
        """The network with every source at its DC level."""
        return make_block(self.board, replace(self.bias, volts=self.local_volts), self.start_region, extra=self._level)

    @property
    def _level(self) -> tuple[VoltageSource, ...]:
        if not self.needs_level:
            return ()
        return (VoltageSource(EMF, node(self.board, self.path.from_net), GROUND, 0.0),)

    @cached_property
    def local_volts(self) -> Mapping[str, float | None]:
        """DC potentials in volts: the board's, and those that a stand-in at the `from` net defines."""
        if not self.needs_level:
            return self.bias.volts
        block = make_block(self.board, self.bias, self.start_region, extra=self._level)
        point = operating_point(block.network)
        floating = set(point.floating)
        solved = {net: point.voltages.get(net) for net in block.nets if net not in floating}
        return {**solved, **{net: volts for net, volts in self.bias.volts.items() if volts is not None}}

    def rails(self) -> tuple[tuple[str, str], ...]:
        """Rails that the path hangs on, each with the name of its source in `ac`."""
        return tuple(
            (net, rail_source_name(net))
            for net in self.region.edges
            if net != self.path.from_net
            and self.board.nets[net].kind == "rail"
            and self.board.volts(net) is not None
        )
