"""Parts known by measurement: impedance over frequency."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from reactance.analysis.parts.base import Stated
from reactance.analysis.parts.claims import Claims
from reactance.analysis.quantity import QuantityError, format_quantity

if TYPE_CHECKING:
    from scipy.interpolate import PchipInterpolator

    from reactance.analysis.circuit.network import Element
    from reactance.analysis.parts.passive_fit import PassiveFit


@dataclass(frozen=True)
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
        """Which of `frequencies` (Hz) lie inside the data's range, in their shape."""
        f = np.asarray(frequencies, dtype=float)
        slack = 1e-9
        return np.asarray((f >= self.low * (1 - slack)) & (f <= self.high * (1 + slack)))

    def beyond(self, frequencies: ArrayLike) -> str:
        """What to say where some of `frequencies` (Hz) lie outside the data, else an empty text."""
        if bool(np.all(self.covers(frequencies))):
            return ""
        low, high = format_quantity(self.low, "Hz"), format_quantity(self.high, "Hz")
        return f"{self.file} reaches from {low} to {high}; beyond, its ends are continued"

    def impedance(self, frequencies: ArrayLike) -> NDArray[np.complex128]:
        """The impedance in ohm at `frequencies` (Hz), in their shape.

        Between the points by monotone cubics of the real and imaginary part over log f (exact at the points).
        Beyond them the resistance is kept and the reactance continued as that of one C or one L, whichever
        its sign tells; `beyond` says so.
        """
        f = np.asarray(frequencies, dtype=float)
        inside = np.clip(f, self.low, self.high)
        x = np.log(inside)
        real, imaginary = self._real(x), self._imaginary(x)
        stretch = np.where(imaginary < 0, inside / f, f / inside)
        return np.asarray(real + 1j * imaginary * stretch, dtype=complex)

    def fit(self) -> PassiveFit:
        """A passive network with the measured impedance, for time work; raises QuantityError if none is close."""
        return self._fit

    def fit_elements(self, name: str, a: str, b: str) -> tuple[Element, ...] | None:
        """The fit as elements of a network between nodes `a` and `b`, or None where there is no close fit."""
        try:
            return self._fit.elements(name, a, b)
        except QuantityError:
            return None

    def describe(self) -> str:
        """The data's range, and how well it is followed in time work."""
        low, high = format_quantity(self.low, "Hz"), format_quantity(self.high, "Hz")
        try:
            fit = self._fit.describe()
        except QuantityError as problem:
            fit = f"none, {problem}"
        return f"measured, {self.file}, {low} to {high}; in time work: {fit}"

    @cached_property
    def _fit(self) -> PassiveFit:
        from reactance.analysis.parts.passive_fit import fit_passive  # not on the path of a cold start

        return fit_passive(self.file, np.asarray(self.frequencies), np.asarray(self.ohms))

    @cached_property
    def _real(self) -> PchipInterpolator:
        return self._interpolator(np.asarray(self.ohms).real)

    @cached_property
    def _imaginary(self) -> PchipInterpolator:
        return self._interpolator(np.asarray(self.ohms).imag)

    def _interpolator(self, y: NDArray[np.float64]) -> PchipInterpolator:
        from scipy.interpolate import PchipInterpolator  # not on the path of a cold start

        return PchipInterpolator(np.log(self.frequencies), y)


def read_measured(claims: Claims, files: Mapping[str, bytes]) -> MeasuredPart | None:
    """The measurement that a `[[part]]` table names, read from `files`, or None.

    A file that cannot be used becomes a problem, never a silent substitute.
    """
    claim = next((claim for claim in claims.of("touchstone") if claim.is_knowledge), None)
    if claim is None:
        return None
    from reactance.analysis.parts.knowledge import touchstone
    from reactance.analysis.parts.touchstone import read_touchstone  # not on the path of a cold start

    try:
        name, connection = touchstone(claim)
        measured = read_touchstone(_content(name, files), name, connection)
    except QuantityError as problem:
        claims.tell("error", f"touchstone in {claim.source}: {problem}; the measurement is not used")
        return None
    claims.stated["touchstone"] = Stated(claim.text, claim.source)
    try:
        measured.fit()
    except QuantityError as problem:
        claims.tell("caution", f"touchstone in {claim.source}: {problem}; it serves over frequency only")
    return measured


def _content(name: str, files: Mapping[str, bytes]) -> bytes:
    """The content of the file written as `name`: under that very name, or the first path that ends in it."""
    if name in files:
        return files[name]
    plain = name.replace("\\", "/").removeprefix("./")
    ending = [path for path in files if path.replace("\\", "/").endswith("/" + plain)]
    if not ending:
        raise QuantityError(f"{name} is not there")
    return files[ending[0]]
