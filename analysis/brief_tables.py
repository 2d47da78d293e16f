"""The tables of a brief, key by key: the one place that says what a brief may hold.

Each quantity has a type that names its unit; `reactance.analysis.brief` reads texts into them. Values are in SI
base units, temperatures in degrees Celsius, gains and losses in decibels, shares as fractions.
"""

from __future__ import annotations

from typing import Any, ClassVar

import msgspec

from reactance.analysis.quantity import Unit
from reactance.analysis.report import DutyKind


class Amount(float):
    """A number read from a quantity in the brief; subclasses name the unit."""

    unit: ClassVar[Unit] = "1"


class Volt(Amount):
    """Volts."""

    unit = "V"


class Ampere(Amount):
    """Amperes."""

    unit = "A"


class Ohm(Amount):
    """Ohms."""

    unit = "ohm"


class Farad(Amount):
    """Farads."""

    unit = "F"


class Henry(Amount):
    """Henries."""

    unit = "H"


class Hertz(Amount):
    """Hertz."""

    unit = "Hz"


class Second(Amount):
    """Seconds."""

    unit = "s"


class Celsius(Amount):
    """Degrees Celsius."""

    unit = "degC"


class Decibel(Amount):
    """Decibels."""

    unit = "dB"


class Fraction(Amount):
    """A share: `5 %` is 0.05."""

    unit = "fraction"


class VoltOrShare(float):
    """A voltage, or a share of some voltage that its user knows. (No dataclass: msgspec would read a table.)"""

    share: bool

    def __new__(cls, value: float, share: bool) -> VoltOrShare:
        """The number as a float that knows whether it is a share."""
        made = super().__new__(cls, value)
        made.share = share
        return made

    def __repr__(self) -> str:
        """Tells a share from a voltage: keys of solved blocks are made of this."""
        return f"{float(self)!r}{' of the whole' if self.share else ' V'}"

    def volts(self, whole: float) -> float:
        """The voltage, where a share is taken of `whole` volts."""
        return float(self) * abs(whole) if self.share else float(self)


class Table(msgspec.Struct, frozen=True, forbid_unknown_fields=True):
    """One table of the brief; a key that it does not list is an error."""


class TemperatureRange(Table, frozen=True):
    """Lowest and highest ambient temperature of the board."""

    low: Celsius
    high: Celsius


class BoardTable(Table, frozen=True):
    """What holds for the whole board."""

    title: str = ""
    ground: tuple[str, ...] = ()
    temperature: TemperatureRange | None = None
    service_life: Second = Second(1000 * 3600)
    mounting_inductance: Henry = Henry(0.5e-9)
    movement: Fraction = Fraction(0.05)
    derating: dict[str, Fraction] = {}
    parts: tuple[str, ...] = ()


class SourceImpedance(Table, frozen=True):
    """Output impedance of what feeds a rail."""

    resistance: Ohm = Ohm(0.0)
    inductance: Henry = Henry(0.0)


class LoadStep(Table, frozen=True):
    """The load's current step: a linear ramp of `rise`, then steady."""

    current: Ampere
    rise: Second


class Span(Table, frozen=True):
    """A band of frequencies."""

    low: Hertz
    high: Hertz


class RailTable(Table, frozen=True):
    """A supply rail and what it has to keep."""

    net: str
    voltage: Volt | None = None
    tolerance: Fraction = Fraction(0.0)
    source: SourceImpedance | None = None
    step: LoadStep | None = None
    allowed: VoltOrShare | None = None
    allowed_rhythm: VoltOrShare | None = None
    band: Span | None = None
    bypass: float | None = None


class PinTable(Table, frozen=True):
    """What one pin, or each of several, does to its net."""

    at: str | tuple[str, ...]
    drives: Volt | None = None
    resistance: Ohm | None = None
    toward: str | None = None
    capacitance: Farad = Farad(0.0)
    bias_current: Ampere = Ampere(0.0)
    greatest_voltage: Volt | None = None
    least_voltage: Volt | None = None

    @property
    def places(self) -> tuple[str, ...]:
        """The pins, each as REFDES.PIN."""
        return (self.at,) if isinstance(self.at, str) else self.at


class SettleTable(Table, frozen=True):
    """How near, and within which time, an output has to settle."""

    within: VoltOrShare
    time: Second | None = None


class TiltTable(Table, frozen=True):
    """A rectangular pulse and the greatest sag allowed at its end."""

    pulse: Second
    most: Fraction | None = None


class CouplingTable(Table, frozen=True, rename={"from_": "from"}):
    """A signal that passes between two bias points."""

    from_: str
    to: str
    name: str = ""
    lowest_frequency: Hertz | None = None
    loss: Decibel | None = None
    settle: SettleTable | None = None
    tilt: TiltTable | None = None
    rejection: Decibel | None = None


class Bounds(Table, frozen=True):
    """Least and most of a frequency."""

    least: Hertz | None = None
    most: Hertz | None = None


class AttenuationTable(Table, frozen=True):
    """The least attenuation at one frequency."""

    at: Hertz
    least: Decibel | None = None


class PassbandTable(Table, frozen=True):
    """Where a filter must pass, and how evenly."""

    to: Hertz
    from_: Hertz | None = msgspec.field(default=None, name="from")
    ripple: Decibel | None = None


class FilterStep(Table, frozen=True):
    """What a filter's step response has to keep."""

    overshoot: Fraction | None = None
    settle: Second | None = None


class FilterTable(Table, frozen=True, rename={"from_": "from"}):
    """A frequency response between two nets."""

    from_: str
    to: str
    name: str = ""
    corner: Hertz | None = None
    tolerance: Fraction = Fraction(0.1)
    corner_low: Bounds | None = None
    corner_high: Bounds | None = None
    attenuation: tuple[AttenuationTable, ...] = ()
    passband: PassbandTable | None = None
    step: FilterStep | None = None
    rejection: Decibel | None = None


class AmplifierTable(Table, frozen=True):
    """An amplifier with one pole, between three pins."""

    plus: str
    minus: str
    out: str
    open_loop_gain: Decibel = Decibel(100.0)
    gain_bandwidth: Hertz = Hertz(float("inf"))
    output_resistance: Ohm = Ohm(0.0)


class DutyTable(Table, frozen=True, rename={"is_": "is"}):
    """Overrules the duty that was worked out for a capacitor."""

    capacitor: str
    is_: DutyKind


class BriefTables(Table, frozen=True):
    """The whole brief as written. `part` rows are read by the part models."""

    board: BoardTable = BoardTable()
    rail: tuple[RailTable, ...] = ()
    pin: tuple[PinTable, ...] = ()
    coupling: tuple[CouplingTable, ...] = ()
    filter: tuple[FilterTable, ...] = ()
    part: tuple[dict[str, Any], ...] = ()
    amplifier: tuple[AmplifierTable, ...] = ()
    duty: tuple[DutyTable, ...] = ()
    attributes: dict[str, tuple[str, ...]] = {}
