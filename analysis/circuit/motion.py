"""A voltage over time, exact at any t: modes of a network driven by an input made of straight pieces.

Each mode obeys z′ = p·z + r·u(t), and v = Σ z + d·u + e·u′. Over a piece u = u0 + m·τ the solution is
z(τ) = z0·exp(pτ) + r·(u0·τ·φ1(pτ) + m·τ²·φ2(pτ)): closed form, no time stepping, no difference of large terms.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.circuit.network import ComplexArray, FloatArray
from reactance.analysis.circuit.phi import phi

_MOST_TERMS = 200_000  # entries of one work array: what stays in the processor's cache
_LOST = 1e-9  # share of the greatest value that rounding may take of a sample before it is taken the slower way
_GONE = 1e-18  # share of all modes' amplitudes below which a mode no longer shows


@dataclass(frozen=True, slots=True)
class Pieces:
    """The modes and the input. V sets of values, K pieces, n modes (those with Im p ≥ 0, residues doubled off axis).

    poles, residues (V, n); direct, slope, offset (V,); start (V, K); level and rate of the input (V, K); state
    (V, K, n) at the start of each piece; period (V,), infinite where the motion does not repeat; jumps: whether the
    input jumps (with `slope` that is an impulse).
    """

    poles: ComplexArray
    residues: ComplexArray
    direct: FloatArray
    slope: FloatArray
    offset: FloatArray
    start: FloatArray
    level: FloatArray
    rate: FloatArray
    state: ComplexArray
    period: FloatArray
    jumps: bool

    @property
    def count(self) -> int:
        """How many sets of values."""
        return len(self.poles)

    def length(self, k: int) -> FloatArray:
        """Length of piece k, (V,); infinite for the last one of a motion that does not repeat."""
        end = self.start[:, k + 1] if k + 1 < self.start.shape[1] else self.period
        return np.asarray(end - self.start[:, k])

    def local(self, k: int, tau: FloatArray) -> tuple[FloatArray, FloatArray]:
        """v and dv/dt of piece k at times tau (V, T) after its start."""
        return self._evaluate(
            tau, self.state[:, k, None, :], self.level[:, k, None], self.rate[:, k, None], bool(self.rate[:, k].any())
        )

    def sampled(self, k: int, tau: FloatArray) -> tuple[FloatArray, FloatArray]:
        """v and dv/dt as `local`, but to within 1e-9 of the greatest |v| only: v = Re Σ A·exp(pτ) + a polynomial."""
        values, slopes = np.empty_like(tau), np.empty_like(tau)
        size = max(1, _MOST_TERMS // max(1, tau.shape[1] * self.poles.shape[1]))
        for first in range(0, self.count, size):
            rows = slice(first, first + size)
            part = self if size >= self.count else self.rows(rows)
            values[rows], slopes[rows], lost = part._summed(k, tau[rows])
            if lost.any():
                again = np.flatnonzero(lost)
                values[first + again], slopes[first + again] = self.rows(first + again).local(k, tau[first + again])
        return values, slopes

    def _summed(self, k: int, tau: FloatArray) -> tuple[FloatArray, FloatArray, NDArray[np.bool_]]:
        """v, dv/dt (V, T), and for which sets of values too many digits are lost (V,)."""
        p, u, m = self.poles, self.level[:, k, None], self.rate[:, k, None]
        still = p == 0
        safe = np.where(still, 1.0, p)
        lag = np.where(still, 0.0, self.residues / safe)
        rest = lag * (u + m / safe)
        z = self.state[:, k]
        swing = np.where(still, 0.0, z + rest)
        drift = np.where(still, self.residues, 0.0).real.sum(axis=1)
        once = self.direct * m[:, 0] + drift * u[:, 0] - (lag * m).sum(axis=1).real
        twice = 0.5 * drift * m[:, 0]
        level = self.direct * u[:, 0] + self.slope * m[:, 0] + self.offset + np.where(still, z, -rest).sum(axis=1).real
        value, moved = _modes_at(p, swing, tau)
        value += level[:, None] + tau * (once[:, None] + tau * twice[:, None])
        moved += once[:, None] + 2.0 * tau * twice[:, None]
        noise = 2.0**-52 * (np.abs(swing) + np.abs(rest)).sum(axis=1)
        return value, moved, ~(noise <= _LOST * np.abs(value).max(axis=1, initial=0.0))

    def gathered(self, k: NDArray[np.intp], tau: FloatArray) -> tuple[FloatArray, FloatArray]:
        """v and dv/dt at times tau (V, T) after the start of pieces k (V, T)."""
        rows = np.arange(self.count)[:, None]
        level, rate = self.level[rows, k], self.rate[rows, k]
        return self._evaluate(tau, self.state[rows, k], level, rate, bool(rate.any()))

    def _evaluate(
        self, tau: FloatArray, state: ComplexArray, level: FloatArray, rate: FloatArray, ramp: bool
    ) -> tuple[FloatArray, FloatArray]:
        p, r, t = self.poles[:, None, :], self.residues[:, None, :], tau[..., None]
        power, one, two = phi(p * t, ramp)
        z = state * power + r * (level[..., None] * t * one)
        if two is not None:
            z = z + r * (rate[..., None] * t * t * two)
        u = level + rate * tau
        moved = (p * z + r * u[..., None]).sum(axis=-1).real + self.direct[:, None] * rate
        value = z.sum(axis=-1).real + self.direct[:, None] * u + self.slope[:, None] * rate + self.offset[:, None]
        return np.asarray(value), np.asarray(moved)

    def rows(self, where: slice | NDArray[np.intp]) -> Pieces:
        """Some of the sets of values."""
        names = ("poles", "residues", "direct", "slope", "offset", "start", "level", "rate", "state", "period")
        return replace(self, **{name: getattr(self, name)[where] for name in names})

    def portions(self, points: int) -> Iterator[Pieces]:
        """The sets of values in portions small enough to be evaluated at `points` times at once."""
        size = max(1, _MOST_TERMS // max(1, points * self.poles.shape[1]))
        for first in range(0, self.count, size):
            yield self.rows(slice(first, first + size))

    def final(self) -> FloatArray:
        """v as t grows without bound, (V,): infinite where it keeps growing, NaN where it repeats for ever."""
        u, m, p = self.level[:, -1], self.rate[:, -1], self.poles
        still = p == 0
        rest = np.where(still, self.state[:, -1], -self.residues * u[:, None] / np.where(still, 1.0, p))
        grows = (still & (np.abs(self.residues * u[:, None]) > 0)).any(axis=1) | (m != 0) | (p.real > 0).any(axis=1)
        value = rest.sum(axis=1).real + self.direct * u + self.offset
        return np.where(np.isfinite(self.period), np.nan, np.where(grows, np.inf, value))


def _modes_at(p: ComplexArray, swing: ComplexArray, tau: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Re Σ swing·exp(pτ) and its slope, (V, T), for p and swing (V, n)."""
    turning = (p.imag != 0).any(axis=0)
    moved = p * swing
    both = np.stack([swing, moved], axis=-1)  # (V, n, 2)
    total = np.zeros((*tau.shape, 2))
    if not turning.all():
        decay = np.exp(tau[:, :, None] * p.real[:, None, ~turning])
        total += decay @ both.real[:, ~turning]
    if turning.any():
        q, x = p[:, turning], both[:, turning]
        decay = np.exp(tau[:, :, None] * q.real[:, None, :])
        shows = decay * np.abs(swing[:, None, turning]) > _GONE * np.abs(swing).sum(axis=1)[:, None, None]
        phase = tau[:, :, None] * q.imag[:, None, :]
        for function, part in ((np.cos, x.real), (np.sin, -x.imag)):
            wave = function(phase, out=np.zeros_like(phase), where=shows)
            wave *= decay
            total += wave @ part
    return total[..., 0], total[..., 1]


