"""A doubly terminated five-section LC ladder with the Chebyshev values for 0.1 dB ripple, from an EDIF file.

Element values: Matthaei, Young and Jones, Microwave Filters, Impedance-Matching Networks, and Coupling Structures
(1964): 1.1468, 1.3712, 1.9750, 1.3712, 1.1468. The prototype's response independently: scipy.signal.cheby1. Exact
figures of the ladder as built: chain matrices in mpmath. Thermal noise of a passive network at one temperature at a
node with shunt C and a DC path to ground: sqrt(kT/C) (Nyquist's theorem).
"""

from __future__ import annotations

import itertools
import math

import mpmath as mp
import pytest
from boardkit import checks_of
from rational_reference import LowPass
from scipy import signal

G = (1.1468, 1.3712, 1.9750, 1.3712, 1.1468)
CUTOFF, R0 = 1e6, 50.0
OMEGA = 2 * math.pi * CUTOFF
C1, L2, C3, L4, C5 = (
    G[0] / (OMEGA * R0),
    G[1] * R0 / OMEGA,
    G[2] / (OMEGA * R0),
    G[3] * R0 / OMEGA,
    G[4] / (OMEGA * R0),
)
PARTS = [
    ("U1", "", {"1": "A"}),
    ("C1", f"{C1 * 1e9:.9f}nF|DIELECTRIC=C0G|TOLERANCE=2%|VOLTAGE=50V", {"1": "A", "2": "GND"}),
    ("L2", f"{L2 * 1e6:.9f}uH|TOLERANCE=2%|DCR=0", {"1": "A", "2": "B"}),
    ("C3", f"{C3 * 1e9:.9f}nF|DIELECTRIC=C0G|TOLERANCE=2%|VOLTAGE=50V", {"1": "B", "2": "GND"}),
    ("L4", f"{L4 * 1e6:.9f}uH|TOLERANCE=2%|DCR=0", {"1": "B", "2": "C"}),
    ("C5", f"{C5 * 1e9:.9f}nF|DIELECTRIC=C0G|TOLERANCE=2%|VOLTAGE=50V", {"1": "C", "2": "GND"}),
    ("U2", "", {"1": "C"}),
]
BRIEF = """
[board]
mounting_inductance = 0
[[pin]]
at = "U1.1"
drives = "0 V"
resistance = "50 ohm"
[[pin]]
at = "U2.1"
resistance = "50 ohm"
[[part]]
match = { refdes = "C*" }
esr = 0
esl = 0
[[filter]]
name = "ladder"
from = "A"
to = "C"
attenuation = [ { at = "2 MHz", least = "30 dB" } ]
passband = { to = "1 MHz", ripple = "0.2 dB" }
step = { overshoot = "20 %", settle = "5 us" }
"""


def ladder(c1: float, l2: float, c3: float, l4: float, c5: float) -> LowPass:
    """1/H = A + B/R0 of the chain, polynomials with the lowest power first."""

    def mul(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
        made = [mp.mpf(0)] * (len(a) + len(b) - 1)
        for i, x in enumerate(a):
            for j, y in enumerate(b):
                made[i + j] += x * y
        return made

    def add(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
        size = max(len(a), len(b))
        return [(a[i] if i < len(a) else 0) + (b[i] if i < len(b) else 0) for i in range(size)]

    one, zero = [mp.mpf(1)], [mp.mpf(0)]
    chain = [[one, [mp.mpf(R0)]], [zero, one]]  # the source resistance
    for kind, value in (("C", c1), ("L", l2), ("C", c3), ("L", l4), ("C", c5)):
        step = [mp.mpf(0), mp.mpf(value)]
        section = [[one, step], [zero, one]] if kind == "L" else [[one, zero], [step, one]]
        chain = [
            [add(mul(chain[i][0], section[0][j]), mul(chain[i][1], section[1][j])) for j in range(2)] for i in range(2)
        ]
    below = add(chain[0][0], [x / R0 for x in chain[0][1]])
    return LowPass(one, below)


def reference(scale: tuple[float, ...]) -> dict[str, float]:
    values = [v * k for v, k in zip((C1, L2, C3, L4, C5), scale, strict=True)]
    low_pass = ladder(*values)
    return {
        "gain": float(low_pass.gain()),
        "corner_high": float(low_pass.corner(mp.mpf("5e5"), mp.mpf("5e6"))),
        "attenuation@2MHz": float(low_pass.attenuation(mp.mpf("2e6"))),
        "noise": math.sqrt(1.380649e-23 * 298.15 / values[4]),
    }


def slow(scale: tuple[float, ...]) -> dict[str, float]:
    low_pass = ladder(*[v * k for v, k in zip((C1, L2, C3, L4, C5), scale, strict=True)])
    until = mp.mpf("6e-6")
    return {
        "ripple": float(low_pass.ripple(mp.mpf("1e6"))),
        "overshoot": float(low_pass.overshoot(until)),
        "rise_time": float(low_pass.rise_time(until)),
        "settling": float(low_pass.settling(until)),
    }


def test_every_measure_and_its_extremes() -> None:
    found = {key.split(":", 2)[2]: check for key, check in checks_of(PARTS, BRIEF).items() if key.startswith("filter:")}
    flat = (1.0,) * 5
    for name, expected in {**reference(flat), **slow(flat)}.items():
        assert found[name].nominal == pytest.approx(expected, rel=1e-5), name
    corners = [reference(scale) for scale in itertools.product((0.98, 1.02), repeat=5)]
    for name in corners[0]:
        check = found[name]
        assert check.low == pytest.approx(min(c[name] for c in corners), rel=1e-5), name
        assert check.high == pytest.approx(max(c[name] for c in corners), rel=1e-5), name


def test_the_prototype_response() -> None:
    b, a = signal.cheby1(5, 0.1, OMEGA, analog=True)
    _, h = signal.freqs(b, a, worN=[2 * math.pi * 2e6])
    found = checks_of(PARTS, BRIEF)
    published = -20 * math.log10(abs(h[0]))
    assert found["filter:ladder:attenuation@2MHz"].nominal == pytest.approx(published, abs=0.01)
    assert found["filter:ladder:gain"].nominal == pytest.approx(20 * math.log10(0.5), abs=1e-6)
    assert found["filter:ladder:ripple"].nominal == pytest.approx(0.1, abs=2e-3)
