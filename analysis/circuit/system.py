"""The equations of a network at any complex frequency, for many frequencies and many sets of values at once.

Unknowns are the voltages of a spanning forest of the greatest admittances (forest.py), so the matrices are no larger
than the number of nodes and keep their digits from 1e-15 F to 1e6 Ω and from 1 mHz to 10 GHz. The forest follows the
frequency. Ideal voltage sources and shorts are known forest voltages; an ideal controlled source replaces the current
law of its own cutset (modified nodal analysis: Ho, Ruehli and Brennan, IEEE Trans. Circuits Syst. 22 (1975) 504,
written in cutset voltages).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from copy import copy
from dataclasses import dataclass
from functools import cached_property
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from reactance.analysis.circuit.branches import Parts, coefficients, take_apart
from reactance.analysis.circuit.forest import Edge, Forest, span
from reactance.analysis.circuit.network import (
    CircuitError,
    ComplexArray,
    CurrentSource,
    FloatArray,
    Network,
    Parameter,
    VoltageSource,
)

T = TypeVar("T")
NEAR_ZERO = 1e-40  # rad/s that stands for DC: far below any rate of any network, far above underflow
NEAR_INFINITY = 1e40


@dataclass(frozen=True, slots=True)
class Drive:
    """Amplitudes of the independent sources: EMFs of branches, of ideal branches, and currents."""

    branches: FloatArray
    ideal: FloatArray
    currents: FloatArray


@dataclass(frozen=True, slots=True)
class Equations:
    """M·x = r at some points s, with the derivatives in s if asked for; `observe` gives the probe's voltage.

    Shapes: matrix (V, F, N, N), rhs (V, F, N), the derivatives alike; observe (N,); known is the probe's share of
    the known forest voltages.
    """

    matrix: ComplexArray
    rhs: ComplexArray
    observe: FloatArray
    known: float
    matrix_slope: ComplexArray | None = None
    rhs_slope: ComplexArray | None = None
    denominator_slope: ComplexArray | None = None


class System:
    """A network with V sets of parameter values, ready to be evaluated at complex frequencies.

    `values` (V, P) gives the parameters' values; None stands for the network as it is (V = 1). `over_time` selects
    what holds in time work: measured parts by their fit, no dielectric loss.
    """

    def __init__(
        self,
        network: Network,
        *,
        over_time: bool,
        parameters: Sequence[Parameter] = (),
        values: FloatArray | None = None,
    ) -> None:
        self.network = network
        self.over_time = over_time
        self.parts: Parts = take_apart(network, over_time=over_time)
        if values is not None:
            values = np.asarray(values, float)
            if values.ndim != 2 or values.shape[1] != len(parameters):
                raise ValueError(f"values of shape {values.shape} for {len(parameters)} parameters")
        self.count = 1 if values is None else len(values)
        self.nodes = self._index_nodes()
        self._coefficients(parameters, values)
        self._forests: dict[tuple[int, ...], Forest] = {}
        self._decades: dict[int, tuple[int, ...]] = {}
        self._drives: dict[str | None, Drive] = {}
        self._layouts: dict[tuple[tuple[int, ...], int, tuple[str, str]], _Layout] = {}

    def only(self, rows: NDArray[np.intp]) -> System:
        """The same network with some of its sets of values."""
        part = copy(self)
        part.count = len(rows)
        part._varied = (self._varied[0][rows], self._varied[1][rows])
        return part

    # what the network is

    def _index_nodes(self) -> dict[str, int]:
        nodes: dict[str, int] = {self.network.ground: 0}
        for branch in (*self.parts.ideal, *self.parts.branches):
            nodes.setdefault(branch.a, len(nodes))
            nodes.setdefault(branch.b, len(nodes))
        for gain in self.parts.gains:
            for node in (gain.plus, gain.minus, gain.out):
                nodes.setdefault(node, len(nodes))
        for current in self.parts.currents:
            nodes.setdefault(current.a, len(nodes))
            nodes.setdefault(current.b, len(nodes))
        return nodes

    def _coefficients(self, parameters: Sequence[Parameter], values: FloatArray | None) -> None:
        changed: dict[str, dict[str, FloatArray]] = {}
        if values is not None:
            for column, parameter in enumerate(parameters):
                changed.setdefault(parameter.name, {})[parameter.attribute] = values[:, column]
        names = {branch.element.name for branch in self.parts.branches}
        for name in changed:
            if name not in names:
                raise CircuitError(f"no branch called {name} has a value to vary", elements=(name,))
        order = sorted(
            range(len(self.parts.branches)),
            key=lambda i: (
                self.parts.branches[i].element.name in changed,
                self.parts.branches[i].impedance is not None,
            ),
        )
        self.branches = tuple(self.parts.branches[i] for i in order)
        self.fixed = sum(branch.element.name not in changed for branch in self.branches)
        self.measured = tuple(i for i, branch in enumerate(self.branches) if branch.impedance is not None)
        lossy = not self.over_time
        blank = np.zeros((1, 3), complex)
        fixed: list[tuple[ComplexArray, ComplexArray]] = []
        varied: list[tuple[ComplexArray, ComplexArray]] = []
        for i, branch in enumerate(self.branches):
            if branch.impedance is not None:
                fixed.append((blank, np.asarray(blank + 1.0)))
            elif i < self.fixed:
                fixed.append(coefficients(branch.element, {}, 1, lossy=lossy))
            else:
                varied.append(coefficients(branch.element, changed[branch.element.name], self.count, lossy=lossy))
        self._fixed = _stack(fixed, 1)
        self._varied = _stack(varied, self.count)

    @cached_property
    def edges(self) -> tuple[Edge, ...]:
        """Candidates for the forest: ideal branches, gains (output to ground), then branches."""
        at = self.nodes
        return (
            *(Edge(at[branch.a], at[branch.b]) for branch in self.parts.ideal),
            *(Edge(at[gain.out], 0) for gain in self.parts.gains),
            *(Edge(at[branch.a], at[branch.b]) for branch in self.branches),
        )

    @cached_property
    def silence(self) -> Drive:
        """Every source at zero."""
        return Drive(np.zeros(len(self.branches)), np.zeros(len(self.parts.ideal)), np.zeros(len(self.parts.currents)))

    def drive(self, source: str | None = None) -> Drive:
        """Unit excitation of one source, or (None) every source at its DC level."""
        if source not in self._drives:
            self._drives[source] = self._make_drive(source)
        return self._drives[source]

    def _make_drive(self, source: str | None) -> Drive:

        def level(element: object) -> float:
            if source is not None:
                return float(isinstance(element, VoltageSource) and element.name == source)
            return element.voltage if isinstance(element, VoltageSource) else 0.0

        drive = Drive(
            np.array([level(branch.element) for branch in self.branches]),
            np.array([level(branch.element) for branch in self.parts.ideal]),
            np.array([c.current if source is None else float(c.name == source) for c in self.parts.currents]),
        )
        if source is not None and not (drive.branches.any() or drive.ideal.any() or drive.currents.any()):
            self._missing_source(source)
        return drive

    def _missing_source(self, source: str) -> None:
        element = self.network.element(source)
        if not isinstance(element, VoltageSource | CurrentSource):
            raise CircuitError(f"{source} is not a source", elements=(source,))

    # admittances

    def admittances(self, s: ComplexArray, fixed: bool) -> ComplexArray:
        """Admittances (V or 1, F, m) of the fixed or of the varied branches at s (V or 1, F)."""
        n, d = self._fixed if fixed else self._varied
        y = _poly(n, s) / _poly(d, s)
        if fixed and self.measured:
            frequency = np.abs(s) / (2.0 * np.pi)
            for i in self.measured:
                measure = self.branches[i].impedance
                assert measure is not None
                y[..., i] = 1.0 / np.asarray(measure(frequency.ravel())).reshape(s.shape)
        return y

    def admittance_slopes(self, s: ComplexArray, fixed: bool) -> tuple[ComplexArray, ComplexArray]:
        """dy/ds (V or 1, F, m) and the sum over branches of d′/d (V or 1, F), at s (V or 1, F)."""
        n, d = self._fixed if fixed else self._varied
        nv, dv = _poly(n, s), _poly(d, s)
        ns, ds = _poly_slope(n, s), _poly_slope(d, s)
        return (ns - nv * (ds / dv)) / dv, np.asarray((ds / dv).sum(axis=-1))

    # the forest

    def forest_at(self, rate: float) -> Forest:
        """The forest for |s| = `rate`, chosen once per decade."""
        decade = int(np.clip(np.round(np.log10(rate)), -60, 60))
        if decade not in self._decades:
            s = np.array([[1j * 10.0**decade]]) if not self.over_time else np.array([[10.0**decade + 0j]])
            weights = np.concatenate([np.abs(self.admittances(s, True))[0, 0], self._mean_varied(s)])
            weights = np.where(np.isfinite(weights), weights, 0.0)
            forced = len(self.parts.ideal) + len(self.parts.gains)
            forest = span(len(self.nodes), 0, self.edges, np.concatenate([np.zeros(forced), weights]), forced)
            for index in forest.closing:
                self._judge_closing(index, forest)
            self._decades[decade] = forest.chosen
            self._forests.setdefault(forest.chosen, forest)
        return self._forests[self._decades[decade]]

    def _mean_varied(self, s: ComplexArray) -> FloatArray:
        y = np.abs(self.admittances(s, False))[:, 0]
        return np.asarray(y.mean(axis=0)) if y.size else np.zeros(y.shape[-1])

    def _judge_closing(self, index: int, forest: Forest) -> None:
        """A forced edge that closes a loop: harmless only where all of the loop is shorts and zero sources."""
        ideal = len(self.parts.ideal)
        edge = self.edges[index]
        path = forest.path(edge.a, edge.b)
        loop = [forest.chosen[k] for k in np.flatnonzero(path)]
        names = [self._edge_name(i) for i in (*loop, index)]
        if index >= ideal or any(i >= ideal for i in loop):
            raise CircuitError(
                f"an amplifier's output without resistance is held by another source: {', '.join(names)}",
                elements=names,
            )
        level = [getattr(self.parts.ideal[i].element, "voltage", 0.0) for i in (*loop, index)]
        around = float(np.dot(path[np.flatnonzero(path)], level[:-1])) - level[-1]
        if abs(around) > 1e-12 * max(map(abs, level), default=0.0):
            raise CircuitError(f"sources that contradict each other: {', '.join(names)}", elements=names)

    def _edge_name(self, index: int) -> str:
        ideal, gains = len(self.parts.ideal), len(self.parts.gains)
        if index < ideal:
            return self.parts.ideal[index].element.name
        if index < ideal + gains:
            return self.parts.gains[index - ideal].name
        return self.branches[index - ideal - gains].element.name

    # the equations

    def _layout(self, forest: Forest, drive: Drive, probe: tuple[str, str]) -> _Layout:
        """The layout for these three, made once; it keeps its drive alive, so that the drive's identity is its own."""
        key = (forest.chosen, id(drive), probe)
        if key not in self._layouts:
            self._layouts[key] = _Layout(self, forest, drive, probe)
        return self._layouts[key]

    def equations(
        self, forest: Forest, s: ComplexArray, drive: Drive, probe: tuple[str, str], *, slopes: bool = False
    ) -> Equations:
        """The equations at s (V or 1, F), driven by `drive`, observed between the nodes of `probe`."""
        layout = self._layout(forest, drive, probe)
        y = [self.admittances(s, True), self.admittances(s, False)]
        matrix, rhs = layout.assemble(y, s)
        if not slopes:
            return Equations(matrix, rhs, layout.observe, layout.known)
        fixed, varied = self.admittance_slopes(s, True), self.admittance_slopes(s, False)
        matrix_slope, rhs_slope = layout.assemble([fixed[0], varied[0]], None)
        return Equations(matrix, rhs, layout.observe, layout.known, matrix_slope, rhs_slope, fixed[1] + varied[1])

    def probe(self, probe: str | tuple[str, str]) -> tuple[str, str]:
        """The pair of nodes of a probe. Raises `CircuitError` for an unknown node."""
        pair = (probe, self.network.ground) if isinstance(probe, str) else probe
        for node in pair:
            if node not in self.nodes:
                raise CircuitError(f"the network has no node {node}", nodes=(node,))
        return pair

    def respond(self, s: ComplexArray, drive: Drive, probe: tuple[str, str]) -> ComplexArray:
        """The probe's voltage at s (V, F) or (1, F): complex (V, F)."""
        answer = np.empty((self.count, s.shape[1]), complex)
        for forest, where in self.groups(s):
            answer[:, where] = self.nudged(s[:, where], lambda x, f=forest: self._solve(f, x, drive, probe))  # type: ignore[misc]
        return answer

    def _solve(self, forest: Forest, s: ComplexArray, drive: Drive, probe: tuple[str, str]) -> ComplexArray:
        eq = self.equations(forest, s, drive, probe)
        x = np.linalg.solve(eq.matrix, eq.rhs[..., None])[..., 0]
        return np.asarray(x @ eq.observe + eq.known)

    def transfers(self, s: ComplexArray, probe: tuple[str, str]) -> ComplexArray:
        """Probe voltage per unit of current that flows within each branch from a to b, all sources at zero.

        s (V, F); returns (V, F, m) in the order of `branches`. One adjoint solve serves all branches (Director and
        Rohrer, IEEE Trans. Circuit Theory 16 (1969) 318).
        """
        answer = np.empty((self.count, s.shape[1], len(self.branches)), complex)
        for forest, where in self.groups(s):
            layout = self._layout(forest, self.silence, probe)
            answer[:, where] = self.nudged(s[:, where], lambda x, one=layout: self._adjoint(one, x))  # type: ignore[misc]
        return answer

    def _adjoint(self, layout: _Layout, s: ComplexArray) -> ComplexArray:
        matrix, _ = layout.assemble([self.admittances(s, True), self.admittances(s, False)], s)
        seek = np.broadcast_to(layout.observe, matrix.shape[:-1])
        dual = np.linalg.solve(np.swapaxes(matrix, -1, -2), seek[..., None])[..., 0]
        for row in layout.gain_unknowns:
            dual[..., row] = 0.0
        return np.asarray(-dual @ layout.paths.T)

    def nudged(self, s: ComplexArray, work: Callable[[ComplexArray], T]) -> T:
        """`work` at s; where that is exactly on a pole, right beside it. Raises `CircuitError` if singular anywhere."""
        for shift in (0.0, 3e-16, 1.1e-15, 7e-15 + 3e-15j, 5e-14 - 2e-14j, 4e-13 + 1e-13j):
            try:
                return work(s * (1.0 + shift) if shift else s)
            except np.linalg.LinAlgError:
                continue
        raise CircuitError("the network has no unique solution: its gains cancel")

    def groups(self, s: ComplexArray) -> list[tuple[Forest, slice | NDArray[np.intp]]]:
        """The forests that serve the columns of s, each with the columns it serves."""
        rates = np.exp(np.mean(np.log(np.abs(s)), axis=0))
        decades = np.round(np.log10(rates))
        found: dict[tuple[int, ...], list[int]] = {}
        for decade in np.unique(decades):
            forest = self.forest_at(10.0**decade)
            found.setdefault(forest.chosen, []).extend(np.flatnonzero(decades == decade))
        if len(found) == 1:
            return [(self._forests[key], slice(None)) for key in found]
        return [(self._forests[key], np.array(sorted(columns))) for key, columns in found.items()]


