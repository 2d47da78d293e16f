"""Rules that any network calculation must reproduce, each with its source."""

from __future__ import annotations

import math

import numpy as np
import pytest

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CurrentSource,
    Inductor,
    Network,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.noise import BOLTZMANN, integrated_noise
from reactance.analysis.circuit.response import Response
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import pulse, ramp, step

R, C = 1e4, 22e-9


def low_pass() -> Network:
    return Network((VoltageSource("V", "in", "0", 1.0), Resistor("R1", "in", "out", R), Capacitor("C1", "out", "0", C)))


def high_pass() -> Network:
    return Network((VoltageSource("V", "in", "0", 1.0), Capacitor("C1", "in", "out", C), Resistor("R1", "out", "0", R)))


def test_rc_step_after_one_and_five_time_constants() -> None:
    """1 − 1/e = 63.2 % after one time constant (textbook); within 1 % after five (common practice)."""
    response = step(pole_residue(low_pass(), "V", "out"))
    one, five = response.value([R * C, 5 * R * C])
    assert one == pytest.approx(1 - math.exp(-1), rel=1e-12)
    assert five == pytest.approx(1 - math.exp(-5), rel=1e-12)
    assert 0.99 < five < 1


def test_rise_time_and_bandwidth() -> None:
    """10–90 % rise time ln(9)·RC = 2.197·RC; f_3dB·t_r = ln(9)/(2π) = 0.35 (common practice)."""
    network = low_pass()
    rise = step(pole_residue(network, "V", "out")).rise_time()
    corner = float(Response(network, "V", "out").falls_through(math.sqrt(0.5), 0.0, "up", 1e9)[0])
    assert rise == pytest.approx(math.log(9) * R * C, rel=1e-12)
    assert corner == pytest.approx(1 / (2 * math.pi * R * C), rel=1e-9)
    assert corner * rise == pytest.approx(math.log(9) / (2 * math.pi), rel=1e-9)
    assert corner * rise == pytest.approx(0.35, abs=5e-4)


def test_tilt_of_a_pulse_through_a_coupling() -> None:
    """Sag of a pulse of width T is 1 − exp(−T/RC); for a square wave of f ≫ f1 the tilt is about π·f1/f.

    J. Millman and H. Taub, Pulse, Digital and Switching Waveforms, 1965.
    """
    modes = pole_residue(high_pass(), "V", "out")
    for width in (0.01 * R * C, 0.3 * R * C):
        response = pulse(modes, width)
        end = float(response.value([width * (1 - 1e-12)])[0])
        assert response.initial == pytest.approx(1.0, rel=1e-12)
        assert 1 - end == pytest.approx(-math.expm1(-width / (R * C)), rel=1e-8)
    f1 = 1 / (2 * math.pi * R * C)
    f = 200 * f1
    sag = 1 - float(step(modes).value([0.5 / f])[0])
    assert sag == pytest.approx(math.pi * f1 / f, rel=0.01)


def test_antiresonance_of_two_capacitors() -> None:
    """f = 1/(2π·sqrt((L1 + L2)·C1·C2/(C1 + C2))) for small ESR (parallel resonance of the mesh)."""
    network = Network((
        CurrentSource("load", "0", "rail", 1.0),
        Capacitor("C1", "rail", "0", 1e-5, 1e-5, 1e-9), Capacitor("C2", "rail", "0", 1e-7, 1e-5, 0.6e-9),
    ))  # fmt: skip
    expected = 1 / (2 * math.pi * math.sqrt(1.6e-9 * 1e-5 * 1e-7 / (1e-5 + 1e-7)))
    at, size = Response(network, "load", "rail").greatest_local_maximum(1e3, 1e9)
    assert float(at[0]) == pytest.approx(expected, rel=1e-6)
    mesh = 2e-5  # the resistance that damps it; |Z| there is about (X1²)/R
    x = 2 * math.pi * expected * 1e-9 - 1 / (2 * math.pi * expected * 1e-5)
    assert float(size[0]) == pytest.approx(x * x / mesh, rel=1e-3)


def test_equal_capacitors_meet_a_target_impedance() -> None:
    """n = 2L/(Z_t·t_r) equal capacitors of total 1/(2π·f·Z_t): edges of 3 ns, 0.1 Ω from 1 MHz, 5 nH each, n = 34.

    In the manner of H. W. Ott, Electromagnetic Compatibility Engineering, 2009 (formula from memory).
    """
    rise, target, inductance = 3e-9, 0.1, 5e-9
    number = math.ceil(2 * inductance / (target * rise))
    assert number == 34
    total = 1 / (2 * math.pi * 1e6 * target)
    assert total / number == pytest.approx(47e-9, rel=0.01)
    parts = [Capacitor(f"C{k}", "rail", "0", 47e-9, 0.0, inductance) for k in range(number)]
    network = Network((CurrentSource("load", "0", "rail", 1.0), *parts))
    high = 1 / (math.pi * rise)
    at, size = Response(network, "load", "rail").greatest(1e6, high)
    assert float(size[0]) <= target * 1.001  # 34 × 47 nF is 0.4 % above the total asked for
    fewer = Network(network.elements[:-2])
    assert float(Response(fewer, "load", "rail").greatest(1e6, high)[1][0]) > target
    assert float(at[0]) == pytest.approx(1e6) or float(at[0]) == pytest.approx(high)


