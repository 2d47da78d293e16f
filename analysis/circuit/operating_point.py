"""The DC operating point: capacitors open but for their leakage, inductors and beads by their DC resistance.

Ideal sources and shorts join nodes with a known difference first (so that sources which contradict each other show by
name); nodes whose voltage is known then cut the rest into small networks that are solved on their own. What has no DC
path is named and left out; everything else is solved.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

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
    VoltageSource,
    terminals,
)
from reactance.analysis.circuit.potentials import Potentials

_DENSE = 150  # unknowns up to which a network is solved with full matrices


@dataclass(frozen=True, slots=True)
class OperatingPoint:
    """DC voltages of nodes against ground and DC currents of elements.

    `voltages` leaves out what has no defined voltage: `floating` names those nodes. `currents`: through resistors,
    inductors, beads and leaking capacitors from a to b, out of a voltage source's plus terminal. `loops`: elements
    without resistance that close a loop, so that the current around it is not determined (their currents are NaN).
    """

    voltages: Mapping[str, float]
    currents: Mapping[str, float]
    floating: tuple[str, ...]
    loops: tuple[tuple[str, ...], ...] = ()


@dataclass(frozen=True, slots=True)
class _Conductor:
    """A resistance from a to b with an EMF (V(a) − V(b) when no current flows). `sign` turns its current outward."""

    name: str
    a: str
    b: str
    resistance: float
    emf: float = 0.0
    sign: float = 1.0


@dataclass(frozen=True, slots=True)
class _Gain:
    name: str
    plus: str
    minus: str
    out: str
    gain: float


def operating_point(network: Network) -> OperatingPoint:
    """Solve `network` at DC.

    Raises `CircuitError` naming sources that contradict each other, or gains that leave no unique solution.
    """
    taken = _Taken()
    for element in network.elements:
        taken.add(element)
    potentials = Potentials(network.ground)
    for node in network.nodes():
        potentials.add(node)
    for ideal in taken.ideal:
        potentials.join(ideal.name, ideal.a, ideal.b, ideal.emf)
    solver = _Solver(network.ground, taken, potentials)
    solver.solve()
    inside = {gain.out for gain in taken.gains} - {node for e in network.elements for node in terminals(e)}
    voltages = {node: v for node, v in solver.node_voltages().items() if node not in inside}
    floating = tuple(node for node in network.nodes() if node not in voltages)
    return OperatingPoint(voltages, solver.currents(), floating, tuple(potentials.loops))


class _Taken:
    """A network's elements as they are at DC."""

    def __init__(self) -> None:
        self.conductors: list[_Conductor] = []
        self.ideal: list[_Conductor] = []
        self.gains: list[_Gain] = []
        self.sources: list[CurrentSource] = []

    def add(self, element: Element) -> None:
        """Take one element in."""
        if isinstance(element, CurrentSource):
            self.sources.append(element)
        elif isinstance(element, VoltageSource):
            e = element
            self._resistance(e.name, e.plus, e.minus, e.resistance, e.voltage, -1.0)
        elif isinstance(element, Amplifier):
            self._amplifier(element)
        elif isinstance(element, Measured):
            self._measured(element)
        elif isinstance(element, Capacitor):
            if np.isfinite(element.leakage):
                self._resistance(element.name, element.a, element.b, element.esr + element.leakage)
        elif isinstance(element, Inductor | Bead):
            self._resistance(element.name, element.a, element.b, element.dcr)
        else:
            self._resistance(element.name, element.a, element.b, element.resistance)

    def _resistance(self, name: str, a: str, b: str, ohms: float, emf: float = 0.0, sign: float = 1.0) -> None:
        if not ohms >= 0:
            raise CircuitError(f"{name}: resistance is {ohms}", elements=(name,))
        if ohms == 0:
            self.ideal.append(_Conductor(name, a, b, 0.0, emf, sign))
        elif np.isfinite(ohms):
            self.conductors.append(_Conductor(name, a, b, ohms, emf, sign))

    def _amplifier(self, element: Amplifier) -> None:
        out = element.out
        if element.output_resistance > 0:
            out = f"{element.name} (inside)"
            self.conductors.append(_Conductor(element.name, out, element.out, element.output_resistance))
        self.gains.append(_Gain(element.name, element.plus, element.minus, out, element.gain))

    def _measured(self, element: Measured) -> None:
        """By its fit; else by its impedance at the lowest frequency, open where that is capacitive."""
        if element.fit is not None:
            for part in element.fit:
                self.add(part)
            return
        z = complex(np.asarray(element.impedance(np.array([1e-6])))[0])
        if z.imag > -abs(z.real):
            self._resistance(element.name, element.a, element.b, max(z.real, 0.0))


