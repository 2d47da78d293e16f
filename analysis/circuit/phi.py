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
    """eˣ, φ1(x) and, where `second`, φ2(x) at complex x of any shape with real part not far above 0.

    By their series where |x| < 1, where differences would lose digits; elsewhere from eˣ.
    """
    power: ComplexArray = np.exp(x)
    small = np.abs(x) < 1.0
    near = x[small]
    safe = np.where(small, 1.0, x)
    one = (power - 1.0) / safe
    two = (one - 1.0) / safe if second else None
    if near.size:
        series = np.full_like(near, _SERIES[-1])
        for c in reversed(_SERIES[:-1]):
            series = series * near + c
        one[small] = 1.0 + near * series
        power[small] = 1.0 + near * one[small]
        if two is not None:
            two[small] = series
    return power, one, two
