"""What is asked of a motion: its extremes, when it settles, when it first passes a level. None of it misses a swing.

Times are sampled where the modes can move: densely over each mode's own time scale and over its first swings, then
where an envelope says that it must be looked at. Between samples a cubic through both values and both slopes says
whether an extreme hides there; the extremes and crossings that matter are then found to the last digits.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from reactance.analysis.circuit.motion import Pieces
from reactance.analysis.circuit.network import ComplexArray, FloatArray

_PER_SWING = 16
_PER_DECADE = 12
_FIRST = 48  # samples over the first swings of every mode
_MOST = 1500  # samples at most over the swings of one mode, where its envelope says that it must be followed
_FOLLOWED = 480  # samples over its swings where a first crossing is sought
_CANDIDATES = 4
_ROUNDS = 80


@dataclass(frozen=True, slots=True)
class Samples:
    """One piece at increasing times: tau, value, moved (dv/dt), each (V, T)."""

    piece: int
    tau: FloatArray
    value: FloatArray
    moved: FloatArray
    first: bool = True


def sample(pieces: Pieces, k: int, extra: FloatArray | None = None) -> Samples:
    """Piece k at the times where it can move; `extra` (V, m) adds times of its own."""
    tau = _times(pieces, k)
    if extra is not None:
        tau = np.concatenate([tau, np.clip(extra, 0.0, pieces.length(k)[:, None])], axis=1)
    return _sampled(pieces, k, np.sort(tau, axis=1))


def _sampled(pieces: Pieces, k: int, tau: FloatArray) -> Samples:
    value, moved = [], []
    done = 0
    for part in pieces.portions(tau.shape[1]):
        v, d = part.local(k, tau[done : done + part.count])
        value.append(v)
        moved.append(d)
        done += part.count
    return Samples(k, tau, np.concatenate(value), np.concatenate(moved))


def _times(pieces: Pieces, k: int) -> FloatArray:
    """Times (V, T) in piece k: even in the logarithm over all time scales, and the first swings of each mode."""
    length = pieces.length(k)
    size, damping = np.abs(pieces.poles), np.abs(pieces.poles.real)
    with np.errstate(divide="ignore"):
        fast = 0.01 / size.max(axis=1, initial=0.0)
        slow = 45.0 / np.where(damping > 0, damping, np.inf).min(axis=1, initial=np.inf)
    slow = np.where(slow > 0, slow, 1.0)
    end = np.where(np.isfinite(length), length, slow)
    fast = np.minimum(np.where(np.isfinite(fast), fast, end), end)
    floor = np.where(end > 0, np.maximum(fast, 1e-300), 1.0)
    decades = float(np.log10(np.maximum(end, floor) / floor).max(initial=0.0))
    shares = np.linspace(0.0, 1.0, int(np.ceil(decades * _PER_DECADE)) + 2)
    found = [
        np.zeros((pieces.count, 1)),
        end[:, None] * np.linspace(0.0, 1.0, 17),
        floor[:, None] * (np.maximum(end, floor) / floor)[:, None] ** shares,
    ]
    for i in np.flatnonzero((np.abs(pieces.poles.imag) > 0.1 * damping).any(axis=0)):
        found.append(_swings(pieces.poles[:, i], _FIRST))
    return np.asarray(np.clip(np.concatenate(found, axis=1), 0.0, end[:, None]))


def _swings(p: ComplexArray, number: int) -> FloatArray:
    """Times (V, number) over the first swings of the modes p (V,)."""
    turning = np.maximum(np.abs(p.imag), np.maximum(0.05 * np.abs(p), 1e-300))
    return np.asarray((2.0 * np.pi / _PER_SWING) / turning[:, None] * np.arange(1, number + 1))


def _amplitudes(pieces: Pieces, k: int) -> FloatArray:
    """A bound (V, n) of each mode's swing about its resting value at the start of piece k."""
    level = np.maximum(np.abs(pieces.level[:, k]), np.abs(pieces.level[:, k] + pieces.rate[:, k] * _short(pieces, k)))
    still = pieces.poles == 0
    rest = np.where(still, 0.0, pieces.residues / np.where(still, 1.0, pieces.poles))
    return np.asarray(np.abs(pieces.state[:, k]) + np.abs(rest) * level[:, None])


def _short(pieces: Pieces, k: int) -> FloatArray:
    length = pieces.length(k)
    return np.where(np.isfinite(length), length, 0.0)


