"""The analysis as the daemon calls it, behind one small surface, so that its import waits until it is needed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

from reactance.analysis.design import Design
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Comparison, Report


class Results(Protocol):
    """What an analysis yields: `reactance.analysis.study.Study`."""

    @property
    def design(self) -> Design:
        """The export, read."""
        ...

    @property
    def report(self) -> Report:
        """The results."""
        ...


class Keeper(Protocol):
    """What an analysis keeps in memory from save to save: `reactance.analysis.study.Memory`."""

    def export_blocks(self) -> bytes:
        """What was solved and not yet exported; empty where that is nothing."""
        ...

    def import_blocks(self, blocks: bytes) -> None:
        """Takes in what an earlier run exported."""
        ...


Side = tuple[Design, Report, bytes | None]


@dataclass(frozen=True, slots=True)
class Engine:
    """The calls into the analysis. `analyse` calls its third argument once the board is understood."""

    analyse: Callable[[BoardFiles, Any, Callable[[], None]], Results]
    compare: Callable[[Side, Side], Comparison]
    design: Callable[[BoardFiles], Design]
    memory: Callable[[], Keeper]


def default_engine() -> Engine:
    """The real analysis."""
    from reactance.analysis.difference import compare
    from reactance.analysis.exports import read_export
    from reactance.analysis.study import Memory, analyse

    limit_threads()
    return Engine(
        analyse=lambda files, memory, understood: analyse(files, memory=memory, understood=understood),
        compare=compare,
        design=lambda files: read_export(files.export),
        memory=Memory,
    )


def limit_threads() -> None:
    """One thread for linear algebra from now on: the networks are many and small, and sharing them out costs more
    than solving them. Takes effect for what is imported already, so it is called after the analysis is."""
    from threadpoolctl import threadpool_limits

    threadpool_limits(limits=1, user_api="blas")
