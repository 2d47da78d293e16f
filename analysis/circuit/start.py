"""A start with capacitors whose capacitance follows their voltage: charge is the unknown, and is conserved.

Between capacitors' charges and inductors' currents a network is resistive, so dq/dt and di/dt are linear in the
capacitors' voltages, which follow from the charges by each one's own law. The equations are stiff; they are
integrated with error control by scipy's LSODA (Petzold, SIAM J. Sci. Stat. Comput. 4 (1983) 136), or Radau where that
gives up. Series inductance of capacitors and parallel capacitance of inductors and beads act far faster than a start
and are left out here.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from reactance.analysis.circuit.charge import ChargeLaw
from reactance.analysis.circuit.family import Family
from reactance.analysis.circuit.modal import expand
from reactance.analysis.circuit.network import (
    Amplifier,
    Bead,
    Capacitor,
    CircuitError,
    CurrentSource,
    Element,
    FloatArray,
    Inductor,
    Measured,
    Network,
    Resistor,
    VoltageSource,
)
from reactance.analysis.circuit.system import System

_LEAST_SHARE = 1e-9  # of the smallest resistance: stands in series with a capacitor without ESR
_TOLERANCE = 1e-10


@dataclass(frozen=True, slots=True)
class _State:
    """One unknown: the source (in the resistive network) that carries it, and where its rate of change is read.

    rate = (V(plus) − V(minus))·factor − decay·(the source's value); `law` maps the unknown to the source's value.
    """

    source: str
    plus: str
    minus: str
    factor: float
    decay: float
    law: Callable[[FloatArray], FloatArray]
    size: float  # of the unknown per volt


@dataclass(frozen=True, slots=True)
class StartMotion:
    """The probe's voltage after power comes on. Same questions as a `TimeResponse`."""

    solution: Callable[[FloatArray], FloatArray]
    times: FloatArray
    end: float

    def value(self, t: ArrayLike) -> FloatArray:
        """v at times t (T,); 0 before t = 0, the final value after the end of the integration."""
        times = np.atleast_1d(np.asarray(t, float))
        v = self.solution(np.clip(times, 0.0, self.end))
        return np.where(times < 0, 0.0, v)

    @property
    def final(self) -> float:
        """v when all has settled."""
        return float(self.solution(np.array([self.end]))[0])

    def farthest(self) -> float:
        """The value of v farthest from 0, with its sign."""
        return float(self._turn(0.0)[1])

    def peak(self, about: float = 0.0) -> float:
        """The greatest |v − about| over t > 0."""
        return abs(float(self._turn(about)[1]) - about)

    def settling_time(self, within: float) -> float:
        """The last time at which |v − v(∞)| is greater than `within`."""
        final = self.final
        t = self._fine()
        outside = np.flatnonzero(np.abs(self.solution(t) - final) > within)
        if not len(outside):
            return 0.0
        low, high = t[outside[-1]], t[min(outside[-1] + 1, len(t) - 1)]
        for _ in range(60):
            middle = 0.5 * (low + high)
            if abs(float(self.solution(np.array([middle]))[0]) - final) > within:
                low = middle
            else:
                high = middle
        return float(0.5 * (low + high))

    def _fine(self) -> FloatArray:
        share = np.linspace(0.0, 1.0, 8, endpoint=False)
        inner = self.times[:-1, None] + np.diff(self.times)[:, None] * share
        return np.append(inner.ravel(), self.times[-1])

    def _turn(self, about: float) -> tuple[float, float]:
        t = self._fine()
        v = self.solution(t)
        k = int(np.abs(v - about).argmax())
        low, high = t[max(k - 1, 0)], t[min(k + 1, len(t) - 1)]
        grid = np.linspace(low, high, 41)
        for _ in range(6):
            values = self.solution(grid)
            k = int(np.abs(values - about).argmax())
            grid = np.linspace(grid[max(k - 1, 0)], grid[min(k + 1, 40)], 41)
        return float(grid[20]), float(self.solution(grid[20:21])[0])


def large_signal_start(
    network: Network, probe: str | tuple[str, str], laws: Mapping[str, ChargeLaw], *, tolerance: float = _TOLERANCE
) -> StartMotion:
    """The probe's voltage when all sources step from 0 to their DC level at t = 0, every capacitor empty.

    `laws` gives the charge laws of capacitors by name; all others keep their capacitance, which for those in `laws`
    should be the value at 0 V (it sets the time to integrate over). `tolerance` is relative, per step.

    Raises `CircuitError` where the network has no unique solution or the integration fails.
    """
    builder = _Builder(network, laws)
    system = System(builder.resistive(), over_time=True)
    states = builder.states
    seen = system.probe(probe)
    probes = [(state.plus, state.minus) for state in states]
    one = np.array([[1.0 + 0j]])

    def gains(source: str | None, where: tuple[str, str]) -> float:
        return float(system.respond(one, system.drive(source), where)[0, 0].real)

    matrix = np.array([[gains(state.source, where) for state in states] for where in probes])
    matrix = matrix.reshape(len(states), len(states))
    constant = np.array([gains(None, where) for where in probes])
    out, out_constant = np.array([gains(state.source, seen) for state in states]), gains(None, seen)
    factor, decay = np.array([s.factor for s in states]), np.array([s.decay for s in states])
    matrix = factor[:, None] * matrix - np.diag(decay)
    constant = factor * constant
    if not states:
        return StartMotion(lambda t: np.full(len(t), out_constant), np.array([0.0, 1.0]), 1.0)
    laws_of = [state.law for state in states]

    def levels(y: FloatArray) -> FloatArray:
        """Sources' values (n, T) from the unknowns (n, T)."""
        return np.stack([law(row) for law, row in zip(laws_of, y, strict=True)])

    scale = np.array([state.size for state in states]) * max(_greatest_level(network), 1e-3)

    def rate(t: float, y: FloatArray) -> FloatArray:
        return np.asarray(matrix @ levels(y[:, None])[:, 0] + constant)

    def slope(t: float, y: FloatArray) -> FloatArray:
        h = 1e-6 * scale
        return np.asarray(matrix * ((levels((y + h)[:, None]) - levels((y - h)[:, None]))[:, 0] / (2.0 * h)))

    end = _horizon(network, seen)
    solution = _integrate(rate, slope, end, np.zeros(len(states)), tolerance, tolerance * 1e-2 * scale)
    return StartMotion(lambda t: out @ levels(solution.sol(t)) + out_constant, solution.t, end)


def _integrate(
    rate: Callable[[float, FloatArray], FloatArray],
    slope: Callable[[float, FloatArray], FloatArray],
    end: float,
    start: FloatArray,
    rtol: float,
    atol: FloatArray,
) -> _Solution:
    from scipy.integrate import solve_ivp

    for method in ("LSODA", "Radau"):
        found = solve_ivp(
            rate, (0.0, end), start, method=method, jac=slope, rtol=rtol, atol=atol, dense_output=True,
            first_step=end * 1e-15,
        )  # fmt: skip
        if found.success:
            return found  # type: ignore[no-any-return]
    raise CircuitError(f"the start could not be integrated: {found.message}")


class _Solution:
    """What is used of scipy's result."""

    t: FloatArray
    sol: Callable[[FloatArray], FloatArray]


def _greatest_level(network: Network) -> float:
    return max((abs(e.voltage) for e in network.elements if isinstance(e, VoltageSource)), default=1.0)


def _horizon(network: Network, probe: tuple[str, str]) -> float:
    """Long enough for the linear network, whose capacitances are the greatest, to settle to 1e-15."""
    modes = expand(Family(network), None, probe, None)
    p, r = modes.poles[0], modes.residues[0]
    if (p.real > 0).any():
        raise CircuitError("the network is unstable")
    size = np.abs(r / np.where(p == 0, 1.0, p))
    shows = (p.real < 0) & (size > 1e-12 * size.max(initial=0.0))
    return float(36.0 / np.abs(p.real[shows]).min()) if shows.any() else 1.0


class _Builder:
    """The resistive network between the states, and the states."""

    def __init__(self, network: Network, laws: Mapping[str, ChargeLaw]) -> None:
        self.network, self.laws = network, laws
        resistances = [
            value
            for element in network.elements
            for name in ("resistance", "esr", "dcr", "output_resistance")
            if (value := getattr(element, name, 0.0)) and math.isfinite(value)
        ]
        self.least = _LEAST_SHARE * min(resistances, default=1.0)
        self.most = max(resistances, default=1.0) / _LEAST_SHARE
        self.made: list[Element] = []
        self.states: list[_State] = []
        for element in network.elements:
            self._add(element)

    def resistive(self) -> Network:
        """The network in which every state is a source."""
        return Network(tuple(self.made), self.network.ground)

    def _add(self, element: Element) -> None:
        if isinstance(element, Capacitor):
            self._capacitor(element)
        elif isinstance(element, Inductor):
            self._inductor(element.name, element.a, element.b, element.inductance, element.dcr)
        elif isinstance(element, Bead):
            middle = f"{element.name} (inside)"
            self.made.append(Resistor(f"{element.name} dcr", element.a, middle, element.dcr))
            self.made.append(Resistor(f"{element.name} loss", middle, element.b, element.resistance))
            self._inductor(element.name, middle, element.b, element.inductance, 0.0)
        elif isinstance(element, VoltageSource) and element.inductance:
            middle = f"{element.name} (inside)"
            self.made.append(VoltageSource(element.name, middle, element.minus, element.voltage, element.resistance))
            self._inductor(f"{element.name} inductance", middle, element.plus, element.inductance, 0.0)
        elif isinstance(element, Amplifier) and math.isfinite(element.gain_bandwidth):
            self._amplifier(element)
        elif isinstance(element, Measured):
            if element.fit is None:
                raise CircuitError(f"{element.name} has no fit for time work", elements=(element.name,))
            for part in element.fit:
                self._add(part)
        else:
            self.made.append(element)

    def _capacitor(self, e: Capacitor) -> None:
        middle, source = f"{e.name} (inside)", f"{e.name} voltage"
        series = max(e.esr, self.least)
        self.made.append(VoltageSource(source, middle, e.b, 0.0))
        self.made.append(Resistor(f"{e.name} series", e.a, middle, series))
        law = self.laws[e.name].voltage if e.name in self.laws else ChargeLaw.constant(e.capacitance).voltage
        self.states.append(_State(source, e.a, middle, 1.0 / series, 1.0 / e.leakage, law, e.capacitance))

    def _inductor(self, name: str, a: str, b: str, inductance: float, dcr: float) -> None:
        if inductance == 0:
            self.made.append(Resistor(name, a, b, dcr))
            return
        source = f"{name} current"
        self.made.append(CurrentSource(source, a, b, 0.0))
        self.made.append(Resistor(f"{name} shunt", a, b, self.most))
        self.states.append(_State(source, a, b, 1.0 / inductance, dcr / inductance, lambda y: y, 1.0 / max(dcr, 1.0)))

    def _amplifier(self, e: Amplifier) -> None:
        rate = 2.0 * math.pi * e.gain_bandwidth
        source = f"{e.name} inner"
        ground = self.network.ground
        self.made.append(VoltageSource(source, e.out, ground, 0.0, e.output_resistance))
        self.states.append(_State(source, e.plus, e.minus, rate, rate / e.gain, lambda y: y, 1.0))
