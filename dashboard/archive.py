"""What pages read again and again and what never changes once stored, kept for a while in memory."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Generic, TypeAlias, TypeVar

from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Comparison, Edit, Report
from reactance.daemon.history import History, RevisionRow

if TYPE_CHECKING:
    from reactance.analysis.study import Study

K = TypeVar("K", bound=Hashable)
V = TypeVar("V")
Analyse: TypeAlias = "Callable[[BoardFiles], Study]"

_REPORTS = 8  # of 2,000 parts each takes a few megabytes
_COMPARISONS = 500
_STUDIES = 6


class Shelf(Generic[K, V]):
    """The values asked for last, up to `most`; each is made once, however many threads want it."""

    def __init__(self, most: int, make: Callable[[K], V]) -> None:
        self._most = most
        self._make = make
        self._kept: OrderedDict[K, V] = OrderedDict()
        self._guard = threading.Lock()
        self._making = threading.Lock()

    def __len__(self) -> int:
        return len(self._kept)

    def get(self, key: K) -> V:
        """The value of `key`, made now where it is not at hand. What `make` raises is raised and not kept."""
        found = self._look(key)
        if found is not None:
            return found
        with self._making:
            found = self._look(key)
            if found is not None:
                return found
            made = self._make(key)
            with self._guard:
                self._kept[key] = made
                while len(self._kept) > self._most:
                    self._kept.popitem(last=False)
            return made

    def _look(self, key: K) -> V | None:
        with self._guard:
            if key not in self._kept:
                return None
            self._kept.move_to_end(key)
            return self._kept[key]


@dataclass(frozen=True, slots=True)
class Stored:
    """A comparison as it was stored, and the revision that it is a comparison with."""

    comparison: Comparison | None
    baseline: int | None

    @property
    def edits(self) -> tuple[Edit, ...]:
        """What was changed since that revision."""
        return self.comparison.edits if self.comparison else ()


class Archive:
    """The history with what is dear to read kept at hand: reports, comparisons, and studies for curves."""

    def __init__(self, history: History, analyse: Analyse | None = None) -> None:
        self.history = history
        self._analyse = analyse
        self._reports: Shelf[int, tuple[Report | None]] = Shelf(_REPORTS, lambda key: (history.report(key),))
        self._stored: Shelf[int, Stored] = Shelf(_COMPARISONS, self._read_stored)
        self._compared: Shelf[tuple[int, int], Comparison] = Shelf(_REPORTS, lambda pair: history.compare(*pair))
        self._studies: Shelf[tuple[str, int], Study] = Shelf(_STUDIES, self._study)

    def report(self, revision: int) -> Report | None:
        """The results of a revision."""
        return self._reports.get(revision)[0]

    def stored(self, revision: int) -> Stored:
        """What a revision changed and did, as judged when it was stored."""
        return self._stored.get(revision)

    def _read_stored(self, revision: int) -> Stored:
        baseline = self.history.compared_with(revision)
        return Stored(self.history.comparison(revision), baseline.id if baseline else None)

    def compare(self, older: int, newer: int) -> Comparison:
        """What lies between any two revisions."""
        return self._compared.get((older, newer))

    def study(self, revision: RevisionRow) -> Study:
        """The revision analysed again, for what is not stored: curves and where figures come from.

        Raises InputError where this version refuses what an earlier one accepted.
        """
        return self._studies.get((revision.sha256, revision.id))

    def _study(self, key: tuple[str, int]) -> Study:
        files = self.history.files(key[1])
        if self._analyse is not None:
            return self._analyse(files)
        from reactance.analysis.study import Memory, analyse

        memory = Memory()
        revision = self.history.revision(key[1])
        for blocks in self.history.blocks(revision.board) if revision else ():
            memory.import_blocks(blocks)  # solved when the revision was stored, and not to be solved again
        return analyse(files, memory=memory)
