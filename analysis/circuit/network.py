"""What a linear network is made of: elements between named nodes, and which of their values are uncertain.

Units are SI throughout. Nodes are strings; one of them is the ground.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]


class CircuitError(Exception):
    """A network without a unique solution. `nodes` and `elements` name what is to blame."""

    def __init__(self, message: str, nodes: Iterable[str] = (), elements: Iterable[str] = ()) -> None:
        super().__init__(message)
        self.nodes = tuple(nodes)
        self.elements = tuple(elements)


@dataclass(frozen=True, slots=True)
class Resistor:
    """`resistance` in ohm; 0 is an ideal short."""

    name: str
    a: str
    b: str
    resistance: float


@dataclass(frozen=True, slots=True)
class Capacitor:
    """esr in series with esl in series with (C in parallel with its leakage resistance).

    Over frequency Z = esr + jω·esl + 1/(1/leakage + jωC(1 − j·tan δ)). Over time the dielectric loss is left out.
    """

    name: str
    a: str
    b: str
    capacitance: float
    esr: float = 0.0
    esl: float = 0.0
    loss_tangent: float = 0.0
    leakage: float = math.inf


@dataclass(frozen=True, slots=True)
class Inductor:
    """(`inductance` in series with `dcr`) in parallel with `parallel_capacitance`."""

    name: str
    a: str
    b: str
    inductance: float
    dcr: float = 0.0
    parallel_capacitance: float = 0.0


@dataclass(frozen=True, slots=True)
class Bead:
    """A ferrite bead: `dcr` in series with `resistance` ∥ `inductance` ∥ `capacitance`."""

    name: str
    a: str
    b: str
    dcr: float
    resistance: float
    inductance: float
    capacitance: float = 0.0


@dataclass(frozen=True, slots=True)
class VoltageSource:
    """An EMF `voltage` from `minus` to `plus` behind a series resistance and inductance."""

    name: str
    plus: str
    minus: str
    voltage: float
    resistance: float = 0.0
    inductance: float = 0.0


@dataclass(frozen=True, slots=True)
class CurrentSource:
    """`current` drawn out of node `a` and delivered into node `b`: a load from `a` to `b`."""

    name: str
    a: str
    b: str
    current: float


@dataclass(frozen=True, slots=True)
class Amplifier:
    """out = A·(plus − minus) against ground behind `output_resistance`, A = A0/(1 + s·A0/(2π·gain_bandwidth)).

    `gain` is A0 as a ratio; `gain_bandwidth` in Hz may be infinite.
    """

    name: str
    plus: str
    minus: str
    out: str
    gain: float
    gain_bandwidth: float
    output_resistance: float = 0.0


@dataclass(frozen=True, slots=True)
class Measured:
    """A part known by measured data. `impedance` maps frequencies in Hz to complex ohms.

    `fit` is a network of elements between `a` and `b` that stands for it in time work; None where there is none.
    """

    name: str
    a: str
    b: str
    impedance: Callable[[FloatArray], ComplexArray]
    fit: tuple[Element, ...] | None = None


Element = Resistor | Capacitor | Inductor | Bead | VoltageSource | CurrentSource | Amplifier | Measured


def terminals(element: Element) -> tuple[str, ...]:
    """The nodes that an element touches (not those inside the fit of a measured part)."""
    if isinstance(element, Amplifier):
        return (element.plus, element.minus, element.out)
    if isinstance(element, VoltageSource):
        return (element.plus, element.minus)
    return (element.a, element.b)


@dataclass(frozen=True, slots=True)
class Parameter:
    """An uncertain value: `attribute` of the element `name`, anywhere in [low, high]."""

    name: str
    attribute: str
    nominal: float
    low: float
    high: float


@dataclass(frozen=True, slots=True)
class Network:
    """Elements with distinct names, and the node that counts as 0 V."""

    elements: tuple[Element, ...]
    ground: str = "0"

    def __post_init__(self) -> None:
        names = [element.name for element in self.elements]
        if len(set(names)) != len(names):
            twice = sorted({name for name in names if names.count(name) > 1})
            raise CircuitError(f"two elements have the same name: {', '.join(twice)}", elements=twice)

    def element(self, name: str) -> Element:
        """The element called `name`. Raises `CircuitError` if there is none."""
        for element in self.elements:
            if element.name == name:
                return element
        raise CircuitError(f"the network has no element {name}", elements=(name,))

    def with_values(self, values: Mapping[tuple[str, str], float]) -> Network:
        """The same network with some attributes replaced; keys are (element name, attribute)."""
        changes: dict[str, dict[str, float]] = {}
        for (name, attribute), value in values.items():
            changes.setdefault(name, {})[attribute] = value
        for name, change in changes.items():
            wrong = set(change) - {field.name for field in fields(self.element(name))}
            if wrong:
                raise CircuitError(f"{name} has no attribute {', '.join(sorted(wrong))}", elements=(name,))
        return Network(
            tuple(replace(e, **changes[e.name]) if e.name in changes else e for e in self.elements),  # type: ignore[arg-type]
            self.ground,
        )

    def nodes(self) -> tuple[str, ...]:
        """Every node that an element touches, ground first."""
        seen = {self.ground: None}
        for element in self.elements:
            seen.update(dict.fromkeys(terminals(element)))
        return tuple(seen)
