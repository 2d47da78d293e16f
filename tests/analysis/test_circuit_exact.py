"""Random networks against exact arithmetic (mpmath, exact_network.py): responses, corners, droop.

36 networks by default; REACTANCE_RANDOM_NETWORKS=200 in the environment widens it.
"""

from __future__ import annotations

import math
import os

import mpmath as mp
import numpy as np
import pytest
from exact_network import ExactResponse, Stamps
from random_networks import random_network

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import Capacitor, CurrentSource, Network, VoltageSource
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import ramp, step

SEEDS = range(int(os.environ.get("REACTANCE_RANDOM_NETWORKS", "36")))
FREQUENCIES = np.geomspace(1e-3, 1e10, 27)


@pytest.mark.parametrize("seed", SEEDS)
def test_random_network_in_frequency_and_time(seed: int) -> None:
    network, source, probe = random_network(seed)
    exact = ExactResponse(network, source, probe)
    found = frequency_response(network, source, probe, FREQUENCIES)
    wanted = np.array([complex(exact.at(f)) for f in FREQUENCIES])
    assert np.abs(found / wanted - 1).max() < 1e-9

    rates = np.array([abs(complex(p)) for p in exact.poles()])
    times = np.geomspace(0.03 / rates.max(), 10 / rates.min(), 30)
    modes = pole_residue(network, source, probe)
    for rise in (0.0, 3.0 / rates.max(), 0.3 / rates.min()):
        v = ramp(modes, 1.0, rise).value(times)
        w = np.array([float(exact.ramp(t, rise)) for t in times])
        assert np.abs(v - w).max() < 1e-7 * np.abs(w).max()


@pytest.mark.parametrize("seed", [s for s in SEEDS if s % 4 == 0])
def test_corner_of_a_random_network(seed: int) -> None:
    """The first fall through 1/√2 of the greatest gain: the exact response is above before it and below after it."""
    network, source, probe = random_network(seed)
    exact = ExactResponse(network, source, probe)
    response = Response(network, source, probe)
    at, top = (float(x[0]) for x in response.greatest(1e-3, 1e10))
    corner = float(response.falls_through(top / math.sqrt(2), at, "up", 1e10)[0])
    for f in np.geomspace(1e-3, 1e10, 400):
        assert abs(exact.at(f)) <= top * (1 + 1e-9)
    if math.isnan(corner):
        assert all(abs(exact.at(f)) * math.sqrt(2) > top * (1 - 1e-9) for f in np.geomspace(at, 1e10, 300))
        return
    level = top / math.sqrt(2)
    assert abs(exact.at(corner * (1 - 1e-6))) > level > abs(exact.at(corner * (1 + 1e-6)))
    assert all(abs(exact.at(f)) > level for f in np.geomspace(at, corner * (1 - 1e-6), 300))


@pytest.mark.parametrize("seed", [s for s in SEEDS if s % 4 == 1])
def test_peak_of_a_random_network(seed: int) -> None:
    """The greatest excursion under a ramp: no exact value exceeds it, and the exact value where it occurs is it."""
    network, source, probe = random_network(seed)
    exact = ExactResponse(network, source, probe)
    poles = np.array([complex(p) for p in exact.poles()])
    rise = 2.0 / np.median(np.abs(poles))
    peak = ramp(pole_residue(network, source, probe), 1.0, rise).peak()
    times = np.concatenate([
        np.geomspace(0.01 / np.abs(poles).max(), 20 / np.abs(poles).min(), 250),
        rise * np.linspace(0.01, 3.0, 60),
    ])  # fmt: skip
    size = float(peak.size)
    assert max(abs(float(exact.ramp(t, rise))) for t in times) <= size * (1 + 1e-6)
    at = float(peak.time) if math.isfinite(peak.time) else 1e3 / np.abs(poles.real).min()
    assert abs(float(exact.ramp(at, rise))) == pytest.approx(size, rel=1e-6)


def test_dielectric_loss_against_exact_elimination() -> None:
    """C(1 − j·tan δ) at each frequency, by elimination in 60 digits."""
    network = Network((
        VoltageSource("source", "a", "0", 1.0, 10.0, 1e-8),
        Capacitor("C1", "a", "b", 1e-6, 0.01, 1e-9, 0.025),
        Capacitor("C2", "b", "0", 2.2e-7, 0.02, 0.6e-9, 0.05, 1e8),
        Capacitor("C3", "a", "0", 1e-7, 0.0, 0.0, 0.1),
    ))  # fmt: skip
    with mp.workdps(60):
        stamps = Stamps(network, "source")
        wanted = [complex(stamps.solve(2j * mp.pi * mp.mpf(f), "b", lossy=True)[1]) for f in FREQUENCIES]
    found = frequency_response(network, "source", "b", FREQUENCIES)
    assert np.abs(found / wanted - 1).max() < 1e-9


def test_sets_of_values_equal_networks_one_by_one() -> None:
    """A batch is the same as each network on its own (a property, not a reference)."""
    from reactance.analysis.circuit.network import Parameter

    network, source, probe = random_network(7)
    names = [e for e in network.elements if isinstance(e, Capacitor)][:2]
    parameters = [Parameter(c.name, "capacitance", c.capacitance, 0, 1) for c in names]
    values = np.array([[c.capacitance * k for c in names] for k in (0.5, 1.0, 1.7)])
    batch = frequency_response(network, source, probe, FREQUENCIES, parameters=parameters, values=values)
    modes = pole_residue(network, source, probe, parameters=parameters, values=values)
    t = np.geomspace(1e-12, 1.0, 40)
    for row, several in zip(values, step(modes).value(t), strict=True):
        one = network.with_values({(c.name, "capacitance"): v for c, v in zip(names, row, strict=True)})
        single = step(pole_residue(one, source, probe)).value(t)
        assert np.abs(several - single).max() < 1e-10 * np.abs(single).max()
    for row, several in zip(values, batch, strict=True):
        one = network.with_values({(c.name, "capacitance"): v for c, v in zip(names, row, strict=True)})
        assert np.abs(several / frequency_response(one, source, probe, FREQUENCIES) - 1).max() < 1e-12


def test_a_small_resistance_between_large_ones_keeps_its_digits() -> None:
    """1 mΩ between two nodes that hang on 1 MΩ and 1 pF: node voltages alone would lose nine digits."""
    from reactance.analysis.circuit.network import Resistor

    network = Network((
        CurrentSource("source", "a", "0", 1.0),
        Resistor("R1", "a", "0", 1e6), Resistor("R2", "a", "b", 1e-3), Resistor("R3", "b", "c", 1e-3),
        Resistor("R4", "c", "0", 1e6), Capacitor("C", "c", "0", 1e-12),
    ))  # fmt: skip
    exact = ExactResponse(network, "source", "c")
    found = frequency_response(network, "source", "c", FREQUENCIES)
    wanted = np.array([complex(exact.at(f)) for f in FREQUENCIES])
    assert np.abs(found / wanted - 1).max() < 1e-12
