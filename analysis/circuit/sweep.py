"""Frequency response: all frequencies and all sets of values in one batched solve."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from reactance.analysis.circuit.network import ComplexArray, FloatArray, Network, Parameter
from reactance.analysis.circuit.system import NEAR_INFINITY, NEAR_ZERO, System


def frequency_response(
    network: Network,
    source: str,
    probe: str | tuple[str, str],
    frequencies: ArrayLike,
    *,
    parameters: Sequence[Parameter] = (),
    values: ArrayLike | None = None,
) -> ComplexArray:
    """Voltage at `probe` per volt or ampere of `source`, all other sources at zero.

    `frequencies` (F,) in Hz, not negative; 0 and inf give the limits. `probe` is a node against ground or a pair of
    nodes. Returns complex (F,); with `values` (V, P) of `parameters`, (V, F). An unbounded limit is inf.

    The impedance that a load (a `CurrentSource` from the node to ground) sees is minus the response to it.

    Raises `CircuitError` where the network has no unique solution.
    """
    grid = None if values is None else np.asarray(values, float)
    system = System(network, over_time=False, parameters=parameters, values=grid)
    answer = evaluate(system, source, system.probe(probe), np.atleast_1d(np.asarray(frequencies, float))[None, :])
    return answer[0] if values is None else answer


def evaluate(system: System, source: str, probe: tuple[str, str], frequencies: FloatArray) -> ComplexArray:
    """The response (V, F) at `frequencies` (V or 1, F) in Hz, with the limits at 0 and inf."""
    rates = np.clip(2.0 * np.pi * frequencies, NEAR_ZERO, NEAR_INFINITY)
    answer = system.respond(1j * rates, system.drive(source), probe)
    at_limit = np.broadcast_to((rates == NEAR_ZERO) | (rates == NEAR_INFINITY), answer.shape)
    return np.where(at_limit, _limit(answer), answer) if at_limit.any() else answer


def _limit(answer: ComplexArray) -> ComplexArray:
    """At an end of the frequency axis a response is real, zero or unbounded."""
    size = np.abs(answer)
    real = np.where(size > 1e20, np.inf, np.where(size < 1e-20, 0.0, answer.real))
    return np.asarray(real, complex)
