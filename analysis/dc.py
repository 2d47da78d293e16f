"""DC voltages over tolerance: the band of a potential difference at the operating point."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.bias import Bias
from reactance.analysis.blocks import Block, make_block
from reactance.analysis.board import Board, Section
from reactance.analysis.circuit.network import Capacitor, CurrentSource, Network, Parameter, VoltageSource
from reactance.analysis.circuit.spread import monte_carlo, spread
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.elements import node, rail_source
from reactance.analysis.likeness import block_likeness
from reactance.analysis.measuring import SEED
from reactance.analysis.parts.models import CapacitorModel
from reactance.analysis.region import TooLargeError, grow, is_stiff
from reactance.analysis.reuse import Solved
from reactance.analysis.values import Value


@dataclass(frozen=True, slots=True)
class DcBand:
    """A DC voltage in volts with its extremes; they are infinite where they could not be found, as `note` says."""

    nominal: float
    low: float
    high: float
    samples: tuple[float, ...] = ()
    note: str = ""


def conducts(section: Section) -> bool:
    """Whether a section carries direct current: everything but a capacitor without leakage."""
    model = section.model
    return not isinstance(model, CapacitorModel) or math.isfinite(model.leakage_resistance)


def dc_band(board: Board, bias: Bias, solved: Solved, a: str, b: str, *, upper: bool = False) -> DcBand:
    """V(a) − V(b) at the operating point, in volts, over the ranges of all parts that carry DC there.

    With `upper` rails are at their upper tolerance. Both potentials must be defined.
    """
    try:
        region = grow(board, (a, b), lambda net: is_stiff(board, net), conducts)
    except TooLargeError as problem:
        potentials = bias.upper if upper else bias.volts
        nominal = (potentials[a] or 0.0) - (potentials[b] or 0.0)
        return DcBand(nominal, -math.inf, math.inf, note=f"its spread is not known: {problem}")
    rails = tuple(
        rail_source(net, volts)
        for net in region.edges
        if not board.is_ground(net) and (volts := (bias.upper if upper else bias.volts).get(net)) is not None
        and board.volts(net) is not None
    )  # fmt: skip
    block = make_block(board, bias, region, extra=rails)
    probe = (node(board, a), node(board, b))
    key, _ = block_likeness(block, probe, "dc")
    found = solved.get(key, lambda: {"dc": _solve(block, probe)})["dc"]
    if found.nominal is None or found.low is None or found.high is None:
        raise AssertionError("the operating point is defined but its band is not")
    return DcBand(found.nominal, found.low, found.high, found.samples)


def _solve(block: Block, probe: tuple[str, str]) -> Value:
    network = Network(
        tuple(e for e in block.network.elements if not isinstance(e, Capacitor) or math.isfinite(e.leakage)),
        block.network.ground,
    )
    names = {element.name for element in network.elements}
    parameters = tuple(p for p in block.parameters if p.attribute == "resistance" and p.name in names)

    def volts(values: NDArray[np.float64]) -> NDArray[np.float64]:
        return dc_volts(network, probe, parameters, values)

    if not parameters:
        nominal = float(volts(np.empty((1, 0)))[0])
        return Value(nominal, nominal, nominal, "V", samples=(nominal,) * block.samples)
    found = spread(volts, parameters)
    samples = tuple(monte_carlo(volts, parameters, block.samples, SEED).tolist()) if block.samples else ()
    return Value(found.nominal, found.low, found.high, "V", samples=samples)


def dc_volts(
    network: Network, probe: tuple[str, str], parameters: Sequence[Parameter], values: NDArray[np.float64]
) -> NDArray[np.float64]:
    """The DC voltage between two nodes for each row of `values` (V, P): shape (V,), in volts.

    The sum over all sources of their DC level times their response at 0 Hz (superposition).
    """
    total = np.zeros(len(values))
    for element in network.elements:
        level = _level(element)
        if level:
            response = frequency_response(
                network, element.name, probe, np.zeros(1), parameters=parameters, values=values
            )
            total += level * np.real(response[:, 0])
    return total


def _level(element: object) -> float:
    if isinstance(element, VoltageSource):
        return element.voltage
    if isinstance(element, CurrentSource):
        return element.current
    return 0.0
