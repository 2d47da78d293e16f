"""The extremes of a measure over uncertain values, its Monte Carlo samples, and which value matters how much.

A measure is a function of values (V, P) that returns (V,): NaN or infinite where it does not exist. It
is called with many rows at once.
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
_INTERIOR = 12
_STARTS = 3
FINER = 1e-5  # an improvement below this share of the figure is no improvement: bands are promised to 0.1 %
_FINEST_STEP = 2e-3  # of a range; the figure is flat about an inside extreme, so its error is far smaller
_IDLE = 3e-3  # beyond `EXHAUSTIVE` parameters: those that together move less than this share are not flipped
_NORMAL_975 = 1.959963984540054


@dataclass(frozen=True, slots=True)
class Spread:
    """A measure's nominal and extremes, the values (P,) where these occur, and each parameter's share (P,).

    A share is the swing over one parameter's range with the others at nominal; shares add to 1, and are all 0 where
    nothing moves the measure.
    """

    nominal: float
    low: float
    high: float
    at_low: FloatArray
    at_high: FloatArray
    shares: FloatArray


def spread(measure: Measure, parameters: Sequence[Parameter], *, finer: float = FINER) -> Spread:
    """The extremes of `measure` over all parameters independently in [low, high].

    The first call of `measure` has the same rows for every measure over equal parameters, so that a caller can solve
    them once: nominal, one parameter at a time, vertices, points inside. Every vertex is tried for up to 8
    parameters; beyond, vertices are climbed from where the slopes point and from the best known. Where a point inside
    beats the vertices (a resonance) the extreme is followed inside. NaN anywhere makes both extremes NaN. `finer` is
    the share of the figure below which a difference is none: not finer than the measure itself is exact.
    """
    box = _Box.of(parameters)
    count = len(parameters)
    singles, corners, inner = box.singles(), box.vertices() if count <= EXHAUSTIVE else box.starts(), box.interior()
    rows = np.concatenate([box.nominal[None, :], singles, box.at(corners), box.at(inner)])
    values = _run(measure, rows if count else rows[:1])
    nominal = float(values[0])
    if not count or math.isnan(nominal):
        return Spread(nominal, nominal, nominal, box.nominal, box.nominal, np.zeros(count))
    if np.isnan(values).any():
        return Spread(nominal, math.nan, math.nan, box.nominal, box.nominal, np.zeros(count))
    slopes = values[1 + count : 1 + 2 * count] - values[1 : 1 + count]
    shares = _shares(nominal, values[1 : 1 + 2 * count].reshape(2, count))
    known = _Known(measure, box, np.concatenate([corners, inner]), values[1 + 2 * count :])
    three = np.stack([values[1 : 1 + count], np.full(count, nominal), values[1 + count : 1 + 2 * count]])
    even = _rises_evenly(three, corners, values[1 + 2 * count : 1 + 2 * count + len(corners)], finer)
    if count > EXHAUSTIVE:
        known.at(np.concatenate([_with_flips((sign * slopes > 0).astype(float), _moving(shares)) for sign in (-1, 1)]))
    ends = []
    for sign in (-1.0, 1.0):
        climber = _Climber(known, sign, finer)
        if count > EXHAUSTIVE:
            climber.climb((sign * slopes > 0).astype(float), _moving(shares), once=even)
        if not even:
            climber.look_inside()
        ends.append((sign * climber.best, box.at(climber.where[None, :])[0]))
    for row, value in zip(np.concatenate([box.nominal[None, :], singles]), values[: 1 + 2 * count], strict=True):
        ends[0] = (float(value), row) if value < ends[0][0] else ends[0]
        ends[1] = (float(value), row) if value > ends[1][0] else ends[1]
    return Spread(nominal, ends[0][0], ends[1][0], ends[0][1], ends[1][1], shares)


def _rises_evenly(three: FloatArray, corners: FloatArray, values: FloatArray, finer: float) -> bool:
    """Whether each parameter moves the measure one way only, as far as the known points tell.

    `three` (3, P): one parameter at low, nominal and high. `corners` (V, P) as shares with their `values` (V,); where
    all vertices are there, every edge of the box is looked at.
    """
    size = max(float(np.abs(values).max(initial=0.0)), float(np.abs(three).max(initial=0.0)))
    steps = np.diff(three, axis=0)
    steps = np.where(np.abs(steps) > finer * size, np.sign(steps), 0.0)
    if (steps[0] * steps[1] < 0).any():
        return False
    way = np.where(steps[0] != 0, steps[0], steps[1])
    count = three.shape[1]
    if len(corners) != 2**count:
        return True
    for i in range(count):
        pairs = values.reshape(-1, 2, 2**i)  # vertices count in binary, the first parameter fastest
        rise = pairs[:, 1] - pairs[:, 0]
        ways = np.sign(rise[np.abs(rise) > finer * size])
        if len(ways) and ((ways != ways[0]).any() or way[i] * ways[0] < 0):
            return False
    return True


def sensitivities(measure: Measure, parameters: Sequence[Parameter]) -> FloatArray:
    """The share (P,) of each parameter in the measure's spread, as in `Spread`; NaN where it cannot be computed."""
    box = _Box.of(parameters)
    values = _run(measure, np.concatenate([box.nominal[None, :], box.singles()]))
    return _shares(float(values[0]), values[1:].reshape(2, len(parameters)))


