"""Networks whose poles are hard: coinciding, nearly so, hardly damped, infinite, at zero."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from exact_network import ExactResponse

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import (
    Amplifier,
    Capacitor,
    CircuitError,
    CurrentSource,
    Element,
    Inductor,
    Network,
    Parameter,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.transient import ramp, step


def buffered_stages(taus: list[float]) -> Network:
    """Equal RC low-passes with ideal buffers between: H = Π 1/(1 + s·τ)."""
    elements: list[Element] = [VoltageSource("V", "b0", "0", 1.0)]
    for k, tau in enumerate(taus):
        elements += [
            Resistor(f"R{k}", f"b{k}", f"c{k}", 1e3),
            Capacitor(f"C{k}", f"c{k}", "0", tau / 1e3),
            Amplifier(f"U{k}", f"c{k}", f"b{k + 1}", f"b{k + 1}", 1e15, math.inf),
        ]
    return Network(tuple(elements))


@pytest.mark.parametrize("order", [2, 3, 4, 5])
def test_equal_poles(order: int) -> None:
    """1 − e^(−x)·Σ x^k/k!: the step response of `order` equal lags (Erlang distribution)."""
    tau = 1e-3
    modes = pole_residue(buffered_stages([tau] * order), "V", f"b{order}")
    x = np.geomspace(1e-2, 30, 60)
    wanted = 1 - np.exp(-x) * sum(x**k / math.factorial(k) for k in range(order))
    assert np.abs(step(modes).value(x * tau) - wanted).max() < 1e-7


@pytest.mark.parametrize("apart", [1e-12, 1e-9, 1e-6, 1e-4, 1e-3, 1e-2])
def test_nearly_equal_poles(apart: float) -> None:
    """Three lags, two of them `apart`: partial fractions in 60 digits."""
    taus = [1e-3, 1e-3 * (1 + apart), 0.7e-3]
    modes = pole_residue(buffered_stages(taus), "V", "b3")
    t = np.geomspace(1e-5, 2e-2, 50)
    with mp.workdps(60):
        farads = [mp.mpf(tau / 1e3) * 1000 for tau in taus]
        wanted = []
        for time in t:
            total = mp.mpf(1)
            for k, tau in enumerate(farads):
                others = [x for i, x in enumerate(farads) if i != k]
                product = mp.mpf(1)
                for other in others:
                    product *= tau / (tau - other)
                total -= product * mp.exp(-mp.mpf(time) / tau)
            wanted.append(float(total))
    assert np.abs(step(modes).value(t) - wanted).max() < 1e-7


@pytest.mark.parametrize("quality", [10.0, 1e3, 1e4])
def test_two_equal_tanks_in_a_row(quality: float) -> None:
    """Double complex poles (two buffered series RLC of one Q), by the exact double-pole step response in mpmath."""
    inductance, capacitance = 1e-6, 1e-9
    w0 = 1 / math.sqrt(inductance * capacitance)
    r = w0 * inductance / quality
    elements: list[Element] = [VoltageSource("V", "b0", "0", 1.0)]
    for k in range(2):
        elements += [
            Inductor(f"L{k}", f"b{k}", f"c{k}", inductance, r),
            Capacitor(f"C{k}", f"c{k}", "0", capacitance),
            Amplifier(f"U{k}", f"c{k}", f"b{k + 1}", f"b{k + 1}", 1e15, math.inf),
        ]
    modes = pole_residue(Network(tuple(elements)), "V", "b2")
    t = np.linspace(0.05, 30.0 * min(quality, 20.0), 40) / w0
    with mp.workdps(50):
        x, c, res = mp.mpf(inductance), mp.mpf(capacitance), mp.mpf(r)
        p = (-res + mp.sqrt(res * res - 4 * x / c)) / (2 * x)
        q = mp.conj(p)
        # 1/(LC)² /((s−p)²(s−q)²·s): residues of a double pole by differentiating the rest
        gain = 1 / (x * c) ** 2

        def pair(a: mp.mpc, b: mp.mpc, time: mp.mpf) -> mp.mpc:
            rest = gain / ((a - b) ** 2 * a)
            slope = rest * (-2 / (a - b) - 1 / a)
            return (rest * time + slope) * mp.exp(a * time)

        wanted = [float(mp.re(1 + pair(p, q, mp.mpf(v)) + pair(q, p, mp.mpf(v)))) for v in t]
    size = np.abs(wanted).max()
    assert np.abs(step(modes).value(t) - wanted).max() < 1e-7 * size


@pytest.mark.parametrize("number", [2, 5, 34])
def test_identical_capacitors_are_one(number: int) -> None:
    """n identical branches in parallel are one branch of n times the admittance, exactly."""
    feed = (VoltageSource("V", "rail", "0", 1.0, 0.01, 1e-8), CurrentSource("I", "0", "rail", 1.0))
    many = [Capacitor(f"C{k}", "rail", "0", 1e-7, 5e-3, 1e-9) for k in range(number)]
    one = Capacitor("C", "rail", "0", 1e-7 * number, 5e-3 / number, 1e-9 / number)
    t = np.geomspace(1e-10, 1e-4, 80)
    va = ramp(pole_residue(Network((*feed, *many)), "I", "rail"), 1.0, 1e-9).value(t)
    vb = ramp(pole_residue(Network((*feed, one)), "I", "rail"), 1.0, 1e-9).value(t)
    assert np.abs(va - vb).max() < 1e-9 * np.abs(vb).max()


def test_capacitors_that_are_equal_in_some_sets_of_values() -> None:
    """Equal at one row and not at the next: both rows against exact arithmetic or the merged network."""
    network = Network((
        VoltageSource("V", "rail", "0", 1.0, 0.01, 1e-8), CurrentSource("I", "0", "rail", 1.0),
        Capacitor("C1", "rail", "0", 1e-7, 5e-3, 1e-9), Capacitor("C2", "rail", "0", 1e-7, 5e-3, 1e-9),
    ))  # fmt: skip
    parameters = [Parameter(n, "capacitance", 1e-7, 0.9e-7, 1.1e-7) for n in ("C1", "C2")]
    values = np.array([[1e-7, 1e-7], [0.9e-7, 1.1e-7], [1e-7, 1.0000001e-7]])
    modes = pole_residue(network, "I", "rail", parameters=parameters, values=values)
    t = np.geomspace(1e-10, 1e-4, 60)
    v = ramp(modes, 1.0, 1e-9).value(t)
    for row, several in zip(values[1:], v[1:], strict=True):
        one = network.with_values({("C1", "capacitance"): row[0], ("C2", "capacitance"): row[1]})
        exact = ExactResponse(one, "I", "rail")
        wanted = np.array([float(exact.ramp(x, 1e-9)) for x in t])
        assert np.abs(several - wanted).max() < 1e-7 * np.abs(wanted).max()


@pytest.mark.parametrize("quality", [1e2, 1e4])
def test_sharp_resonance_is_found(quality: float) -> None:
    """A parallel tank: |Z| peaks at R exactly at 1/(2π·sqrt(LC)); the band's grid cannot see it by chance."""
    inductance, capacitance = 1e-6, 1e-9
    w0 = 1 / math.sqrt(inductance * capacitance)
    r = quality * w0 * inductance
    network = Network((
        CurrentSource("I", "0", "a", 1.0), Inductor("L", "a", "0", inductance), Capacitor("C", "a", "0", capacitance),
        Resistor("R", "a", "0", r),
    ))  # fmt: skip
    response = Response(network, "I", "a")
    for low, high in ((1e3, 1e9), (4.9e6, 5.1e6)):
        at, size = response.greatest(low, high)
        assert float(at[0]) == pytest.approx(w0 / 2 / math.pi, rel=1e-6)
        assert float(size[0]) == pytest.approx(r, rel=1e-9)
    assert len(response.local_maxima(1e3, 1e9)) == 1


