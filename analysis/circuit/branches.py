"""From elements to two-terminal branches whose admittance is a ratio of polynomials in s.

Every branch admittance is y(s) = (n0 + n1·s + n2·s²)/(d0 + d1·s + d2·s²). Series and parallel parasitics are inside
the branch, so a capacitor with ESR and ESL costs no node of its own. A branch without impedance at any frequency
(d = 0) is *ideal*: it fixes a voltage and has no admittance.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CircuitError,
    ComplexArray,
    CurrentSource,
    Element,
    FloatArray,
    Inductor,
    Measured,
    Network,
    Resistor,
    VoltageSource,
)

Values = Mapping[str, FloatArray]  # attribute -> (V,)


@dataclass(frozen=True, slots=True)
class Branch:
    """A two-terminal branch of `element`; `impedance` is its measured data, if that is what it goes by."""

    element: Element
    a: str
    b: str
    impedance: Callable[[FloatArray], ComplexArray] | None = None
    noisy: bool = True


@dataclass(frozen=True, slots=True)
class Gain:
    """An ideal controlled source: V(out) = A(s)·(V(plus) − V(minus)), 1/A(s) = inverse_gain + s·slope."""

    name: str
    plus: str
    minus: str
    out: str
    inverse_gain: float
    slope: float


@dataclass(frozen=True, slots=True)
class Parts:
    """A network taken apart: branches with admittance, ideal branches, gains, and current sources."""

    branches: tuple[Branch, ...]
    ideal: tuple[Branch, ...]
    gains: tuple[Gain, ...]
    currents: tuple[CurrentSource, ...]


def take_apart(network: Network, *, over_time: bool) -> Parts:
    """The branches of `network`. `over_time`: measured parts by their fit, else by their data.

    Raises `CircuitError` if a measured part has no fit and one is needed, or a value is not usable.
    """
    branches: list[Branch] = []
    ideal: list[Branch] = []
    gains: list[Gain] = []
    currents: list[CurrentSource] = []

    def add(element: Element) -> None:
        if isinstance(element, CurrentSource):
            currents.append(element)
        elif isinstance(element, Amplifier):
            _check(element)
            out = element.out
            if element.output_resistance > 0:
                out = f"{element.name} (inside)"
                buried = Resistor(element.name, out, element.out, element.output_resistance)
                branches.append(Branch(buried, out, element.out, noisy=False))
            slope = 1.0 / (2.0 * math.pi * element.gain_bandwidth)
            gains.append(Gain(element.name, element.plus, element.minus, out, 1.0 / element.gain, slope))
        elif isinstance(element, Measured):
            if not over_time:
                branches.append(Branch(element, element.a, element.b, element.impedance))
                return
            if element.fit is None:
                raise CircuitError(
                    f"{element.name} is known over frequency only; its response over time needs a fit",
                    elements=(element.name,),
                )
            for part in element.fit:
                add(part)
        else:
            _check(element)
            branch = Branch(element, *_ends(element))
            (ideal if is_ideal(element) else branches).append(branch)

    for element in network.elements:
        add(element)
    return Parts(tuple(branches), tuple(ideal), tuple(gains), tuple(currents))


def _ends(element: Element) -> tuple[str, str]:
    if isinstance(element, VoltageSource):
        return element.plus, element.minus
    assert not isinstance(element, Amplifier)
    return element.a, element.b


def is_ideal(element: Element) -> bool:
    """Whether an element has no impedance at any frequency."""
    if isinstance(element, Resistor):
        return element.resistance == 0
    if isinstance(element, VoltageSource):
        return element.resistance == 0 and element.inductance == 0
    if isinstance(element, Inductor):
        return element.inductance == 0 and element.dcr == 0
    if isinstance(element, Bead):
        return element.dcr == 0 and (element.inductance == 0 or element.resistance == 0)
    return False


_NOT_NEGATIVE = (
    "resistance", "capacitance", "inductance", "esr", "esl", "loss_tangent", "leakage", "dcr",
    "parallel_capacitance", "output_resistance", "gain_bandwidth",
)  # fmt: skip


def _check(element: Element) -> None:
    for attribute in _NOT_NEGATIVE:
        value = getattr(element, attribute, 0.0)
        if not value >= 0:
            raise CircuitError(f"{element.name}: {attribute} is {value}", elements=(element.name,))
    if isinstance(element, Amplifier) and (element.gain == 0 or element.gain_bandwidth == 0):
        raise CircuitError(f"{element.name}: an amplifier needs a gain", elements=(element.name,))


def coefficients(element: Element, values: Values, count: int, *, lossy: bool) -> tuple[ComplexArray, ComplexArray]:
    """Numerator and denominator of a branch's admittance, each (count, 3), lowest power first.

    `values` overrides attributes with arrays of `count`. `lossy` puts the dielectric loss in, as C(1 − j·tan δ),
    which holds for positive real frequencies only.
    """

    def get(attribute: str) -> FloatArray:
        return np.broadcast_to(np.asarray(values.get(attribute, getattr(element, attribute)), float), (count,))

    zero = np.zeros(count)
    one = np.ones(count)
    terms: tuple[Sequence[FloatArray | ComplexArray], Sequence[FloatArray | ComplexArray]]
    if isinstance(element, Resistor):
        terms = _resistance(get("resistance"), one, zero)
    elif isinstance(element, VoltageSource):
        terms = ((one, zero, zero), (get("resistance"), get("inductance"), zero))
    elif isinstance(element, Inductor):
        r, ind, c = get("dcr"), get("inductance"), get("parallel_capacitance")
        terms = ((one, c * r, ind * c), (r, ind, zero))
    elif isinstance(element, Bead):
        dcr, ind, c = get("dcr"), get("inductance"), get("capacitance")
        g = 1.0 / get("resistance")
        terms = ((one, ind * g, ind * c), (dcr, dcr * ind * g + ind, dcr * ind * c))
    elif isinstance(element, Capacitor):
        r, ind, g = get("esr"), get("esl"), 1.0 / get("leakage")
        c = get("capacitance") * (1.0 - 1j * get("loss_tangent")) if lossy else get("capacitance")
        terms = ((g, c, zero), (1.0 + r * g, r * c + ind * g, ind * c))
    else:
        raise TypeError(f"{type(element).__name__} has no admittance of its own")
    numerator, denominator = terms
    return (
        np.stack([np.asarray(term, complex) for term in numerator], axis=-1),
        np.stack([np.asarray(term, complex) for term in denominator], axis=-1),
    )


def _resistance(r: FloatArray, one: FloatArray, zero: FloatArray) -> tuple[Sequence[FloatArray], Sequence[FloatArray]]:
    infinite = np.isinf(r)
    return (np.where(infinite, 0.0, one), zero, zero), (np.where(infinite, 1.0, r), zero, zero)