class _Solver:
    """Unknown groups of joined nodes, cut into independent networks by the groups whose voltage is known."""

    def __init__(self, ground: str, taken: _Taken, potentials: Potentials) -> None:
        self.taken, self.potentials = taken, potentials
        for gain in taken.gains:
            for node in (gain.plus, gain.minus, gain.out):
                potentials.add(node)
        self.home = potentials.root(ground)[0]
        self.level: dict[str, float] = {self.home: -potentials.root(ground)[1]}
        self.where = {node: potentials.root(node) for node in potentials.nodes}
        self.dead_gains: set[str] = set()

    def solve(self) -> None:
        """Fill `level`: the voltage of each group's root, for all that have one."""
        for members in self._components(self._live_gains()):
            self._solve_component(members)

    def _live_gains(self) -> list[_Gain]:
        """Gains whose inputs have a defined voltage; found by striking out those that have none until all have."""
        gains = list(self.taken.gains)
        while True:
            defined = self._defined(gains)
            live = [g for g in gains if self.where[g.plus][0] in defined and self.where[g.minus][0] in defined]
            if len(live) == len(gains):
                return live
            gains = live

    def _defined(self, gains: Sequence[_Gain]) -> set[str]:
        """Groups that conductors join to ground or to an amplifier's output."""
        near: dict[str, list[str]] = {}
        for c in self.taken.conductors:
            a, b = self.where[c.a][0], self.where[c.b][0]
            near.setdefault(a, []).append(b)
            near.setdefault(b, []).append(a)
        found = {self.home, *(self.where[g.out][0] for g in gains)}
        stack = list(found)
        while stack:
            for other in near.get(stack.pop(), ()):
                if other not in found:
                    found.add(other)
                    stack.append(other)
        self.found = found
        return found

    def _tied(self, gains: Sequence[_Gain]) -> Potentials:
        """Unknown groups that conductors and gains tie together, apart from the ground's group."""
        tied = Potentials(self.home)
        for root in self.found:
            tied.add(root)

        def tie(a: str, b: str) -> None:
            if self.home not in (a, b) and a in self.found and b in self.found:
                tied.unite(a, b)

        for c in self.taken.conductors:
            tie(self.where[c.a][0], self.where[c.b][0])
        for gain in gains:
            tie(self.where[gain.out][0], self.where[gain.plus][0])
            tie(self.where[gain.out][0], self.where[gain.minus][0])
        return tied

    def _components(self, gains: Sequence[_Gain]) -> Iterable[_Component]:
        """The networks that can be solved on their own."""
        for gain in gains:
            if self.where[gain.out][0] == self.home:
                raise CircuitError(
                    f"the output of {gain.name} has no resistance and is held by another source", elements=(gain.name,)
                )
        tied = self._tied(gains)
        parts: dict[str, _Component] = {}

        def part(*nodes: str) -> _Component | None:
            for node in nodes:
                root = self.where[node][0]
                if root != self.home and root in self.found:
                    return parts.setdefault(tied.root(root)[0], _Component([], [], [], []))
            return None

        for root in self.found:
            if root != self.home and (found := part(root)) is not None:
                found.roots.append(root)
        for c in self.taken.conductors:
            if (found := part(c.a, c.b)) is not None:
                found.conductors.append(c)
        for gain in gains:
            if (found := part(gain.out)) is not None:
                found.gains.append(gain)
        for source in self.taken.sources:
            for node, sign in ((source.a, -1.0), (source.b, 1.0)):
                if (found := part(node)) is not None:
                    found.injected.append((node, sign * source.current))
        return parts.values()

    def _solve_component(self, part: _Component) -> None:
        number = {root: k for k, root in enumerate(part.roots)}
        size = len(number)
        entries: list[tuple[int, int, float]] = []
        right = np.zeros(size)

        def at(node: str) -> tuple[int | None, float]:
            """Index of the unknown and the known part of a node's voltage."""
            root, offset = self.where[node]
            return (None, self.level[self.home] + offset) if root == self.home else (number[root], offset)

        for c in part.conductors:
            (i, vi), (j, vj) = at(c.a), at(c.b)
            g = 1.0 / c.resistance
            known = g * (vi - vj - c.emf)
            for row, sign in ((i, 1.0), (j, -1.0)):
                if row is not None:
                    right[row] -= sign * known
                    if i is not None:
                        entries.append((row, i, sign * g))
                    if j is not None:
                        entries.append((row, j, -sign * g))
        for node, current in part.injected:
            row, _ = at(node)
            if row is not None:
                right[row] += current
        held = {number[self.where[gain.out][0]] for gain in part.gains}
        if len(held) < len(part.gains):
            names = [gain.name for gain in part.gains]
            raise CircuitError(f"amplifier outputs without resistance meet: {', '.join(names)}", elements=names)
        entries = [entry for entry in entries if entry[0] not in held]
        for gain in part.gains:
            (out, vo), (plus, vp), (minus, vm) = at(gain.out), at(gain.plus), at(gain.minus)
            assert out is not None
            right[out] = vp - vm - vo / gain.gain
            entries.append((out, out, 1.0 / gain.gain))
            if plus is not None:
                entries.append((out, plus, -1.0))
            if minus is not None:
                entries.append((out, minus, 1.0))
        x = _solve_entries(entries, right, [gain.name for gain in part.gains])
        self.level.update(zip(part.roots, x.tolist(), strict=True))

    def node_voltages(self) -> dict[str, float]:
        """The voltage of every node that has one."""
        return {node: self.level[root] + offset for node, (root, offset) in self.where.items() if root in self.level}

    def currents(self) -> dict[str, float]:
        """Currents by element name, as `OperatingPoint` states them."""
        volts = self.node_voltages()
        found: dict[str, float] = {}
        leaving: dict[str, float] = {}
        for c in self.taken.conductors:
            amps = 0.0
            if c.a in volts and c.b in volts:
                amps = (volts[c.a] - volts[c.b] - c.emf) / c.resistance
            found[c.name] = c.sign * amps
            leaving[c.a] = leaving.get(c.a, 0.0) + amps
            leaving[c.b] = leaving.get(c.b, 0.0) - amps
        for source in self.taken.sources:
            leaving[source.a] = leaving.get(source.a, 0.0) + source.current
            leaving[source.b] = leaving.get(source.b, 0.0) - source.current
        free = {gain.out for gain in self.taken.gains}
        through = self.potentials.through(leaving, free)
        for ideal in self.taken.ideal:
            found[ideal.name] = ideal.sign * through.get(ideal.name, float("nan"))
        return found


