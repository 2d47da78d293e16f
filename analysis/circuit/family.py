"""One network under many sets of values of the same parameters: what these share is worked out once.

Forests and the layout of the equations do not hang on the values; and natural frequencies move little from one set of
values to another, so that those found for one are the first guess for the next.
"""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from reactance.analysis.circuit.network import ComplexArray, FloatArray, Network, Parameter
from reactance.analysis.circuit.roots import Question, Roots, find_roots
from reactance.analysis.circuit.system import System

_BATCHES = 6  # batches of roots that are kept whole
_LANDMARKS = 600  # sets of values whose roots may serve others as a guess


@dataclass(slots=True)
class _Found:
    """What is known of the roots of one question: whole batches by their values, and landmarks (K, P) and (K, n)."""

    batches: OrderedDict[bytes, Roots] = field(default_factory=OrderedDict)
    values: FloatArray | None = None
    roots: ComplexArray | None = None

    def guess(self, values: FloatArray) -> ComplexArray | None:
        """For each row of `values` (V, P) the roots (V, n) of the landmark that is nearest."""
        if self.values is None or self.roots is None:
            return None
        size = np.maximum(np.abs(self.values).max(axis=0), 1e-300)
        known, asked = self.values / size, values / size
        distance = (asked**2).sum(axis=1)[:, None] - 2.0 * asked @ known.T + (known**2).sum(axis=1)
        return np.asarray(self.roots[distance.argmin(axis=1)])

    def keep(self, key: bytes, values: FloatArray | None, found: Roots) -> None:
        """Remember a batch; its rows with the full number of roots become landmarks."""
        self.batches[key] = found
        while len(self.batches) > _BATCHES:
            self.batches.popitem(last=False)
        if values is None:
            return
        whole = np.isfinite(found.roots).all(axis=1)
        rows, roots = values[whole], found.roots[whole]
        if self.values is not None and self.roots is not None and self.roots.shape[1] == roots.shape[1]:
            rows, roots = np.concatenate([rows, self.values]), np.concatenate([roots, self.roots])
        if len(rows):
            self.values, self.roots = rows[:_LANDMARKS], roots[:_LANDMARKS]


class Family:
    """A network and its parameters. Values are (V, P); None stands for the network as it is."""

    def __init__(self, network: Network, parameters: Sequence[Parameter] = ()) -> None:
        self.network, self.parameters = network, tuple(parameters)
        self._systems: dict[tuple[bool, bool], System] = {}
        self._found: dict[tuple[str, ...], _Found] = {}

    def system(self, values: FloatArray | None, *, over_time: bool) -> System:
        """The network's equations for `values`."""
        key = (over_time, values is None)
        known = self._systems.get(key)
        if known is None:
            known = System(self.network, over_time=over_time, parameters=self.parameters, values=values)
            self._systems[key] = known
            return known
        return known if values is None else known.at_values(values)

    def poles(self, values: FloatArray | None) -> Roots:
        """The natural frequencies of the network."""
        ground = self.network.ground
        return self._roots(values, (), lambda system: Question(system, system.silence, (ground, ground)))

    def zeros(self, values: FloatArray | None, source: str, probe: tuple[str, str]) -> Roots:
        """The zeros of the response at `probe` to `source`."""
        key = (source, *probe)
        return self._roots(values, key, lambda system: Question(system, system.drive(source), probe, zeros=True))

    def _roots(self, values: FloatArray | None, key: tuple[str, ...], ask: Callable[[System], Question]) -> Roots:
        found = self._found.setdefault(key, _Found())
        which = b"" if values is None else values.tobytes()
        if which not in found.batches:
            question = ask(self.system(values, over_time=True))
            guess = None if values is None else found.guess(values)
            found.keep(which, values, find_roots(question, guess))
        return found.batches[which]
