"""Networks in exact arithmetic: modified nodal analysis in mpmath with hundreds of digits.

Independent of the program's solver: its own stamps, node voltages against ground, determinants at integer multiples of
a rate, the polynomial through them, its roots by Laguerre's method with deflation. Nothing here is fast.
"""

from __future__ import annotations

from collections.abc import Sequence

import mpmath as mp

from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CurrentSource,
    Element,
    Inductor,
    Network,
    Resistor,
    VoltageSource,
)

LEAST_DIGITS, DIGITS_PER_DEGREE = 150, 24
TIME_DIGITS = 50


class Stamps:
    """G + s·C and the right side, as lists of entries; `excite` names the one source that is 1."""

    def __init__(self, network: Network, excite: str) -> None:
        self.ground = network.ground
        self.index: dict[str, int] = {}
        self.size = 0
        self.g: list[tuple[int, int, mp.mpf]] = []
        self.c: list[tuple[int, int, mp.mpf]] = []
        self.b: dict[int, mp.mpf] = {}
        self.lossy: list[tuple[int, int, mp.mpf, mp.mpf]] = []  # row, column, farads, loss tangent
        for element in network.elements:
            self._add(element, excite)

    def _new(self) -> int:
        self.size += 1
        return self.size - 1

    def node(self, name: str) -> int | None:
        if name == self.ground:
            return None
        if name not in self.index:
            self.index[name] = self._new()
        return self.index[name]

    def _put(self, where: list, a: int | None, b: int | None, value: mp.mpf) -> None:
        if a is not None:
            where.append((a, a, value))
        if b is not None:
            where.append((b, b, value))
        if a is not None and b is not None:
            where += [(a, b, -value), (b, a, -value)]

    def _branch(self, a: int | None, b: int | None, r: float, x: float, emf: float) -> None:
        """V(a) − V(b) − (r + s·x)·i = emf, i from a to b."""
        i = self._new()
        for node, sign in ((a, 1), (b, -1)):
            if node is not None:
                self.g += [(node, i, mp.mpf(sign)), (i, node, mp.mpf(sign))]
        self.g.append((i, i, -mp.mpf(r)))
        self.c.append((i, i, -mp.mpf(x)))
        self.b[i] = mp.mpf(emf)

    def _series(self, a: int | None, b: int | None, r: float, x: float) -> int | None:
        """A new node behind r and x from a, towards b; a itself where both are 0."""
        if not r and not x:
            return a
        inner = self._new()
        self._branch(a, inner, r, x, 0.0)
        return inner

    def _add(self, e: Element, excite: str) -> None:  # noqa: PLR0912
        if isinstance(e, Resistor):
            self._put(self.g, self.node(e.a), self.node(e.b), 1 / mp.mpf(e.resistance))
        elif isinstance(e, Capacitor):
            a, b = self.node(e.a), self.node(e.b)
            inner = self._series(a, b, e.esr, e.esl)
            entries: list[tuple[int, int, mp.mpf]] = []
            self._put(entries, inner, b, mp.mpf(e.capacitance))
            self.lossy += [(row, column, value, mp.mpf(e.loss_tangent)) for row, column, value in entries]
            if mp.isfinite(e.leakage):
                self._put(self.g, inner, b, 1 / mp.mpf(e.leakage))
        elif isinstance(e, Inductor):
            a, b = self.node(e.a), self.node(e.b)
            self._branch(a, b, e.dcr, e.inductance, 0.0)
            self._put(self.c, a, b, mp.mpf(e.parallel_capacitance))
        elif isinstance(e, Bead):
            a, b = self.node(e.a), self.node(e.b)
            inner = self._series(a, b, e.dcr, 0.0)
            self._put(self.g, inner, b, 1 / mp.mpf(e.resistance))
            self._branch(inner, b, 0.0, e.inductance, 0.0)
            self._put(self.c, inner, b, mp.mpf(e.capacitance))
        elif isinstance(e, VoltageSource):
            self._branch(self.node(e.plus), self.node(e.minus), e.resistance, e.inductance, float(e.name == excite))
        elif isinstance(e, CurrentSource):
            if e.name == excite:
                for node, sign in ((self.node(e.a), -1), (self.node(e.b), 1)):
                    if node is not None:
                        self.b[node] = self.b.get(node, mp.mpf(0)) + sign
            else:
                self.node(e.a), self.node(e.b)
        elif isinstance(e, Amplifier):
            self._amplifier(e)
        else:
            raise TypeError(type(e).__name__)

    def _amplifier(self, e: Amplifier) -> None:
        out, plus, minus, i = self.node(e.out), self.node(e.plus), self.node(e.minus), self._new()
        tau = 0 if mp.isinf(e.gain_bandwidth) else mp.mpf(e.gain) / (2 * mp.pi * mp.mpf(e.gain_bandwidth))
        ro = mp.mpf(e.output_resistance)
        assert out is not None
        self.g += [(out, i, mp.mpf(1)), (i, out, mp.mpf(1)), (i, i, -ro)]
        self.c += [(i, out, tau), (i, i, -ro * tau)]
        for node, sign in ((plus, -1), (minus, 1)):
            if node is not None:
                self.g.append((i, node, sign * mp.mpf(e.gain)))

    def solve(self, s: mp.mpc, probe: str, *, lossy: bool = False) -> tuple[mp.mpc, mp.mpc]:
        """The determinant and the probe's voltage at s."""
        n = self.size
        rows = [[mp.mpf(0)] * (n + 1) for _ in range(n)]
        for row, column, value in self.g:
            rows[row][column] += value
        for row, column, value in self.c:
            rows[row][column] += s * value
        for row, column, value, loss in self.lossy:
            rows[row][column] += s * value * ((1 - 1j * loss) if lossy else 1)
        for row, value in self.b.items():
            rows[row][n] = value
        return _eliminate(rows, self.node(probe))


