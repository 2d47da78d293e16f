"""What is asked of a motion: its extremes, when it settles, when it first passes a level. None of it misses a swing.

Times are sampled where the modes can move: densely over each mode's own time scale and over its first swings, then
where an envelope says that it must be looked at. Between samples a cubic through both values and both slopes says
whether an extreme hides there; the extremes and crossings that matter are then found to the last digits.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.circuit.motion import Pieces
from reactance.analysis.circuit.network import ComplexArray, FloatArray
from reactance.analysis.circuit.search import bracketed_root

_PER_SWING = 16
_PER_DECADE = 12
_FIRST = 48  # samples over the first swings of every mode
_MOST = 1500  # samples at most over the swings of one mode, where its envelope says that it must be followed
_STRETCHES, _RIVALS = 24, 5  # stretches of time of which the best are looked at again
_LATE_PER_DECADE = 40  # times at which a mode with many swings is looked at
_FOLLOWED = 480  # samples over its swings where a first crossing is sought
_RINGS = 0.4  # turning over damping; below it a mode is gone after half a swing, and even times show it
_CANDIDATES = 4


@dataclass(frozen=True, slots=True)
class Samples:
    """One piece at increasing times: tau, value, moved (dv/dt), each (V, T). `look`: how many looks came before."""

    piece: int
    tau: FloatArray
    value: FloatArray
    moved: FloatArray
    look: int = 0
    sparse: bool = False


def sample(pieces: Pieces, k: int, extra: FloatArray | None = None, *, rough: bool = False) -> Samples:
    """Piece k at the times where it can move; `extra` (V, m) adds times of its own."""
    tau = _times(pieces, k, rough)
    if extra is not None:
        tau = np.concatenate([tau, np.clip(extra, 0.0, pieces.length(k)[:, None])], axis=1)
    return _sampled(pieces, k, np.sort(tau, axis=1))


def _sampled(pieces: Pieces, k: int, tau: FloatArray) -> Samples:
    return Samples(k, tau, *pieces.sampled(k, tau))


def _times(pieces: Pieces, k: int, rough: bool) -> FloatArray:
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
    shares = np.linspace(0.0, 1.0, int(np.ceil(decades * (_PER_DECADE // 2 if rough else _PER_DECADE))) + 2)
    found = [
        np.zeros((pieces.count, 1)),
        end[:, None] * np.linspace(0.0, 1.0, 17),
        floor[:, None] * (np.maximum(end, floor) / floor)[:, None] ** shares,
    ]
    for i in np.flatnonzero((np.abs(pieces.poles.imag) > _RINGS * damping).any(axis=0)):
        swings = _swings(pieces.poles[:, i], _FIRST)
        found.append(swings[:, 1 : _FIRST // 2 : 2] if rough else swings)
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


def _follow(pieces: Pieces, k: int, room: FloatArray, best: FloatArray) -> tuple[FloatArray | None, bool]:
    """Times (V, T) over the further swings of ringing modes, as far as they could still take v beyond `best`.

    `room` (V,) is how far v would have to swing about its resting value. A mode with few such swings is followed
    densely; one with many is looked at where it is at its own extremes, over all time scales: then the second result
    is true, and the neighbourhood of the best wants another look. None where the first swings are all there is to see.
    """
    amplitude, p = _amplitudes(pieces, k), pieces.poles
    ringing = np.abs(p.imag) > 0.1 * np.abs(p.real)
    end = np.minimum(_fall(amplitude, p, room), pieces.length(k))
    found, sparse = [], False
    for i in np.flatnonzero(ringing.any(axis=0)):
        own = _fall(amplitude[:, i, None], p[:, i, None], 1e-10 * np.abs(best))
        until = np.minimum(end, np.where(amplitude[:, i] > 0, own, 0.0))
        swings = float((until * np.abs(p[:, i].imag)).max(initial=0.0)) / (2.0 * np.pi)
        if swings * _PER_SWING > _MOST:
            found.append(_own_extremes(pieces, k, int(i), until))
            found.append(np.minimum(_swings(p[:, i], _MOST)[:, _FIRST:], until[:, None]))
            sparse = True
        elif swings * _PER_SWING > _FIRST:
            number = int(np.ceil(swings * _PER_SWING))
            found.append(np.minimum(_swings(p[:, i], number)[:, _FIRST:], until[:, None]))
    return (np.sort(np.concatenate(found, axis=1), axis=1) if found else None), sparse


def _own_extremes(pieces: Pieces, k: int, i: int, until: FloatArray) -> FloatArray:
    """Times at which mode i alone is greatest or least, near times even in the logarithm up to `until`: (V, T)."""
    p = pieces.poles[:, i]
    safe = np.where(p == 0, 1.0, p)
    r, u, m = pieces.residues[:, i], pieces.level[:, k], pieces.rate[:, k]
    swing = pieces.state[:, k, i] + r * u / safe + r * m / safe**2
    turning = np.maximum(np.abs(p.imag), 1e-300)
    first = np.minimum(2.0 * np.pi / turning, np.maximum(until, 1e-300))
    decades = float(np.log10(np.maximum(until, first) / first).max())
    shares = np.linspace(0.0, 1.0, int(np.ceil(decades * _LATE_PER_DECADE)) + 2)
    coarse = first[:, None] * (np.maximum(until, first) / first)[:, None] ** shares
    phase = np.angle(swing)[:, None] + turning[:, None] * coarse
    to_top = np.mod(-phase, 2.0 * np.pi)
    to_bottom = np.mod(np.pi - phase, 2.0 * np.pi)
    times = [coarse + to / turning[:, None] for to in (to_top, to_bottom)]
    return np.asarray(np.minimum(np.concatenate(times, axis=1), until[:, None]))


def _windows(pieces: Pieces, found: Samples, about: FloatArray, sign: float) -> FloatArray:
    """Times (V, T) about the best samples of different stretches, dense for the fastest ringing mode."""
    p = pieces.poles
    turning = np.where(np.abs(p.imag) > 0.1 * np.abs(p.real), np.abs(p.imag), 0.0).max(axis=1)
    score = _score(found.value, about[:, None], sign)
    stretches = np.array_split(np.arange(score.shape[1]), _STRETCHES)
    tops = np.stack([part[score[:, part].argmax(axis=1)] for part in stretches], axis=1)
    rank = np.argsort(-np.take_along_axis(score, tops, 1), axis=1)[:, :_RIVALS]
    centre = np.take_along_axis(found.tau, np.take_along_axis(tops, rank, 1), 1)
    step = 2.0 * np.pi / _PER_SWING / np.maximum(turning, 1e-300)
    steps = np.arange(-_MOST // (2 * _RIVALS), _MOST // (2 * _RIVALS))
    times = centre[:, :, None] + step[:, None, None] * steps
    return np.asarray(np.clip(times.reshape(len(times), -1), 0.0, pieces.length(found.piece)[:, None]))


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

    The time is infinite where the greatest is only approached. `rough`, for a first search, looks at the first swings
    alone and leaves extremes between samples at what the cubic through the samples says.
    """
    best_time = np.full(pieces.count, np.inf)
    final = pieces.final()
    best = _score(final, about, sign)
    best = np.where(np.isnan(best), -np.inf, best)
    for k in range(pieces.start.shape[1]):
        found: Samples | None = sample(pieces, k, rough=rough)
        while found is not None:
            times, scores = _best_of(pieces, found, about, sign, rough)
            better = scores > best * (1.0 + 1e-13 * np.sign(best))
            best = np.where(better, scores, best)
            best_time = np.where(better, pieces.start[:, k] + times, best_time)
            found = None if rough else _next_look(pieces, found, best, about, sign)
    if pieces.jumps:
        best = np.where(pieces.slope != 0, np.inf, best)
    return best_time, best


