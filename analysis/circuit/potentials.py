"""Nodes joined by known differences of potential: union-find that carries the differences along.

(Tarjan, J. ACM 22 (1975) 215, with an offset on every link.)
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from reactance.analysis.circuit.network import CircuitError


class Potentials:
    """Groups of nodes whose differences of potential ideal sources and shorts fix."""

    def __init__(self, ground: str) -> None:
        self.ground = ground
        self._parent: dict[str, str] = {ground: ground}
        self._offset: dict[str, float] = {ground: 0.0}  # V(node) − V(parent)
        self._links: list[tuple[str, str, str]] = []
        self.loops: list[tuple[str, ...]] = []

    @property
    def nodes(self) -> tuple[str, ...]:
        """All nodes, in the order added."""
        return tuple(self._parent)

    def add(self, node: str) -> None:
        """Know of `node`, by itself until it is joined."""
        self._parent.setdefault(node, node)
        self._offset.setdefault(node, 0.0)

    def root(self, node: str) -> tuple[str, float]:
        """The representative of a node's group, and V(node) − V(representative)."""
        trail = []
        while self._parent[node] != node:
            trail.append(node)
            node = self._parent[node]
        total = 0.0
        for each in reversed(trail):
            total += self._offset[each]
            self._parent[each], self._offset[each] = node, total
        return node, total

    def unite(self, a: str, b: str) -> None:
        """Put two nodes into one group, their difference of no interest."""
        (ra, _), (rb, _) = self.root(a), self.root(b)
        self._parent[ra] = rb

    def join(self, name: str, a: str, b: str, emf: float) -> None:
        """Fix V(a) − V(b) = `emf` by the element `name`.

        Raises `CircuitError` naming the elements of the loop if they fix it otherwise already.
        """
        (ra, oa), (rb, ob) = self.root(a), self.root(b)
        if ra != rb:
            self._parent[ra], self._offset[ra] = rb, emf + ob - oa
            self._links.append((name, a, b))
            return
        loop = (name, *self._between(a, b))
        if abs(oa - ob - emf) > 1e-9 * max(abs(oa), abs(ob), abs(emf)):
            raise CircuitError(f"sources that contradict each other: {', '.join(loop)}", elements=loop)
        self.loops.append(loop)

    def _between(self, a: str, b: str) -> tuple[str, ...]:
        """Names of the links on the way from a to b."""
        near: dict[str, list[tuple[str, str]]] = {}
        for name, p, q in self._links:
            near.setdefault(p, []).append((q, name))
            near.setdefault(q, []).append((p, name))
        came: dict[str, tuple[str, str] | None] = {a: None}
        stack = [a]
        while stack and b not in came:
            node = stack.pop()
            for other, name in near.get(node, ()):
                if other not in came:
                    came[other] = (node, name)
                    stack.append(other)
        names = []
        step = came.get(b)
        while step is not None:
            names.append(step[1])
            step = came[step[0]]
        return tuple(names)

    def through(self, leaving: Mapping[str, float], free: Iterable[str]) -> dict[str, float]:
        """Current through each link from its a to its b, given what leaves every node by other ways.

        The ground and the nodes in `free` take up whatever is left over. Links of a loop are left out: the current
        around it is not determined.
        """
        near: dict[str, list[tuple[str, str, float]]] = {}
        for name, a, b in self._links:
            near.setdefault(a, []).append((b, name, 1.0))
            near.setdefault(b, []).append((a, name, -1.0))
        undetermined = {name for loop in self.loops for name in loop}
        found: dict[str, float] = {}
        seen: set[str] = set()
        for start in (self.ground, *free, *near):
            if start in seen or start not in near:
                continue
            order: list[tuple[str, str, str, float]] = []
            seen.add(start)
            stack = [start]
            while stack:
                node = stack.pop()
                for other, name, sign in near[node]:
                    if other not in seen:
                        seen.add(other)
                        order.append((other, node, name, sign))
                        stack.append(other)
            total = {node: leaving.get(node, 0.0) for node in (start, *(entry[0] for entry in order))}
            for child, parent, name, sign in reversed(order):
                # what leaves the child's side by other ways arrives through this link, from the parent
                total[parent] += total[child]
                if name not in undetermined:
                    found[name] = sign * total[child]
        return found