def _shares(nominal: float, ends: FloatArray) -> FloatArray:
    swing = np.maximum(ends.max(axis=0), nominal) - np.minimum(ends.min(axis=0), nominal)
    total = swing.sum()
    return np.asarray(swing / total if total != 0 else np.zeros(len(swing)))


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

    def singles(self) -> FloatArray:
        """One parameter at its low end, the others at nominal, for each; then the same at the high ends: (2P, P)."""
        count = len(self.low)
        rows = np.repeat(self.nominal[None, :], 2 * count, axis=0)
        rows[np.arange(count), np.arange(count)] = self.low
        rows[count + np.arange(count), np.arange(count)] = self.high
        return rows

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
    every = np.concatenate(found)
    return np.where(np.isfinite(every), every, np.nan)


class _Known:
    """A measure over a box with every point remembered."""

    def __init__(self, measure: Measure, box: _Box, shares: FloatArray, values: FloatArray) -> None:
        self.measure, self.box, self.count = measure, box, shares.shape[1]
        self.seen = {row.tobytes(): float(value) for row, value in zip(shares, values, strict=True)}

    def at(self, shares: FloatArray) -> FloatArray:
        """The measure at shares (V, P); a point seen before is not measured again."""
        missing = {row.tobytes(): i for i, row in enumerate(shares) if row.tobytes() not in self.seen}
        fresh = list(missing.values())
        if fresh:
            for i, value in zip(fresh, _run(self.measure, self.box.at(shares[fresh])), strict=True):
                self.seen[shares[i].tobytes()] = float(value)
        return np.array([self.seen[row.tobytes()] for row in shares])


class _Climber:
    """Follows sign·measure upward through the box."""

    def __init__(self, known: _Known, sign: float, finer: float) -> None:
        self.known, self.sign, self.finer = known, sign, finer
        self.where, self.best = self._top(corners=False)

    def _top(self, *, corners: bool) -> tuple[FloatArray, float]:
        keys = (key for key in self.known.seen if not corners or _is_corner(np.frombuffer(key)))
        best = max(keys, key=lambda key: self._score(self.known.seen[key]))
        return np.frombuffer(best).copy(), self._score(self.known.seen[best])

    def _score(self, value: float) -> float:
        return -math.inf if math.isnan(value) else self.sign * value

    def _try(self, shares: FloatArray) -> FloatArray:
        """sign·measure at shares (V, P), the best of which is kept."""
        values = np.array([self._score(value) for value in self.known.at(shares)])
        if len(values) and values.max() > self.best:
            best = int(values.argmax())
            self.where, self.best = shares[best].copy(), float(values[best])
        return values

    def climb(self, first: FloatArray, moving: NDArray[np.intp], *, once: bool) -> None:
        """Climb over vertices from `first`, where the slopes point; unless `once`, also from the best corner known."""
        self._climb(first, moving)
        if not once:
            self._climb(self._top(corners=True)[0], moving)

    def _climb(self, start: FloatArray, moving: NDArray[np.intp]) -> None:
        """Flip what gains: of all flips that gain alone, as many at once as gain most together."""
        here = start.copy()
        for _ in range(len(moving) + 10):
            values = self._try(_with_flips(here, moving))
            value = float(values[0])
            good = np.flatnonzero(values[1:] > value + self.finer * abs(value))
            if not len(good):
                return
            order = moving[good[np.argsort(-values[1:][good])]]
            joint = np.repeat(here[None, :], len(order), axis=0)
            for k in range(len(order)):
                joint[k:, order[k]] = 1.0 - here[order[k]]
            here = joint[int(self._try(joint).argmax())].copy()

    def look_inside(self) -> None:
        """If a point inside, or inside an edge from the best corner, beats the corners, follow it inside."""
        count = len(self.where)
        corner_at, corner = self._top(corners=True)
        lines = np.repeat(corner_at[None, :], 2 * count, axis=0)
        for k, share in enumerate((0.06, 0.5)):
            rows = k * count + np.arange(count)
            lines[rows, np.arange(count)] = np.abs(corner_at - share)
        self._try(lines)
        if self.best > corner + self.finer * abs(corner):
            self._search()

    def _search(self) -> None:
        """A pattern search: coordinates, the last direction of progress and random directions, with shrinking steps."""
        count = len(self.where)
        random = np.random.default_rng(21)
        step, memory = 0.25, np.zeros(count)
        while step > max(_FINEST_STEP, 20.0 * self.finer):
            here, value = self.where.copy(), self.best
            drawn = random.standard_normal((count + 4, count))
            drawn *= 1.0 / np.abs(drawn).max(axis=1, keepdims=True)
            ways = np.concatenate([np.eye(count), -np.eye(count), memory[None, :], 2 * memory[None, :], drawn])
            self._try(np.clip(here + step * ways, 0.0, 1.0))
            if self.best > value + self.finer * abs(value):
                moved = self.where - here
                memory = moved / max(float(np.abs(moved).max()), 1e-300)
            else:
                step *= 0.4


def _moving(swings: FloatArray) -> NDArray[np.intp]:
    """The parameters that are worth flipping: all but those that together move next to nothing."""
    order = np.argsort(swings)
    return np.setdiff1d(np.arange(len(swings)), order[np.cumsum(swings[order]) <= _IDLE])


def _with_flips(corner: FloatArray, moving: NDArray[np.intp]) -> FloatArray:
    """A corner and its neighbours along `moving`: shares (1 + M, P)."""
    rows = np.repeat(corner[None, :], 1 + len(moving), axis=0)
    rows[1 + np.arange(len(moving)), moving] = 1.0 - corner[moving]
    return rows


def _is_corner(shares: FloatArray) -> bool:
    return bool(((shares == 0) | (shares == 1)).all())


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