def test_sharp_notch_is_found() -> None:
    """A series trap of Q = 1e4 between grid points: least |H| at its resonance, and the first fall through a level."""
    inductance, capacitance = 1e-6, 1e-9
    w0 = 1 / math.sqrt(inductance * capacitance)
    esr = w0 * inductance / 1e4
    network = Network((
        VoltageSource("V", "in", "0", 1.0, 50.0), Capacitor("C", "in", "0", capacitance, esr, inductance),
        Resistor("R", "in", "0", 1e6),
    ))  # fmt: skip
    response = Response(network, "V", "in")
    at, size = response.least(1e3, 1e9)
    assert float(at[0]) == pytest.approx(w0 / 2 / math.pi, rel=1e-6)
    assert float(size[0]) == pytest.approx(esr / (50 + esr), rel=1e-4)
    corner = float(response.falls_through(0.9, 1e3, "up", 1e9)[0])
    assert corner < w0 / 2 / math.pi
    assert abs(response.at(corner)[0, 0]) == pytest.approx(0.9, rel=1e-9)


def test_pole_at_zero() -> None:
    """A current into a capacitor and an RC: v = t/(C1 + C2) + …, exact by charge sharing."""
    network = Network((
        CurrentSource("I", "0", "a", 1e-6), Capacitor("C1", "a", "0", 1e-6), Resistor("R", "a", "b", 10.0),
        Capacitor("C2", "b", "0", 1e-7),
    ))  # fmt: skip
    response = step(pole_residue(network, "I", "a"), 1e-6)
    total, series = 1.1e-6, 1e-6 * 1e-7 / 1.1e-6
    tau = 10.0 * series
    t = np.geomspace(1e-8, 1.0, 30)
    wanted = 1e-6 * (t / total + 10.0 * (series / 1e-6) ** 2 * -np.expm1(-t / tau))
    assert np.allclose(response.value(t), wanted, rtol=1e-10)
    assert math.isinf(float(response.final))


def test_floating_nodes_are_named() -> None:
    network = Network((VoltageSource("V", "a", "0", 1.0), Resistor("R", "a", "0", 1.0), Resistor("S", "x", "y", 1.0)))
    with pytest.raises(CircuitError, match="x") as caught:
        pole_residue(network, "V", "x")
    assert caught.value.nodes == ("x",)
    with pytest.raises(CircuitError, match="no node q"):
        pole_residue(network, "V", "q")
    with pytest.raises(CircuitError, match="no element W"):
        pole_residue(network, "W", "a")


def test_sources_that_contradict_each_other_are_named() -> None:
    network = Network(
        (VoltageSource("V", "a", "0", 1.0), VoltageSource("W", "a", "0", 2.0), Resistor("R", "a", "0", 1.0))
    )
    with pytest.raises(CircuitError, match="contradict") as caught:
        pole_residue(network, "V", "a")
    assert set(caught.value.elements) == {"V", "W"}


def test_gains_that_cancel_are_named_as_such() -> None:
    """A follower of gain exactly 1 fed back positively has no solution."""
    network = Network((
        VoltageSource("V", "in", "0", 1.0), Resistor("R", "in", "x", 1e3),
        Amplifier("U", "x", "0", "y", 1.0, math.inf), Resistor("S", "y", "x", 0.0), Resistor("T", "y", "0", 1e3),
    ))  # fmt: skip
    with pytest.raises(CircuitError):
        pole_residue(network, "V", "y")