def _follow(pieces: Pieces, k: int, room: FloatArray) -> FloatArray | None:
    """Times (V, T) over the further swings of ringing modes, as far as their envelopes exceed `room` (V,).

    None where the first swings are all there is to see.
    """
    amplitude, p = _amplitudes(pieces, k), pieces.poles
    ringing = np.abs(p.imag) > 0.1 * np.abs(p.real)
    if not ringing.any():
        return None
    until = np.minimum(_fall(amplitude, p, room), pieces.length(k))
    found = []
    for i in np.flatnonzero(ringing.any(axis=0)):
        alive = amplitude[:, i] > 0.01 * amplitude.sum(axis=1)
        swings = np.where(alive, until * np.abs(p[:, i].imag) / (2.0 * np.pi), 0.0)
        number = int(min(_MOST, np.ceil(float(swings.max(initial=0.0)) * _PER_SWING)))
        if number > _FIRST:
            found.append(_swings(p[:, i], number)[:, _FIRST:])
    if not found:
        return None
    tau = np.clip(np.concatenate(found, axis=1), 0.0, until[:, None])
    return np.asarray(np.sort(tau, axis=1))


def _fall(amplitude: FloatArray, p: ComplexArray, room: FloatArray) -> FloatArray:
    """When the sum of the modes' envelopes falls to `room`, (V,)."""
    damping = np.where(p.real < 0, -p.real, 1e-300)
    low, high = np.zeros(len(p)), 700.0 / damping.min(axis=1, initial=np.inf)
    for _ in range(60):
        middle = 0.5 * (low + high)
        above = (amplitude * np.exp(-damping * middle[:, None])).sum(axis=1) > room
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return np.asarray(high)


def greatest(pieces: Pieces, about: FloatArray, sign: float, *, rough: bool = False) -> tuple[FloatArray, FloatArray]:
    """Time and size of the greatest sign·(v − about) over t > 0: each (V,). `sign` 0 takes the greatest |v − about|.

    The time is infinite where the greatest is only approached. `rough` leaves extremes between samples at what the
    cubic through the samples says, for a first search.
    """
    best_time = np.full(pieces.count, np.inf)
    final = pieces.final()
    best = _score(final, about, sign)
    best = np.where(np.isnan(best), -np.inf, best)
    for k in range(pieces.start.shape[1]):
        found: Samples | None = sample(pieces, k)
        while found is not None:
            times, scores = _best_of(pieces, found, about, sign, rough)
            better = scores > best * (1.0 + 1e-13 * np.sign(best))
            best = np.where(better, scores, best)
            best_time = np.where(better, pieces.start[:, k] + times, best_time)
            found = _more(pieces, k, best, about, sign) if found.first else None
    if pieces.jumps:
        best = np.where(pieces.slope != 0, np.inf, best)
    return best_time, best


def _more(pieces: Pieces, k: int, best: FloatArray, about: FloatArray, sign: float) -> Samples | None:
    """Samples of later swings of piece k that could still beat `best`."""
    p, still = pieces.poles, pieces.poles == 0
    rest = np.where(still, 0.0, -pieces.residues / np.where(still, 1.0, p)).sum(axis=1).real + pieces.direct
    levels = [pieces.level[:, k], pieces.level[:, k] + pieces.rate[:, k] * _short(pieces, k)]
    resting = np.max([_score(rest * u + pieces.offset, about, sign) for u in levels], axis=0)
    tau = _follow(pieces, k, np.maximum(best - resting, 0.0))
    if tau is None:
        return None
    later = _sampled(pieces, k, tau)
    return Samples(k, later.tau, later.value, later.moved, first=False)


def _score(value: FloatArray, about: FloatArray, sign: float) -> FloatArray:
    return np.asarray(np.abs(value - about) if sign == 0 else sign * (value - about))


def _best_of(
    pieces: Pieces, found: Samples, about: FloatArray, sign: float, rough: bool
) -> tuple[FloatArray, FloatArray]:
    """The best score of one piece and its time, extremes between samples included."""
    rows = np.arange(pieces.count)
    score = _score(found.value, about[:, None], sign)
    top = score.argmax(axis=1)
    time, best = found.tau[rows, top], score[rows, top]
    turns = found.moved[:, :-1] * found.moved[:, 1:] < 0
    reach = np.where(turns, _score(_swell(found), about[:, None], sign), -np.inf)
    number = min(_CANDIDATES, reach.shape[1])
    if not number or not turns.any():
        return time, best
    if rough:
        top = reach.argmax(axis=1)
        better = reach[rows, top] > best
        return np.where(better, found.tau[rows, top], time), np.where(better, reach[rows, top], best)
    choice = np.argpartition(-reach, number - 1, axis=1)[:, :number]
    choice = np.where(np.isfinite(np.take_along_axis(reach, choice, 1)), choice, reach.argmax(axis=1)[:, None])
    tau = polish_turn(pieces, found, choice)
    value, _ = pieces.local(found.piece, tau)
    value = np.where(np.take_along_axis(turns, choice, 1), value, np.nan)
    score = np.nan_to_num(_score(value, about[:, None], sign), nan=-np.inf)
    top = score.argmax(axis=1)
    better = score[rows, top] > best
    return np.where(better, tau[rows, top], time), np.where(better, score[rows, top], best)


