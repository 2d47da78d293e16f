"""Parts known by measurement: impedance over frequency."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from reactance.analysis.parts.base import Stated
from reactance.analysis.parts.claims import Claims
from reactance.analysis.quantity import QuantityError


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


def read_measured(claims: Claims, files: Mapping[str, bytes]) -> MeasuredPart | None:
    """The measurement that a `[[part]]` table names, read from `files`, or None.

    A file that cannot be used becomes a problem, never a silent substitute.
    """
    from reactance.analysis.parts.knowledge import touchstone

    claim = next((claim for claim in claims.of("touchstone") if claim.is_knowledge), None)
    if claim is None:
        return None
    from reactance.analysis.parts.touchstone import read_touchstone  # not on the path of a cold start

    try:
        name, connection = touchstone(claim)
        measured = read_touchstone(_content(name, files), name, connection)
    except QuantityError as problem:
        claims.tell("error", f"touchstone in {claim.source}: {problem}; the measurement is not used")
        return None
    claims.stated["touchstone"] = Stated(claim.text, claim.source)
    return measured


def _content(name: str, files: Mapping[str, bytes]) -> bytes:
    """The content of the file written as `name`: under that very name, or the one path that ends in it."""
    if name in files:
        return files[name]
    plain = name.replace("\\", "/").removeprefix("./")
    ending = [path for path in files if path.replace("\\", "/").endswith("/" + plain)]
    if not ending:
        raise QuantityError(f"{name} is not there")
    return files[ending[0]]
