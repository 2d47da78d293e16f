"""Operating points against hand calculation, and the large-signal start against an exact solution."""

from __future__ import annotations

import math

import numpy as np
import pytest

from reactance.analysis.circuit.charge import ChargeLaw
from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CircuitError,
    CurrentSource,
    Element,
    Inductor,
    Network,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.operating_point import operating_point
from reactance.analysis.circuit.start import large_signal_start
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import start_response


def test_divider_with_bias_current_and_leakage() -> None:
    """5 V over 10 kΩ to a node with 40 kΩ, a leaking capacitor of 200 kΩ and 20 µA drawn out (Kirchhoff by hand)."""
    network = Network((
        VoltageSource("V", "a", "0", 5.0), Resistor("R1", "a", "b", 1e4), Resistor("R2", "b", "0", 4e4),
        Capacitor("C", "b", "0", 1e-5, leakage=2e5), CurrentSource("I", "b", "0", 20e-6),
        Capacitor("C2", "b", "c", 1e-6), Inductor("L", "b", "d", 1e-6), Bead("F", "d", "e", 0.5, 600.0, 1e-6),
        Resistor("R3", "e", "0", 1e5),
    ))  # fmt: skip
    g = 1 / 1e4 + 1 / 4e4 + 1 / 2e5 + 1 / (1e5 + 0.5)
    v = (5.0 / 1e4 - 20e-6) / g
    point = operating_point(network)
    assert point.voltages["b"] == pytest.approx(v, rel=1e-12)
    assert point.voltages["d"] == pytest.approx(v, rel=1e-12)
    assert point.voltages["e"] == pytest.approx(v * 1e5 / (1e5 + 0.5), rel=1e-12)
    assert point.currents["L"] == pytest.approx(v / (1e5 + 0.5), rel=1e-9)
    assert point.currents["F"] == pytest.approx(v / (1e5 + 0.5), rel=1e-6)
    assert point.currents["C"] == pytest.approx(v / 2e5, rel=1e-12)
    assert point.currents["V"] == pytest.approx((5.0 - v) / 1e4, rel=1e-12)
    assert point.floating == ("c",)


def test_amplifier_and_stacked_sources() -> None:
    """A non-inverting amplifier of gain 1 + R2/R1 with finite open-loop gain; sources in series add."""
    gain = 1e4
    network = Network((
        VoltageSource("V", "a", "0", 0.5), VoltageSource("W", "b", "a", 0.25),
        Amplifier("U", "b", "m", "o", gain, 1e6, 100.0), Resistor("R2", "o", "m", 9e3), Resistor("R1", "m", "0", 1e3),
    ))  # fmt: skip
    inner = 0.75 / (1 / gain + 1e3 / (1e4 + 100.0))
    point = operating_point(network)
    assert point.voltages["b"] == pytest.approx(0.75, rel=1e-12)
    assert point.voltages["o"] == pytest.approx(inner * 1e4 / (1e4 + 100.0), rel=1e-12)
    assert "U (inside)" not in point.voltages


def test_floating_parts_leave_the_rest_solved() -> None:
    """A node behind capacitors only, and an amplifier that senses it: both named, the divider still solved."""
    network = Network((
        VoltageSource("V", "a", "0", 3.0), Resistor("R1", "a", "b", 1e3), Resistor("R2", "b", "0", 2e3),
        Capacitor("C1", "b", "x", 1e-9), Resistor("R3", "x", "y", 1e3), Capacitor("C2", "y", "0", 1e-9),
        Amplifier("U", "x", "o", "o", 1e5, 1e6),
    ))  # fmt: skip
    point = operating_point(network)
    assert point.voltages["b"] == pytest.approx(2.0, rel=1e-12)
    assert set(point.floating) == {"x", "y", "o"}


def test_contradicting_sources_and_loops_are_named() -> None:
    with pytest.raises(CircuitError, match="contradict") as caught:
        operating_point(Network((
            VoltageSource("V1", "a", "0", 3.3), VoltageSource("V2", "b", "0", 5.0), Inductor("L1", "a", "b", 1e-6),
        )))  # fmt: skip
    assert set(caught.value.elements) == {"V1", "V2", "L1"}
    point = operating_point(Network((
        VoltageSource("V", "a", "0", 1.0), Inductor("L1", "a", "b", 1e-6), Inductor("L2", "a", "b", 1e-6),
        Resistor("R", "b", "0", 2.0),
    )))  # fmt: skip
    assert [set(loop) for loop in point.loops] == [{"L1", "L2"}]
    assert math.isnan(point.currents["L1"])
    assert point.voltages["b"] == 1.0
    assert point.currents["V"] == pytest.approx(0.5)


