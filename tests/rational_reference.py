"""Measures of a low-pass given as N(s)/D(s), by mpmath: independent of the program's own solver."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise

import mpmath as mp

mp.mp.dps = 40


class LowPass:
    """H(s) = N/D, coefficients with the lowest power first; proper, with simple poles."""

    def __init__(self, n: Sequence[mp.mpf], d: Sequence[mp.mpf]) -> None:
        self.n, self.d = list(n), list(d)
        while self.d and self.d[-1] == 0:
            self.d.pop()
        self.poles = mp.polyroots(self.d[::-1], maxsteps=1000, extraprec=1000)
        slope = [k * self.d[k] for k in range(1, len(self.d))]
        self.residues = [mp.polyval(self.n[::-1], p) / mp.polyval(slope[::-1], p) for p in self.poles]
        self.final = self.n[0] / self.d[0]

    def size(self, f: mp.mpf) -> mp.mpf:
        s = 2j * mp.pi * f
        return abs(mp.polyval(self.n[::-1], s) / mp.polyval(self.d[::-1], s))

    def step(self, t: mp.mpf) -> mp.mpf:
        return self.final + mp.re(
            sum(r / p * mp.exp(p * t) for p, r in zip(self.poles, self.residues, strict=True))
        )

    def gain(self) -> mp.mpf:
        return 20 * mp.log10(abs(self.final))

    def attenuation(self, f: mp.mpf) -> mp.mpf:
        return 20 * mp.log10(abs(self.final) / self.size(f))

    def corner(self, start: mp.mpf, stop: mp.mpf) -> mp.mpf:
        level = abs(self.final) / mp.sqrt(2)
        return self._first(lambda f: self.size(f) - level, start, stop, 4000, geometric=True)

    def ripple(self, to: mp.mpf) -> mp.mpf:
        grid = [to * i / 2000 for i in range(2001)]
        sizes = [self.size(f) for f in grid]
        high = self._polish(self.size, grid, sizes, max(range(2001), key=sizes.__getitem__), 1)
        low = self._polish(self.size, grid, sizes, min(range(2001), key=sizes.__getitem__), -1)
        return 20 * mp.log10(high / low)

    def overshoot(self, until: mp.mpf) -> mp.mpf:
        grid = [until * i / 3000 for i in range(1, 3001)]
        values = [self.step(t) / self.final for t in grid]
        best = max(range(3000), key=values.__getitem__)
        return max(mp.mpf(0), self._polish(lambda t: self.step(t) / self.final, grid, values, best, 1) - 1)

    def rise_time(self, until: mp.mpf) -> mp.mpf:
        def crossing(share: mp.mpf) -> mp.mpf:
            return self._first(lambda t: self.step(t) / self.final - share, until / 1e6, until, 4000)

        return crossing(mp.mpf("0.9")) - crossing(mp.mpf("0.1"))

    def settling(self, until: mp.mpf) -> mp.mpf:
        def outside(t: mp.mpf) -> mp.mpf:
            return abs(self.step(t) / self.final - 1) - mp.mpf("0.01")

        grid = [until * i / 4000 for i in range(1, 4001)]
        last = max(i for i, t in enumerate(grid) if outside(t) > 0)
        return mp.findroot(outside, (grid[last], grid[last + 1]), solver="anderson")

    @staticmethod
    def _first(
        f: Callable[[mp.mpf], mp.mpf], start: mp.mpf, stop: mp.mpf, count: int, *, geometric: bool = False
    ) -> mp.mpf:
        grid = [
            start * (stop / start) ** (mp.mpf(i) / count) if geometric else start + (stop - start) * i / count
            for i in range(count + 1)
        ]
        before = f(grid[0])
        for a, b in pairwise(grid):
            after = f(b)
            if before * after <= 0:
                return mp.findroot(f, (a, b), solver="anderson")
            before = after
        raise AssertionError("no crossing")

    @staticmethod
    def _polish(
        f: Callable[[mp.mpf], mp.mpf], grid: list[mp.mpf], values: list[mp.mpf], best: int, sign: int
    ) -> mp.mpf:
        a, b = grid[max(best - 1, 0)], grid[min(best + 1, len(grid) - 1)]
        ratio = (mp.sqrt(5) - 1) / 2
        for _ in range(60):
            c, d = b - ratio * (b - a), a + ratio * (b - a)
            if sign * f(c) > sign * f(d):
                b = d
            else:
                a = c
        return sign * max(sign * f(a), sign * values[best])
