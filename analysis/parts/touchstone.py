"""From Touchstone files (IBIS Open Forum, versions 1.1 and 2.0) to the impedance of a two-terminal part.

Reading the format itself is scikit-rf's; it is imported only where a measured part is used.
"""

from __future__ import annotations

import io
from typing import cast

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.parts.knowledge import Connection
from reactance.analysis.parts.measured import MeasuredPart
from reactance.analysis.quantity import QuantityError


def impedance_of(
    s: NDArray[np.complex128], z0: NDArray[np.complex128], connection: Connection
) -> NDArray[np.complex128]:
    """The impedance in ohm of a part from its scattering matrices.

    `s` has the shape (frequencies, ports, ports), `z0` the reference impedance per frequency. Shunt-through
    Z = Z0/2 * S21/(1 - S21), series-through Z = 2 Z0 (1 - S21)/S21, one-port Z = Z0 (1 + S11)/(1 - S11).
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        if connection == "one-port":
            return z0 * (1 + s[:, 0, 0]) / (1 - s[:, 0, 0])
        s21 = s[:, 1, 0]
        if connection == "shunt":
            return z0 / 2 * s21 / (1 - s21)
        return 2 * z0 * (1 - s21) / s21


def read_touchstone(content: bytes, name: str, connection: Connection) -> MeasuredPart:
    """The part measured in the file `name`; raises QuantityError where it cannot be used."""
    ports = 1 if connection == "one-port" else 2
    frequencies, s, z0 = _scattering(content, name)
    if s.shape[1] != ports:
        raise QuantityError(f"{name} has {s.shape[1]} ports; a {connection} measurement has {ports}")
    z = impedance_of(s, z0, connection)
    usable = (frequencies > 0) & np.isfinite(z)
    frequencies, z = frequencies[usable], z[usable]
    if len(frequencies) < 2 or np.any(np.diff(frequencies) <= 0):
        raise QuantityError(f"{name} needs at least two usable points at rising frequencies")
    return MeasuredPart(name, tuple(frequencies.tolist()), tuple(z.tolist()))


def _scattering(
    content: bytes, name: str
) -> tuple[NDArray[np.float64], NDArray[np.complex128], NDArray[np.complex128]]:
    import skrf  # imports pandas: only where a measured part is used

    try:
        text = io.StringIO(content.decode("utf-8", errors="replace").replace("\r\n", "\n"))
        text.name = name.rpartition("/")[2].rpartition("\\")[2]
        network = skrf.Network(text)
    except Exception as problem:  # whatever the reader's parser stumbles over, the file is at fault
        raise QuantityError(f"{name} is no Touchstone file that can be read: {problem}") from None
    s = cast("NDArray[np.complex128]", network.s)
    return np.asarray(network.f, dtype=float), s, np.asarray(network.z0[:, 0], dtype=complex)
