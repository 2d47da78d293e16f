"""Thermal noise of a network's resistances, from 0 Hz to infinity, in closed form.

Johnson–Nyquist: each resistance R carries an EMF of density 4kTR (J. B. Johnson, Phys. Rev. 32 (1928) 97; H. Nyquist,
Phys. Rev. 32 (1928) 110). With H(s) = Σ r/(s − p) from that EMF to the probe, ∫|H|²df over all positive frequencies is
−½·ΣΣ rᵢ·rⱼ*/(pᵢ + pⱼ*) (Parseval's theorem).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.modal import residues_at
from reactance.analysis.circuit.network import (
    Bead,
    Capacitor,
    ComplexArray,
    Element,
    FloatArray,
    Inductor,
    Network,
    Parameter,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.system import NEAR_INFINITY, NEAR_ZERO, System

BOLTZMANN = 1.380649e-23  # J/K, exact in the SI

Values = Callable[[str], FloatArray]  # attribute -> (V, 1)


@dataclass(frozen=True, slots=True)
class _Origin:
    """One noisy resistance: its branch, its ohms (V,), and the share of its EMF that drives the branch, at s and y."""

    branch: int
    resistance: FloatArray
    drives: Callable[[ComplexArray, ComplexArray], ComplexArray]


def integrated_noise(
    network: Network,
    probe: str | tuple[str, str],
    temperature_kelvin: float,
    *,
    parameters: Sequence[Parameter] = (),
    values: ArrayLike | None = None,
    family: Family | None = None,
) -> float | FloatArray:
    """Thermal noise voltage at `probe` in V rms, a float or (V,) with `values` (V, P): inf where nothing bounds it.

    Every resistance counts: resistors, ESR, DCR, source resistances, a bead's loss and stated leakage; the output
    resistance of an amplifier does not. Raises `CircuitError` as `pole_residue` does.
    """
    grid = None if values is None else np.asarray(values, float)
    family = family or Family(network, parameters)
    system = family.system(grid, over_time=True)
    nodes = system.probe(probe)
    poles = family.poles(grid).roots
    square = np.zeros(system.count)
    for origin in _origins(system, parameters, grid):
        gathered = _gathered(system, nodes, origin, poles)
        square = square + np.where(origin.resistance > 0, origin.resistance * gathered, 0.0)
    rms = np.sqrt(4.0 * BOLTZMANN * temperature_kelvin * square)
    return rms if values is not None else float(rms[0])


def _gathered(system: System, probe: tuple[str, str], origin: _Origin, poles: ComplexArray) -> FloatArray:
    """∫|H|²df from one EMF to the probe, (V,)."""

    def respond(s: ComplexArray) -> ComplexArray:
        y = _admittance(system, origin.branch, s)
        return origin.drives(s, y) * system.transfers(s, probe)[..., origin.branch]

    ends = np.abs(respond(np.broadcast_to(np.array([[NEAR_ZERO, NEAR_INFINITY]], complex), (system.count, 2))))
    unbounded = (ends[:, 0] > 1e20) | (ends[:, 1] > 1e-20)
    p, r = residues_at(poles, respond)
    sums = np.where(r[:, :, None] * r[:, None, :] == 0, -1.0, p[:, :, None] + p[:, None, :].conj())
    total = -0.5 * (r[:, :, None] * r[:, None, :].conj() / sums).sum(axis=(1, 2)).real
    unstable = ((p.real >= 0) & (np.abs(r) > 1e-9 * np.abs(r).max(axis=1, keepdims=True, initial=0.0))).any(axis=1)
    return np.where(unbounded | unstable, np.inf, np.maximum(total, 0.0))


def _admittance(system: System, branch: int, s: ComplexArray) -> ComplexArray:
    fixed = branch < system.fixed
    return system.admittances(s, fixed)[..., branch if fixed else branch - system.fixed]


def _origins(system: System, parameters: Sequence[Parameter], values: FloatArray | None) -> list[_Origin]:
    found: list[_Origin] = []
    for index, branch in enumerate(system.branches):
        if branch.noisy:
            get = _getter(branch.element, parameters, values, system.count)
            found += _of_element(index, branch.element, get)
    return found


def _getter(element: Element, parameters: Sequence[Parameter], values: FloatArray | None, count: int) -> Values:
    columns = {p.attribute: i for i, p in enumerate(parameters) if p.name == element.name}

    def get(attribute: str) -> FloatArray:
        if values is not None and attribute in columns:
            return np.asarray(values[:, columns[attribute], None])
        return np.full((count, 1), float(getattr(element, attribute)))

    return get


def _of_element(index: int, element: Element, get: Values) -> list[_Origin]:
    """The noisy resistances of one branch. An EMF in series with all of it drives it with y; others less."""

    def series(attribute: str) -> _Origin:
        return _Origin(index, get(attribute)[:, 0], lambda s, y: y)

    if isinstance(element, Resistor):
        return [series("resistance")] if math.isfinite(element.resistance) else []
    if isinstance(element, VoltageSource):
        return [series("resistance")]
    if isinstance(element, Capacitor):
        found = [series("esr")] if element.esr else []
        if math.isfinite(element.leakage):
            g, c = 1.0 / get("leakage"), get("capacitance")
            found.append(_Origin(index, get("leakage")[:, 0], lambda s, y: y * g / (g + s * c)))
        return found
    if isinstance(element, Inductor):
        r, ind = get("dcr"), get("inductance")
        return [_Origin(index, r[:, 0], lambda s, y: 1.0 / (r + s * ind))] if element.dcr else []
    if isinstance(element, Bead):
        gb, lb, cb = 1.0 / get("resistance"), get("inductance"), get("capacitance")
        tank = _Origin(
            index, get("resistance")[:, 0], lambda s, y: y * s * lb * gb / (1.0 + s * lb * gb + s * s * lb * cb)
        )
        return [tank, series("dcr")] if element.dcr else [tank]
    return []