class _Layout:
    """Which forest voltages are unknown, and how branches and sources enter the equations."""

    def __init__(self, system: System, forest: Forest, drive: Drive, probe: tuple[str, str]) -> None:
        at, ideal, gains = system.nodes, len(system.parts.ideal), len(system.parts.gains)
        self.count = len(forest.chosen)
        is_known = np.array([i < ideal for i in forest.chosen], bool)
        self.unknown = np.flatnonzero(~is_known)
        self.fixed = np.flatnonzero(is_known)
        self.levels = np.array([drive.ideal[forest.chosen[k]] for k in self.fixed])
        self.gain_rows = [(k, i - ideal) for k, i in enumerate(forest.chosen) if ideal <= i < ideal + gains]
        self.gain_unknowns = [int(np.flatnonzero(self.unknown == k)[0]) for k, _ in self.gain_rows]
        self.gain_parts = system.parts.gains
        edges = system.edges[ideal + gains :]
        paths = np.array([forest.path(e.a, e.b) for e in edges]).reshape(len(edges), self.count)
        self.paths = paths[:, self.unknown]
        size = len(self.unknown)
        outer = (self.paths[:, :, None] * self.paths[:, None, :]).reshape(len(edges), size * size)
        right = (drive.branches - paths[:, self.fixed] @ self.levels)[:, None] * self.paths
        split = system.fixed
        self.outer = (outer[:split], outer[split:])
        self.right = (right[:split], right[split:])
        self.forest = forest
        self.drive = drive
        self.at = at
        self.injected = np.zeros(self.count)
        for amplitude, current in zip(drive.currents, system.parts.currents, strict=True):
            if amplitude:
                self.injected -= amplitude * self._between(current.a, current.b, f"{current.name} drives")
        whole = self._between(*probe, "the probe spans")
        self.observe = whole[self.unknown]
        self.known = float(whole[self.fixed] @ self.levels)
        self.sensed = [self._between(g.plus, g.minus, f"{g.name} senses") for g in system.parts.gains]

    def _between(self, a: str, b: str, what: str) -> FloatArray:
        component = self.forest.component
        if component[self.at[a]] != component[self.at[b]]:
            nodes = tuple(node for node in (a, b) if component[self.at[node]] != 0)
            raise CircuitError(f"{what} {a} and {b}, but no path joins them: {', '.join(nodes)} floats", nodes=nodes)
        return self.forest.path(self.at[a], self.at[b])

    def assemble(self, y: Sequence[ComplexArray], s: ComplexArray | None) -> tuple[ComplexArray, ComplexArray]:
        """Matrix (V, F, N, N) and right side (V, F, N); with s None, their derivatives for y = dy/ds."""
        whole, rhs = _product(y[0], self.outer[0]), _product(y[0], self.right[0])
        if y[1].shape[-1]:
            whole, rhs = whole + _product(y[1], self.outer[1]), rhs + _product(y[1], self.right[1])
        size = len(self.unknown)
        whole = whole.reshape(*whole.shape[:-1], size, size)
        if s is not None:
            rhs = rhs + self.injected[self.unknown]
        for row, (_, number) in zip(self.gain_unknowns, self.gain_rows, strict=True):
            gain, sensed = self.gain_parts[number], self.sensed[number]
            whole[..., row, :] = 0.0 if s is None else -sensed[self.unknown]
            whole[..., row, row] += gain.slope if s is None else gain.inverse_gain + s * gain.slope
            rhs[..., row] = 0.0 if s is None else sensed[self.fixed] @ self.levels
        return whole, rhs


