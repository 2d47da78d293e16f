"""The extremes of a measure over uncertain values, its Monte Carlo samples, and which value matters how much.

A measure is a function of values (V, P) that returns (V,): NaN where it cannot be computed. It is called with many
rows at once.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from reactance.analysis.circuit.network import FloatArray, Parameter

Measure = Callable[[FloatArray], FloatArray]

EXHAUSTIVE = 8  # up to this many parameters every vertex is looked at
_ROWS = 512  # most rows handed to a measure at once
_INTERIOR = 24
_STARTS = 8
_FINER = 1e-5  # an improvement below this share of the figure is no improvement: bands are promised to 0.1 %
_FINEST_STEP = 4e-3  # of a range; the figure is flat about an inside extreme, so its error is far smaller
_NORMAL_975 = 1.959963984540054


@dataclass(frozen=True, slots=True)
class Spread:
    """A measure's nominal and extremes, and the values (P,) at which the extremes occur."""

    nominal: float
    low: float
    high: float
    at_low: FloatArray
    at_high: FloatArray


def spread(measure: Measure, parameters: Sequence[Parameter]) -> Spread:
    """The extremes of `measure` over all parameters independently in [low, high].

    Every vertex is tried for up to 8 parameters; beyond, vertices are climbed by single and joint flips from several
    starts. Interior points are then tried, and where one beats the vertices (a resonance) the extreme is followed
    inside. NaN anywhere makes both extremes NaN.
    """
    box = _Box.of(parameters)
    nominal = float(_run(measure, box.nominal[None, :])[0])
    if not parameters or math.isnan(nominal):
        return Spread(nominal, nominal, nominal, box.nominal, box.nominal)
    points = box.vertices() if len(parameters) <= EXHAUSTIVE else box.starts()
    shares = np.concatenate([points, box.interior()])
    values = _run(measure, box.at(shares))
    if np.isnan(values).any():
        return Spread(nominal, math.nan, math.nan, box.nominal, box.nominal)
    ends = []
    for sign in (-1.0, 1.0):
        climber = _Climber(measure, box, sign, shares, sign * values)
        if len(parameters) > EXHAUSTIVE:
            climber.flip()
        climber.look_inside()
        ends.append((sign * climber.best, box.at(climber.where[None, :])[0]))
    (low, at_low), (high, at_high) = ends
    low, at_low = (nominal, box.nominal) if nominal < low else (low, at_low)
    high, at_high = (nominal, box.nominal) if nominal > high else (high, at_high)
    return Spread(nominal, low, high, at_low, at_high)


@dataclass(frozen=True, slots=True)
class _Box:
    """The parameters' ranges; a point of the box is given as shares (P,) from 0 (low) to 1 (high)."""

    nominal: FloatArray
    low: FloatArray
    high: FloatArray

    @classmethod
    def of(cls, parameters: Sequence[Parameter]) -> _Box:
        rows = np.array([(p.nominal, p.low, p.high) for p in parameters]).reshape(-1, 3)
        return cls(rows[:, 0], rows[:, 1], rows[:, 2])

    def at(self, shares: FloatArray) -> FloatArray:
        """Values (V, P) at shares (V, P); the ends exactly."""
        inside = self.low + shares * (self.high - self.low)
        return np.asarray(np.where(shares >= 1.0, self.high, np.where(shares <= 0.0, self.low, inside)))

    def vertices(self) -> FloatArray:
        """All 2^P corners."""
        count = len(self.low)
        return ((np.arange(2**count)[:, None] >> np.arange(count)) & 1).astype(float)

    def starts(self) -> FloatArray:
        """Some corners to climb from: all low, all high, and a repeatable draw."""
        count = len(self.low)
        drawn = np.random.default_rng(20).integers(0, 2, (_STARTS, count)).astype(float)
        return np.concatenate([np.zeros((1, count)), np.ones((1, count)), drawn])

    def interior(self) -> FloatArray:
        """Points spread evenly through the inside (additive recurrence, M. Roberts' generalised golden ratio)."""
        count = len(self.low)
        phi = 1.5
        for _ in range(60):
            phi = (1.0 + phi) ** (1.0 / (count + 1))
        steps = phi ** -np.arange(1.0, count + 1.0)
        return np.asarray(np.mod(0.5 + np.arange(1, _INTERIOR + 1)[:, None] * steps, 1.0))


def _run(measure: Measure, values: FloatArray) -> FloatArray:
    found = [np.asarray(measure(values[i : i + _ROWS]), float) for i in range(0, len(values), _ROWS)]
    return np.concatenate(found)


