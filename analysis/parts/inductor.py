"""The model of an inductor."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from reactance.analysis.parts.band import Band
from reactance.analysis.parts.base import Model
from reactance.analysis.parts.measured import MeasuredPart

# At its saturation current an inductor has lost 30 % of its inductance (common practice of makers' tables).
LOSS_AT_SATURATION = 0.3


@dataclass(frozen=True, kw_only=True)
class InductorModel(Model):
    """An inductor: L with `dcr` in series and the capacitance of its self-resonance in parallel.

    `value` in henry, `dcr` in ohm, `self_resonance` in Hz, `saturation_current` in A.
    """

    kind: Literal["inductor"] = "inductor"
    dcr: float = 0.0
    self_resonance: float | None = None
    saturation_current: float | None = None
    measured: MeasuredPart | None = None

    @property
    def inductance(self) -> Band:
        """Inductance without direct current, in henry; raises ValueError where the value is unknown."""
        return self.inductance_at(0.0)

    def inductance_at(self, amps: float) -> Band:
        """Inductance with a direct current of `amps` through it, in henry.

        L(I) = L0 / (1 + c (I/I_sat)^2) with c such that L(I_sat) = 0.7 L0; constant where no saturation
        current is stated.
        """
        if self.value is None:
            raise ValueError(f"{self.refdes} has no value")
        band = Band.spread(self.value, self.tolerance or (0.0, 0.0))
        return band.scaled(self.saturation_factor(amps))

    def saturation_factor(self, amps: float) -> float:
        """The share of the inductance left at `amps`."""
        if not self.saturation_current:
            return 1.0
        c = LOSS_AT_SATURATION / (1.0 - LOSS_AT_SATURATION)
        return 1.0 / (1.0 + c * (amps / self.saturation_current) ** 2)

    @property
    def parallel_capacitance(self) -> float:
        """The capacitance in farad that resonates with the nominal L at the self-resonance; 0 if unknown."""
        if self.value is None or not self.self_resonance:
            return 0.0
        return 1.0 / ((2.0 * math.pi * self.self_resonance) ** 2 * self.value)
