"""All checks of a board by what they are about, what presses first."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from reactance.analysis.report import Check
from reactance.dashboard import words
from reactance.dashboard.rows import Row, Strips, by_weight, check_row
from reactance.dashboard.shown import Shown

MOST_IN_GROUP = 12
SMALL_BOARD = 90  # up to so many checks are all shown at once
_PRESSING = frozenset({"fail", "marginal", "unknown"})
_QUIET_KINDS = frozenset({"part", "net"})  # many, and rarely news


@dataclass(frozen=True, slots=True)
class Group:
    """Checks of one kind: those shown, those behind a disclosure, and how many more there are."""

    key: str
    title: str
    standing: str
    rows: tuple[Row, ...]
    quiet: tuple[Row, ...]
    total: int

    @property
    def rest(self) -> int:
        """How many are not on the page."""
        return self.total - len(self.rows) - len(self.quiet)


def groups(found: Shown, strips: Strips) -> tuple[Group, ...]:
    """All checks by what they are about; on a large board the most pressing of each kind."""
    kinds: dict[str, list[Check]] = {}
    for check in found.report.checks:
        kinds.setdefault(kind_of(check), []).append(check)
    return tuple(_summary(found, strips, scope, kinds[scope]) for scope in words.SCOPES if scope in kinds)


def kind_of(check: Check) -> str:
    """The kind of a check, a key of `words.SCOPES`."""
    scope = check.id.partition(":")[0]
    return scope if scope in words.SCOPES else ""


def _summary(found: Shown, strips: Strips, scope: str, checks: Sequence[Check]) -> Group:
    """A kind on the page of its board: what is pressing in the open, the rest behind a disclosure or a link."""
    moved = {move.check for move in found.comparison.movements} if found.comparison else set()
    pressing = [check for check in checks if check.status in _PRESSING or check.id in moved]
    if len(checks) <= MOST_IN_GROUP and scope not in _QUIET_KINDS:
        return _group(found, strips, checks, checks)
    if len(found.report.checks) > SMALL_BOARD and scope in _QUIET_KINDS:
        return _group(found, strips, checks, by_weight(pressing, found.comparison)[:MOST_IN_GROUP])
    if len(found.report.checks) > SMALL_BOARD:
        return _group(found, strips, checks, by_weight(checks, found.comparison)[:MOST_IN_GROUP])
    chosen = {check.id for check in pressing}
    quiet = [check for check in checks if check.id not in chosen]
    return _group(found, strips, checks, by_weight(pressing, found.comparison), quiet)


def page_of_group(found: Shown, scope: str, start: int, most: int) -> Group | None:
    """One kind's checks from `start`, at most `most`, the most pressing first; None where there are none."""
    checks = [check for check in found.report.checks if kind_of(check) == scope]
    ordered = by_weight(checks, found.comparison)[start : start + most]
    return _group(found, found.strips(), checks, ordered) if ordered else None


def _group(
    found: Shown, strips: Strips, checks: Sequence[Check], shown: Sequence[Check], quiet: Sequence[Check] = ()
) -> Group:
    board, scope = found.board.id, kind_of(checks[0])
    return Group(
        key=scope or "other",
        title=words.SCOPES[scope],
        standing=words.tally(Counter(check.status for check in checks)),
        rows=tuple(check_row(board, check, strips) for check in shown),
        quiet=tuple(check_row(board, check, strips) for check in quiet),
        total=len(checks),
    )
