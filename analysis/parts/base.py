"""What every part model shares: where a value came from, what was assumed, and the board's conditions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Literal

from reactance.analysis.design import Problem
from reactance.analysis.parts.band import Band

Kind = Literal["capacitor", "resistor", "inductor", "bead", "other"]

REFERENCE_TEMPERATURE = 25.0
AGEING_REFERENCE_HOURS = 1000.0


@dataclass(frozen=True, slots=True)
class Stated:
    """An attribute's text as found, and where: `export VALUE`, `board.brief.toml [[part]] 2`."""

    text: str
    source: str


@dataclass(frozen=True, slots=True)
class Assumption:
    """Something used that nobody stated. `about` is a refdes; equal ones of one part kind can be merged."""

    about: str
    attribute: str
    value: str
    because: str


@dataclass(frozen=True, slots=True)
class Conditions:
    """What the board meets: temperatures in degC, service life in hours, mounting inductance in henry."""

    temperature_low: float = REFERENCE_TEMPERATURE
    temperature_high: float = REFERENCE_TEMPERATURE
    hours: float = AGEING_REFERENCE_HOURS
    mounting_inductance: float = 0.5e-9

    @property
    def beyond_reference(self) -> bool:
        """Whether the temperature range is more than 25 degC alone."""
        return (self.temperature_low, self.temperature_high) != (REFERENCE_TEMPERATURE, REFERENCE_TEMPERATURE)

    def departure(self) -> tuple[float, float]:
        """The range of T - 25 degC in kelvin, widened to contain 0, where the nominal value is defined."""
        return (
            min(self.temperature_low - REFERENCE_TEMPERATURE, 0.0),
            max(self.temperature_high - REFERENCE_TEMPERATURE, 0.0),
        )


@dataclass(frozen=True, kw_only=True)
class Model:
    """The part of a model that all kinds share.

    `text` is the value as found, `value` what it means in SI or None where that is not known; `tolerance` as
    fractions; `stated` maps canonical attribute names to where they were read.
    """

    refdes: str
    kind: Kind
    fitted: bool = True
    text: str = ""
    value: float | None = None
    tolerance: tuple[float, float] | None = None
    package: str | None = None
    stated: Mapping[str, Stated] = field(default_factory=lambda: MappingProxyType({}))
    assumptions: tuple[Assumption, ...] = ()
    problems: tuple[Problem, ...] = ()


@dataclass(frozen=True, kw_only=True)
class OtherModel(Model):
    """A part that is no capacitor, resistor, inductor or bead."""

    kind: Literal["other"] = "other"


def linear_drift(coefficient_low: float, coefficient_high: float, conditions: Conditions) -> Band:
    """The factor 1 + a(T - 25) over the board's temperatures, a anywhere between the two (in 1/K)."""
    corners = [1.0 + a * t for a in (coefficient_low, coefficient_high) for t in conditions.departure()]
    return Band(1.0, min(1.0, *corners), max(1.0, *corners))
