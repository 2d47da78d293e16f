"""One revision analysed: bytes in, a judged report out, and where each of its figures comes from.

The board is cut into blocks that are solved on their own; `Memory` keeps what was read and solved, so that the
next save costs only what it changed.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, field, replace
from typing import TypeVar

import numpy as np

from reactance.analysis.bias import Bias, solve_bias
from reactance.analysis.board import Board, ModelMemory, resolve_board
from reactance.analysis.brief import read_brief
from reactance.analysis.design import Design
from reactance.analysis.exports import FormMemory, read_export
from reactance.analysis.files import BoardFiles
from reactance.analysis.part_checks import net_checks, part_checks
from reactance.analysis.path_checks import PathStudy, study_paths
from reactance.analysis.rail_checks import RailStudy, rails_to_study, study_rails
from reactance.analysis.report import FORMAT_CHECK, Check, Curve, DesignSummary, Origin, Report
from reactance.analysis.reuse import Solved
from reactance.analysis.roles import Roles, assign_roles
from reactance.analysis.summary import (
    capacitor_entries,
    duty_entries,
    gathered_assumptions,
    gathered_problems,
    net_entries,
    part_entries,
)

_T = TypeVar("_T")


@dataclass
class Memory:
    """What a caller keeps from save to save: forms of exports already parsed and blocks already solved."""

    forms: FormMemory = field(default_factory=FormMemory)
    solved: Solved = field(default_factory=Solved)
    models: ModelMemory = field(default_factory=ModelMemory)

    def export_blocks(self) -> bytes:
        """Blocks solved since the last call, encoded, to be kept across restarts; empty where there are none."""
        return self.solved.take_fresh()

    def import_blocks(self, data: bytes) -> None:
        """Take in what `export_blocks` gave before."""
        self.solved.add(data)


@dataclass(frozen=True)
class Study:
    """One revision: its design, the board with the brief applied, its operating point, and the report."""

    design: Design
    board: Board
    bias: Bias
    roles: Roles
    rails: tuple[RailStudy, ...]
    paths: tuple[PathStudy, ...]
    report: Report

    def check(self, check_id: str) -> Check | None:
        """The check of that id, or None."""
        return next((check for check in self.report.checks if check.id == check_id), None)

    def curve(self, check_id: str) -> Curve | None:
        """The curve behind a check, or None where it has none."""
        from reactance.analysis.curves import curve_of

        return curve_of(self, check_id)

    def sine(self, check_id: str, frequency: float) -> Curve | None:
        """In and out over time for a sine of `frequency` in Hz, for checks of couplings and filters."""
        from reactance.analysis.curves import sine_of

        return sine_of(self, check_id, frequency)

    def origin(self, check_id: str) -> Origin:
        """Where a check's number comes from: parts, model, assumptions."""
        from reactance.analysis.origins import origin_of

        return origin_of(self, check_id)


def analyse(
    files: BoardFiles,
    *,
    memory: Memory | None = None,
    understood: Callable[[], None] | None = None,
    samples: int = 0,
    progress: Callable[[int, int], None] | None = None,
) -> Study:
    """Read, understand and solve one board. Raises `InputError` where the export or the brief cannot be used.

    `understood` is called between understanding and solving, for callers that time the two. `samples` > 0 adds the
    yield of as many Monte Carlo samples to judged checks; with them nothing solved is taken from or put into `memory`.
    `progress` is told how many networks are solved, and of how many.
    """
    kept = memory or Memory()
    design = read_export(files.export, memory=kept.forms)
    brief = read_brief(files.brief, files.brief_name)
    board = resolve_board(design, brief, files.knowledge, kept.models)
    if understood is not None:
        understood()
    if samples:
        return study(replace(board, samples=samples), files.export_sha256, progress=progress)
    return study(board, files.export_sha256, kept.solved, progress=progress)


def study(
    board: Board,
    export_sha256: str = "",
    solved: Solved | None = None,
    *,
    progress: Callable[[int, int], None] | None = None,
) -> Study:
    """Solve a board. `solved` holds the results of blocks that are known already; `progress` as for `analyse`."""
    # Far from its poles a response may overflow on the way to its limit; a figure that is not finite is judged unknown.
    with np.errstate(over="ignore", under="ignore", divide="ignore", invalid="ignore"):
        return _study(board, export_sha256, solved or Solved(), progress)


def _study(
    board: Board, export_sha256: str, known: Solved, progress: Callable[[int, int], None] | None
) -> Study:
    bias = solve_bias(board)
    roles = assign_roles(board)
    nets = rails_to_study(board)
    told = _Told(progress, len(nets) + len(roles.paths))
    rails = tuple(told.each(study_rails(board, bias, known, nets)))
    paths = tuple(told.each(study_paths(board, bias, known, roles.paths)))
    checks = tuple(_checks(board, bias, known, roles, rails, paths))
    assumptions = gathered_assumptions(board, bias, rails, paths)
    report = Report(
        format=FORMAT_CHECK,
        design=DesignSummary(
            board.design.name, board.design.file, export_sha256, len(board.design.parts), len(board.design.nets)
        ),
        nets=net_entries(board, bias),
        parts=part_entries(board),
        capacitors=capacitor_entries(board, bias, roles),
        duties=duty_entries(board, roles),
        checks=checks,
        assumptions=assumptions,
        problems=gathered_problems(board, bias, checks),
    )
    return Study(board.design, board, bias, roles, rails, paths, report)


class _Told:
    """Tells a listener how far the solving is."""

    def __init__(self, listener: Callable[[int, int], None] | None, total: int) -> None:
        self._listener, self._total, self._done = listener, total, 0

    def each(self, items: Iterable[_T]) -> Iterator[_T]:
        """`items`, each counted once it is there."""
        for item in items:
            self._done += 1
            if self._listener is not None:
                self._listener(self._done, self._total)
            yield item


def _checks(
    board: Board,
    bias: Bias,
    solved: Solved,
    roles: Roles,
    rails: Iterable[RailStudy],
    paths: Iterable[PathStudy],
) -> Iterable[Check]:
    for rail in rails:
        yield from rail.checks
    for path in paths:
        yield from path.checks
    yield from part_checks(board, bias, solved)
    yield from net_checks(bias, roles.crystal_nets)
