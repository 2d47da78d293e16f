"""exp(x) and the two functions that integrate it, without loss of digits near x = 0.

φ1(x) = (eˣ − 1)/x and φ2(x) = (eˣ − 1 − x)/x²: the φ functions of exponential integrators (Hochbruck and Ostermann,
Acta Numer. 19 (2010) 209).
"""

from __future__ import annotations

import math

import numpy as np

from reactance.analysis.circuit.network import ComplexArray

_SERIES = [1.0 / math.factorial(k + 2) for k in range(17)]


def phi(x: ComplexArray, second: bool) -> tuple[ComplexArray, ComplexArray, ComplexArray | None]:
    """eˣ, φ1(x) and, where `second`, φ2(x) at complex x of any shape with real part not far above 0."""
    minus_one: ComplexArray = np.expm1(x)
    safe = np.where(x == 0, 1.0, x)
    one: ComplexArray = np.where(x == 0, 1.0, minus_one / safe)
    if not second:
        return minus_one + 1.0, one, None
    small = np.abs(x) < 1.0
    near = np.where(small, x, 0.0)
    series = np.zeros_like(x)
    for c in reversed(_SERIES):
        series = series * near + c
    return minus_one + 1.0, one, np.where(small, series, (one - 1.0) / safe)
