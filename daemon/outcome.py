"""What came of one save, and how long each stage of it took."""

from __future__ import annotations

from dataclasses import dataclass, field, fields
from typing import Literal

from reactance.analysis.report import Comparison, Report
from reactance.daemon.rows import RevisionRow

OutcomeKind = Literal["stored", "same", "broken", "gone", "back", "not stored"]


@dataclass(frozen=True, slots=True)
class Timings:
    """Seconds per stage of the way from the end of a save to the stored revision.

    `event`: until the file system's word arrived; `settle`: until the files were quiet; `read`: reading them;
    `queue`: until the analysis was free; `understand`: export and brief to a board; `solve`: the measures;
    `compare`: with the baseline; `store`: in the history.
    """

    event: float = 0.0
    settle: float = 0.0
    read: float = 0.0
    queue: float = 0.0
    understand: float = 0.0
    solve: float = 0.0
    compare: float = 0.0
    store: float = 0.0

    @property
    def total(self) -> float:
        """All stages together."""
        return float(sum(getattr(self, part.name) for part in fields(self)))


@dataclass(frozen=True, slots=True)
class Outcome:
    """What came of one save of `file`: a stored revision, the same contents again, a broken or a missing file.

    `message` says why a file is broken or nothing was stored. `older` holds the baseline's results.
    """

    kind: OutcomeKind
    file: str
    name: str
    revision: RevisionRow | None = None
    report: Report | None = None
    comparison: Comparison | None = None
    baseline: RevisionRow | None = None
    older: Report | None = None
    message: str = ""
    timings: Timings = field(default_factory=Timings)
