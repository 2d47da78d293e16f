"""A rail with three unlike capacitors, from an EDIF file, against rational arithmetic in mpmath.

Z(s) is a quotient of polynomials built branch by branch; its partial fractions give the ramp response exactly.
"""

from __future__ import annotations

import itertools

import mpmath as mp
import pytest
from boardkit import checks_of

PARTS = [
    ("U1", "", {"1": "+3V3", "2": "GND"}),
    ("C1", "100nF|TOLERANCE=10%|DIELECTRIC=C0G|VOLTAGE=16V", {"1": "+3V3", "2": "GND"}),
    ("C2", "2.2uF|TOLERANCE=10%|DIELECTRIC=C0G|VOLTAGE=16V", {"1": "+3V3", "2": "GND"}),
    ("C3", "47uF|TOLERANCE=20%|TECHNOLOGY=polymer|VOLTAGE=6.3V", {"1": "+3V3", "2": "GND"}),
]
BRIEF = """
[board]
mounting_inductance = "0.5 nH"
[[rail]]
net = "+3V3"
voltage = "3.3 V"
source = { resistance = "20 mohm", inductance = "30 nH" }
step = { current = "0.8 A", rise = "10 ns" }
allowed = "5 %"
[[part]]
match = { refdes = "C1" }
esr = "20 mohm"
esl = "0.5 nH"
[[part]]
match = { refdes = "C2" }
esr = "8 mohm"
esl = "0.7 nH"
[[part]]
match = { refdes = "C3" }
esr = "25 mohm"
esl = "2 nH"
"""
mp.mp.dps = 40
UNIT = mp.mpf("1e-8")  # times are counted in units of 10 ns, which keeps the polynomials well scaled
CURRENT, RISE, ALLOWED = mp.mpf("0.8"), mp.mpf("10e-9") / UNIT, mp.mpf("0.165")
LOW, HIGH = mp.mpf(1000) * UNIT, mp.mpf("0.35") / RISE


def times(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
    made = [mp.mpf(0)] * (len(a) + len(b) - 1)
    for i, x in enumerate(a):
        for j, y in enumerate(b):
            made[i + j] += x * y
    return made


def plus(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
    size = max(len(a), len(b))
    return [(a[i] if i < len(a) else 0) + (b[i] if i < len(b) else 0) for i in range(size)]


class Rail:
    """Z(s) = N(s)/D(s), lowest power first."""

    def __init__(self, c1: mp.mpf, c2: mp.mpf, c3: mp.mpf) -> None:
        branches = [([mp.mpf("0.02"), mp.mpf("30e-9") / UNIT], [mp.mpf(1)])]
        for c, r, inductance in ((c1, "0.02", "1e-9"), (c2, "0.008", "1.2e-9"), (c3, "0.025", "2.5e-9")):
            scaled = c / UNIT
            branches.append(([mp.mpf(1), mp.mpf(r) * scaled, mp.mpf(inductance) / UNIT * scaled], [mp.mpf(0), scaled]))
        self.n, self.d = [mp.mpf(1)], [mp.mpf(0)]
        for above, below in branches:  # Y = Σ below/above
            self.d = plus(times(self.d, above), times(below, self.n))
            self.n = times(self.n, above)
        while self.d[-1] == 0:
            self.d.pop()

    def z(self, s: mp.mpc) -> mp.mpc:
        return mp.polyval(self.n[::-1], s) / mp.polyval(self.d[::-1], s)

    def size(self, f: mp.mpf) -> mp.mpf:
        return abs(self.z(2j * mp.pi * f))

    def extremes(self) -> list[tuple[mp.mpf, mp.mpf]]:
        grid = [LOW * (HIGH / LOW) ** (mp.mpf(i) / 500) for i in range(501)]
        sizes = [self.size(f) for f in grid]
        peaks = []
        for i in range(1, 500):
            if sizes[i] > sizes[i - 1] and sizes[i] > sizes[i + 1]:
                peaks.append(self._golden(grid[i - 1], grid[i + 1]))
        return peaks

    def _golden(self, a: mp.mpf, b: mp.mpf) -> tuple[mp.mpf, mp.mpf]:
        ratio = (mp.sqrt(5) - 1) / 2
        for _ in range(40):
            c, d = b - ratio * (b - a), a + ratio * (b - a)
            if self.size(c) > self.size(d):
                b = d
            else:
                a = c
        return a, self.size(a)

    def droop(self) -> mp.mpf:
        """The greatest change after a ramp of current: value and derivative from partial fractions of N/(s² D)."""
        poles = mp.polyroots(self.d[::-1], maxsteps=400, extraprec=400)
        slope = [k * self.d[k] for k in range(1, len(self.d))]
        e = self.n[-1] / self.d[-1]  # the inductive part of an all-inductive node
        rest = plus(self.n, [-e * x for x in times(self.d, [mp.mpf(0), mp.mpf(1)])])[: len(self.d)]
        direct = rest[-1] / self.d[-1]
        residues = [mp.polyval(rest[::-1], p) / mp.polyval(slope[::-1], p) for p in poles]

        def ramp(t: mp.mpf) -> mp.mpf:
            if t <= 0:
                return mp.mpf(0)
            value = e + direct * t
            for p, r in zip(poles, residues, strict=True):
                value += (r / p**2 * (mp.expm1(p * t) - p * t)).real
            return value

        def v(t: mp.mpf) -> mp.mpf:
            return abs(CURRENT / RISE * (ramp(t) - ramp(t - RISE)))

        grid = [RISE * mp.mpf(i) / 60 for i in range(1, 61)]
        slowest = 1 / min(abs(p.real) for p in poles)
        grid += [RISE * (12 * slowest / RISE) ** (mp.mpf(i) / 600) for i in range(1, 601)]
        values = [v(t) for t in grid]
        best = max(range(len(grid)), key=values.__getitem__)
        a, b = grid[max(best - 1, 0)], grid[min(best + 1, len(grid) - 1)]
        ratio = (mp.sqrt(5) - 1) / 2
        for _ in range(40):
            c, d = b - ratio * (b - a), a + ratio * (b - a)
            if v(c) > v(d):
                b = d
            else:
                a = c
        return max(v(a), *values)


def reference(c1: float, c2: float, c3: float) -> dict[str, float]:
    rail = Rail(mp.mpf(c1), mp.mpf(c2), mp.mpf(c3))
    peaks = rail.extremes()
    greatest = max([size for _, size in peaks] + [rail.size(LOW), rail.size(HIGH)])
    return {
        "impedance": float(greatest / (ALLOWED / CURRENT)),
        "antiresonance": float(max(size for _, size in peaks)),
        "droop": float(rail.droop()),
        "capacitance": c1 + c2 + c3,
    }


def test_every_measure_and_its_extremes() -> None:
    checks = checks_of(PARTS, BRIEF)
    nominal = reference(100e-9, 2.2e-6, 47e-6)
    corners = [
        reference(100e-9 * (1 + a), 2.2e-6 * (1 + b), 47e-6 * (1 + c))
        for a, b, c in itertools.product((-0.1, 0.1), (-0.1, 0.1), (-0.2, 0.2))
    ]
    for name, expected in nominal.items():
        check = checks[f"rail:+3V3:{name}"]
        assert check.nominal == pytest.approx(expected, rel=1e-5), name
        assert check.low == pytest.approx(min(c[name] for c in corners), rel=1e-5), name
        assert check.high == pytest.approx(max(c[name] for c in corners), rel=1e-5), name
    assert checks["rail:+3V3:bypass"].nominal == 3.0