class _Climber:
    """Follows sign·measure upward through the box."""

    def __init__(self, measure: Measure, box: _Box, sign: float, shares: FloatArray, values: FloatArray) -> None:
        self.measure, self.box, self.sign = measure, box, sign
        self.shares, self.values = shares, values
        best = int(values.argmax())
        self.where, self.best = shares[best].copy(), float(values[best])
        self.seen = {row.tobytes(): float(value) for row, value in zip(shares, values, strict=True)}

    def _try(self, shares: FloatArray) -> FloatArray:
        """sign·measure at shares (V, P), the best of which is kept; a point seen before is not measured again."""
        keys = [row.tobytes() for row in shares]
        fresh = list(dict.fromkeys(i for i, key in enumerate(keys) if key not in self.seen))
        if fresh:
            found = self.sign * _run(self.measure, self.box.at(shares[fresh]))
            for i, value in zip(fresh, found, strict=True):
                self.seen[keys[i]] = -math.inf if math.isnan(value) else float(value)
        values = np.array([self.seen[key] for key in keys])
        best = int(values.argmax())
        if values[best] > self.best:
            self.where, self.best = shares[best].copy(), float(values[best])
        return values

    def flip(self) -> None:
        """Climb over vertices from where the slopes at the middle point, and from the best corner met so far."""
        count = len(self.where)
        middle = np.full(count, 0.5)
        up, down = self._try(middle + 0.5 * np.eye(count)), self._try(middle - 0.5 * np.eye(count))
        with np.errstate(invalid="ignore"):
            slope = np.nan_to_num(up - down)
        moving = np.flatnonzero(np.abs(slope) > _FINER * np.abs(slope).max(initial=0.0))
        first = (slope > 0).astype(float)
        best = max((key for key in self.seen if _is_corner(np.frombuffer(key))), key=self.seen.__getitem__)
        for start in (first, np.frombuffer(best).copy()):
            self._climb(start, moving)

    def _climb(self, start: FloatArray, moving: NDArray[np.intp]) -> None:
        """Flip what gains, first all together, then fewer; `moving` are the parameters that move the measure at all."""
        here = start.copy()
        value = float(self._try(here[None, :])[0])
        for _ in range(len(moving) + 10):
            flips = np.repeat(here[None, :], len(moving), axis=0)
            flips[np.arange(len(moving)), moving] = 1.0 - here[moving]
            values = self._try(flips) if len(moving) else np.zeros(0)
            good = np.flatnonzero(values > value + _FINER * abs(value))
            if not len(good):
                return
            order = moving[good[np.argsort(-values[good])]]
            joint = np.repeat(here[None, :], len(order), axis=0)
            for k in range(len(order)):
                joint[k:, order[k]] = 1.0 - here[order[k]]
            together = self._try(joint)
            top = int(together.argmax())
            here, value = joint[top].copy(), float(together[top])

    def look_inside(self) -> None:
        """If an interior point beats its neighbours on the boundary, follow it; else the vertex stands."""
        count = len(self.where)
        lines = np.repeat(self.where[None, :], 3 * count, axis=0)
        for k, share in enumerate((0.04, 0.5, 0.96)):
            lines[k * count + np.arange(count), np.arange(count)] = share
        self._try(lines)
        corner = max(value for key, value in self.seen.items() if _is_corner(np.frombuffer(key)))
        if self.best > corner + _FINER * abs(corner):
            self._search()

    def _search(self) -> None:
        """A pattern search: coordinates, the last direction of progress and random directions, with shrinking steps."""
        count = len(self.where)
        random = np.random.default_rng(21)
        step, memory = 0.25, np.zeros(count)
        while step > _FINEST_STEP:
            here, value = self.where.copy(), self.best
            drawn = random.standard_normal((count + 4, count))
            drawn *= 1.0 / np.abs(drawn).max(axis=1, keepdims=True)
            ways = np.concatenate([np.eye(count), -np.eye(count), memory[None, :], 2 * memory[None, :], drawn])
            self._try(np.clip(here + step * ways, 0.0, 1.0))
            if self.best > value + _FINER * abs(value):
                moved = self.where - here
                memory = moved / max(float(np.abs(moved).max()), 1e-300)
            else:
                step *= 0.4


def _is_corner(shares: FloatArray) -> bool:
    return bool(((shares == 0) | (shares == 1)).all())


def sensitivities(measure: Measure, parameters: Sequence[Parameter]) -> FloatArray:
    """The share (P,) of each parameter in the measure's spread: its own swing over its range, the others at nominal.

    Shares add to 1; all are 0 where nothing moves the measure, NaN where it cannot be computed.
    """
    count = len(parameters)
    if not count:
        return np.zeros(0)
    box = _Box.of(parameters)
    low, high = (np.repeat(box.nominal[None, :], count, axis=0) for _ in range(2))
    low[np.arange(count), np.arange(count)] = box.low
    high[np.arange(count), np.arange(count)] = box.high
    values = _run(measure, np.concatenate([box.nominal[None, :], low, high]))
    three = np.stack([np.full(count, values[0]), values[1 : count + 1], values[count + 1 :]])
    swing = three.max(axis=0) - three.min(axis=0)
    total = swing.sum()
    return swing / total if total != 0 else np.zeros(count)


def monte_carlo(measure: Measure, parameters: Sequence[Parameter], samples: int, seed: int) -> FloatArray:
    """`samples` values of the measure with every parameter uniform in [low, high], independent; repeatable by seed."""
    box = _Box.of(parameters)
    shares = np.random.default_rng(seed).random((samples, len(parameters)))
    return _run(measure, box.low + shares * (box.high - box.low))


def wilson_interval(successes: int, trials: int) -> tuple[float, float]:
    """The 95 % score interval of a share (E. B. Wilson, J. Am. Stat. Assoc. 22 (1927) 209)."""
    if trials <= 0:
        return 0.0, 1.0
    z2 = _NORMAL_975**2
    share = successes / trials
    centre = (share + z2 / (2 * trials)) / (1 + z2 / trials)
    half = _NORMAL_975 / (1 + z2 / trials) * math.sqrt(share * (1 - share) / trials + z2 / (4 * trials**2))
    return max(0.0, centre - half), min(1.0, centre + half)


def inside(samples: FloatArray, low: float | None, high: float | None) -> NDArray[np.bool_]:
    """Which samples meet both limits; NaN meets none."""
    good = ~np.isnan(samples)
    if low is not None:
        good &= samples >= low
    if high is not None:
        good &= samples <= high
    return good
