"""A spanning forest of the heaviest branches, and every branch's voltage in terms of the forest's.

Node voltages against ground lose digits where a small impedance joins two nodes that hang on large ones: the
difference that drives its current drowns. With the voltages of a spanning forest of the greatest admittances as
unknowns (the cutset equations of network theory), no such difference is ever formed.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from reactance.analysis.circuit.network import FloatArray


@dataclass(frozen=True, slots=True)
class Edge:
    """One candidate for the forest: a branch from node `a` to node `b`, both as indices."""

    a: int
    b: int


@dataclass(frozen=True, slots=True)
class Forest:
    """`chosen`: indices of the edges in the forest, T of them, heaviest first.

    `paths` (nodes, T): the voltage of each node against its component's root as a signed sum of forest voltages.
    `component` (nodes,): the root of each node. `closing`: those of the first `forced` edges that close a loop.
    """

    chosen: tuple[int, ...]
    paths: FloatArray
    component: tuple[int, ...]
    closing: tuple[int, ...]

    def path(self, a: int, b: int) -> FloatArray:
        """The voltage from node `a` to node `b`, (T,). The two must share a component."""
        return np.asarray(self.paths[a] - self.paths[b])

    def serves(self, edges: Sequence[Edge], weights: FloatArray, forced: int, slack: float) -> bool:
        """Whether no edge left out is heavier than `slack` times any edge of its path through the forest.

        `weights` are those of the edges after the first `forced`, which count as heavier than all.
        """
        inside = np.array([math.inf if i < forced else weights[i - forced] for i in self.chosen])
        a, b = np.array([(edge.a, edge.b) for edge in edges[forced:]], int).reshape(-1, 2).T
        component = np.array(self.component)
        apart = component[a] != component[b]
        if (inside == 0).any() or (weights[apart] > 0).any():
            return False
        least = np.where(self.paths[a] != self.paths[b], inside, math.inf).min(axis=1, initial=math.inf)
        return bool((apart | (weights <= slack * least)).all())


def span(nodes: int, ground: int, edges: Sequence[Edge], weights: FloatArray, forced: int) -> Forest:
    """The forest of greatest weight over `edges`, the first `forced` of which come before all others, in order.

    Edges of zero weight are left out. Kruskal's algorithm: J. B. Kruskal, Proc. Am. Math. Soc. 7 (1956) 48.
    """
    order = [*range(forced), *(forced + np.argsort(-weights[forced:], kind="stable"))]
    parent = list(range(nodes))

    def root(node: int) -> int:
        while parent[node] != node:
            parent[node] = parent[parent[node]]
            node = parent[node]
        return node

    chosen: list[int] = []
    closing: list[int] = []
    for index in order:
        edge = edges[index]
        ra, rb = root(edge.a), root(edge.b)
        if ra == rb:
            if index < forced:
                closing.append(int(index))
        elif index < forced or weights[index] > 0:
            parent[ra] = rb
            chosen.append(int(index))
    return Forest(tuple(chosen), *_walk(nodes, ground, edges, chosen), tuple(closing))


def _walk(nodes: int, ground: int, edges: Sequence[Edge], chosen: Sequence[int]) -> tuple[FloatArray, tuple[int, ...]]:
    """Paths from each node to its root, and the root of each node; the ground is the root of its component."""
    near: Mapping[int, list[tuple[int, int, float]]] = {node: [] for node in range(nodes)}
    for column, index in enumerate(chosen):
        edge = edges[index]
        near[edge.a].append((edge.b, column, -1.0))
        near[edge.b].append((edge.a, column, 1.0))
    paths = np.zeros((nodes, len(chosen)))
    component = [-1] * nodes
    for start in (ground, *range(nodes)):
        if component[start] >= 0:
            continue
        component[start] = start
        stack = [start]
        while stack:
            node = stack.pop()
            for other, column, sign in near[node]:
                if component[other] < 0:
                    component[other] = start
                    paths[other] = paths[node]
                    paths[other, column] += sign
                    stack.append(other)
    return paths, tuple(component)
