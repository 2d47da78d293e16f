"""Responses over time from poles and residues: steps, ramps, pulses, repeated pulses, sines.

Everything here accepts a `PoleResidue` with or without a leading axis of sets of values; results are floats and
(T,) arrays without it, (V,) and (V, T) arrays with it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from reactance.analysis.circuit import features
from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.modal import PoleResidue, expand, first
from reactance.analysis.circuit.motion import Pieces, settle_pieces
from reactance.analysis.circuit.network import ComplexArray, FloatArray, Network, Parameter
from reactance.analysis.circuit.phi import phi

Number = float | FloatArray
Modes = tuple[ComplexArray, ComplexArray, FloatArray, FloatArray]

_RIVALS = 2  # local maxima over the repetition rate that are followed to their top


@dataclass(frozen=True, slots=True)
class Extreme:
    """`size` as asked for and the `time` at which it occurs (infinite where it is only approached)."""

    time: Number
    size: Number


@dataclass(frozen=True, slots=True)
class TimeResponse:
    """A voltage over time after rest at 0 V, exact at any t. Times in s, voltages in V."""

    pieces: Pieces
    batched: bool

    def value(self, t: ArrayLike) -> FloatArray:
        """v at times t (T,): (T,) or (V, T). Before t = 0 it is 0; at a jump, the value after it."""
        times = np.broadcast_to(np.atleast_1d(np.asarray(t, float)), (self.pieces.count, np.size(t)))
        period = self.pieces.period[:, None]
        repeats = np.isfinite(period)
        local = np.where(repeats, np.mod(times, np.where(repeats, period, 1.0)), times)
        k = (local[:, :, None] >= self.pieces.start[:, None, :]).sum(axis=2) - 1
        started = k >= 0
        k = np.maximum(k, 0)
        tau = np.where(started, local - np.take_along_axis(self.pieces.start, k, 1), 0.0)
        out, done = [], 0
        for part in self.pieces.portions(times.shape[1]):
            here = slice(done, done + part.count)
            out.append(part.gathered(k[here], tau[here])[0])
            done += part.count
        v = np.where(started, np.concatenate(out), 0.0)
        return v if self.batched else v[0]

    @property
    def initial(self) -> Number:
        """v just after t = 0."""
        return self._out(self.pieces.local(0, np.zeros((self.pieces.count, 1)))[0][:, 0])

    @property
    def final(self) -> Number:
        """v as t grows without bound: inf where it keeps growing, NaN where it repeats for ever."""
        return self._out(self.pieces.final())

    def peak(self, about: ArrayLike = 0.0, *, rough: bool = False) -> Extreme:
        """The greatest |v(t) − about| over t > 0; `rough`, for comparing many, from the first swings alone."""
        return self._extreme(about, 0.0, rough)

    def highest(self, about: ArrayLike = 0.0) -> Extreme:
        """The greatest v(t) − about over t > 0."""
        return self._extreme(about, 1.0)

    def lowest(self, about: ArrayLike = 0.0) -> Extreme:
        """The least v(t) − about over t > 0."""
        found = self._extreme(about, -1.0)
        return Extreme(found.time, -found.size)

    def farthest(self) -> Number:
        """The value of v farthest from 0, with its sign."""
        high, low = np.atleast_1d(self.highest().size), np.atleast_1d(self.lowest().size)
        return self._out(np.where(high >= -low, high, low))

    def settling_time(self, within: ArrayLike, about: ArrayLike | None = None) -> Number:
        """The last time at which |v − v(∞)| (or |v − about|) is greater than `within`: 0 if never, inf if always."""
        centre = self.pieces.final() if about is None else self._each(about)
        return self._out(features.last_outside(self.pieces, centre, self._each(within)))

    def first_crossing(self, level: ArrayLike) -> Number:
        """The first time at which v reaches `level`; inf if it never does."""
        return self._out(features.first_passing(self.pieces, self._each(level)))

    def rise_time(self, low: float = 0.1, high: float = 0.9) -> Number:
        """From first reaching `low` of the final value to first reaching `high` of it."""
        final = self.pieces.final()
        return self._out(
            features.first_passing(self.pieces, high * final) - features.first_passing(self.pieces, low * final)
        )

    def _extreme(self, about: ArrayLike, sign: float, rough: bool = False) -> Extreme:
        time, size = features.greatest(self.pieces, self._each(about), sign, rough=rough)
        return Extreme(self._out(time), self._out(size))

    def _each(self, x: ArrayLike) -> FloatArray:
        return np.broadcast_to(np.asarray(x, float), (self.pieces.count,))

    def _out(self, x: FloatArray) -> Number:
        return x if self.batched else float(x[0])


def step(response: PoleResidue, amplitude: float = 1.0) -> TimeResponse:
    """The input jumps from 0 to `amplitude` at t = 0 and stays."""
    return _response(response, [0.0], [amplitude], [0.0])


def ramp(response: PoleResidue, amplitude: float, rise: float) -> TimeResponse:
    """The input rises evenly from 0 to `amplitude` in `rise` seconds and stays; with rise 0 it jumps."""
    if rise == 0:
        return step(response, amplitude)
    return _response(response, [0.0, rise], [0.0, amplitude], [amplitude / rise, 0.0])


def pulse(response: PoleResidue, width: float, amplitude: float = 1.0) -> TimeResponse:
    """The input is `amplitude` for 0 ≤ t < `width`, else 0."""
    return _response(response, [0.0, width], [amplitude, 0.0], [0.0, 0.0])


def modes_of(response: PoleResidue) -> Modes:
    """Poles on and above the real axis with doubled residues above it: half the work for the same real part."""
    poles, residues = np.atleast_2d(response.poles), np.atleast_2d(response.residues)
    residues = residues * np.where(poles.imag > 0, 2.0, np.where(poles.imag < 0, 0.0, 1.0))
    still = poles == 0
    weight = np.where(still, 0.0, np.abs(residues) / np.where(still, 1.0, np.abs(poles)))
    total = weight.sum(axis=1, keepdims=True) + np.abs(np.atleast_1d(response.direct))[:, None]
    keep = ((weight > 1e-18 * total) | (still & (residues != 0))).any(axis=0)
    return (
        poles[:, keep],
        residues[:, keep],
        np.atleast_1d(np.asarray(response.direct, float)),
        np.atleast_1d(np.asarray(response.slope, float)),
    )


def _response(
    response: PoleResidue, start: Sequence[float], level: Sequence[float], rate: Sequence[float]
) -> TimeResponse:
    return TimeResponse(settle_pieces(modes_of(response), start, level, rate), response.batched)


def start_response(
    network: Network,
    probe: str | tuple[str, str],
    *,
    parameters: Sequence[Parameter] = (),
    values: ArrayLike | None = None,
    family: Family | None = None,
) -> TimeResponse:
    """The probe's voltage when all sources step from 0 to their DC level at t = 0, every capacitor empty."""
    found = expand(family or Family(network, parameters), None, probe, values)
    return step(found if values is not None else first(found))