def _swell(found: Samples) -> FloatArray:
    """The value at the turn of the cubic through each pair of samples, (V, T − 1); the nearer end where it has none."""
    h = np.diff(found.tau, axis=1)
    a, b = found.value[:, :-1], found.value[:, 1:]
    da, db = found.moved[:, :-1] * h, found.moved[:, 1:] * h
    c3, c2 = 2 * (a - b) + da + db, 3 * (b - a) - 2 * da - db
    root = np.sqrt(np.maximum(c2 * c2 - 3 * c3 * da, 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        q = -(c2 + np.copysign(root, c2))
        x = np.stack([q / (3 * c3), da / q])
    x = np.where((x >= 0) & (x <= 1), x, 0.0)
    value = a + x * (da + x * (c2 + x * c3))
    middle = 0.5 * (a + b)
    far = np.abs(value - middle).argmax(axis=0)
    return np.asarray(np.take_along_axis(value, far[None], axis=0)[0])


def polish_turn(pieces: Pieces, found: Samples, choice: NDArray[np.intp]) -> FloatArray:
    """The time of the extreme between samples `choice` and `choice` + 1, (V, c), to the last digits."""
    low = np.take_along_axis(found.tau, choice, 1)
    high = np.take_along_axis(found.tau, choice + 1, 1)
    rising = np.take_along_axis(found.moved, choice, 1) > 0

    def beyond(tau: FloatArray) -> tuple[FloatArray, NDArray[np.bool_]]:
        _, moved = pieces.local(found.piece, tau)
        return moved, (moved > 0) != rising

    return _narrow(low, high, beyond, 1e-8)


def polish_crossing(
    pieces: Pieces, k: NDArray[np.intp], low: FloatArray, high: FloatArray, level: FloatArray
) -> FloatArray:
    """Where v passes `level` (V,) between times `low` and `high` (V,) of pieces k (V,)."""
    start, _ = pieces.gathered(k[:, None], low[:, None])
    above = start[:, 0] > level

    def beyond(tau: FloatArray) -> tuple[FloatArray, NDArray[np.bool_]]:
        value, _ = pieces.gathered(k[:, None], tau)
        return value - level[:, None], (value > level[:, None]) != above[:, None]

    return _narrow(low[:, None], high[:, None], beyond, 0.0)[:, 0]


def _narrow(
    low: FloatArray,
    high: FloatArray,
    beyond: Callable[[FloatArray], tuple[FloatArray, NDArray[np.bool_]]],
    share: float,
) -> FloatArray:
    """Bisection mixed with the secant (the Illinois rule), until the point moves by less than `share` of the bracket.

    With share 0, to the last digits.
    """
    low, high = low.copy(), high.copy()
    f_low, f_high = beyond(low)[0], beyond(high)[0]
    enough = np.maximum(share * (high - low), 4e-16 * np.abs(high))
    last = low
    for step in range(_ROUNDS):
        width = high - low
        with np.errstate(divide="ignore", invalid="ignore"):
            secant = high - f_high * width / (f_high - f_low)
        usable = np.isfinite(secant) & (secant > low) & (secant < high) & (step % 4 != 3)
        at = np.where(usable, secant, 0.5 * (low + high))
        f, past = beyond(at)
        done = (width <= enough) | (f == 0) | (usable & (np.abs(at - last) <= enough) & (share > 0))
        if done.all():
            return at
        f_low, f_high = np.where(past, 0.5 * f_low, f), np.where(past, f, 0.5 * f_high)
        low, high, last = np.where(past, low, at), np.where(past, at, high), at
    return at


def last_outside(pieces: Pieces, about: FloatArray, within: FloatArray) -> FloatArray:
    """The last time at which |v − about| is greater than `within`, (V,): 0 if never, inf if it never ends."""
    answer = np.zeros(pieces.count)
    open_rows = np.ones(pieces.count, bool)
    for k in reversed(range(pieces.start.shape[1])):
        found = sample(pieces, k, _tail(pieces, k, within) if k + 1 == pieces.start.shape[1] else None)
        time, hit = _last_in_piece(pieces, found, about, within)
        answer = np.where(open_rows & hit, pieces.start[:, k] + time, answer)
        open_rows &= ~hit
    endless = ~(np.abs(pieces.final() - about) <= within)
    return np.where(endless, np.inf, answer)


def _tail(pieces: Pieces, k: int, within: FloatArray) -> FloatArray:
    """Times just before the envelope of the modes falls to `within`, spaced for the fastest mode still alive there."""
    p, amplitude = pieces.poles, _amplitudes(pieces, k)
    damping = np.where(p.real < 0, -p.real, 1e-300)
    high = _fall(amplitude, p, within)
    alive = amplitude * np.exp(-damping * high[:, None]) > 0.003 * within[:, None]
    speed = np.where(alive, np.abs(p.imag) + 0.2 * damping, 0.0).max(axis=1, initial=0.0)
    step = 2.0 * np.pi / _PER_SWING / np.maximum(speed, 1e-300)
    return np.asarray(np.maximum(high[:, None] - step[:, None] * np.arange(400), 0.0))


def _last_in_piece(
    pieces: Pieces, found: Samples, about: FloatArray, within: FloatArray
) -> tuple[FloatArray, NDArray[np.bool_]]:
    rows = np.arange(pieces.count)
    outside = np.abs(found.value - about[:, None]) > within[:, None]
    turns = found.moved[:, :-1] * found.moved[:, 1:] < 0
    hidden = turns & ~outside[:, 1:] & (np.abs(_swell(found) - about[:, None]) > 0.9 * within[:, None])
    columns = found.tau.shape[1]
    last = np.where(outside.any(axis=1), columns - 1 - outside[:, ::-1].argmax(axis=1), -1)
    low = np.where(last >= 0, found.tau[rows, last], 0.0)
    for _ in range(columns):
        pending = hidden & (np.arange(columns - 1)[None, :] >= last[:, None])
        if not pending.any():
            break
        at = np.where(pending.any(axis=1), columns - 2 - pending[:, ::-1].argmax(axis=1), 0)
        tau = polish_turn(pieces, found, at[:, None])[:, 0]
        value, _ = pieces.local(found.piece, tau[:, None])
        real = pending.any(axis=1) & (np.abs(value[:, 0] - about) > within)
        low, last = np.where(real, tau, low), np.where(real, at, last)
        hidden[rows, at] = False
    hit = last >= 0
    high = found.tau[rows, np.minimum(np.maximum(last, 0) + 1, columns - 1)]
    inside = hit & (high > low)
    start, _ = pieces.local(found.piece, low[:, None])
    level = np.where(start[:, 0] > about, about + within, about - within)
    k = np.full(pieces.count, found.piece)
    crossing = polish_crossing(pieces, k, low, np.where(inside, high, low), level)
    return np.where(inside, crossing, low), hit


def first_passing(pieces: Pieces, level: FloatArray) -> FloatArray:
    """The first t ≥ 0 at which v reaches `level` (V,), coming from 0 at t < 0; inf if it never does."""
    answer = np.full(pieces.count, np.inf)
    side = np.sign(0.0 - level)
    for k in range(pieces.start.shape[1]):
        found = sample(pieces, k, _followed(pieces))
        time, hit = _first_in_piece(pieces, found, level, side)
        fresh = hit & np.isinf(answer)
        answer = np.where(fresh, pieces.start[:, k] + time, answer)
    return np.where(level == 0, 0.0, answer)


def _followed(pieces: Pieces) -> FloatArray | None:
    p = pieces.poles
    ringing = np.flatnonzero((np.abs(p.imag) > np.abs(p.real)).any(axis=0))
    return np.concatenate([_swings(p[:, i], _FOLLOWED) for i in ringing], axis=1) if len(ringing) else None


def _first_in_piece(
    pieces: Pieces, found: Samples, level: FloatArray, side: FloatArray
) -> tuple[FloatArray, NDArray[np.bool_]]:
    rows = np.arange(pieces.count)
    reached = (found.value - level[:, None]) * side[:, None] <= 0
    turns = found.moved[:, :-1] * found.moved[:, 1:] < 0
    hidden = turns & ((_swell(found) - level[:, None]) * side[:, None] < 0) & ~reached[:, :-1] & ~reached[:, 1:]
    index = np.where(reached.any(axis=1), reached.argmax(axis=1), reached.shape[1])
    first_hidden = np.where(hidden.any(axis=1), hidden.argmax(axis=1), reached.shape[1])
    use_hidden = first_hidden < index
    at = np.where(use_hidden, first_hidden, np.maximum(index - 1, 0))
    at = np.minimum(at, found.tau.shape[1] - 2)
    hit = use_hidden | (index < reached.shape[1])
    low = found.tau[rows, at]
    high = np.where(use_hidden, polish_turn(pieces, found, at[:, None])[:, 0], found.tau[rows, at + 1])
    high = np.where(index == 0, low, high)
    k = np.full(pieces.count, found.piece)
    return np.where(index == 0, low, polish_crossing(pieces, k, low, high, level)), hit
