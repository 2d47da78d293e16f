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
_GOOD_ENOUGH = 30.0  # a forest serves another decade as long as no branch left out beats one of its own by more
_MANY = 4096  # entries from which a complex product is better taken as two real ones


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
        self.parameters = tuple(parameters)
        values = None if values is None else _checked(values, parameters)
        self.count = 1 if values is None else len(values)
        self.nodes = self._index_nodes()
        self._coefficients(parameters, values)
        self.edges = self._edges()  # candidates for the forest: ideal branches, gains (output to ground), then branches
        self.silence = Drive(
            np.zeros(len(self.branches)), np.zeros(len(self.parts.ideal)), np.zeros(len(self.parts.currents))
        )
        self._forests: dict[tuple[int, ...], Forest] = {}
        self._decades: dict[int, tuple[int, ...]] = {}
        self._drives: dict[str | None, Drive] = {}
        self._layouts: dict[tuple[tuple[int, ...], int, tuple[str, str]], _Layout] = {}

    def only(self, rows: NDArray[np.intp]) -> System:
        """The same network with some of its sets of values."""
        return self._with((self._varied[0][rows], self._varied[1][rows]), len(rows))

    def at_values(self, values: FloatArray) -> System:
        """The same network with other values (V, P) of the same parameters; what does not hang on them is shared."""
        lossy = not self.over_time
        changed = _by_name(self.parameters, _checked(values, self.parameters))
        varied = [
            coefficients(branch.element, changed[branch.element.name], len(values), lossy=lossy)
            for branch in self.branches[self.fixed :]
        ]
        return self._with(_stack(varied, len(values)), len(values))

    def _with(self, varied: tuple[ComplexArray, ComplexArray], count: int) -> System:
        other = copy(self)
        other.count, other._varied = count, varied
        other.__dict__.pop("_every", None)
        return other

    @cached_property
    def _every(self) -> tuple[ComplexArray, ComplexArray]:
        """Coefficients (V, m, 3) of all branches, the fixed ones repeated for every set of values."""
        n, d = (np.repeat(c, self.count // len(c), axis=0) for c in self._fixed)
        return np.concatenate([n, self._varied[0]], axis=1), np.concatenate([d, self._varied[1]], axis=1)

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
        changed = {} if values is None else _by_name(parameters, values)
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

    def _edges(self) -> tuple[Edge, ...]:
        at = self.nodes
        return (
            *(Edge(at[branch.a], at[branch.b]) for branch in self.parts.ideal),
            *(Edge(at[gain.out], 0) for gain in self.parts.gains),
            *(Edge(at[branch.a], at[branch.b]) for branch in self.branches),
        )

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
        y = _ratio(_poly(n, s), _poly(d, s))
        return self._measured_in(y, s) if fixed and self.measured else y

    def _measured_in(self, y: ComplexArray, s: ComplexArray) -> ComplexArray:
        frequency = np.abs(s) / (2.0 * np.pi)
        for i in self.measured:
            measure = self.branches[i].impedance
            assert measure is not None
            y[..., i] = 1.0 / np.asarray(measure(frequency.ravel())).reshape(s.shape)
        return y

    def _in_groups(self, s: ComplexArray) -> list[ComplexArray]:
        """Admittances at s: of all branches at once where each set of values has its own s, else fixed and varied."""
        if len(s) < self.count:
            return [self.admittances(s, True), self.admittances(s, False)]
        n, d = self._every
        y = _ratio(_poly(n, s), _poly(d, s))
        return [self._measured_in(y, s) if self.measured else y]

    def _with_slopes(self, s: ComplexArray) -> tuple[list[ComplexArray], list[ComplexArray], ComplexArray]:
        """y and dy/ds, each as `_in_groups`, and the sum over branches of d′/d (V or 1, F)."""
        every = [self._every] if len(s) == self.count else [self._fixed, self._varied]
        values, slopes, total = [], [], np.zeros(s.shape, complex)
        with np.errstate(all="ignore"):  # s may be just where a branch's own admittance has a pole
            for n, d in every:
                inverse = 1.0 / _poly(d, s)
                y, d_slope = _poly(n, s) * inverse, _poly_slope(d, s)
                slopes.append((_poly_slope(n, s) - y * d_slope) * inverse)
                values.append(y)
                total = total + (d_slope * inverse).sum(axis=-1)
        return values, slopes, total

    # the forest

    def forest_at(self, rate: float) -> Forest:
        """The forest for |s| = `rate`, chosen once per decade."""
        return self._forest_of(int(np.clip(np.round(np.log10(rate)), -60, 60)))

    def _forest_of(self, decade: int) -> Forest:
        if decade not in self._decades:
            s = np.array([[1j * 10.0**decade]]) if not self.over_time else np.array([[10.0**decade + 0j]])
            weights = np.concatenate([np.abs(self.admittances(s, True))[0, 0], self._mean_varied(s)])
            weights = np.where(np.isfinite(weights), weights, 0.0)
            self._decades[decade] = (self._serving(decade, weights) or self._fresh(weights)).chosen
        return self._forests[self._decades[decade]]

    def _serving(self, decade: int, weights: FloatArray) -> Forest | None:
        """A forest of a near decade that still serves: fewer forests mean fewer and larger batches."""
        for near in sorted(self._decades, key=lambda other: abs(other - decade)):
            forest = self._forests[self._decades[near]]
            if forest.serves(self.edges, weights, self._forced, _GOOD_ENOUGH):
                return forest
        return None

    def _fresh(self, weights: FloatArray) -> Forest:
        forced = self._forced
        forest = span(len(self.nodes), 0, self.edges, np.concatenate([np.zeros(forced), weights]), forced)
        for index in forest.closing:
            self._judge_closing(index, forest)
        return self._forests.setdefault(forest.chosen, forest)

    @property
    def _forced(self) -> int:
        return len(self.parts.ideal) + len(self.parts.gains)

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
        if not slopes:
            matrix, rhs = layout.assemble(self._in_groups(s), s)
            return Equations(matrix, rhs, layout.observe, layout.known)
        y, y_slope, denominators = self._with_slopes(s)
        matrix, rhs = layout.assemble(y, s)
        matrix_slope, rhs_slope = layout.assemble(y_slope, None)
        return Equations(matrix, rhs, layout.observe, layout.known, matrix_slope, rhs_slope, denominators)

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
        matrix, _ = layout.assemble(self._in_groups(s), s)
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
        size = np.log10(np.abs(s))
        decades = np.clip(np.round(size[0] if len(s) == 1 else size.mean(axis=0)), -60, 60).astype(int)
        found: dict[tuple[int, ...], list[int]] = {}
        chosen = {decade: self._forest_of(decade).chosen for decade in sorted(set(decades.tolist()))}
        if len(set(chosen.values())) == 1:
            return [(self._forests[key], slice(None)) for key in set(chosen.values())]
        for column, decade in enumerate(decades.tolist()):
            found.setdefault(chosen[decade], []).append(column)
        return [(self._forests[key], np.array(columns)) for key, columns in found.items()]


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
        self.products = np.concatenate([outer, right], axis=1)
        self.split = system.fixed
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
        size, split = len(self.unknown), self.split
        if len(y) == 1:
            both = _product(y[0], self.products)
        else:
            both = _product(y[0], self.products[:split])
            if y[1].shape[-1]:
                both = both + _product(y[1], self.products[split:])
        whole = both[..., : size * size].reshape(*both.shape[:-1], size, size)
        rhs = both[..., size * size :]
        if s is not None:
            rhs = rhs + self.injected[self.unknown]
        for row, (_, number) in zip(self.gain_unknowns, self.gain_rows, strict=True):
            gain, sensed = self.gain_parts[number], self.sensed[number]
            whole[..., row, :] = 0.0 if s is None else -sensed[self.unknown]
            whole[..., row, row] += gain.slope if s is None else gain.inverse_gain + s * gain.slope
            rhs[..., row] = 0.0 if s is None else sensed[self.fixed] @ self.levels
        return whole, rhs


def _product(y: ComplexArray, outer: FloatArray) -> ComplexArray:
    """Σ y·pᵀp over branches: (V, F, m) and (m, K) to (V, F, K); a large one as one real product."""
    count = y.shape[0] * y.shape[1]
    flat = y.reshape(count, -1)
    with np.errstate(invalid="ignore"):
        if count * outer.shape[1] < _MANY:
            return np.asarray((flat @ outer).reshape(*y.shape[:-1], -1))
        split = np.concatenate([flat.real, flat.imag]) @ outer
    whole = np.empty((count, outer.shape[1]), complex)
    whole.real, whole.imag = split[:count], split[count:]
    return whole.reshape(*y.shape[:-1], -1)


def _ratio(n: ComplexArray, d: ComplexArray) -> ComplexArray:
    with np.errstate(all="ignore"):  # s may be just where a branch's own admittance has a pole
        return np.asarray(n / d)


def _checked(values: FloatArray, parameters: Sequence[Parameter]) -> FloatArray:
    values = np.asarray(values, float)
    if values.ndim != 2 or values.shape[1] != len(parameters):
        raise ValueError(f"values of shape {values.shape} for {len(parameters)} parameters")
    return values


def _by_name(parameters: Sequence[Parameter], values: FloatArray) -> dict[str, dict[str, FloatArray]]:
    """The columns of `values` by name and attribute."""
    found: dict[str, dict[str, FloatArray]] = {}
    for column, parameter in enumerate(parameters):
        found.setdefault(parameter.name, {})[parameter.attribute] = values[:, column]
    return found


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
