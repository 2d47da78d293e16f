"""The model of a resistor."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from reactance.analysis.parts.band import UNITY, Band, product
from reactance.analysis.parts.base import Model
from reactance.analysis.quantity import format_quantity

SHORT_BELOW = 1e-9  # ohm


@dataclass(frozen=True, kw_only=True)
class ResistorModel(Model):
    """A resistor: `value` in ohm with initial tolerance and drift over the board's temperatures."""

    kind: Literal["resistor"] = "resistor"
    drift: Band = UNITY

    @property
    def is_short(self) -> bool:
        """Whether it is a 0 ohm link, which joins its nets."""
        return self.value is not None and self.value < SHORT_BELOW

    @property
    def resistance(self) -> Band:
        """Resistance in ohm with tolerance and temperature; raises ValueError where the value is unknown."""
        if self.value is None:
            raise ValueError(f"{self.refdes} has no value")
        return product((Band.spread(self.value, self.tolerance or (0.0, 0.0)), self.drift))

    def explain(self) -> tuple[str, ...]:
        """What the band is made of, a line each."""
        if self.value is None:
            return (f"value {self.text!r} is not understood",)
        low, high = self.tolerance or (0.0, 0.0)
        lines = [f"value {format_quantity(self.value, 'ohm')}", f"tolerance {low:+.3g} to {high:+.3g}"]
        if not self.drift.is_exact:
            lines.append(f"temperature ×{self.drift.low:.4f} to ×{self.drift.high:.4f}")
        return tuple(lines)
