"""What the history hands out: boards, revisions and the cells of a strip, each frozen."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from reactance.analysis.report import Status, Verdict


class HistoryError(Exception):
    """A history that cannot be used: which file, why, and what would mend it."""


@dataclass(frozen=True, slots=True)
class BoardRow:
    """A watched export. `file` is its absolute path; `pinned` the id of the pinned baseline, if one is."""

    id: int
    name: str
    file: str
    gone: bool
    pinned: int | None


@dataclass(frozen=True, slots=True)
class RevisionRow:
    """One stored revision. Times are seconds since 1970; `error` is the message of one that cannot be used."""

    id: int
    board: int
    sha256: str
    saved: float
    read: float
    author: str | None
    parts: int
    status: Mapping[Status, int]
    worse: int
    error: str | None


@dataclass(frozen=True, slots=True)
class StripCell:
    """One check in one revision. A check that vanished while its duty is in the brief has no figures."""

    revision: int
    check: str
    nominal: float | None
    low: float | None
    high: float | None
    margin: float | None
    status: Status
    verdict: Verdict | None


@dataclass(frozen=True, slots=True)
class Saved:
    """Whose save this is, when it was made (by the file's own clock) and when it was read."""

    file: str
    saved: float
    read: float
    author: str | None = None
