"""Extremes over uncertain values: against closed forms, all vertices, and samples that must stay inside."""

from __future__ import annotations

import math

import numpy as np
import pytest

from reactance.analysis.circuit.network import (
    Capacitor,
    CurrentSource,
    Element,
    FloatArray,
    Inductor,
    Network,
    Parameter,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.spread import inside, monte_carlo, sensitivities, spread, wilson_interval
from reactance.analysis.circuit.sweep import frequency_response


def parameter(name: str, attribute: str, nominal: float, tolerance: float) -> Parameter:
    return Parameter(name, attribute, nominal, nominal * (1 - tolerance), nominal * (1 + tolerance))


def test_corner_of_an_rc_is_extreme_at_its_vertices() -> None:
    network = Network((VoltageSource("V", "a", "0", 1.0), Resistor("R", "a", "b", 1e3), Capacitor("C", "b", "0", 1e-7)))
    parameters = [parameter("R", "resistance", 1e3, 0.01), parameter("C", "capacitance", 1e-7, 0.1)]

    def corner(values: FloatArray) -> FloatArray:
        response = Response(network, "V", "b", parameters=parameters, values=values)
        return response.falls_through(math.sqrt(0.5), 0.0, "up", 1e9)

    found = spread(corner, parameters)
    base = 1 / (2 * math.pi * 1e-4)
    assert found.nominal == pytest.approx(base, rel=1e-9)
    assert found.low == pytest.approx(base / (1.01 * 1.1), rel=1e-9)
    assert found.high == pytest.approx(base / (0.99 * 0.9), rel=1e-9)
    assert found.at_high == pytest.approx([990.0, 0.9e-7])
    shares = sensitivities(corner, parameters)
    swings = np.array([1 / 0.99 - 1 / 1.01, 1 / 0.9 - 1 / 1.1])
    assert shares == pytest.approx(swings / swings.sum(), rel=1e-6)


def test_a_resonance_puts_the_extreme_inside() -> None:
    """|H| of a tank at its own nominal resonance: greatest where L·C is nominal, on a ridge inside the box."""
    w0, q = 2 * math.pi * 1e6, 40.0
    inductance = 1e-5
    capacitance = 1 / (w0 * w0 * inductance)
    r = q * w0 * inductance
    network = Network((
        CurrentSource("I", "0", "a", 1.0), Inductor("L", "a", "0", inductance), Capacitor("C", "a", "0", capacitance),
        Resistor("R", "a", "0", r),
    ))  # fmt: skip
    parameters = [
        Parameter("L", "inductance", inductance, inductance * 0.83, inductance * 1.1),
        Parameter("C", "capacitance", capacitance, capacitance * 0.85, capacitance * 1.13),
        parameter("R", "resistance", r, 0.05),
    ]

    def size(values: FloatArray) -> FloatArray:
        return np.abs(frequency_response(network, "I", "a", [1.07e6], parameters=parameters, values=values))[:, 0]

    found = spread(size, parameters)
    assert found.high == pytest.approx(r * 1.05, rel=1e-4)  # off the vertices
    samples = monte_carlo(size, parameters, 10_000, 1)
    assert samples.max() <= found.high and samples.min() >= found.low


def random_circuit(seed: int) -> tuple[Network, list[Parameter], float]:
    """A toleranced RLC ladder of up to 8 uncertain values and a frequency to look at it."""
    rng = np.random.default_rng(seed)
    elements: list[Element] = [VoltageSource("V", "n0", "0", 1.0, 50.0)]
    parameters: list[Parameter] = []
    for k in range(int(rng.integers(1, 4))):
        r, c, x = 10 ** rng.uniform(1, 3), 10 ** rng.uniform(-9, -7), 10 ** rng.uniform(-7, -5)
        if rng.random() < 0.5:
            elements.append(Inductor(f"L{k}", f"n{k}", f"n{k + 1}", x, 1.0))
            parameters.append(parameter(f"L{k}", "inductance", x, 0.2))
        else:
            elements.append(Resistor(f"R{k}", f"n{k}", f"n{k + 1}", r))
            parameters.append(parameter(f"R{k}", "resistance", r, 0.05))
        elements.append(Capacitor(f"C{k}", f"n{k + 1}", "0", c, 0.5, 1e-9))
        parameters += [parameter(f"C{k}", "capacitance", c, 0.3), Parameter(f"C{k}", "esr", 0.5, 0.2, 0.9)]
    return Network(tuple(elements)), parameters[:8], 10 ** rng.uniform(5, 7)


@pytest.mark.parametrize("seed", range(24))
def test_no_sample_escapes_and_vertices_are_reached(seed: int) -> None:
    """10,000 samples stay inside; the band reaches at least every vertex, and no farther than it was evaluated."""
    network, parameters, frequency = random_circuit(seed)
    out = f"n{sum(isinstance(e, Capacitor) for e in network.elements)}"

    def size(values: FloatArray) -> FloatArray:
        found = frequency_response(network, "V", out, [frequency], parameters=parameters, values=values)
        return np.abs(found)[:, 0]

    found = spread(size, parameters)
    samples = monte_carlo(size, parameters, 10_000, seed)
    assert found.low <= samples.min() and samples.max() <= found.high
    corners = np.array(np.meshgrid(*[(p.low, p.high) for p in parameters])).reshape(len(parameters), -1).T
    at_corners = size(corners)
    assert found.low <= at_corners.min() and at_corners.max() <= found.high
    assert size(found.at_low[None, :])[0] == pytest.approx(found.low, rel=1e-12)
    assert size(found.at_high[None, :])[0] == pytest.approx(found.high, rel=1e-12)


def test_many_parameters_reach_the_known_vertex() -> None:
    """Twenty resistors in series against twenty shunts: extremes are all-high or all-low by monotony (divider)."""
    elements: list[Element] = [VoltageSource("V", "n0", "0", 1.0)]
    parameters = []
    for k in range(20):
        elements += [Resistor(f"R{k}", f"n{k}", f"n{k + 1}", 100.0), Resistor(f"S{k}", f"n{k + 1}", "0", 1e4)]
        parameters += [parameter(f"R{k}", "resistance", 100.0, 0.2), parameter(f"S{k}", "resistance", 1e4, 0.2)]
    network = Network(tuple(elements))

    def level(values: FloatArray) -> FloatArray:
        return np.abs(frequency_response(network, "V", "n20", [1.0], parameters=parameters, values=values))[:, 0]

    found = spread(level, parameters)
    worst = np.array([[p.high if p.name.startswith("R") else p.low for p in parameters]])
    best = np.array([[p.low if p.name.startswith("R") else p.high for p in parameters]])
    assert found.low == pytest.approx(float(level(worst)[0]), rel=1e-12)
    assert found.high == pytest.approx(float(level(best)[0]), rel=1e-12)


def test_what_cannot_be_computed_is_nan() -> None:
    parameters = [parameter("R", "resistance", 1.0, 0.1)]
    found = spread(lambda v: np.where(v[:, 0] > 1.05, np.nan, v[:, 0]), parameters)
    assert found.nominal == 1.0 and math.isnan(found.low) and math.isnan(found.high)


def test_monte_carlo_repeats_by_seed() -> None:
    parameters = [parameter("R", "resistance", 1.0, 0.1)]
    first = monte_carlo(lambda v: v[:, 0], parameters, 2000, 7)
    assert (first == monte_carlo(lambda v: v[:, 0], parameters, 2000, 7)).all()
    assert (first != monte_carlo(lambda v: v[:, 0], parameters, 2000, 8)).any()
    assert first.min() >= 0.9 and first.max() <= 1.1
    assert first.mean() == pytest.approx(1.0, abs=0.005)
    assert inside(first, 0.95, None).mean() == pytest.approx(0.75, abs=0.04)


def test_wilson_interval() -> None:
    """Published example: 81 of 263 gives 0.255 to 0.366 (R. G. Newcombe, Stat. Med. 17 (1998) 857, method 3)."""
    assert wilson_interval(81, 263) == pytest.approx((0.2553, 0.3662), abs=5e-5)
    assert wilson_interval(0, 20)[0] == 0.0
    assert wilson_interval(0, 20)[1] == pytest.approx(0.1611, abs=5e-5)
    assert wilson_interval(20, 20)[1] == 1.0
