"""The solver's speed as ratios measured in one run; they stand in `extra_info`, nothing is asserted on time.

Aims: a frequency sweep at most 1.3 times numpy's batched solve of the same matrices, and at least 20 times faster than
a loop of scipy solves per frequency.
"""

from __future__ import annotations

import time
from collections.abc import Callable, Iterator
from typing import Any

import numpy as np
import pytest
from threadpoolctl import threadpool_limits

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import (
    Capacitor,
    CurrentSource,
    Element,
    Inductor,
    Network,
    Parameter,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.system import System
from reactance.analysis.circuit.transient import ramp


def ladder(sections: int) -> Network:
    """An invented LC ladder with losses."""
    elements: list[Element] = [VoltageSource("V", "n0", "0", 1.0, 50.0)]
    for k in range(sections):
        elements += [
            Inductor(f"L{k}", f"n{k}", f"n{k + 1}", 1e-6 * (1 + 0.1 * k), 0.1),
            Capacitor(f"C{k}", f"n{k + 1}", "0", 1e-9 * (1 + 0.07 * k), 0.01, 1e-9),
        ]
    elements.append(Resistor("RL", f"n{sections}", "0", 50.0))
    return Network(tuple(elements))


@pytest.fixture(autouse=True)
def one_thread() -> Iterator[None]:
    """As the program itself runs: small batched solves are faster with one BLAS thread."""
    with threadpool_limits(limits=1, user_api="blas"):
        yield


def best_of(work: Callable[[], Any], rounds: int = 7) -> float:
    """The shortest of a few runs, in seconds."""
    times = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        times.append(time.perf_counter() - start)
    return min(times)


@pytest.mark.parametrize("sections", [6, 12, 24])
def test_sweep_over_numpy_and_scipy(benchmark: Any, sections: int) -> None:
    import scipy.linalg

    network, probe = ladder(sections), f"n{sections}"
    frequencies = np.geomspace(1e3, 1e9, 2000)
    system = System(network, over_time=False)
    drive, pair = system.drive("V"), system.probe(probe)
    s = 2j * np.pi * frequencies[None, :]
    parts = [system.equations(forest, s[:, where], drive, pair) for forest, where in system.groups(s)]

    def batched() -> None:
        for part in parts:
            np.linalg.solve(part.matrix, part.rhs[..., None])

    def looped() -> None:
        for part in parts:
            for matrix, rhs in zip(part.matrix[0], part.rhs[0], strict=True):
                scipy.linalg.solve(matrix, rhs)

    ours = best_of(lambda: frequency_response(network, "V", probe, frequencies))
    benchmark.extra_info["over numpy's batched solve of the same matrices"] = round(ours / best_of(batched), 2)
    benchmark.extra_info["times faster than a loop of scipy solves"] = round(best_of(looped, 2) / ours, 1)
    benchmark.pedantic(frequency_response, args=(network, "V", probe, frequencies), rounds=3)


def test_vertices_of_a_rail(benchmark: Any) -> None:
    """Poles, residues and the droop of 256 sets of values of a rail with eight unlike capacitors, over one set's."""
    parts = [Capacitor(f"C{k}", "rail", "0", 10.0 ** (-5 - 0.5 * k), 5e-3 * (1 + k), 1e-9) for k in range(8)]
    source = VoltageSource("V", "rail", "0", 3.3, 0.02, 30e-9)
    network = Network((source, CurrentSource("load", "rail", "0", 1.0), *parts))
    parameters = [
        Parameter(c.name, "capacitance", c.capacitance, 0.8 * c.capacitance, 1.2 * c.capacitance) for c in parts
    ]
    corners = np.array([[p.low, p.high] for p in parameters])
    values = np.array(np.meshgrid(*corners)).reshape(8, -1).T

    def droop(rows: np.ndarray) -> Any:
        modes = pole_residue(network, "load", "rail", parameters=parameters, values=rows)
        return ramp(modes, 1.0, 10e-9).peak().size

    one = best_of(lambda: droop(values[:1]), 3)
    all_of_them = best_of(lambda: droop(values), 2)
    benchmark.extra_info["256 sets over one"] = round(all_of_them / one, 1)
    benchmark.pedantic(droop, args=(values,), rounds=2)
