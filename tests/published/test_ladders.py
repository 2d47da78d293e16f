"""Doubly terminated LC ladders: published element values must show the prototypes' responses.

Element values: Butterworth g = 2·sin((2k − 1)π/2N), Chebyshev by the closed form and the tables of Matthaei, Young and
Jones, Microwave Filters, Impedance-Matching Networks, and Coupling Structures (1964); Bessel by continued fraction of
the polynomial that scipy.signal gives. The responses come from scipy.signal independently.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import pytest
from scipy import signal

from reactance.analysis.circuit.modal import pole_residue
from reactance.analysis.circuit.network import Capacitor, Element, Inductor, Network, Resistor, VoltageSource
from reactance.analysis.circuit.sweep import frequency_response
from reactance.analysis.circuit.transient import step

OMEGA = np.geomspace(0.01, 30, 60)
TIMES = np.linspace(0.0, 40, 81)


def butterworth(order: int) -> list[float]:
    return [2 * math.sin((2 * k - 1) * math.pi / (2 * order)) for k in range(1, order + 1)]


def chebyshev(order: int, ripple: float) -> list[float]:
    """g1..gN for `ripple` in dB (Matthaei, Young and Jones, section 4.05)."""
    beta = math.log(1 / math.tanh(ripple / (40 * math.log10(math.e))))
    gamma = math.sinh(beta / (2 * order))
    a = [math.sin((2 * k - 1) * math.pi / (2 * order)) for k in range(1, order + 1)]
    b = [gamma**2 + math.sin(k * math.pi / order) ** 2 for k in range(1, order + 1)]
    g = [2 * a[0] / gamma]
    for k in range(1, order):
        g.append(4 * a[k - 1] * a[k] / (b[k - 1] * g[k - 1]))
    return g


def ladder(values: Sequence[float], load: float = 1.0, *, source: float = 1.0) -> Network:
    """Shunt C first, then series L, and so on, between `source` and `load` ohms, at 1 rad/s."""
    elements: list[Element] = [VoltageSource("V", "in", "0", 1.0, source)]
    node = "in"
    for k, g in enumerate(values):
        if k % 2 == 0:
            elements.append(Capacitor(f"C{k}", node, "0", g))
        else:
            elements.append(Inductor(f"L{k}", node, f"n{k}", g))
            node = f"n{k}"
    elements.append(Resistor("RL", node, "0", load))
    return Network(tuple(elements))


def last_node(network: Network) -> str:
    load = network.element("RL")
    assert isinstance(load, Resistor)
    return load.a


def check(network: Network, b: np.ndarray, a: np.ndarray, gain: float) -> None:
    """Frequency and step response of `network` against b/a of scipy.signal, times `gain`."""
    out = last_node(network)
    h = frequency_response(network, "V", out, OMEGA / (2 * math.pi))
    _, wanted = signal.freqs(b, a, OMEGA)
    assert np.abs(h / (gain * wanted) - 1).max() < 1e-8
    _, w = signal.step((b, a), T=TIMES)
    v = step(pole_residue(network, "V", out)).value(TIMES)
    assert np.abs(v - gain * w).max() < 1e-6


@pytest.mark.parametrize("order", range(1, 10))
def test_butterworth(order: int) -> None:
    b, a = signal.butter(order, 1.0, analog=True)
    check(ladder(butterworth(order)), b, a, 0.5)


@pytest.mark.parametrize("order", [1, 3, 5, 7, 9])
@pytest.mark.parametrize("ripple", [0.1, 0.5, 3.0])
def test_chebyshev(order: int, ripple: float) -> None:
    b, a = signal.cheby1(order, ripple, 1.0, analog=True)
    check(ladder(chebyshev(order, ripple)), b, a, 0.5)


@pytest.mark.parametrize("order", [2, 4, 6, 8])
def test_chebyshev_of_even_order_needs_unequal_terminations(order: int) -> None:
    """g(N+1) = coth²(β/4); the gain at DC is then the least of the ripple."""
    ripple = 0.5
    beta = math.log(1 / math.tanh(ripple / (40 * math.log10(math.e))))
    load = math.tanh(beta / 4) ** 2
    b, a = signal.cheby1(order, ripple, 1.0, analog=True)
    network = ladder(chebyshev(order, ripple), load)
    dc = abs(frequency_response(network, "V", last_node(network), [0.0])[0])
    check(network, b, a, dc / (b[-1] / a[-1]).real)


def test_published_chebyshev_values() -> None:
    """0.1 dB: N = 3: 1.0316, 1.1474, 1.0316; N = 5: 1.1468, 1.3712, 1.9750, 1.3712, 1.1468 (Matthaei et al. 1964)."""
    table = {3: [1.0316, 1.1474, 1.0316], 5: [1.1468, 1.3712, 1.9750, 1.3712, 1.1468]}
    for order, values in table.items():
        assert chebyshev(order, 0.1) == pytest.approx(values, abs=6e-5)
        network = ladder(values)
        h = frequency_response(network, "V", last_node(network), OMEGA / (2 * math.pi))
        b, a = signal.cheby1(order, 0.1, 1.0, analog=True)
        _, wanted = signal.freqs(b, a, OMEGA)
        assert np.abs(np.abs(h) / np.abs(0.5 * wanted) - 1).max() < 1e-3  # the table has five digits


def bessel_ladder(order: int) -> tuple[list[float], np.ndarray, np.ndarray]:
    """A ladder from an ideal source into 1 Ω with the reversed Bessel polynomial of `order` as its denominator.

    Its elements are the continued fraction of the polynomial's even and odd parts (Weinberg, Network Analysis and
    Synthesis, 1962), taken as the admittance or impedance seen from the load. Returned from the source on: series L,
    shunt C, and so on.
    """
    b, a = signal.bessel(order, 1.0, analog=True, norm="delay")
    c = [float(x) for x in a[::-1]]
    even = [x if k % 2 == 0 else 0.0 for k, x in enumerate(c)]
    odd = [x if k % 2 == 1 else 0.0 for k, x in enumerate(c)]
    top, bottom = (even, odd) if order % 2 == 0 else (odd, even)
    values = []
    for degree in range(order, 0, -1):
        ratio = top[degree] / bottom[degree - 1]
        values.append(ratio)
        rest = [t - ratio * (bottom[k - 1] if k else 0.0) for k, t in enumerate(top)]
        top, bottom = bottom, rest
    return values[::-1], b, a


@pytest.mark.parametrize("order", range(1, 10))
def test_bessel(order: int) -> None:
    values, b, a = bessel_ladder(order)
    elements: list[Element] = [VoltageSource("V", "in", "0", 1.0)]
    node = "in"
    for k, g in enumerate(values):
        if k % 2 == 0:
            elements.append(Inductor(f"L{k}", node, f"n{k}", g))
            node = f"n{k}"
        else:
            elements.append(Capacitor(f"C{k}", node, "0", g))
    elements.append(Resistor("RL", node, "0", 1.0))
    check(Network(tuple(elements)), b, a, 1.0)
