"""A figure with its extremes."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Band:
    """A nominal figure and the least and greatest it can be, in one unit: `low <= nominal <= high`."""

    nominal: float
    low: float
    high: float

    @classmethod
    def exact(cls, value: float) -> Band:
        """A figure without uncertainty."""
        return cls(value, value, value)

    @classmethod
    def spread(cls, nominal: float, tolerance: tuple[float, float]) -> Band:
        """`nominal` with a tolerance given as fractions, for example (-0.1, 0.1)."""
        return cls(nominal, nominal * (1.0 + tolerance[0]), nominal * (1.0 + tolerance[1]))

    @property
    def is_exact(self) -> bool:
        """Whether the three figures are one."""
        return self.low == self.nominal == self.high

    def scaled(self, factor: float) -> Band:
        """The band times a factor that is not negative."""
        return Band(self.nominal * factor, self.low * factor, self.high * factor)

    def inverse(self) -> Band:
        """The band of the reciprocal of a positive figure."""
        return Band(1.0 / self.nominal, 1.0 / self.high, 1.0 / self.low)


def product(bands: Iterable[Band]) -> Band:
    """The product of independent non-negative figures: low is the product of lows, and so on."""
    factors = tuple(bands)
    return Band(
        math.prod(band.nominal for band in factors),
        math.prod(band.low for band in factors),
        math.prod(band.high for band in factors),
    )


UNITY = Band.exact(1.0)
