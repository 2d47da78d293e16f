"""Charge of a capacitor whose capacitance depends on the voltage across it: Q(V) = ∫ C(V) dV, and its inverse."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from reactance.analysis.circuit.network import FloatArray

Law = Callable[[FloatArray], FloatArray]

_PANELS = 96


@dataclass(frozen=True, slots=True)
class ChargeLaw:
    """`charge` maps voltages (n,) to coulombs, `voltage` is its inverse; both odd and rising."""

    charge: Law
    voltage: Law

    @classmethod
    def constant(cls, capacitance: float) -> ChargeLaw:
        """Q = C·V."""
        return cls(lambda v: capacitance * np.asarray(v), lambda q: np.asarray(q) / capacitance)

    @classmethod
    def of_capacitance(cls, capacitance: Law, greatest: float) -> ChargeLaw:
        """The law of C(V) > 0, an even function of V given for V ≥ 0, integrated by Gauss–Legendre over panels.

        `greatest` is a voltage that will hardly be exceeded; beyond it the law goes on in one panel.
        """
        edges = np.linspace(0.0, greatest, _PANELS + 1)
        x, w = np.polynomial.legendre.leggauss(8)

        def over(a: FloatArray, b: FloatArray) -> FloatArray:
            half = 0.5 * (b - a)
            points = (a + half)[:, None] + half[:, None] * x
            return np.asarray(half * (np.asarray(capacitance(points.ravel())).reshape(points.shape) @ w))

        total = np.concatenate([[0.0], np.cumsum(over(edges[:-1], edges[1:]))])

        def charge(v: FloatArray) -> FloatArray:
            size = np.abs(np.atleast_1d(np.asarray(v, float)))
            panel = np.minimum((size / greatest * _PANELS).astype(int), _PANELS)
            value = total[panel] + over(edges[panel], size)
            return np.asarray(np.sign(v) * value)

        def voltage(q: FloatArray) -> FloatArray:
            size = np.abs(np.atleast_1d(np.asarray(q, float)))
            v = np.interp(size, total, edges)
            v = np.where(size > total[-1], greatest + (size - total[-1]) / capacitance(np.array([greatest]))[0], v)
            for _ in range(30):
                step = (charge(v) - size) / capacitance(v)
                v = np.maximum(v - step, 0.0)
                if (np.abs(step) <= 1e-15 * greatest + 4e-16 * v).all():
                    break
            return np.asarray(np.sign(q) * v)

        return cls(charge, voltage)
