"""A unity-gain Sallen-Key low-pass with a one-pole amplifier, from an EDIF file.

Its transfer function comes from nodal equations solved by sympy (topology: Sallen and Key, IRE Trans. Circuit
Theory 2 (1955) 74); figures by mpmath; noise through scipy's Lyapunov solver; the ideal shape:
Q = sqrt(R1 R2 C1 C2)/(C2 (R1 + R2)).
"""

from __future__ import annotations

import itertools
import math

import mpmath as mp
import numpy as np
import pytest
import sympy as sp
from boardkit import checks_of
from rational_reference import LowPass
from scipy import linalg, signal

R1, R2, C1, C2 = 10e3, 10e3, 2.2e-9, 1e-9
PARTS = [
    ("U2", "", {"1": "IN"}),
    ("R1", "10k|TOLERANCE=1%", {"1": "IN", "2": "X"}),
    ("R2", "10k|TOLERANCE=1%", {"1": "X", "2": "P"}),
    ("C1", "2.2nF|DIELECTRIC=C0G|TOLERANCE=5%|VOLTAGE=50V", {"1": "X", "2": "OUT"}),
    ("C2", "1nF|DIELECTRIC=C0G|TOLERANCE=5%|VOLTAGE=50V", {"1": "P", "2": "GND"}),
    ("U1", "", {"1": "OUT", "2": "OUT", "3": "P"}),
]
BRIEF = """
[board]
mounting_inductance = 0
[[pin]]
at = "U2.1"
drives = "0 V"
[[amplifier]]
plus = "U1.3"
minus = "U1.2"
out = "U1.1"
open_loop_gain = "100 dB"
gain_bandwidth = "10 MHz"
output_resistance = "0 ohm"
[[part]]
match = { refdes = "C*" }
esr = 0
esl = 0
[[filter]]
name = "active"
from = "IN"
to = "OUT"
corner = "11 kHz"
tolerance = "20 %"
attenuation = [ { at = "100 kHz", least = "30 dB" } ]
"""


def transfer() -> tuple[list[sp.Symbol], dict[str, sp.Expr]]:
    """H from the input, and from a noise EMF in series with each resistor, as rational functions of s."""
    s, r1, r2, c1, c2 = sp.symbols("s r1 r2 c1 c2", positive=True)
    vin, n1, n2, x, p, out = sp.symbols("vin n1 n2 x p out")
    a0, gbw = sp.Integer(10) ** 5, sp.Integer(10) ** 7
    gain = a0 / (1 + s * a0 / (2 * sp.pi * gbw))
    equations = [
        (x - vin - n1) / r1 + (x - p - n2) / r2 + s * c1 * (x - out),
        (p - x + n2) / r2 + s * c2 * p,
        out - gain * (p - out),
    ]
    solved = sp.solve(equations, [x, p, out], dict=True)[0][out]
    parts = {}
    for name, source in (("in", vin), ("n1", n1), ("n2", n2)):
        parts[name] = sp.together(
            solved.subs({other: (1 if other == source else 0) for other in (vin, n1, n2)})
        )
    return [s, r1, r2, c1, c2], parts


SYMBOLS, TRANSFERS = transfer()


def polynomials(name: str, values: tuple[float, ...]) -> tuple[list[mp.mpf], list[mp.mpf]]:
    s = SYMBOLS[0]
    exact = dict(zip(SYMBOLS[1:], (sp.Rational(str(v)) for v in values), strict=True))
    above, below = sp.fraction(sp.together(TRANSFERS[name].subs(exact)))
    return tuple(  # type: ignore[return-value]
        [mp.mpf(str(sp.N(c, 40))) for c in reversed(sp.Poly(sp.expand(part), s).all_coeffs())]
        for part in (above, below)
    )


def noise(values: tuple[float, ...]) -> float:
    total = 0.0
    for name, resistance in (("n1", values[0]), ("n2", values[1])):
        n, d = polynomials(name, values)
        scale = 1e5  # rad/s: keeps the state space well scaled
        top = [float(c * mp.mpf(scale) ** k) for k, c in enumerate(n)][::-1]
        bottom = [float(c * mp.mpf(scale) ** k) for k, c in enumerate(d)][::-1]
        a, b, c, _ = signal.tf2ss(top, bottom)
        gram = linalg.solve_continuous_lyapunov(a, -b @ b.T)
        h2 = float((c @ gram @ c.T)[0, 0]) * scale
        total += 4 * 1.380649e-23 * 298.15 * resistance * h2 / 2
    return math.sqrt(total)


def reference(values: tuple[float, ...]) -> dict[str, float]:
    low_pass = LowPass(*polynomials("in", values))
    until = mp.mpf("4e-4")
    return {
        "gain": float(low_pass.gain()),
        "corner_high": float(low_pass.corner(mp.mpf("1e3"), mp.mpf("1e5"))),
        "attenuation@100kHz": float(low_pass.attenuation(mp.mpf("1e5"))),
        "overshoot": float(low_pass.overshoot(until)),
        "rise_time": float(low_pass.rise_time(until)),
        "settling": float(low_pass.settling(until)),
        "noise": noise(values),
    }


def test_every_measure_and_its_extremes() -> None:
    found = {key.split(":", 2)[2]: check for key, check in checks_of(PARTS, BRIEF).items() if key.startswith("filter:")}
    nominal = reference((R1, R2, C1, C2))
    assert set(found) == set(nominal)
    for name, expected in nominal.items():
        assert found[name].nominal == pytest.approx(expected, rel=1e-5, abs=1e-9), name
    corners = [
        reference((R1 * (1 + a), R2 * (1 + b), C1 * (1 + c), C2 * (1 + d)))
        for a, b, c, d in itertools.product((-0.01, 0.01), (-0.01, 0.01), (-0.05, 0.05), (-0.05, 0.05))
    ]
    for name in ("gain", "corner_high", "attenuation@100kHz", "rise_time", "noise"):
        check = found[name]
        assert check.low == pytest.approx(min(c[name] for c in corners), rel=1e-5, abs=1e-9), name
        assert check.high == pytest.approx(max(c[name] for c in corners), rel=1e-5, abs=1e-9), name


def test_the_ideal_shape() -> None:
    f0 = 1 / (2 * math.pi * math.sqrt(R1 * R2 * C1 * C2))
    q = math.sqrt(R1 * R2 * C1 * C2) / (C2 * (R1 + R2))
    b, a = [1.0], [1 / (2 * math.pi * f0) ** 2, 1 / (2 * math.pi * f0 * q), 1.0]
    _, h = signal.freqs(b, a, worN=np.array([2 * math.pi * 100e3]))
    check = checks_of(PARTS, BRIEF)["filter:active:attenuation@100kHz"]
    assert check.nominal == pytest.approx(-20 * math.log10(abs(h[0])), abs=0.1)


def test_noise_without_an_upper_frequency_is_said_to_be_unbounded() -> None:
    """Behind an output resistance R1's noise reaches the output through C1 at any frequency: its integral diverges."""
    brief = BRIEF.replace('output_resistance = "0 ohm"', 'output_resistance = "50 ohm"')
    check = checks_of(PARTS, brief)["filter:active:noise"]
    assert check.nominal is None
    assert check.status == "unknown"
    assert "upper frequency" in check.explain
