"""The model of a ferrite bead."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from reactance.analysis.parts.band import Band
from reactance.analysis.parts.base import Model
from reactance.analysis.parts.bias import BiasCurve
from reactance.analysis.parts.measured import MeasuredPart

# A bead known only by its impedance at 100 MHz turns from inductive to resistive near here (common practice).
TURNING_FREQUENCY = 25e6  # Hz


@dataclass(frozen=True, kw_only=True)
class BeadModel(Model):
    """A ferrite bead: `dcr` in series with R, L and C in parallel.

    `value` is the impedance at 100 MHz in ohm where the part is known by that. R in ohm, L in henry, C in farad.
    """

    kind: Literal["bead"] = "bead"
    dcr: float = 0.0
    nominal_resistance: float | None = None
    nominal_inductance: float | None = None
    capacitance: float = 0.0
    bias: BiasCurve | None = None
    measured: MeasuredPart | None = None

    @property
    def usable(self) -> bool:
        """Whether R and L are known."""
        return self.nominal_resistance is not None and self.nominal_inductance is not None

    @property
    def resistance(self) -> Band:
        """R in ohm without direct current; raises ValueError where it is unknown."""
        return self.resistance_at(0.0)

    @property
    def inductance(self) -> Band:
        """L in henry without direct current; raises ValueError where it is unknown."""
        return self.inductance_at(0.0)

    def resistance_at(self, amps: float) -> Band:
        """R in ohm with a direct current of `amps`, by the bias curve where one is stated."""
        return self._band(self.nominal_resistance, amps)

    def inductance_at(self, amps: float) -> Band:
        """L in henry with a direct current of `amps`, by the bias curve where one is stated."""
        return self._band(self.nominal_inductance, amps)

    def bias_factor(self, amps: float) -> float:
        """The share of the impedance left at `amps`."""
        return float(self.bias.nominal(amps)) if self.bias else 1.0

    def _band(self, nominal: float | None, amps: float) -> Band:
        if nominal is None:
            raise ValueError(f"{self.refdes} has no value")
        return Band.spread(nominal * self.bias_factor(amps), self.tolerance or (0.0, 0.0))


def inductance_from_impedance(resistance: float) -> float:
    """L in henry of a bead known only by its impedance at 100 MHz: R/(2 pi 25 MHz) (common practice)."""
    return resistance / (2.0 * math.pi * TURNING_FREQUENCY)