def _next_look(pieces: Pieces, found: Samples, best: FloatArray, about: FloatArray, sign: float) -> Samples | None:
    """After the first swings, later ones that could still beat `best`; after those, the neighbourhood of the best."""
    k = found.piece
    tau, sparse = None, False
    if found.look == 0:
        tau, sparse = _follow(pieces, k, np.maximum(best - _resting(pieces, k, about, sign), 0.0), best)
    elif found.look == 1 and found.sparse:
        tau = np.sort(_windows(pieces, found, about, sign), axis=1)
    if tau is None:
        return None
    seen = _sampled(pieces, k, tau)
    return Samples(k, seen.tau, seen.value, seen.moved, found.look + 1, sparse)


def _resting(pieces: Pieces, k: int, about: FloatArray, sign: float) -> FloatArray:
    """The greatest score of the value about which v swings in piece k, (V,)."""
    still = pieces.poles == 0
    rest = np.where(still, 0.0, -pieces.residues / np.where(still, 1.0, pieces.poles)).sum(axis=1).real
    levels = [pieces.level[:, k], pieces.level[:, k] + pieces.rate[:, k] * _short(pieces, k)]
    return np.asarray(np.max([_score((rest + pieces.direct) * u + pieces.offset, about, sign) for u in levels], axis=0))


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
    if not rough:
        best = _score(pieces.local(found.piece, time[:, None])[0], about[:, None], sign)[:, 0]
    turns = found.moved[:, :-1] * found.moved[:, 1:] < 0
    reach = np.where(turns, _score(_swell(pieces, found), about[:, None], sign), -np.inf)
    number = min(_CANDIDATES, reach.shape[1])
    if not number or not turns.any():
        return time, best
    if rough:
        top = reach.argmax(axis=1)
        better = reach[rows, top] > best
        return np.where(better, found.tau[rows, top], time), np.where(better, reach[rows, top], best)
    for beside in (top, np.maximum(top, 1) - 1):  # where the greatest sample itself is next to a turn
        at = np.minimum(beside, reach.shape[1] - 1)
        reach[rows, at] = np.where(turns[rows, at], np.inf, reach[rows, at])
    choice = np.argpartition(-reach, number - 1, axis=1)[:, :number]
    choice = np.where(np.take_along_axis(turns, choice, 1), choice, reach.argmax(axis=1)[:, None])
    tau = polish_turn(pieces, found, choice)
    value, _ = pieces.local(found.piece, tau)
    value = np.where(np.take_along_axis(turns, choice, 1), value, np.nan)
    score = np.nan_to_num(_score(value, about[:, None], sign), nan=-np.inf)
    top = score.argmax(axis=1)
    better = score[rows, top] > best
    return np.where(better, tau[rows, top], time), np.where(better, score[rows, top], best)


