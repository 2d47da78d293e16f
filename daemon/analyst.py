"""The thread that analyses and writes, one save after the other in the order in which they were read."""

from __future__ import annotations

import queue
import sys
import threading
import time
import traceback
from collections import deque
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Literal

from reactance.analysis.files import BoardFiles
from reactance.daemon.history import Saved
from reactance.daemon.intake import Intake, author_of
from reactance.daemon.outcome import Outcome, Timings
from reactance.daemon.reading import Signature
from reactance.daemon.workers import Waiting, Workers

JobKind = Literal["take", "refuse", "gone", "back"]


@dataclass(frozen=True, slots=True)
class Job:
    """Something to do about one board. `signature` and `changed` are of the files when they were read."""

    kind: JobKind
    board: str
    saved: float = 0.0
    read: float = 0.0
    files: BoardFiles | None = None
    message: str = ""
    signature: Signature = ()
    changed: float = 0.0
    timings: Timings = field(default_factory=Timings)
    queued: float = 0.0


@dataclass(frozen=True, slots=True)
class _Turn:
    """A job in line, and who analyses it already."""

    job: Job
    waiting: Waiting | None = None


class Analyst:
    """Works off jobs in a thread of its own; `done` is called in that thread with each job and its outcome.

    Where many saves wait, as in a first pass, `workers` analyse them meanwhile; they are stored in their order.
    """

    def __init__(
        self, intake: Intake, done: Callable[[Job, Outcome], None], workers: Workers | None = None
    ) -> None:
        self._intake = intake
        self._done = done
        self._workers = workers
        self._line: deque[_Turn] = deque()
        self._jobs: queue.SimpleQueue[Job | None] = queue.SimpleQueue()
        self._thread = threading.Thread(target=self._run, name="reactance-analyst", daemon=True)

    def start(self) -> None:
        """Begins."""
        self._thread.start()

    def submit(self, job: Job) -> None:
        """Adds a job behind those already waiting."""
        self._jobs.put(replace(job, queued=time.perf_counter()))

    def stop(self, patience: float) -> None:
        """Finishes what waits, if that takes no longer than `patience` seconds; the rest is caught up on later."""
        self._jobs.put(None)
        self._thread.join(patience)
        workers, self._workers = self._workers, None
        if workers is not None:
            workers.close()

    def _run(self) -> None:
        while (turn := self._next()) is not None:
            job = turn.job
            try:
                outcome = self._work(turn)
            except Exception as error:  # a defect: loud, and the next save still gets its turn
                traceback.print_exc(file=sys.stderr)
                outcome = Outcome(
                    "not stored", job.board, Path(job.board).name, message=f"a defect in reactance: {error!r}"
                )
            self._done(job, outcome)
            if self._jobs.empty() and not self._line:
                self._intake.keep()
                workers = self._workers
                if workers is not None:
                    workers.close()
        self._intake.keep()

    def _next(self) -> _Turn | None:
        """The job whose turn it is; those behind it are handed to workers, if they are many. None at the end."""
        ended = False
        while not ended and (not self._line or not self._jobs.empty()):
            job = self._jobs.get()
            if job is None:
                self._jobs.put(None)
                ended = True
            else:
                self._line.append(_Turn(job))
        if not self._line:
            return None
        self._hand_out()
        return self._line.popleft()

    def _hand_out(self) -> None:
        workers = self._workers
        if workers is None or not workers.pay(len(self._line)):
            return
        for place, turn in enumerate(self._line):
            if not workers.room:
                return
            job = turn.job
            if job.kind == "take" and job.files is not None and turn.waiting is None:
                self._line[place] = _Turn(job, self._intake.begin(job.board, job.files, workers))

    def _work(self, turn: _Turn) -> Outcome:
        job = turn.job
        if job.kind in ("gone", "back"):
            return self._intake.gone(job.board, job.kind == "gone")
        timings = replace(job.timings, queue=time.perf_counter() - job.queued)
        save = Saved(job.board, job.saved, job.read, author_of(str(Path(job.board).parent)))
        if job.kind == "take" and job.files is not None:
            return self._intake.take(save, job.files, timings, turn.waiting)
        return self._intake.refuse(save, job.files, job.message)