def _eliminate(rows: list[list[mp.mpf]], wanted: int | None) -> tuple[mp.mpf, mp.mpf]:
    n = len(rows)
    det = mp.mpf(1)
    for k in range(n):
        pivot = max(range(k, n), key=lambda i: abs(rows[i][k]))
        if pivot != k:
            rows[k], rows[pivot] = rows[pivot], rows[k]
            det = -det
        head = rows[k]
        det *= head[k]
        for i in range(k + 1, n):
            if rows[i][k]:
                ratio = rows[i][k] / head[k]
                row = rows[i]
                for j in range(k + 1, n + 1):
                    if head[j]:
                        row[j] -= ratio * head[j]
    x = [mp.mpf(0)] * n
    for k in reversed(range(n)):
        x[k] = (rows[k][n] - sum(rows[k][j] * x[j] for j in range(k + 1, n) if rows[k][j])) / rows[k][k]
    return det, (mp.mpf(0) if wanted is None else x[wanted])


class ExactResponse:
    """The response of a network as numerator and denominator polynomials in s, lowest power first."""

    def __init__(self, network: Network, source: str, probe: str) -> None:
        stamps = Stamps(network, source)
        degree = len({row for row, _, value in stamps.c if value} | {row for row, *_ in stamps.lossy})
        self.digits = LEAST_DIGITS + DIGITS_PER_DEGREE * degree
        with mp.workdps(self.digits):
            stamps = Stamps(network, source)
            points = [mp.mpf(10) ** 5 * (k + 1) for k in range(degree + 1)]
            values = [stamps.solve(s, probe) for s in points]
            self.d = _trim(_interpolate(points, [det for det, _ in values]))
            self.n = _trim(_interpolate(points, [det * v for det, v in values]))
        self.stamps, self.probe = stamps, probe
        self._poles: list[mp.mpc] | None = None
        self._residues: list[mp.mpc] | None = None

    def at(self, frequency: float) -> mp.mpc:
        """H at a frequency in Hz."""
        with mp.workdps(self.digits):
            s = 2j * mp.pi * mp.mpf(frequency)
            return _value(self.n, s) / _value(self.d, s)

    def poles(self) -> list[mp.mpc]:
        """The roots of the denominator."""
        if self._poles is None:
            with mp.workdps(self.digits):
                self._poles = _roots(self.d)
        return self._poles

    def ramp(self, t: float, rise: float) -> mp.mpf:
        """The response at t to an input that rises evenly from 0 to 1 in `rise` seconds; a step for rise 0."""
        residues = self.residues()
        with mp.workdps(TIME_DIGITS):
            time, edge = mp.mpf(t), mp.mpf(rise)
            if rise == 0:
                return self._moment(residues, time, 1)
            late = self._moment(residues, time - edge, 2) if time > edge else mp.mpf(0)
            return (self._moment(residues, time, 2) - late) / edge

    def residues(self) -> list[mp.mpc]:
        """N/D′ at each pole; the poles are distinct."""
        if self._residues is None:
            poles = self.poles()
            with mp.workdps(self.digits):
                slope = [k * c for k, c in enumerate(self.d)][1:]
                self._residues = [_value(self.n, p) / _value(slope, p) for p in poles]
        return self._residues

    def _moment(self, residues: list[mp.mpc], t: mp.mpf, order: int) -> mp.mpf:
        """The inverse transform of H(s)/s^order at t ≥ 0, distinct poles, by residues; impulses left out."""
        total = mp.mpf(0)
        for p, r in zip(self.poles(), residues, strict=True):
            total += mp.re(r * mp.exp(p * t) / p**order)
        h0 = self.n[0] / self.d[0]
        if order == 1:
            return total + h0
        n1 = self.n[1] if len(self.n) > 1 else 0
        d1 = self.d[1] if len(self.d) > 1 else 0
        return total + h0 * t + (n1 - h0 * d1) / self.d[0]


