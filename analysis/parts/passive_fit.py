"""A passive network for a measured impedance, to be used in time work.

Z(s) = R + s L + 1/(s C) + sum s R_k/(s + p_k) + sum r_k p_k/(s + p_k), all coefficients non-negative: a series
chain of R, L, C, of parallel R-L pairs and of parallel R-C pairs (Foster's first form). With the p_k on a
fixed logarithmic grid the impedance is linear in the coefficients, so that the best fit is a non-negative
least squares problem (Lawson and Hanson, Solving Least Squares Problems, 1974), which has one solution and
always ends. A network of non-negative R, L and C is passive by construction, so no passivity has to be
enforced on the result; what such a network cannot follow is refused with the error that it would have.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.circuit.network import Bead, Capacitor, Element, Inductor, Resistor
from reactance.analysis.quantity import QuantityError, format_quantity

POLES_PER_DECADE = 3
GREATEST_ERROR = 0.2  # root mean square, relative; a fit beyond that is no model of the part
NEGATIVE_SHARE = 0.5  # of the points with a negative resistance: the data is then no measurement of a part
NEGLIGIBLE = 1e-7  # of |Z| everywhere: a branch below that is left out


@dataclass(frozen=True, slots=True)
class PassiveFit:
    """Branches in series: `resistance` (ohm), `inductance` (H), 1/`capacitance` (F, inf where there is none),
    parallel pairs `rl` of (ohm, H) and parallel pairs `rc` of (ohm, F).

    `error` is the greatest and `rms` the root mean square of |Z_fit/Z - 1| over the data.
    """

    resistance: float
    inductance: float
    capacitance: float
    rl: tuple[tuple[float, float], ...]
    rc: tuple[tuple[float, float], ...]
    error: float
    rms: float

    def impedance(self, frequencies: ArrayLike) -> NDArray[np.complex128]:
        """The network's impedance in ohm at `frequencies` (Hz), in their shape."""
        s = 2j * np.pi * np.asarray(frequencies, dtype=float)
        z = self.resistance + s * self.inductance
        if np.isfinite(self.capacitance):
            z = z + 1.0 / (s * self.capacitance)
        for r, inductance in self.rl:
            z = z + 1.0 / (1.0 / r + 1.0 / (s * inductance))
        for r, capacitance in self.rc:
            z = z + 1.0 / (1.0 / r + s * capacitance)
        return np.asarray(z, dtype=complex)

    def elements(self, name: str, a: str, b: str) -> tuple[Element, ...]:
        """The network as elements between nodes `a` and `b`, with nodes of its own between its branches."""
        nodes = [a, *(f"{name} inner {n}" for n in range(1, len(self.rl) + len(self.rc) + 1)), b]
        ends = list(pairwise(nodes))
        first: Element
        if np.isfinite(self.capacitance):
            first = Capacitor(f"{name} C", *ends[0], self.capacitance, self.resistance, self.inductance)
        elif self.inductance:
            first = Inductor(f"{name} L", *ends[0], self.inductance, self.resistance)
        else:
            first = Resistor(f"{name} R", *ends[0], self.resistance)
        made: list[Element] = [first]
        for n, (r, inductance) in enumerate(self.rl, 1):
            made.append(Bead(f"{name} RL {n}", *ends[n], 0.0, r, inductance))
        for n, (r, c) in enumerate(self.rc, len(self.rl) + 1):
            made.append(Capacitor(f"{name} RC {n}", *ends[n], c, leakage=r))
        return tuple(made)

    def describe(self) -> str:
        """The fit and its error in words."""
        pairs = len(self.rl) + len(self.rc)
        worst, rms = format_quantity(self.error, "fraction"), format_quantity(self.rms, "fraction")
        return f"passive network of R, L, C and {pairs} pairs, within {worst} of the data ({rms} rms)"


def fit_passive(name: str, frequencies: NDArray[np.float64], z: NDArray[np.complex128]) -> PassiveFit:
    """The passive network closest to `z` (ohm, complex) at `frequencies` (Hz), in relative error.

    Raises QuantityError, naming the file, where the data is no passive part's or no such network is close.
    """
    negative = float(np.mean(z.real < 0))
    if negative > NEGATIVE_SHARE:
        share = format_quantity(negative, "fraction")
        raise QuantityError(f"{name} is not passive: its resistance is negative at {share} of the points")
    plain = _solve(frequencies, z, np.empty(0))
    fit = plain if plain.error < 1e-6 else _solve(frequencies, z, _poles(frequencies))
    if not fit.rms <= GREATEST_ERROR:
        error = format_quantity(fit.rms, "fraction")
        raise QuantityError(f"{name} has no passive network close to it: the best is off by {error} rms")
    return fit


def _poles(frequencies: NDArray[np.float64]) -> NDArray[np.float64]:
    """Pole frequencies in rad/s over the data's range."""
    low, high = 2 * np.pi * frequencies[0], 2 * np.pi * frequencies[-1]
    count = max(int(POLES_PER_DECADE * np.log10(high / low)) + 1, 2)
    return np.asarray(np.geomspace(low, high, count))


def _columns(s: NDArray[np.complex128], poles: NDArray[np.float64]) -> NDArray[np.complex128]:
    """The impedance of each branch with coefficient 1: R, L, 1/C, the R-L pairs, the R-C pairs."""
    chain = [np.ones_like(s), s, 1.0 / s]
    return np.stack([*chain, *(s / (s + p) for p in poles), *(p / (s + p) for p in poles)], axis=1)


def _solve(frequencies: NDArray[np.float64], z: NDArray[np.complex128], poles: NDArray[np.float64]) -> PassiveFit:
    from scipy.optimize import nnls  # not on the path of a cold start

    s = np.asarray(2j * np.pi * frequencies, dtype=complex)
    columns = _columns(s, poles) / np.abs(z)[:, None]
    # Columns differ by twenty orders of magnitude; scaled to one length the problem is well conditioned.
    scale = np.linalg.norm(columns, axis=0)
    scaled = columns / scale
    wanted = z / np.abs(z)
    solution, _ = nnls(np.vstack((scaled.real, scaled.imag)), np.concatenate((wanted.real, wanted.imag)))
    weights = np.max(np.abs(scaled), axis=0) * solution
    coefficients = np.where(weights > NEGLIGIBLE, solution / scale, 0.0)
    return _network(frequencies, z, coefficients, poles)


def _network(
    frequencies: NDArray[np.float64],
    z: NDArray[np.complex128],
    coefficients: NDArray[np.float64],
    poles: NDArray[np.float64],
) -> PassiveFit:
    r, inductance, elastance = (float(value) for value in coefficients[:3])
    pairs = coefficients[3:].tolist()
    n = len(poles)
    rl = tuple((a, a / p) for a, p in zip(pairs[:n], poles.tolist(), strict=True) if a > 0)
    rc = tuple((a, 1.0 / (a * p)) for a, p in zip(pairs[n:], poles.tolist(), strict=True) if a > 0)
    fit = PassiveFit(r, inductance, 1.0 / elastance if elastance else np.inf, rl, rc, 0.0, 0.0)
    errors = np.abs(fit.impedance(frequencies) / z - 1.0)
    error, rms = float(np.max(errors)), float(np.sqrt(np.mean(errors**2)))
    return PassiveFit(fit.resistance, fit.inductance, fit.capacitance, rl, rc, error, rms)