@dataclass(frozen=True, slots=True)
class _Component:
    roots: list[str]
    conductors: list[_Conductor]
    gains: list[_Gain]
    injected: list[tuple[str, float]]


def _solve_entries(entries: Sequence[tuple[int, int, float]], right: FloatArray, gains: Sequence[str]) -> FloatArray:
    size = len(right)
    rows, columns, values = (np.array(x) for x in zip(*entries, strict=True))
    scale = np.zeros(size)
    np.maximum.at(scale, rows, np.abs(values))
    values, right = values / scale[rows], right / scale
    if size <= _DENSE:
        matrix = np.zeros((size, size))
        np.add.at(matrix, (rows, columns), values)
        try:
            x = np.linalg.solve(matrix, right)
            return np.asarray(x + np.linalg.solve(matrix, right - matrix @ x))
        except np.linalg.LinAlgError:
            x = np.full(size, np.nan)
    else:
        from scipy.sparse import csc_matrix
        from scipy.sparse.linalg import splu

        sparse = csc_matrix((values, (rows, columns)), shape=(size, size))
        try:
            factors = splu(sparse)
            x = factors.solve(right)
            x = x + factors.solve(right - sparse @ x)
        except RuntimeError:
            x = np.full(size, np.nan)
    if not np.isfinite(x).all():
        raise CircuitError(f"no unique operating point: the gains cancel ({', '.join(gains)})", elements=gains)
    return np.asarray(x)
