"""The model of a capacitor: what it is worth at a voltage, over tolerance, temperature, bias and age.

Z(w) = R_s + j w L_s + 1 / (j w C_eff (1 - j tan d)), with a leakage resistance across the C.
C_eff = C (1 + tolerance) (1 + temperature) k_bias(V) k_age; the four are independent, so that the least
C_eff is the product of the least factors.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.parts.band import UNITY, Band, product
from reactance.analysis.parts.base import AGEING_REFERENCE_HOURS, Model
from reactance.analysis.parts.bias import KEEPS_ALL, NOT_KNOWN, BiasLaw, HalfVoltage
from reactance.analysis.parts.measured import MeasuredPart
from reactance.analysis.quantity import format_quantity

Technology = Literal["ceramic", "film", "aluminium", "tantalum", "polymer"]

BIAS_MATTERS = 0.01  # a nominal loss beyond 1 % deserves a start solved with charge


@dataclass(frozen=True, kw_only=True)
class CapacitorModel(Model):
    """A capacitor. `value` in F, `rated_voltage` in V, `esr` in ohm, `esl` in H with mounting included,
    `leakage_resistance` in ohm (inf where there is none), `dielectric_range` in degC, `positive_pin` a pin
    designator. `temperature`, `ageing` and `bias` are the factors of C_eff.
    """

    kind: Literal["capacitor"] = "capacitor"
    technology: Technology = "ceramic"
    dielectric: str | None = None
    rated_voltage: float | None = None
    polarised: bool = False
    positive_pin: str | None = None
    esr: float = 0.0
    esl: float = 0.0
    loss_tangent: float = 0.0
    leakage_resistance: float = math.inf
    dielectric_range: tuple[float, float] | None = None
    derating: float = 0.8
    temperature: Band = UNITY
    ageing: Band = UNITY
    bias: BiasLaw = KEEPS_ALL
    measured: MeasuredPart | None = None

    @property
    def needs_curve(self) -> bool:
        """Whether a bias curve would narrow this part's band."""
        return (isinstance(self.bias, HalfVoltage) and self.bias.is_estimate) or self.bias == NOT_KNOWN

    def effective(self, volts: float) -> Band:
        """C_eff in farad with `volts` across it; raises ValueError where the value is unknown."""
        initial = Band.spread(self._known_value(), self.tolerance or (0.0, 0.0))
        return product((initial, self.temperature, self.bias_factor(volts), self.ageing))

    def bias_factor(self, volts: float) -> Band:
        """The share of the capacitance that `volts` leave."""
        return self.bias.factor(volts)

    def bias_matters(self, volts: float) -> bool:
        """Whether the nominal loss at `volts` is beyond 1 %."""
        return float(self.bias.nominal(volts)) < 1.0 - BIAS_MATTERS

    def capacitance_at(self, volts: ArrayLike) -> NDArray[np.float64]:
        """Nominal C(V) in farad, aged, in the shape of `volts`."""
        return self._known_value() * self.ageing.nominal * self.bias.nominal(volts)

    def charge(self, volts: ArrayLike) -> NDArray[np.float64]:
        """Nominal charge Q(V), the integral of C from 0 to V, in coulomb, in the shape of `volts`; odd in V."""
        return self._known_value() * self.ageing.nominal * self.bias.integral(volts)

    def explain(self, volts: float) -> tuple[str, ...]:
        """What C_eff at `volts` is made of, a line each."""
        if self.value is None:
            return (f"value {self.text!r} is not understood",)
        lines = [f"value {format_quantity(self.value, 'F')}", _tolerance_line(self.tolerance)]
        if not self.temperature.is_exact:
            where = f" ({self.dielectric})" if self.dielectric else ""
            lines.append(f"temperature{where} ×{self.temperature.low:.4g} to ×{self.temperature.high:.4g}")
        because = self.bias.describe(volts)
        if because:
            factor = self.bias_factor(volts).nominal
            lines.append(f"bias at {format_quantity(abs(volts), 'V')}: ×{factor:.3g} ({because})")
        if not self.ageing.is_exact:
            lines.append(f"ageing ×{self.ageing.low:.3g}, between that and none")
        lines.append(f"R_s {format_quantity(self.esr, 'ohm')}, L_s {format_quantity(self.esl, 'H')} with mounting")
        if self.loss_tangent:
            lines.append(f"tan δ {self.loss_tangent:g}")
        if self.measured is not None:
            lines.append(self.measured.describe())
        if math.isfinite(self.leakage_resistance):
            lines.append(f"leakage {format_quantity(self.leakage_resistance, 'ohm')}")
        return tuple(lines)

    def _known_value(self) -> float:
        if self.value is None:
            raise ValueError(f"{self.refdes} has no value")
        return self.value


def _tolerance_line(tolerance: tuple[float, float] | None) -> str:
    low, high = tolerance or (0.0, 0.0)
    if low == -high:
        return f"tolerance ±{format_quantity(high, 'fraction')}"
    return f"tolerance −{format_quantity(-low, 'fraction')} +{format_quantity(high, 'fraction')}"


def ageing_factor(per_decade: float, hours: float) -> Band:
    """k_age after `hours`: 1 - a log10(hours/1000) beyond 1000 h; the band runs from no ageing to a."""
    decades = math.log10(max(hours, AGEING_REFERENCE_HOURS) / AGEING_REFERENCE_HOURS)
    worst = max(1.0 - per_decade * decades, 0.0)
    return Band(worst, worst, 1.0)


def stored_energy(capacitance: float, volts: float) -> float:
    """The energy in joule that a capacitance in farad holds at `volts`: C V^2 / 2."""
    return 0.5 * capacitance * volts * volts


def discharge_time(capacitance: float, resistance: float, volts: float, to: float = 60.0) -> float:
    """The time in s in which C discharges through R from `volts` to `to` volts: R C ln(V/to).

    0 where it is there already, inf where there is no path (an infinite resistance).
    """
    if abs(volts) <= to:
        return 0.0
    return resistance * capacitance * math.log(abs(volts) / to)