@pytest.mark.parametrize("resistance", [1.0, 1e3, 1e6])
def test_noise_of_an_rc_does_not_depend_on_r(resistance: float) -> None:
    """sqrt(kT/C) (J. B. Johnson and H. Nyquist, Phys. Rev. 32 (1928) 97 and 110)."""
    network = Network((Resistor("R", "a", "0", resistance), Capacitor("C", "a", "0", 1e-12)))
    assert integrated_noise(network, "a", 300.0) == pytest.approx(math.sqrt(BOLTZMANN * 300 / 1e-12), rel=1e-12)
    assert math.isinf(float(integrated_noise(Network((Resistor("R", "a", "0", resistance),)), "a", 300.0)))


def test_noise_of_any_passive_network_is_that_of_its_limiting_capacitance() -> None:
    """∫4kT·Re Z df = kT·(1/C∞ − 1/C0) for a passive node (Nyquist's theorem with the resistance integral of Bode)."""
    network = Network((
        Resistor("R1", "a", "0", 1e3), Resistor("R2", "a", "b", 120.0), Capacitor("C1", "a", "0", 1e-9, 10.0, 1e-9),
        Bead("F1", "b", "c", 0.1, 600.0, 1e-6, 1e-12), Inductor("L1", "b", "d", 1e-3, 3.0, 1e-12),
        Capacitor("C4", "d", "0", 1e-9), Capacitor("C3", "c", "0", 1e-7, leakage=1e6), Capacitor("C5", "b", "0", 1e-10),
    ))  # fmt: skip
    limiting = 1e-10 + 1 / (1 / 1e-12 + 1 / 1e-9)  # the bead's dcr hides C3
    expected = math.sqrt(BOLTZMANN * 350 / limiting)
    assert integrated_noise(network, "b", 350.0) == pytest.approx(expected, rel=1e-9)


def test_noise_of_an_inverting_amplifier_by_its_integral() -> None:
    """4kTR·|H|² of each resistance of an active low-pass, integrated numerically over log frequency."""
    f = np.geomspace(1e-4, 1e13, 20001)
    network = Network((
        VoltageSource("V", "in", "0", 0.0), Resistor("R1", "in", "minus", 1e3), Resistor("R2", "minus", "out", 1e4),
        Capacitor("C2", "minus", "out", 1e-9), Amplifier("U1", "0", "minus", "out", 1e5, 1e6, 50.0),
        Resistor("RL", "out", "load", 100.0), Capacitor("CL", "load", "0", 1e-9),
    ))  # fmt: skip
    total = 0.0
    for name, resistance, a, b in (
        ("R1", 1e3, "in", "minus"), ("R2", 1e4, "minus", "out"), ("RL", 100.0, "out", "load"),
    ):  # fmt: skip
        driven = Network((*network.elements, CurrentSource(f"n{name}", a, b, 0.0)))
        h = frequency_response(driven, f"n{name}", "load", f)
        total += float(np.trapezoid(4 * BOLTZMANN * 300 / resistance * np.abs(h) ** 2 * f, np.log(f)))
    assert integrated_noise(network, "load", 300.0) == pytest.approx(math.sqrt(total), rel=1e-6)


def test_overshoot_of_a_second_order_network() -> None:
    """exp(−πζ/sqrt(1 − ζ²)) at t = π/(ω0·sqrt(1 − ζ²)) (any text on control)."""
    resistance, inductance, capacitance = 10.0, 1e-6, 1e-9
    zeta = resistance / 2 * math.sqrt(capacitance / inductance)
    w0 = 1 / math.sqrt(inductance * capacitance)
    network = Network((
        VoltageSource("V", "in", "0", 1.0), Inductor("L", "in", "out", inductance, resistance),
        Capacitor("C", "out", "0", capacitance),
    ))  # fmt: skip
    top = step(pole_residue(network, "V", "out")).highest()
    root = math.sqrt(1 - zeta * zeta)
    assert top.size == pytest.approx(1 + math.exp(-math.pi * zeta / root), rel=1e-12)
    assert top.time == pytest.approx(math.pi / (w0 * root), rel=1e-7)


def test_current_ramp_into_inductance_alone() -> None:
    """v = L·di/dt: a node fed through inductance only has an improper impedance."""
    network = Network((VoltageSource("V", "rail", "0", 3.3, 0.0, 20e-9), CurrentSource("load", "rail", "0", 1.0)))
    modes = pole_residue(network, "load", "rail")
    assert modes.slope == pytest.approx(-20e-9, rel=1e-12)
    response = ramp(modes, 0.5, 10e-9)
    assert np.allclose(response.value([1e-9, 9e-9, 11e-9]), [-1.0, -1.0, 0.0], atol=1e-12)
    assert response.peak().size == pytest.approx(20e-9 * 0.5 / 10e-9, rel=1e-12)
    assert math.isinf(float(step(modes).peak().size))
