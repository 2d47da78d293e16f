"""Extremes and roots of functions between grid points, for many functions at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.circuit.network import FloatArray

_ROUNDS = 80
_ULP = 2.0**-53


def bracketed_root(
    function: Callable[[FloatArray], FloatArray], low: FloatArray, high: FloatArray, share: float = 0.0
) -> FloatArray:
    """Roots of `function` between `low` and `high`, where it has opposite signs; any shape, each entry on its own.

    Where the signs are the same, as of a root just at an end, the end that is nearer to one. To the last digits, or to
    `share` of each bracket. Method of T. R. Chandrupatla, Adv. Eng. Softw. 28 (1997) 145: inverse quadratic
    interpolation where it is safe, else bisection.
    """
    a, b = low.astype(float), high.astype(float)
    fa, fb = function(a), function(b)
    c, fc = a, fa
    t = np.full(a.shape, 0.5)
    slack = share * np.abs(b - a)
    answer, open_ = np.where(np.abs(fa) < np.abs(fb), a, b), np.sign(fa) * np.sign(fb) < 0
    for _ in range(_ROUNDS):
        x = a + t * (b - a)
        fx = function(x)
        same = np.sign(fx) == np.sign(fa)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = x, fx
        nearer = np.abs(fa) < np.abs(fb)
        answer = np.where(open_, np.where(nearer, a, b), answer)
        with np.errstate(divide="ignore", invalid="ignore"):
            limit = (2.0 * _ULP * np.abs(answer) + slack + 1e-300) / np.abs(b - a)
            open_ = open_ & ~(limit > 0.5) & (np.where(nearer, fa, fb) != 0.0)
            if not open_.any():
                break
            xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
            smooth = (phi * phi < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
            inverse = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        t = np.where(smooth & np.isfinite(inverse), inverse, 0.5)
        limit = np.where(np.isfinite(limit), np.minimum(limit, 0.5), 0.5)
        t = np.clip(t, limit, 1.0 - limit)
    return answer


def polish(
    function: Callable[[FloatArray], FloatArray],
    f: FloatArray,
    size: FloatArray,
    choice: NDArray[np.intp],
    sign: float,
    tolerance: float,
) -> tuple[FloatArray, FloatArray]:
    """The extremes next to grid points: where (V, c) and how great (V, c), by successive parabolas in a bracket.

    `function` maps f (V, c) to sizes (V, c); f and size (V, F) are the grid, ascending; `choice` (V, c) the points of
    it to start from; `sign` 1 for greatest, −1 for least; the bracket closes to `tolerance` of f.
    """
    last = f.shape[1] - 1
    x = [np.take_along_axis(f, np.clip(choice + k, 0, last), 1) for k in (-1, 0, 1)]
    y = [sign * np.take_along_axis(size, np.clip(choice + k, 0, last), 1) for k in (-1, 0, 1)]
    for step in range(_ROUNDS):
        a, b, c = x
        if ((c - a) <= tolerance * b).all():
            break
        fresh = _next_point(x, y, step, 0.3 * tolerance)
        value = sign * function(fresh)
        left, better = fresh < b, value > y[1]
        x, y = _replace(x, y, fresh, value, left, better)
    return x[1], sign * y[1]


def _next_point(x: list[FloatArray], y: list[FloatArray], step: int, least_share: float) -> FloatArray:
    """The vertex of the parabola through three points, or (in turn, or if it leaves the bracket) a golden section."""
    a, b, c = x
    ya, yb, yc = y
    with np.errstate(divide="ignore", invalid="ignore"):
        p = (b - a) ** 2 * (yb - yc) - (b - c) ** 2 * (yb - ya)
        q = (b - a) * (yb - yc) - (b - c) * (yb - ya)
        vertex = b - 0.5 * p / q
    least = least_share * b
    close = np.abs(vertex - b) < least
    wider = np.where(c - b > b - a, b + least, b - least)
    vertex = np.where(close, wider, vertex)
    golden = np.where(c - b > b - a, b + 0.381966 * (c - b), b - 0.381966 * (b - a))
    usable = np.isfinite(vertex) & (vertex > a) & (vertex < c) & (step % 4 != 3)
    return np.where(usable, vertex, golden)


def _replace(
    x: list[FloatArray],
    y: list[FloatArray],
    fresh: FloatArray,
    value: FloatArray,
    left: NDArray[np.bool_],
    better: NDArray[np.bool_],
) -> tuple[list[FloatArray], list[FloatArray]]:
    """The bracket after one more point."""
    a, b, c = x
    ya, yb, yc = y
    new_b, new_yb = np.where(better, fresh, b), np.where(better, value, yb)
    new_a = np.where(better, np.where(left, a, b), np.where(left, fresh, a))
    new_ya = np.where(better, np.where(left, ya, yb), np.where(left, value, ya))
    new_c = np.where(better, np.where(left, b, c), np.where(left, c, fresh))
    new_yc = np.where(better, np.where(left, yb, yc), np.where(left, yc, value))
    return [new_a, new_b, new_c], [new_ya, new_yb, new_yc]
