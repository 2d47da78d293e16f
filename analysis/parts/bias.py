"""How a class II ceramic loses capacitance under DC bias: the factor k(V) and its integral.

Three forms, in order of preference: a stated curve, a stated half voltage, an estimate from geometry.
The law is Johnson's: k(V) = (1 + 7 (V/V_half)^2)^(-1/3), written so that k(V_half) = 1/2.
Source: K. M. Johnson, "Variation of dielectric constant with voltage in ferroelectrics and its application to
parametric devices", J. Appl. Phys. 33 (1962) 2826.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.parts.band import Band
from reactance.analysis.quantity import format_quantity

if TYPE_CHECKING:
    from scipy.interpolate import PchipInterpolator

VACUUM_PERMITTIVITY = 8.8541878128e-12  # F/m, CODATA 2018
RELATIVE_PERMITTIVITY = 3000.0  # class II ceramic, common practice
ACTIVE_SHARE = 0.5  # of the body's volume that is dielectric between electrodes, common practice
# Field at which half the capacitance is left, V/m. The nominal is common practice; the band contains three
# published points (distributor and maker notes): 10 uF 10 V X7R 0805 at 5 V keeps 0.50, 10 uF 10 V X7R 1206
# at 5 V keeps 0.93, 22 uF 35 V class II 1210 at 25 V keeps 0.20; they ask for 2.45, 8.13 and 1.71 V/um.
HALF_FIELD = Band(4.0e6, 1.6e6, 8.5e6)


def johnson(volts: ArrayLike, half_voltage: float) -> NDArray[np.float64]:
    """k(V) of Johnson's law; `volts` in V, any shape, either sign."""
    u = np.asarray(volts, dtype=float) / half_voltage
    return np.asarray((1.0 + 7.0 * u * u) ** (-1.0 / 3.0), dtype=float)


def johnson_integral(volts: ArrayLike, half_voltage: float) -> NDArray[np.float64]:
    """The integral of k from 0 to V in V: V * 2F1(1/3, 1/2; 3/2; -7 (V/V_half)^2), odd in V.

    The integral of (1 + x^2)^(-1/3) has no elementary form; its series is the hypergeometric function above
    (DLMF 15.2.1).
    """
    from scipy.special import hyp2f1  # not on the path of a cold start

    v = np.asarray(volts, dtype=float)
    return np.asarray(v * hyp2f1(1.0 / 3.0, 0.5, 1.5, -7.0 * (v / half_voltage) ** 2), dtype=float)


@dataclass(frozen=True, slots=True)
class NoBias:
    """A capacitor that keeps its capacitance under bias, or one of which nothing is known (`unknown`)."""

    unknown: bool = False

    def factor(self, volts: float) -> Band:
        """Exactly 1 at any voltage."""
        return Band.exact(1.0)

    def nominal(self, volts: ArrayLike) -> NDArray[np.float64]:
        """Ones in the shape of `volts`."""
        return np.ones_like(np.asarray(volts, dtype=float))

    def integral(self, volts: ArrayLike) -> NDArray[np.float64]:
        """The voltage itself."""
        return np.array(volts, dtype=float)

    def describe(self, volts: float) -> str:
        """Nothing to say, unless the loss is unknown."""
        return "not known: neither package, bias curve nor half voltage is stated" if self.unknown else ""


@dataclass(frozen=True, slots=True)
class HalfVoltage:
    """Johnson's law with a stated half voltage (an exact band) or one estimated from geometry."""

    half_voltage: Band
    package: str = ""

    @property
    def is_estimate(self) -> bool:
        """Whether the half voltage comes from geometry."""
        return not self.half_voltage.is_exact

    def factor(self, volts: float) -> Band:
        """k(V) with its extremes: the lower the half voltage, the greater the loss."""
        half = self.half_voltage
        return Band(*(float(johnson(volts, v)) for v in (half.nominal, half.low, half.high)))

    def nominal(self, volts: ArrayLike) -> NDArray[np.float64]:
        """k(V) at the nominal half voltage, in the shape of `volts`."""
        return johnson(volts, self.half_voltage.nominal)

    def integral(self, volts: ArrayLike) -> NDArray[np.float64]:
        """The integral of k from 0 to each of `volts`, in V."""
        return johnson_integral(volts, self.half_voltage.nominal)

    def describe(self, volts: float) -> str:
        """Where the law's half voltage comes from."""
        half = self.half_voltage
        if not self.is_estimate:
            return f"half voltage {format_quantity(half.nominal, 'V')}"
        k = self.factor(volts)
        return f"estimate from geometry {self.package}, a bias curve would narrow {k.low:.2f}..{k.high:.2f}"


@dataclass(frozen=True)
class BiasCurve:
    """A stated curve: rising abscissae (volts for a capacitor, amperes for a bead) and the factors there.

    Between its points the curve is the monotone cubic of Fritsch and Carlson (SIAM J. Numer. Anal. 17 (1980)
    238); outside them it is clamped, and `beyond` tells so.
    """

    points: tuple[tuple[float, float], ...]

    @cached_property
    def _interpolator(self) -> PchipInterpolator:
        from scipy.interpolate import PchipInterpolator  # not on the path of a cold start

        x, y = zip(*self.points, strict=True)
        return PchipInterpolator(x, y)

    @cached_property
    def _antiderivative(self) -> Any:
        return self._interpolator.antiderivative()

    def beyond(self, at: float) -> bool:
        """Whether `at` lies past the last point, so that the value there is only clamped."""
        return abs(at) > self.points[-1][0] * (1 + 1e-12)

    def factor(self, volts: float) -> Band:
        """The curve's factor, taken as exact."""
        return Band.exact(float(self.nominal(volts)))

    def nominal(self, volts: ArrayLike) -> NDArray[np.float64]:
        """The curve's factor in the shape of `volts`, even in V."""
        x = np.abs(np.asarray(volts, dtype=float))
        if len(self.points) == 1:
            return np.full_like(x, self.points[0][1])
        return np.asarray(self._interpolator(np.clip(x, self.points[0][0], self.points[-1][0])), dtype=float)

    def integral(self, volts: ArrayLike) -> NDArray[np.float64]:
        """The integral of the factor from 0 to each of `volts`, in V, odd in V, exact for the curve."""
        v = np.asarray(volts, dtype=float)
        x = np.abs(v)
        (first, start), (last, end) = self.points[0], self.points[-1]
        if len(self.points) == 1:
            return v * start
        inner = self._antiderivative(np.clip(x, first, last))
        area = start * np.minimum(x, first) + inner + end * np.maximum(x - last, 0.0)
        return np.asarray(np.sign(v) * area, dtype=float)

    def describe(self, volts: float) -> str:
        """That a curve is used, and whether the voltage lies beyond it."""
        if self.beyond(volts):
            last = format_quantity(self.points[-1][0], "V")
            return f"stated curve, which ends at {last}: its last value is used beyond"
        return "stated curve"


BiasLaw = NoBias | HalfVoltage | BiasCurve

KEEPS_ALL = NoBias()
NOT_KNOWN = NoBias(unknown=True)


def estimated_half_voltage(capacitance: float, volume: float) -> Band:
    """The half voltage of a class II ceramic from its geometry, in V.

    C = eps0 epsr A/d with A d = share * volume gives d = sqrt(eps0 epsr share volume / C), and V_half =
    E_half d. `capacitance` in F, `volume` of the body in m^3.
    """
    active = VACUUM_PERMITTIVITY * RELATIVE_PERMITTIVITY * ACTIVE_SHARE * volume
    return HALF_FIELD.scaled(math.sqrt(active / capacitance))
