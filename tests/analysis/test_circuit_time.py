"""Features of responses over time, against closed forms and brute-force sampling."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reactance.analysis.circuit.modal import PoleResidue, pole_residue
from reactance.analysis.circuit.network import Capacitor, CurrentSource, Network, Resistor, VoltageSource
from reactance.analysis.circuit.rhythm import Rhythm
from reactance.analysis.circuit.transient import (
    pulse,
    ramp,
    sine,
    start_response,
    step,
    trapezoid,
)

TAU = 2e-3


def lag() -> PoleResidue:
    return PoleResidue(np.array([-1 / TAU + 0j]), np.array([1 / TAU + 0j]), np.float64(0), np.float64(0))


def ringing(zeta: float, w0: float = 1e6) -> PoleResidue:
    """1/(1 + 2ζs/ω0 + s²/ω0²)."""
    p = w0 * (-zeta + 1j * math.sqrt(1 - zeta * zeta))
    r = w0 * w0 / (p - p.conjugate())
    return PoleResidue(np.array([p, p.conjugate()]), np.array([r, r.conjugate()]), np.float64(0), np.float64(0))


def test_ramp_is_the_mean_of_steps() -> None:
    """A ramp's response is the running mean of the step's: 1 − (τ/T)·(e^(T/τ) − 1)·e^(−t/τ) after it (textbook)."""
    for rise in (1e-12, 1e-6, TAU, 50 * TAU):
        response = ramp(lag(), 2.0, rise)
        t = rise + np.linspace(0.1, 5, 20) * TAU
        wanted = 2.0 * (1 + TAU / rise * np.expm1(-rise / TAU) * np.exp(-(t - rise) / TAU))
        assert np.allclose(response.value(t), wanted, rtol=1e-12)
        inside = rise * np.array([1e-3, 0.5, 1.0])
        with mp.workdps(50):  # in doubles this difference keeps no digits for a short ramp
            x = [mp.mpf(v) / TAU for v in inside]
            within = [float(2 * TAU / mp.mpf(rise) * (v + mp.expm1(-v))) for v in x]
        assert np.allclose(response.value(inside), within, rtol=1e-12, atol=0)


def test_pulse_and_its_end() -> None:
    width = 0.7 * TAU
    response = pulse(lag(), width, 3.0)
    t = np.array([-1.0, 0.0, 0.5 * TAU, 2 * TAU])
    wanted = [0, 0, 3 * -math.expm1(-0.5), 3 * -math.expm1(-0.7) * math.exp(-1.3)]
    assert np.allclose(response.value(t), wanted, rtol=1e-12)
    assert response.final == pytest.approx(0.0, abs=1e-15)
    assert response.peak().time == pytest.approx(width, rel=1e-12)
    assert response.peak().size == pytest.approx(3 * -math.expm1(-0.7), rel=1e-12)


def test_crossing_and_settling_of_a_lag() -> None:
    response = step(lag(), 5.0)
    assert response.first_crossing(2.0) == pytest.approx(-TAU * math.log(0.6), rel=1e-12)
    assert math.isinf(float(response.first_crossing(5.1)))
    assert response.settling_time(0.01) == pytest.approx(-TAU * math.log(0.01 / 5), rel=1e-12)
    assert response.settling_time(6.0) == 0.0
    assert response.initial == 0.0


@settings(max_examples=25, deadline=None)
@given(st.floats(2e-4, 0.9), st.floats(1e-4, 0.5))
def test_settling_of_a_ring_is_right_on_both_sides(zeta: float, within: float) -> None:
    """At the settling time |v − v∞| is `within`; afterwards never more (sampled at 60 points a turn)."""
    response = step(ringing(zeta))
    t = float(response.settling_time(within))
    if t > 0:
        assert abs(float(response.value([t])[0]) - 1) == pytest.approx(within, rel=1e-6)
    later = t + np.linspace(1e-9, 40.0, 2400) / 1e6
    assert (np.abs(response.value(later) - 1) <= within * (1 + 1e-9)).all()


@settings(max_examples=25, deadline=None)
@given(st.integers(0, 10_000))
def test_peak_is_never_exceeded(seed: int) -> None:
    """Two rings and a lag of random sizes under a ramp: dense samples exceed the peak by no more than 1e-6."""
    rng = np.random.default_rng(seed)
    p = [-(10 ** rng.uniform(4, 6)) + 1j * 10 ** rng.uniform(5, 8) for _ in range(2)]
    r = [complex(*rng.standard_normal(2)) * abs(x) for x in p]
    real = -(10 ** rng.uniform(3, 7))
    poles = np.array([*p, *np.conj(p), real])
    residues = np.array([*r, *np.conj(r), real * rng.standard_normal()])
    response = ramp(PoleResidue(poles, residues, np.float64(0), np.float64(0)), 1.0, 10 ** rng.uniform(-9, -5))
    peak = float(response.peak().size)
    slow, fast = 20 / np.abs(poles.real).min(), 0.01 / np.abs(poles).max()
    first = 30 / np.abs(poles.imag).max()
    t = np.concatenate([np.geomspace(fast, slow, 20000), np.linspace(0, first, 20000), np.linspace(0, slow, 20000)])
    top = float(np.abs(response.value(t)).max())
    assert top <= peak * (1 + 1e-6)
    assert peak <= top * 1.02 or math.isinf(float(response.peak().time))


def test_trapezoid_is_the_sum_of_its_ramps() -> None:
    """The steady state equals the response long after the train began, each edge a ramp (superposition)."""
    modes, period, rise, amplitude = ringing(0.05), 4.3e-6, 0.2e-6, 0.8
    edge = ramp(modes, amplitude, rise)
    t = np.linspace(0.0, period, 50)
    cycles = 150
    late = t + cycles * period
    wanted = sum(edge.value(late - k * period) - edge.value(late - (k + 0.5) * period) for k in range(cycles + 1))
    found = trapezoid(modes, amplitude, rise, 1 / period)
    assert np.allclose(found.value(t), wanted, atol=1e-9)
    assert np.allclose(found.value(t), found.value(t + 7 * period), atol=1e-12)


def test_worst_repetition_rate() -> None:
    """The rate in the band that moves the output most, against a fine scan of the steady state itself."""
    modes = ringing(0.02)
    at, size = (float(x[0]) for x in Rhythm.of(modes, 1.0, 20e-9, 1e4, 1e6).worst(modes))
    rates = np.concatenate([np.geomspace(1e4, 1e6, 60), np.linspace(0.155e6, 0.163e6, 60)])
    scan = [float(trapezoid(modes, 1.0, 20e-9, f).peak(0.5).size) for f in rates]
    assert max(scan) <= float(size) * (1 + 1e-6)
    assert max(scan) == pytest.approx(float(size), rel=2e-3)
    assert float(trapezoid(modes, 1.0, 20e-9, at).peak(0.5).size) == pytest.approx(float(size), rel=1e-9)
    assert at == pytest.approx(1e6 / 2 / math.pi, rel=0.01)


def test_worst_rate_may_be_a_subharmonic() -> None:
    """Where the band ends below the resonance, a third of it is worst."""
    modes = ringing(0.002)
    at = float(Rhythm.of(modes, 1.0, 20e-9, 1e4, 0.1e6).worst(modes)[0][0])
    assert at == pytest.approx(1e6 / 2 / math.pi / 3, rel=1e-3)


def test_sine_from_rest_to_steady_state() -> None:
    """Lag driven by sin ωt: (sin(ωt − φ) + sin φ·e^(−t/τ))·cos φ with tan φ = ωτ (textbook)."""
    f = 0.4 / TAU
    found = sine(lag(), f)
    phi = math.atan(2 * math.pi * f * TAU)
    t = np.linspace(0.0, 6 * TAU, 40)
    w = 2 * math.pi * f
    wanted = math.cos(phi) * (np.sin(w * t - phi) + math.sin(phi) * np.exp(-t / TAU))
    assert np.allclose(found.value(t), wanted, atol=1e-12)
    assert found.ratio == pytest.approx(math.cos(phi), rel=1e-12)
    assert found.lag == pytest.approx(phi, rel=1e-12)
    assert np.allclose(found.settled(t), math.cos(phi) * np.sin(w * t - phi), atol=1e-12)


def test_start_superposes_all_sources() -> None:
    """A coupling between two bias points: v = Thevenin level of each side, one capacitor, one time constant."""
    network = Network((
        VoltageSource("VA", "a", "0", 5.0, 1e3), VoltageSource("VB", "b", "0", 2.0, 1e4),
        Capacitor("C", "a", "b", 1e-6), CurrentSource("I", "b", "0", 1e-5),
    ))  # fmt: skip
    t = np.linspace(0, 0.1, 30)
    end_a, end_b = 5.0, 2.0 - 1e-5 * 1e4
    tau = 1.1e4 * 1e-6
    jump = end_b + (end_a - end_b) * 1e4 / 1.1e4
    wanted = end_b + (jump - end_b) * np.exp(-t / tau)
    response = start_response(network, "b")
    assert np.allclose(response.value(t), wanted, rtol=1e-10)
    assert response.final == pytest.approx(end_b, rel=1e-12)
    assert response.farthest() == pytest.approx(jump, rel=1e-12)


def test_a_batch_answers_row_by_row() -> None:
    """Shapes, and each row equal to its own network."""
    from reactance.analysis.circuit.network import Parameter

    network = Network((VoltageSource("V", "a", "0", 1.0), Resistor("R", "a", "b", 1e3), Capacitor("C", "b", "0", 1e-6)))
    parameters = [Parameter("R", "resistance", 1e3, 900, 1100)]
    values = np.array([[900.0], [1000.0], [1100.0]])
    response = step(pole_residue(network, "V", "b", parameters=parameters, values=values))
    assert response.value([1e-3, 2e-3]).shape == (3, 2)
    assert np.allclose(response.rise_time(), values[:, 0] * 1e-6 * math.log(9), rtol=1e-12)
    assert np.allclose(response.settling_time(np.array([0.01, 0.02, 0.03])),
                       -values[:, 0] * 1e-6 * np.log([0.01, 0.02, 0.03]), rtol=1e-12)  # fmt: skip
