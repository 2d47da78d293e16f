"""Frequency response: all frequencies and all sets of values in one batched solve."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.network import ComplexArray, Network, Parameter
from reactance.analysis.circuit.response import Response, evaluate

__all__ = ["Response", "frequency_response"]


def frequency_response(
    network: Network,
    source: str,
    probe: str | tuple[str, str],
    frequencies: ArrayLike,
    *,
    parameters: Sequence[Parameter] = (),
    values: ArrayLike | None = None,
    family: Family | None = None,
) -> ComplexArray:
    """Voltage at `probe` per volt or ampere of `source`, all other sources at zero.

    `frequencies` (F,) in Hz, not negative; 0 and inf give the limits. `probe` is a node against ground or a pair of
    nodes. Returns complex (F,); with `values` (V, P) of `parameters`, (V, F). An unbounded limit is inf.

    The impedance that a load (a `CurrentSource` from the node to ground) sees is minus the response to it.

    Raises `CircuitError` where the network has no unique solution.
    """
    grid = None if values is None else np.asarray(values, float)
    system = (family or Family(network, parameters)).system(grid, over_time=False)
    answer = evaluate(system, source, system.probe(probe), np.atleast_1d(np.asarray(frequencies, float))[None, :])
    return answer[0] if values is None else answer