def _swell(pieces: Pieces, found: Samples) -> FloatArray:
    """The value at the turn of the cubic through each pair of samples, (V, T − 1).

    Where it has none, or the samples lie too far apart for the fastest ringing mode to be told from them, the value of
    the end that is farther from the middle.
    """
    h = np.diff(found.tau, axis=1)
    a, b = found.value[:, :-1], found.value[:, 1:]
    da, db = found.moved[:, :-1] * h, found.moved[:, 1:] * h
    c3, c2 = 2 * (a - b) + da + db, 3 * (b - a) - 2 * da - db
    root = np.sqrt(np.maximum(c2 * c2 - 3 * c3 * da, 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        q = -(c2 + np.copysign(root, c2))
        x = np.stack([q / (3 * c3), da / q])
    ringing = np.where(np.abs(pieces.poles.imag) > 0.1 * np.abs(pieces.poles.real), np.abs(pieces.poles.imag), 0.0)
    near = h * ringing.max(axis=1, initial=0.0)[:, None] < 1.0
    x = np.where((x >= 0) & (x <= 1) & near, x, np.where(np.abs(b) > np.abs(a), 1.0, 0.0))
    value = a + x * (da + x * (c2 + x * c3))
    middle = 0.5 * (a + b)
    far = np.abs(value - middle).argmax(axis=0)
    return np.asarray(np.take_along_axis(value, far[None], axis=0)[0])


def polish_turn(pieces: Pieces, found: Samples, choice: NDArray[np.intp]) -> FloatArray:
    """The time of the extreme between samples `choice` and `choice` + 1, (V, c), to the last digits."""
    low = np.take_along_axis(found.tau, choice, 1)
    high = np.take_along_axis(found.tau, choice + 1, 1)
    return bracketed_root(lambda tau: pieces.local(found.piece, tau)[1], low, high, 1e-9)


def polish_crossing(
    pieces: Pieces, k: NDArray[np.intp], low: FloatArray, high: FloatArray, level: FloatArray
) -> FloatArray:
    """Where v passes `level` (V,) between times `low` and `high` (V,) of pieces k (V,)."""

    def above(tau: FloatArray) -> FloatArray:
        return pieces.gathered(k[:, None], tau)[0] - level[:, None]

    return bracketed_root(above, low[:, None], high[:, None])[:, 0]


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
    hidden = turns & ~outside[:, 1:] & (np.abs(_swell(pieces, found) - about[:, None]) > 0.9 * within[:, None])
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
    hidden = turns & ((_swell(pieces, found) - level[:, None]) * side[:, None] < 0) & ~reached[:, :-1] & ~reached[:, 1:]
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
