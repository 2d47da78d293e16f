"""The natural frequencies of a network, and the zeros of a response, to full precision.

Both are the roots of polynomials in s that are never written out: their logarithmic derivatives come from the
equations themselves, which keep their digits at every s (system.py). How many roots there are is read from the
slopes of the polynomial at both ends of the axis, so that infinite eigenvalues of the descriptor form never appear.
All roots are found at once by the Ehrlich–Aberth iteration (O. Aberth, Math. Comput. 27 (1973) 339), started from
the magnitudes that the slope along the positive real axis gives (compare D. A. Bini, Numer. Algorithms 13 (1996) 179).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.circuit.forest import Forest
from reactance.analysis.circuit.network import CircuitError, ComplexArray, FloatArray
from reactance.analysis.circuit.system import Drive, Equations, System

_FAR_LOW, _FAR_HIGH = 1e-30, 1e30
_MOST_ROUNDS = 120


@dataclass(frozen=True, slots=True)
class Question:
    """Whose roots: the poles of the network (`zeros` False) or the zeros of a response of it."""

    system: System
    drive: Drive
    probe: tuple[str, str]
    zeros: bool = False

    def slope(self, s: ComplexArray) -> ComplexArray:
        """f′/f at s (V or 1, F): complex (V, F)."""
        answer = np.empty((self.system.count, s.shape[1]), complex)
        for forest, where in self.system.groups(s):
            answer[:, where] = self._slope(forest, s[:, where])
        return answer

    def _slope(self, forest: Forest, s: ComplexArray) -> ComplexArray:
        eq, inverse = self.system.nudged(s, lambda x: self._inverse(forest, x))
        assert eq.matrix_slope is not None and eq.rhs_slope is not None and eq.denominator_slope is not None
        total = np.einsum("...ij,...ji->...", inverse, eq.matrix_slope) + eq.denominator_slope
        if not self.zeros:
            return np.asarray(total)
        x = (inverse @ eq.rhs[..., None])[..., 0]
        moved = eq.rhs_slope - (eq.matrix_slope @ x[..., None])[..., 0]
        h = x @ eq.observe + eq.known
        h_slope = (inverse @ moved[..., None])[..., 0] @ eq.observe
        with np.errstate(divide="ignore", invalid="ignore"):  # s may be just on a zero
            return np.asarray(total + h_slope / h)

    def _inverse(self, forest: Forest, s: ComplexArray) -> tuple[Equations, ComplexArray]:
        eq = self.system.equations(forest, s, self.drive, self.probe, slopes=True)
        return eq, np.asarray(np.linalg.inv(eq.matrix))

    def only(self, rows: NDArray[np.intp]) -> Question:
        """The same question of some of the sets of values."""
        return Question(self.system.only(rows), self.drive, self.probe, self.zeros)


@dataclass(frozen=True, slots=True)
class Roots:
    """Roots (V, n) other than zero; rows with fewer end in NaN. `at_zero`: how many are zero (the least over V)."""

    roots: ComplexArray
    at_zero: int


def find_roots(question: Question, guess: ComplexArray | None = None) -> Roots:
    """The roots of `question`. `guess` (V, n) may say near which values they are."""
    ends = np.array([[_FAR_LOW, _FAR_HIGH]], complex)
    at_zero, total = np.round((question.slope(ends) * ends).real).T
    if not (np.isfinite(at_zero).all() and np.isfinite(total).all()):
        raise CircuitError("the network has no unique solution at any frequency")
    counts = (total - at_zero).astype(int)
    roots = np.full((len(counts), max(int(counts.max(initial=0)), 0)), np.nan + 0j)
    for count in np.unique(counts):
        rows = np.flatnonzero(counts == count)
        if count > 0:
            part = question if len(rows) == len(counts) else question.only(rows)
            near = guess[rows] if guess is not None and guess.shape[1] == count else None
            start = _start(part, int(count), at_zero[rows]) if near is None else _apart(near)
            roots[rows, :count] = _iterate(part, start, at_zero[rows])
    return Roots(roots, int(at_zero.min()))


def _apart(guess: ComplexArray) -> ComplexArray:
    """Guesses (V, n), equal ones moved a little apart."""
    k = np.arange(1, guess.shape[1] + 1)
    return np.asarray(guess * (1.0 + 1e-7 * k * np.exp(1j * (k - 1))))


def _start(question: Question, count: int, at_zero: FloatArray) -> ComplexArray:
    """First guesses (V, n): magnitudes from the slope along the positive axis, angles spread over the left half."""
    if question.system.count > 1:
        middle = question.only(np.array([0]))
        guess = _iterate(middle, _start(middle, count, at_zero[:1]), at_zero[:1])
        return np.repeat(_apart(guess), question.system.count, axis=0)
    decades = np.arange(-12.0, 20.01, 0.2)
    s = 10.0**decades
    below = np.maximum.accumulate((question.slope(s[None, :].astype(complex))[0] * s).real - at_zero[0])
    below = below + 1e-9 * np.arange(len(below))
    magnitudes = 10.0 ** np.interp(np.arange(count) + 0.5, below, decades)
    k = np.arange(count)
    angles = np.pi + np.where(k % 2, 1.0, -1.0) * (0.25 + 0.9 * ((0.618 * (k + 1)) % 1.0))
    return np.asarray((magnitudes * np.exp(1j * angles))[None, :])


def _iterate(question: Question, s: ComplexArray, at_zero: FloatArray) -> ComplexArray:
    """Ehrlich–Aberth until no root moves any more. s (V, n)."""
    s = s.copy()
    n = s.shape[1]
    moving = np.ones(n, bool)
    last = np.full(n, np.inf)
    for _ in range(_MOST_ROUNDS):
        columns = np.flatnonzero(moving)
        x = s[:, columns]
        newton = question.slope(x) - at_zero[:, None] / x
        with np.errstate(divide="ignore", invalid="ignore"):
            others = 1.0 / (x[:, :, None] - s[:, None, :])
            others[:, np.arange(len(columns)), columns] = 0.0
            step = 1.0 / (newton - np.where(np.isfinite(others), others, 0.0).sum(axis=-1))
        step = np.where(np.isfinite(step), step, 1e-16 * x)
        size = np.abs(step) / np.abs(x)
        step = np.where(size > 0.8, step * (0.8 / np.maximum(size, 1e-300)), step)
        s[:, columns] = x - step
        worst = size.max(axis=0)
        stuck = (worst < 1e-7) & (worst > 0.3 * last[columns])
        moving[columns] = (worst > 2e-15) & ~stuck
        last[columns] = worst
        if not moving.any():
            break
    return _mirror(s)


def _mirror(s: ComplexArray) -> ComplexArray:
    """Roots of a real polynomial: real, or in exact conjugate pairs."""
    distance = np.abs(s[:, :, None].conj() - s[:, None, :])
    partner = distance.argmin(axis=2)
    rows = np.arange(len(s))[:, None]
    mutual = partner[rows, partner] == np.arange(s.shape[1])
    return np.asarray(np.where(mutual, 0.5 * (s + s[rows, partner].conj()), s))