def trapezoid(response: PoleResidue, amplitude: float, rise: float, frequency: ArrayLike) -> TimeResponse:
    """The steady state under an input that repeats: up from 0 to `amplitude` in `rise`, hold, down, hold.

    Half the time each at `frequency` (a number, or (V,) with a batched response). t = 0 is the start of a rise. Where
    the response to a constant input grows without bound, its mean is taken as 0.
    """
    pieces = steady_state(modes_of(response), amplitude, rise, np.asarray(frequency, float), halves=2)
    dc = np.real(np.atleast_2d(_dc(response)))[:, 0] * amplitude / 2.0
    whole = Pieces(
        pieces.poles, pieces.residues, pieces.direct, pieces.slope, np.where(np.isfinite(dc), dc, 0.0),
        pieces.start, pieces.level, pieces.rate, pieces.state, pieces.period, pieces.jumps,
    )  # fmt: skip
    return TimeResponse(whole, response.batched)


def _dc(response: PoleResidue) -> ComplexArray:
    poles = np.atleast_2d(response.poles)
    terms = np.where(poles == 0, 0.0, -np.atleast_2d(response.residues) / np.where(poles == 0, 1.0, poles))
    return np.asarray(terms.sum(axis=1, keepdims=True) + np.atleast_1d(response.direct)[:, None])