def _interpolate(x: Sequence[mp.mpf], y: Sequence[mp.mpf]) -> list[mp.mpf]:
    """Coefficients of the polynomial through the points (Newton's divided differences)."""
    c = list(y)
    for k in range(1, len(x)):
        for i in range(len(x) - 1, k - 1, -1):
            c[i] = (c[i] - c[i - 1]) / (x[i] - x[i - k])
    out = [mp.mpf(0)]
    for k in reversed(range(len(x))):
        shifted = [mp.mpf(0), *out]
        for i, value in enumerate(out):
            shifted[i] -= x[k] * value
        shifted[0] += c[k]
        out = shifted
    return out


def _trim(c: list[mp.mpf]) -> list[mp.mpf]:
    """Drop leading coefficients that are rounding: they count for nothing at the highest rate of any network."""
    high = mp.mpf(10) ** 22
    size = [abs(value) * high**k for k, value in enumerate(c)]
    while len(c) > 1 and size[len(c) - 1] < max(size) * mp.mpf(10) ** -80:
        c = c[:-1]
        size.pop()
    return c


def _value(c: Sequence[mp.mpf], s: mp.mpc) -> mp.mpc:
    total = mp.mpc(0)
    for value in reversed(c):
        total = total * s + value
    return total


def _roots(c: list[mp.mpf]) -> list[mp.mpc]:
    """All roots by Laguerre's method, deflating, each polished on the whole polynomial."""
    rest = list(c)
    found: list[mp.mpc] = []
    while len(rest) > 1:
        root = _laguerre(c, _laguerre(rest, _smallest(rest)))
        found.append(root)
        if abs(mp.im(root)) > abs(root) * mp.mpf(10) ** -100:
            found.append(mp.conj(root))
            rest = _divide(rest, [abs(root) ** 2, -2 * mp.re(root), mp.mpf(1)])
        else:
            found[-1] = mp.re(root)
            rest = _divide(rest, [-mp.re(root), mp.mpf(1)])
    return found


def _smallest(c: Sequence[mp.mpf]) -> mp.mpc:
    """A point at the scale of the smallest root."""
    scale = min((abs(c[0] / c[k]) ** (mp.mpf(1) / k) for k in range(1, len(c)) if c[k]), default=mp.mpf(1))
    return mp.mpc(-scale / 2, scale / 3)


def _laguerre(c: Sequence[mp.mpf], s: mp.mpc) -> mp.mpc:
    n = len(c) - 1
    for _ in range(300):
        p, d1, d2 = mp.mpc(0), mp.mpc(0), mp.mpc(0)
        for value in reversed(c):
            d2 = d2 * s + d1
            d1 = d1 * s + p
            p = p * s + value
        if p == 0:
            return s
        g = d1 / p
        h = g * g - 2 * d2 / p
        root = mp.sqrt((n - 1) * (n * h - g * g))
        bottom = max((g + root, g - root), key=abs)
        step = n / bottom
        s -= step
        if abs(step) < abs(s) * mp.mpf(10) ** (-mp.mp.dps * 2 // 3):
            return s
    return s


def _divide(c: Sequence[mp.mpf], by: Sequence[mp.mpf]) -> list[mp.mpf]:
    """The quotient of two polynomials whose remainder is rounding."""
    rest, out = list(c), []
    for k in reversed(range(len(c) - len(by) + 1)):
        lead = rest[k + len(by) - 1] / by[-1]
        out.append(lead)
        for i, value in enumerate(by):
            rest[k + i] -= lead * value
    return out[::-1]