def _product(y: ComplexArray, outer: FloatArray) -> ComplexArray:
    """Σ y·pᵀp over branches: (V, F, m) and (m, T·T) to (V, F, T·T), as one real product."""
    count = y.shape[0] * y.shape[1]
    flat = y.reshape(count, -1)
    split = np.concatenate([flat.real, flat.imag]) @ outer
    whole = np.empty((count, outer.shape[1]), complex)
    whole.real, whole.imag = split[:count], split[count:]
    return whole.reshape(*y.shape[:-1], -1)


def _stack(pairs: Sequence[tuple[ComplexArray, ComplexArray]], count: int) -> tuple[ComplexArray, ComplexArray]:
    if not pairs:
        blank = np.zeros((count, 0, 3), complex)
        return blank, blank
    return np.stack([n for n, _ in pairs], axis=1), np.stack([d for _, d in pairs], axis=1)


def _poly(c: ComplexArray, s: ComplexArray) -> ComplexArray:
    """Values (V, F, m) of quadratics (V, m, 3) at s (V, F)."""
    x = s[..., None]
    return np.asarray(c[:, None, :, 0] + x * (c[:, None, :, 1] + x * c[:, None, :, 2]))


def _poly_slope(c: ComplexArray, s: ComplexArray) -> ComplexArray:
    return np.asarray(c[:, None, :, 1] + 2.0 * s[..., None] * c[:, None, :, 2])