def steady_state(
    modes: Modes,
    amplitude: float,
    rise: float,
    frequency: FloatArray,
    halves: int,
) -> Pieces:
    """The periodic motion about its mean: in closed form from z(T/2) = −z(0), which the symmetry of the input gives."""
    poles, residues, direct, slope = modes
    half = np.broadcast_to(0.5 / frequency, (len(poles),))
    half_amplitude = 0.5 * amplitude
    edge = np.minimum(np.full(len(poles), rise), half)
    hold = half - edge
    steep = amplitude / edge if rise > 0 else np.zeros(len(poles))
    power, one, two = phi(poles * edge[:, None], True)
    assert two is not None
    t = edge[:, None]
    gained = residues * (-half_amplitude * t * one + steep[:, None] * t * t * two)
    held, held_one, _ = phi(poles * hold[:, None], False)
    gained = gained * held + residues * half_amplitude * hold[:, None] * held_one
    state = -gained / (1.0 + power * held)
    high = np.full(len(poles), half_amplitude)
    none = np.zeros(len(poles))
    if rise > 0:
        start = [none, edge, half, half + edge]
        level, rate = [-high, high, high, -high], [steep, none, -steep, none]
    else:
        start, level, rate = [none, half], [high, -high], [none, none]
    number = len(start) * halves // 2
    return settle_pieces(
        (poles, residues, direct, slope),
        np.stack(start[:number], axis=1),
        np.stack(level[:number], axis=1),
        np.stack(rate[:number], axis=1),
        state=state,
        period=half * halves,
    )


@dataclass(frozen=True, slots=True)
class SineResponse:
    """The response to amplitude·sin(2πft) from rest; `ratio` and `lag` (radians, positive = late) once settled."""

    response: PoleResidue
    frequency: float
    amplitude: float

    @property
    def gain(self) -> complex:
        """Out over in, complex."""
        return complex(self.response.at(np.array([2j * np.pi * self.frequency]))[0])

    @property
    def ratio(self) -> float:
        """Output amplitude over input amplitude."""
        return abs(self.gain)

    @property
    def lag(self) -> float:
        """Phase by which the output is behind, in radians, within (−π, π]."""
        return float(-np.angle(self.gain))

    def settled(self, t: ArrayLike) -> FloatArray:
        """The sine that the output settles to."""
        turn = np.exp(2j * np.pi * self.frequency * np.asarray(t, float))
        return np.asarray(self.amplitude * (self.gain * turn).imag)

    def value(self, t: ArrayLike) -> FloatArray:
        """The output from rest at t = 0."""
        times = np.asarray(t, float)
        w, p, r = 2j * np.pi * self.frequency, self.response.poles, self.response.residues
        x = (w - p) * times[:, None]
        near = np.abs(x) < 1.0
        swing = np.exp(p * times[:, None]) * times[:, None] * phi(np.where(near, x, 0.0), False)[1]
        apart = (np.exp(w * times[:, None]) - np.exp(p * times[:, None])) / np.where(w == p, 1.0, w - p)
        z = (r * np.where(near, swing, apart)).sum(axis=1)
        direct = (self.response.direct + w * self.response.slope) * np.exp(w * times)
        return np.where(times < 0, 0.0, self.amplitude * (z + direct).imag)


def sine(response: PoleResidue, frequency: float, amplitude: float = 1.0) -> SineResponse:
    """The response to a sine that starts at t = 0; for a response without a batch axis."""
    if response.batched:
        raise ValueError("a sine is shown for one set of values")
    return SineResponse(response, frequency, amplitude)