def settle_pieces(
    modes: tuple[ComplexArray, ComplexArray, FloatArray, FloatArray],
    start: ArrayLike,
    level: ArrayLike,
    rate: ArrayLike,
    *,
    state: ComplexArray | None = None,
    offset: FloatArray | None = None,
    period: FloatArray | None = None,
) -> Pieces:
    """Pieces of an input given by start, level and rate, each (K,) or (V, K), with the states carried through.

    `modes` are poles, residues (V, n), direct and slope (V,); `state` (V, n) at the first start, 0 by default.
    """
    poles, residues, direct, slope = modes
    count = len(poles)
    starts, levels, rates = (
        np.broadcast_to(np.atleast_2d(np.asarray(x, float)), (count, np.atleast_2d(x).shape[1]))
        for x in (start, level, rate)
    )
    z = np.zeros_like(residues) if state is None else state
    states = [z]
    for k in range(starts.shape[1] - 1):
        t = (starts[:, k + 1] - starts[:, k])[:, None]
        power, one, two = phi(poles * t, True)
        assert two is not None
        z = z * power + residues * (levels[:, k, None] * t * one + rates[:, k, None] * t * t * two)
        states.append(z)
    before = np.zeros(count)
    jumps = bool(levels[:, 0].any()) and period is None
    for k in range(starts.shape[1] - 1):
        before = levels[:, k] + rates[:, k] * (starts[:, k + 1] - starts[:, k])
        jumps = jumps or bool((np.abs(levels[:, k + 1] - before) > 1e-9 * np.abs(before)).any())
    return Pieces(
        poles,
        residues,
        direct,
        slope,
        np.zeros(count) if offset is None else offset,
        starts,
        levels,
        rates,
        np.stack(states, axis=1),
        np.full(count, np.inf) if period is None else period,
        jumps,
    )