def test_large_network_agrees_with_small_matrices() -> None:
    """A ladder of 2,000 resistors: the golden-ratio input resistance of an endless one (textbook)."""
    elements: list[Element] = [VoltageSource("V", "n0", "0", 1.0)]
    for k in range(1000):
        elements += [Resistor(f"R{k}", f"n{k}", f"n{k + 1}", 1.0), Resistor(f"S{k}", f"n{k + 1}", "0", 1.0)]
    point = operating_point(Network(tuple(elements)))
    assert point.currents["V"] == pytest.approx(2 / (1 + math.sqrt(5)), rel=1e-12)
    few = Network(tuple(elements[:41]))
    ac = frequency_response(few, "V", "n5", [0.0])[0].real
    assert operating_point(few).voltages["n5"] == pytest.approx(ac, rel=1e-12)


def coupling() -> Network:
    return Network((
        VoltageSource("V", "a", "0", 5.0), Resistor("R1", "a", "b", 1e4), Resistor("R2", "b", "0", 4e4),
        Capacitor("C", "b", "c", 1e-6, 0.005, 1e-9), Resistor("R3", "c", "0", 1e5), Capacitor("C2", "c", "0", 1e-9),
    ))  # fmt: skip


def test_start_with_constant_capacitance_is_the_linear_one() -> None:
    network = coupling()
    linear, large = start_response(network, "c"), large_signal_start(network, "c", {"C": ChargeLaw.constant(1e-6)})
    t = np.geomspace(1e-9, 1.0, 60)
    assert np.abs(large.value(t) - linear.value(t)).max() < 1e-6 * 5.0
    assert large.farthest() == pytest.approx(linear.farthest(), rel=1e-6)
    assert large.settling_time(0.01) == pytest.approx(linear.settling_time(0.01), rel=1e-6)
    assert large.final == pytest.approx(0.0, abs=1e-9)


def test_start_with_inductor_and_amplifier_is_the_linear_one() -> None:
    network = Network((
        VoltageSource("V", "a", "0", 3.0, 1.0), Inductor("L", "a", "b", 1e-3, 5.0), Capacitor("C", "b", "0", 1e-6, 0.1),
        Amplifier("U", "b", "o", "o", 1e4, 1e5, 50.0), Resistor("R", "o", "p", 1e3), Capacitor("C2", "p", "0", 1e-7),
    ))  # fmt: skip
    linear, large = start_response(network, "p"), large_signal_start(network, "p", {})
    t = np.geomspace(1e-7, 3e-3, 60)
    assert np.abs(large.value(t) - linear.value(t)).max() < 1e-6 * 3.0
    assert large.peak(3.0) == pytest.approx(float(linear.peak(3.0).size), rel=1e-5)


@pytest.mark.parametrize("half", [2.0, 6.0, 30.0])
def test_start_through_the_bias_law_is_exact(half: float) -> None:
    """One R and C(V) = C0·(1 + 7(V/Vh)²)^(−1/3): t(V) = ∫ R·C(v)/(E − v) dv, by quadrature (separable equation).

    The law: R. E. Johnson... after Johnson, J. Appl. Phys. 33 (1962) 2826, written so that C(Vh) = C0/2.
    """
    from scipy.integrate import quad

    def capacitance(v: np.ndarray) -> np.ndarray:
        return 1e-6 * (1 + 7 * (np.asarray(v) / half) ** 2) ** (-1 / 3)

    network = Network((
        VoltageSource("V", "a", "0", 10.0), Resistor("R", "a", "b", 1e4), Capacitor("C", "b", "0", 1e-6),
    ))  # fmt: skip
    motion = large_signal_start(network, "b", {"C": ChargeLaw.of_capacitance(capacitance, 10.0)})
    for v in (0.1, 1.0, 5.0, 9.0, 9.99):
        t = quad(lambda x: 1e4 * float(capacitance(x)) / (10.0 - x), 0, v, epsabs=0, epsrel=1e-12)[0]
        assert float(motion.value([t])[0]) == pytest.approx(v, rel=1e-6)
    settled = quad(lambda x: 1e4 * float(capacitance(x)) / (10.0 - x), 0, 9.9, epsabs=0, epsrel=1e-12)[0]
    assert motion.settling_time(0.1) == pytest.approx(settled, rel=1e-6)


def test_charge_law_is_its_own_inverse() -> None:
    """Q(V) of the bias law has the closed form V·₂F₁(1/3, 1/2; 3/2; −7(V/Vh)²) (scipy.special)."""
    from scipy.special import hyp2f1

    law = ChargeLaw.of_capacitance(lambda v: (1 + 7 * (np.asarray(v) / 4.0) ** 2) ** (-1 / 3), 16.0)
    v = np.array([-30.0, -3.0, 0.0, 1e-6, 0.5, 4.0, 15.99, 16.5, 25.0])
    wanted = v * hyp2f1(1 / 3, 1 / 2, 3 / 2, -7 * (v / 4.0) ** 2)
    assert law.charge(v) == pytest.approx(wanted, rel=1e-8)
    assert law.voltage(law.charge(v)) == pytest.approx(v, rel=1e-10, abs=1e-15)
