"""Agreement with two independent programs: python-control (state space) and scikit-rf (scattering circuit solver)."""

from __future__ import annotations

import math

import numpy as np
import pytest

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import Capacitor, Element, Inductor, Network, Resistor, VoltageSource
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import ramp, step


def rlc_chain(seed: int) -> list[tuple[float, float, float]]:
    """Sections (R, L, C) of a ladder, repeatable."""
    rng = np.random.default_rng(seed)
    return [
        (10 ** rng.uniform(0, 3), 10 ** rng.uniform(-7, -4), 10 ** rng.uniform(-10, -7))
        for _ in range(int(rng.integers(1, 6)))
    ]


def as_network(sections: list[tuple[float, float, float]], load: float) -> Network:
    elements: list[Element] = [VoltageSource("V", "n0", "0", 1.0)]
    for k, (r, x, c) in enumerate(sections):
        elements += [Inductor(f"L{k}", f"n{k}", f"n{k + 1}", x, r), Capacitor(f"C{k}", f"n{k + 1}", "0", c)]
    elements.append(Resistor("RL", f"n{len(sections)}", "0", load))
    return Network(tuple(elements))


@pytest.mark.parametrize("seed", range(10))
def test_python_control(seed: int) -> None:
    """States i_k, v_k of an RL-C ladder: L·i′ = v_(k−1) − v_k − R·i, C·v′ = i_k − i_(k+1)."""
    import control

    sections, load = rlc_chain(seed), 470.0
    n = len(sections)
    a, b, c = np.zeros((2 * n, 2 * n)), np.zeros((2 * n, 1)), np.zeros((1, 2 * n))
    for k, (r, x, cap) in enumerate(sections):
        i, v = 2 * k, 2 * k + 1
        a[i, i], a[i, v], a[v, i] = -r / x, -1 / x, 1 / cap
        if k:
            a[i, v - 2] = 1 / x
        else:
            b[i, 0] = 1 / x
        if k + 1 < n:
            a[v, i + 2] = -1 / cap
        else:
            a[v, v] = -1 / (load * cap)
    c[0, 2 * n - 1] = 1.0
    system = control.ss(a, b, c, 0)
    network, out = as_network(sections, load), f"n{n}"
    modes = pole_residue(network, "V", out)

    poles = control.poles(system)
    end = 8.0 / np.abs(poles.real).min()
    t = np.linspace(0.0, end, 400)
    wanted = control.step_response(system, t).outputs
    assert np.abs(step(modes).value(t) - wanted).max() < 1e-7

    rise = t[40]
    driven = control.forced_response(system, t, np.minimum(t / rise, 1.0)).outputs
    assert np.abs(ramp(modes, 1.0, rise).value(t) - driven).max() < 1e-7

    omega = np.geomspace(1e3, 1e9, 60)
    h = frequency_response(network, "V", out, omega / (2 * math.pi))
    assert np.abs(h / np.asarray(system(1j * omega)).ravel() - 1).max() < 1e-7


@pytest.mark.filterwarnings("ignore")
@pytest.mark.parametrize("seed", range(10))
def test_scikit_rf_circuit(seed: int) -> None:
    """The same ladder between 50 Ω ports: S21 = 2·V(out)/E of a source with 50 Ω into 50 Ω (definition of S21)."""
    import skrf as rf
    from skrf.circuit import Circuit

    sections = rlc_chain(100 + seed)
    f = np.geomspace(1e3, 1e9, 40)
    frequency = rf.Frequency.from_f(f, unit="hz")
    line = rf.media.DefinedGammaZ0(frequency, z0=50.0)
    ground = [Circuit.Ground(frequency, name=f"ground{k}") for k in range(len(sections))]
    ports = [Circuit.Port(frequency, name=name, z0=50.0) for name in ("in", "out")]
    joints: list[list[tuple[object, int]]] = [[(ports[0], 0)]]
    for k, (r, x, c) in enumerate(sections):
        resistor, coil = line.resistor(r, name=f"R{k}"), line.inductor(x, name=f"L{k}")
        capacitor = line.capacitor(c, name=f"C{k}")
        joints[-1].append((resistor, 0))
        joints += [[(resistor, 1), (coil, 0)], [(capacitor, 1), (ground[k], 0)], [(coil, 1), (capacitor, 0)]]
    joints[-1].append((ports[1], 0))
    s21 = Circuit(joints).network.s[:, 1, 0]

    elements = list(as_network(sections, 50.0).elements)
    elements[0] = VoltageSource("V", "n0", "0", 1.0, 50.0)
    h = frequency_response(Network(tuple(elements)), "V", f"n{len(sections)}", f)
    assert np.abs(2 * h - s21).max() < 1e-7 * np.abs(s21).max()
    strong = np.abs(s21) > 1e-4
    assert np.abs(2 * h[strong] / s21[strong] - 1).max() < 1e-5
