"""From bytes to a stored revision: analyse, compare with the baseline, store. One thread at a time uses it."""

from __future__ import annotations

import getpass
import shutil
import subprocess
import sys
import time
import traceback
from collections import OrderedDict
from dataclasses import replace
from functools import lru_cache
from pathlib import Path

from reactance.analysis.design import Design, InputError
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Report
from reactance.daemon.engine import Engine, Keeper, Side
from reactance.daemon.history import History, HistoryError, Saved
from reactance.daemon.outcome import Outcome, Timings
from reactance.daemon.workers import Analysed, Waiting, Workers, result

_WARM_BOARDS = 8  # boards kept warm in memory; others start from what the history keeps
_GIT_SECONDS = 2.0


class Intake:
    """Takes saves in. Keeps the last few boards' memories and newest results, so that the next save is quick."""

    def __init__(self, history: History, engine: Engine) -> None:
        self._history = history
        self._engine = engine
        self._memories: OrderedDict[str, Keeper] = OrderedDict()
        self._sides: OrderedDict[int, Side] = OrderedDict()
        self._blocks: dict[str, bytes] = {}  # that workers solved, to be kept when nothing else waits

    def begin(self, file: str, files: BoardFiles, workers: Workers) -> Waiting | None:
        """Has workers analyse a save that `take` will store; None where they cannot."""
        board = self._history.board_of(file)
        return workers.begin(files, self._history.blocks(board.id) if board else ())

    def take(
        self, save: Saved, files: BoardFiles, timings: Timings | None = None, waiting: Waiting | None = None
    ) -> Outcome:
        """Analyses a save, or waits for the worker that does, and stores it. A save that cannot be used comes back
        as `broken` and is not recorded: it may be half-written. Raises nothing for what is in the files."""
        timings = timings or Timings()
        name = Path(save.file).name
        try:
            found = result(waiting) if waiting is not None else None
            if found is not None:
                return self._take_over(save, files, found, timings)
            clock = [time.perf_counter()]
            study = self._engine.analyse(files, self._memory(save.file), lambda: clock.append(time.perf_counter()))
            clock.append(time.perf_counter())
            timings = replace(timings, understand=clock[1] - clock[0], solve=clock[-1] - clock[1])
            return self._store(save, files, study.design, study.report, timings)
        except InputError as error:
            return Outcome("broken", save.file, name, message=str(error), timings=timings)
        except HistoryError as error:
            return Outcome("not stored", save.file, name, message=str(error), timings=timings)
        except Exception as error:
            # A defect of ours must not take the other boards down with it, and must not pass in silence.
            traceback.print_exc(file=sys.stderr)
            message = f"{files.export.name}: a defect in reactance stopped the analysis: {error!r}"
            return Outcome("broken", save.file, name, message=message, timings=timings)

    def _take_over(self, save: Saved, files: BoardFiles, found: Analysed, timings: Timings) -> Outcome:
        """Stores what a worker found."""
        if found.blocks:
            self._blocks[save.file] = found.blocks
        timings = replace(timings, understand=found.understand, solve=found.solve)
        return self._store(save, files, None, found.report, timings)

    def refuse(self, save: Saved, files: BoardFiles | None, message: str) -> Outcome:
        """Records a save that stayed broken; what was stored before stays what is shown."""
        name = Path(save.file).name
        try:
            revision = self._history.store_error(save, files, message)
        except HistoryError as error:
            return Outcome("not stored", save.file, name, message=str(error))
        return Outcome("broken" if revision else "same", save.file, name, revision, message=message)

    def gone(self, file: str, gone: bool) -> Outcome:
        """Marks an export as gone or as back."""
        name = Path(file).name
        try:
            changed = self._history.mark_gone(file, gone)
        except HistoryError as error:
            return Outcome("not stored", file, name, message=str(error))
        return Outcome(("gone" if gone else "back") if changed else "same", file, name)

    def keep(self) -> None:
        """Puts newly solved blocks into the history, for reuse after a restart; done when nothing else waits."""
        try:
            while self._blocks:
                file, blocks = self._blocks.popitem()
                board = self._history.board_of(file)
                if board:
                    self._history.keep_blocks(board.id, blocks)
            for file, memory in self._memories.items():
                board = self._history.board_of(file)
                blocks = memory.export_blocks() if board else b""
                if board and blocks:
                    self._history.keep_blocks(board.id, blocks)
        except HistoryError:
            return  # they are solved again; a history that cannot be written to is told of with the next save

    def _store(
        self, save: Saved, files: BoardFiles, design: Design | None, report: Report, timings: Timings
    ) -> Outcome:
        """Compares and stores. Without its `design` the export is read again where there is a baseline."""
        started = time.perf_counter()
        board = self._history.board_of(save.file)
        baseline = self._history.baseline(board.id) if board else None
        older = self._side(baseline.id) if baseline else None
        if older is not None and design is None:
            design = self._engine.design(files)
        newer = (design, report, files.brief) if design is not None else None
        comparison = self._engine.compare(older, newer) if older is not None and newer is not None else None
        compared = time.perf_counter()
        revision = self._history.store(
            save, files, report, comparison, baseline.id if comparison and baseline else None
        )
        timings = replace(timings, compare=compared - started, store=time.perf_counter() - compared)
        name = report.design.name
        if revision is None:
            return Outcome("same", save.file, name, report=report, timings=timings)
        if newer is not None:
            self._remember(revision.id, newer)
        before = older[1] if older is not None else None
        return Outcome("stored", save.file, name, revision, report, comparison, baseline, before, "", timings)

    def _side(self, revision_id: int) -> Side | None:
        known = self._sides.get(revision_id)
        if known is not None:
            self._sides.move_to_end(revision_id)
            return known
        report = self._history.report(revision_id)
        if report is None:
            return None
        files = self._history.files(revision_id)
        try:
            side = (self._engine.design(files), report, files.brief)
        except InputError:
            return None  # stored by an earlier version that read it differently; there is nothing to compare with
        self._remember(revision_id, side)
        return side

    def _remember(self, revision_id: int, side: Side) -> None:
        self._sides[revision_id] = side
        while len(self._sides) > _WARM_BOARDS:
            self._sides.popitem(last=False)

    def _memory(self, file: str) -> Keeper:
        memory = self._memories.get(file)
        if memory is None:
            memory = self._engine.memory()
            board = self._history.board_of(file)
            for blocks in self._history.blocks(board.id) if board else ():
                memory.import_blocks(blocks)
            self._memories[file] = memory
            while len(self._memories) > _WARM_BOARDS:
                self._memories.popitem(last=False)
        self._memories.move_to_end(file)
        return memory


@lru_cache(maxsize=256)
def author_of(folder: str) -> str | None:
    """Who saves in that folder: the name that git has for it, else the login name, else nobody."""
    git = shutil.which("git")
    if git is not None:
        try:
            found = subprocess.run(
                [git, "config", "user.name"],
                cwd=folder,
                capture_output=True,
                timeout=_GIT_SECONDS,
                check=False,
            )
        except (OSError, subprocess.SubprocessError):
            pass
        else:
            name = found.stdout.decode("utf-8", "replace").strip()
            if name:
                return name
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):
        return None
