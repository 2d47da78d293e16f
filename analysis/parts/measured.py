"""Parts known by measurement: impedance over frequency."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray


@dataclass(frozen=True, slots=True)
class MeasuredPart:
    """The impedance of a two-terminal part as measured: `frequencies` in Hz (rising), `ohms` complex.

    `file` names where the data came from. Both are tuples so that a model can be compared and stored.
    """

    file: str
    frequencies: tuple[float, ...]
    ohms: tuple[complex, ...]

    @property
    def low(self) -> float:
        """The lowest measured frequency in Hz."""
        return self.frequencies[0]

    @property
    def high(self) -> float:
        """The highest measured frequency in Hz."""
        return self.frequencies[-1]

    def covers(self, frequencies: ArrayLike) -> NDArray[np.bool_]:
        """Which of `frequencies` (Hz) lie inside the data's range."""
        f = np.asarray(frequencies, dtype=float)
        return np.asarray((f >= self.low) & (f <= self.high))

    def impedance(self, frequencies: ArrayLike) -> NDArray[np.complex128]:
        """The impedance in ohm at `frequencies` (Hz), interpolated; outside the data its end values."""
        f = np.asarray(frequencies, dtype=float)
        x = np.log(self.frequencies)
        z = np.asarray(self.ohms)
        return np.asarray(np.interp(np.log(f), x, z.real) + 1j * np.interp(np.log(f), x, z.imag))
