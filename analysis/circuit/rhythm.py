"""The repetition rate at which a load that keeps switching moves a voltage most.

For the first set of values the whole band is searched; its best rates, each tied to the ringing mode whose odd
subharmonic it is, say where to look for the others, whose modes differ by little. The search goes by rough sizes;
the size at the rate found is exact.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reactance.analysis.circuit import features
from reactance.analysis.circuit.modal import PoleResidue
from reactance.analysis.circuit.network import ComplexArray, FloatArray
from reactance.analysis.circuit.search import polish
from reactance.analysis.circuit.transient import Modes, modes_of, steady_state

_RIVALS = 3
_PER_DECADE = 4
_TIED = 0.2  # how near an odd subharmonic of a mode a rate has to be to move with that mode
_AROUND = np.array([-0.8, 0.0, 0.8])
_RIVAL = 0.85  # a rate whose excursion is below this share of the greatest is no rival for near sets of values


@dataclass(frozen=True, slots=True)
class Rhythm:
    """The best rates (R,) in Hz over the whole band of one set of values, each with the pole of its mode (R,) or 0."""

    amplitude: float
    rise: float
    low: float
    high: float
    rates: FloatArray
    poles: ComplexArray

    @classmethod
    def of(cls, response: PoleResidue, amplitude: float, rise: float, low: float, high: float) -> Rhythm:
        """Search [low, high] Hz for a load between 0 and `amplitude` with linear edges of `rise` seconds.

        Half the time each. Of a batch, its first set of values is searched.
        """
        modes = modes_of(response)
        first = (modes[0][:1], modes[1][:1], modes[2][:1], modes[3][:1])
        rates = _whole_band(first, amplitude, rise, low, high)
        return cls(amplitude, rise, low, high, rates, np.array([_mode_of(rate, modes[0][0]) for rate in rates]))

    def worst(self, response: PoleResidue, *, rough: bool = False) -> tuple[FloatArray, FloatArray]:
        """The rate (V,) in Hz and the greatest |v − mean| (V,) in the steady state there; `rough` to compare many."""
        modes = modes_of(response)
        near = self._followed(modes[0])
        size = _excursion(modes, self.amplitude, self.rise, near, rough=True)
        rate = _vertex(near, size)
        return rate, _excursion(modes, self.amplitude, self.rise, rate[:, None], rough=rough)[:, 0]

    def _followed(self, poles: ComplexArray) -> FloatArray:
        """Rates to look at (V, F): about each of `rates`, moved as the mode that it belongs to moves."""
        count = len(poles)
        found: list[FloatArray] = []
        for rate, mode in zip(self.rates, self.poles, strict=True):
            scale, width = np.ones(count), np.full(count, 0.1)
            if mode.imag:
                nearest = np.abs(poles - mode).argmin(axis=1)
                own = poles[np.arange(count), nearest]
                turning = np.where(own.imag != 0, np.abs(own.imag), abs(mode.imag))
                scale = turning / abs(mode.imag)
                width = np.clip(np.abs(own.real) / turning, 1e-4, 0.1)
            found.append(rate * scale[:, None] * (1.0 + width[:, None] * _AROUND))
        return np.asarray(np.sort(np.clip(np.concatenate(found, axis=1), self.low, self.high), axis=1))


def _mode_of(rate: float, poles: ComplexArray) -> complex:
    """The ringing pole of which `rate` is nearly an odd subharmonic; 0 where there is none."""
    turning = np.abs(poles.imag) / (2.0 * np.pi)
    times = turning / rate
    odd = np.maximum(2.0 * np.round((times - 1.0) / 2.0) + 1.0, 1.0)
    miss = np.where(turning > 0, np.abs(times / odd - 1.0) * odd, np.inf)
    return complex(poles[miss.argmin()]) if miss.size and miss.min() < _TIED else 0j


def _excursion(modes: Modes, amplitude: float, rise: float, f: FloatArray, *, rough: bool) -> FloatArray:
    """The greatest |v − mean| (V, F) at rates f (V, F)."""
    times = f.shape[1]
    poles, residues = np.repeat(modes[0], times, axis=0), np.repeat(modes[1], times, axis=0)
    direct, slope = np.repeat(modes[2], times), np.repeat(modes[3], times)
    pieces = steady_state((poles, residues, direct, slope), amplitude, rise, f.ravel(), halves=1)
    return np.asarray(features.greatest(pieces, np.zeros(pieces.count), 0.0, rough=rough)[1].reshape(f.shape))


def _whole_band(first: Modes, amplitude: float, rise: float, low: float, high: float) -> FloatArray:
    """The best few rates (R,) of one set of values, from an even grid and the odd subharmonics of ringing modes."""
    poles = first[0][0]
    found = [np.geomspace(low, high, max(9, int(_PER_DECADE * np.log10(high / low))))]
    for pole in poles[np.abs(poles.imag) > 0.3 * np.abs(poles.real)]:
        turning = abs(pole.imag) / (2.0 * np.pi)
        width = min(abs(pole.real / pole.imag), 0.2)
        start = 2 * int(np.ceil(max(turning / high - 1.0, 0.0) / 2.0)) + 1
        for odd in (start, start + 2):
            found.append(turning / odd * (1.0 + width * np.array([-1.0, -0.3, 0.0, 0.3, 1.0])))
    f = np.concatenate(found)
    f = np.unique(np.clip(f, low, high))[None, :]
    size = _excursion(first, amplitude, rise, f, rough=True)
    padded = np.pad(size, ((0, 0), (1, 1)), constant_values=-np.inf)
    peaks = np.where((size >= padded[:, :-2]) & (size > padded[:, 2:]), size, -np.inf)
    choice = np.argsort(-peaks, axis=1)[:, : min(_RIVALS, f.shape[1])]
    at, top = polish(lambda x: _excursion(first, amplitude, rise, x, rough=True), f, size, choice, 1.0, 2e-3)
    return np.asarray(at[0][top[0] >= _RIVAL * top[0].max()])


def _vertex(f: FloatArray, size: FloatArray) -> FloatArray:
    """The top (V,) of the parabola through the greatest point and its neighbours; the point itself at an end."""
    rows, top = np.arange(len(f)), size.argmax(axis=1)
    inner = np.clip(top, 1, f.shape[1] - 2)
    a, b, c = (f[rows, inner + k] for k in (-1, 0, 1))
    ya, yb, yc = (size[rows, inner + k] for k in (-1, 0, 1))
    with np.errstate(divide="ignore", invalid="ignore"):
        p = (b - a) ** 2 * (yb - yc) - (b - c) ** 2 * (yb - ya)
        vertex = b - 0.5 * p / ((b - a) * (yb - yc) - (b - c) * (yb - ya))
    usable = np.isfinite(vertex) & (vertex > a) & (vertex < c) & (inner == top)
    return np.asarray(np.where(usable, vertex, f[rows, top]))
