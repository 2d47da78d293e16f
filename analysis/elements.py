"""From a board's parts to the elements of a network, each with the attribute that is uncertain."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from reactance.analysis.board import Board, DescribedPin, PlacedAmplifier, Section
from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CurrentSource,
    Element,
    Inductor,
    Measured,
    Parameter,
    Resistor,
    VoltageSource,
)
from reactance.analysis.parts.band import Band
from reactance.analysis.parts.models import BeadModel, CapacitorModel, InductorModel, ResistorModel

GROUND = "(ground)"


@dataclass(frozen=True, slots=True)
class Placed:
    """One network element with its uncertain attributes."""

    element: Element
    parameters: tuple[Parameter, ...] = ()


def node(board: Board, net: str) -> str:
    """The network node of a net: all grounds are one."""
    return GROUND if board.is_ground(net) else net


def placed(board: Board, section: Section, volts: float | None, current: float = 0.0) -> Placed | None:
    """The element for `section`, or None where its value is not known.

    `volts` is the DC voltage across it (None: not known, the bias loss is left out), `current` the DC current
    through it in amperes.
    """
    a, b = node(board, section.a), node(board, section.b)
    model, name = section.model, section.name
    if isinstance(model, CapacitorModel | InductorModel | BeadModel) and model.measured is not None:
        return Placed(Measured(name, a, b, model.measured.impedance, model.measured.fit_elements(name, a, b)))
    if isinstance(model, BeadModel):
        return _bead(name, a, b, model, current) if model.usable else None
    if model.value is None:
        return None
    if isinstance(model, CapacitorModel):
        return _capacitor(name, a, b, model, volts or 0.0)
    if isinstance(model, ResistorModel):
        band = model.resistance
        return Placed(Resistor(name, a, b, band.nominal), (_parameter(name, "resistance", band),))
    return _inductor(name, a, b, model, current) if isinstance(model, InductorModel) else None


def _inductor(name: str, a: str, b: str, model: InductorModel, current: float) -> Placed:
    band = model.inductance_at(current)
    element = Inductor(name, a, b, band.nominal, model.dcr, model.parallel_capacitance)
    return Placed(element, (_parameter(name, "inductance", band),))


def _parameter(name: str, attribute: str, band: Band) -> Parameter:
    return Parameter(name, attribute, band.nominal, band.low, band.high)


def _bead(name: str, a: str, b: str, model: BeadModel, current: float) -> Placed:
    resistance, inductance = model.resistance_at(current), model.inductance_at(current)
    element = Bead(name, a, b, model.dcr, resistance.nominal, inductance.nominal, model.capacitance)
    return Placed(
        element, (_parameter(name, "resistance", resistance), _parameter(name, "inductance", inductance))
    )


def _capacitor(name: str, a: str, b: str, model: CapacitorModel, volts: float) -> Placed:
    band = model.effective(volts)
    element = Capacitor(name, a, b, band.nominal, model.esr, model.esl, model.loss_tangent, model.leakage_resistance)
    return Placed(element, (_parameter(name, "capacitance", band),))


def certain(parameters: Iterable[Parameter]) -> tuple[Parameter, ...]:
    """Those parameters that really have a range."""
    return tuple(p for p in parameters if p.low < p.high)


def pin_elements(board: Board, pin: DescribedPin, *, drive: bool = True) -> tuple[Element, ...]:
    """What a described pin adds to its net: a source behind its resistance, or an input resistance, and so on."""
    at, home, table = pin.at, node(board, pin.net), pin.table
    made: list[Element] = []
    if table.drives is not None and drive:
        made.append(VoltageSource(source_name(pin), home, GROUND, float(table.drives), float(table.resistance or 0.0)))
    elif table.drives is None and table.resistance is not None:
        toward = node(board, pin.toward) if pin.toward is not None else GROUND
        made.append(Resistor(f"{at} input", home, toward, float(table.resistance)))
    if table.capacitance:
        made.append(Capacitor(f"{at} capacitance", home, GROUND, float(table.capacitance)))
    if table.bias_current:
        made.append(CurrentSource(f"{at} bias", home, GROUND, float(table.bias_current)))
    return tuple(element for element in made if home != GROUND or isinstance(element, Resistor))


def source_name(pin: DescribedPin) -> str:
    """The name of the voltage source that a driving pin makes."""
    return f"{pin.at} drive"


def rail_source(net: str, volts: float, resistance: float = 0.0, inductance: float = 0.0) -> VoltageSource:
    """A rail held at `volts` against ground behind its output impedance."""
    return VoltageSource(rail_source_name(net), net, GROUND, volts, resistance, inductance)


def rail_source_name(net: str) -> str:
    """The name of the voltage source that holds a rail."""
    return f"{net} supply"


def amplifier_element(board: Board, amplifier: PlacedAmplifier) -> Amplifier:
    """The network element of an amplifier of the brief."""
    table = amplifier.table
    return Amplifier(
        amplifier.name,
        node(board, amplifier.plus),
        node(board, amplifier.minus),
        node(board, amplifier.out),
        10 ** (table.open_loop_gain / 20),
        float(table.gain_bandwidth),
        float(table.output_resistance),
    )


def across(volts: Mapping[str, float | None], section: Section) -> float | None:
    """V(a) − V(b) of a section, None where either is not known."""
    a, b = volts.get(section.a), volts.get(section.b)
    return None if a is None or b is None else a - b
