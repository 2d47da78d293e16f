"""Boards analysed in processes of their own, for a first pass over many: they read and solve, and write nothing.

The one writer takes their results and stores them, so that a worker may be killed at any moment and nothing is lost.
Each worker hangs on a leash, a pipe whose other end is the writer's: it ends when that end closes, however it does.
"""

from __future__ import annotations

import multiprocessing
import os
import signal
import threading
import time
from concurrent.futures import BrokenExecutor, Future, ProcessPoolExecutor
from dataclasses import dataclass, replace
from multiprocessing.connection import Connection

from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Report

FEWEST = 3  # boards for which starting processes pays
TASKS_PER_WORKER = 2  # read ahead, so that no worker waits for the writer


@dataclass(frozen=True, slots=True)
class Analysed:
    """What a worker found: the results, the blocks it solved, and seconds of understanding and of solving."""

    report: Report
    blocks: bytes
    understand: float
    solve: float


Waiting = Future[Analysed]


def cores() -> int:
    """How many processors this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


class Workers:
    """As many processes as there are processors, started when they are first needed."""

    def __init__(self, most: int | None = None) -> None:
        self.most = cores() if most is None else most
        self._pool: ProcessPoolExecutor | None = None
        self._leash: Connection | None = None
        self._given: list[Waiting] = []

    def pay(self, boards: int) -> bool:
        """Whether so many boards are worth it."""
        return self.most > 1 and boards >= FEWEST

    @property
    def room(self) -> int:
        """How many more boards to hand over now; more of them would only fill the memory."""
        self._given = [one for one in self._given if not one.done()]
        return max(self.most * TASKS_PER_WORKER - len(self._given), 0)

    def begin(self, files: BoardFiles, blocks: tuple[bytes, ...]) -> Waiting | None:
        """Hands a board over, with the blocks that are kept for it; None where there are no processes to be had."""
        try:
            waiting = self._started().submit(analyse_apart, _plain(files), blocks)
        except (OSError, RuntimeError):  # of which a broken executor is one
            self.close()
            return None
        self._given.append(waiting)
        return waiting

    def close(self) -> None:
        """Ends the processes, with what they are at."""
        pool, leash, busy = self._pool, self._leash, any(not one.done() for one in self._given)
        self._pool, self._leash, self._given = None, None, []
        if leash is not None and busy:
            leash.close()
        if pool is not None:
            pool.shutdown(wait=True, cancel_futures=True)
        if leash is not None:
            leash.close()

    def _started(self) -> ProcessPoolExecutor:
        if self._pool is None:
            context = multiprocessing.get_context("spawn")
            theirs, self._leash = context.Pipe(duplex=False)
            self._pool = ProcessPoolExecutor(self.most, context, initializer=_settle_in, initargs=(theirs,))
        return self._pool


def result(waiting: Waiting) -> Analysed | None:
    """What a worker found, waited for; None where it was killed. Raises what the analysis raised."""
    try:
        return waiting.result()
    except BrokenExecutor:
        return None


def analyse_apart(files: BoardFiles, blocks: tuple[bytes, ...]) -> Analysed:
    """What a worker does. Raises `InputError` where the board cannot be used."""
    from reactance.daemon.engine import default_engine

    engine = default_engine()
    memory = engine.memory()
    for kept in blocks:
        memory.import_blocks(kept)
    clock = [time.perf_counter()]
    study = engine.analyse(files, memory, lambda: clock.append(time.perf_counter()))
    clock.append(time.perf_counter())
    return Analysed(study.report, memory.export_blocks(), clock[1] - clock[0], clock[-1] - clock[1])


def _plain(files: BoardFiles) -> BoardFiles:
    """The same files in mappings that can be sent to another process."""
    export = replace(files.export, companions=dict(files.export.companions))
    return replace(files, export=export, knowledge=dict(files.knowledge))


def _settle_in(leash: Connection) -> None:
    """A worker's first act: Ctrl-C is the writer's business, and the end of the leash is the worker's end."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_leave_with, args=(leash,), name="reactance-leash", daemon=True).start()


def _leave_with(leash: Connection) -> None:
    try:
        leash.recv()
    except (EOFError, OSError):
        os._exit(0)
