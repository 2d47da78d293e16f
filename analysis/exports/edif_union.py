"""Sets of nodes that are one net."""

from __future__ import annotations


class Nodes:
    """Nodes numbered from 0, joined into sets; the lowest number of a set stands for it."""

    __slots__ = ("joined", "parent")

    def __init__(self) -> None:
        self.parent: list[int] = []
        self.joined = False

    def __len__(self) -> int:
        return len(self.parent)

    def add(self, count: int = 1) -> int:
        """So many new nodes; the number of the first."""
        first = len(self.parent)
        self.parent.extend(range(first, first + count))
        return first

    def root(self, node: int) -> int:
        """The node that stands for the set."""
        parent = self.parent
        while parent[node] != node:
            parent[node] = parent[parent[node]]
            node = parent[node]
        return node

    def join(self, one: int, other: int) -> int:
        """Make two sets one; the node that stands for it."""
        self.joined = True
        one, other = self.root(one), self.root(other)
        if one > other:
            one, other = other, one
        self.parent[other] = one
        return one
