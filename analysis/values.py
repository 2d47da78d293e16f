"""A measure's figures before they are judged."""

from __future__ import annotations

import math

import msgspec


class Value(msgspec.Struct, frozen=True):
    """Nominal, low and high of one measure, or why they could not be computed.

    `matters` names the parts that move the figure most, with their shares; `note` says what went into it; `samples`
    are figures of a Monte Carlo run, where one was asked for; `at` the nominal values of the uncertain attributes and
    those at the extremes, while the figure is only roughly known.
    """

    nominal: float | None
    low: float | None
    high: float | None
    unit: str
    note: str = ""
    missing: str = ""
    matters: tuple[tuple[str, float], ...] = ()
    samples: tuple[float, ...] = ()
    at: tuple[tuple[float, ...], ...] = ()

    @property
    def known(self) -> bool:
        """Whether there is a figure."""
        return self.nominal is not None


def exactly(value: float, unit: str, note: str = "") -> Value:
    """A figure without a band."""
    return Value(value, value, value, unit, note)


def unknown(unit: str, why: str) -> Value:
    """A figure that cannot be computed, and why."""
    return Value(None, None, None, unit, missing=why)


def banded(nominal: float, low: float, high: float, unit: str, note: str, missing: str) -> Value:
    """A figure with its band; not a number means that it does not exist, for the reason `missing`."""
    if not math.isfinite(nominal):
        return unknown(unit, missing)
    finite_low = low if math.isfinite(low) else None
    finite_high = high if math.isfinite(high) else None
    return Value(nominal, finite_low, finite_high, unit, note)
