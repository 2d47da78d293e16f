"""A whole check, cold and warm, as ratios measured in one run; they stand in `extra_info`, nothing is asserted on time.

The yardstick is a process that imports numpy and scipy.linalg and reads the same file with `sexpdata.loads`. Aims: a
cold `check` at most 1.5 times that, a check after one value changed at most 0.1 of the cold one, 600 MB at most for
20,000 parts. A plain run takes a small board; REACTANCE_BENCH=full takes 2,000 and 20,000 parts.
"""

from __future__ import annotations

import os
import subprocess
import sys
import time
from dataclasses import dataclass
from pathlib import Path

import pytest
from pytest_benchmark.fixture import BenchmarkFixture
from writers.many_parts import brief, export

from reactance.daemon.engine import default_engine
from reactance.daemon.reading import read_board

FULL = os.environ.get("REACTANCE_BENCH") == "full"
SIZES = [2_000, 20_000] if FULL else [200]
ROUNDS = 3 if FULL else 1
YARDSTICK = "import sys, numpy, scipy.linalg, sexpdata; sexpdata.loads(open(sys.argv[1], encoding='utf-8').read())"
CHECK = "from reactance.daemon.cli import main; main()"


@dataclass(frozen=True)
class Spent:
    """What a process took: seconds on the clock and of the processor, and its greatest memory in MB."""

    wall: float
    cpu: float
    megabytes: float
    status: int


def spent(code: str, *arguments: str) -> Spent:
    """Runs Python code as a process of its own. Where the system does not tell (Windows), cpu is the clock's time."""
    start = time.perf_counter()
    command = [sys.executable, "-c", code, *arguments]
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
    if not hasattr(os, "wait4"):
        process.communicate()
        wall = time.perf_counter() - start
        return Spent(wall, wall, 0.0, process.returncode)
    _, told, usage = os.wait4(process.pid, 0)
    process.returncode = os.waitstatus_to_exitcode(told)
    unit = 1e6 if sys.platform == "darwin" else 1e3
    cpu = usage.ru_utime + usage.ru_stime
    return Spent(time.perf_counter() - start, cpu, usage.ru_maxrss / unit, process.returncode)


def least(found: list[Spent]) -> Spent:
    """The one that took the processor least."""
    return min(found, key=lambda one: one.cpu)


@pytest.mark.parametrize("parts", SIZES)
def test_check_cold_and_warm(benchmark: BenchmarkFixture, tmp_path: Path, parts: int) -> None:
    file = tmp_path / "board.edn"
    file.write_bytes(export(parts))
    (tmp_path / "board.brief.toml").write_bytes(brief(parts))
    rounds = ROUNDS if parts < 10_000 else 1
    yardstick = least([spent(YARDSTICK, str(file)) for _ in range(rounds)])
    cold = least([spent(CHECK, "check", str(file)) for _ in range(rounds)])
    assert yardstick.status == 0
    assert cold.status in {0, 1}

    engine = default_engine()
    memory = engine.memory()
    reports = [engine.analyse(read_board(file).files, memory, lambda: None).report]
    values = iter(f"{n}k3" for n in range(3, 9))
    taken: list[float] = []

    def change() -> None:
        file.write_bytes(export(parts, first_filter=next(values)))

    def check_again() -> None:
        start = time.process_time()
        reports.append(engine.analyse(read_board(file).files, memory, lambda: None).report)
        taken.append(time.process_time() - start)

    benchmark.pedantic(check_again, setup=change, rounds=ROUNDS)
    assert all(report.parts != reports[0].parts for report in reports[1:])
    assert len(reports[0].checks) > parts
    warm = min(taken)
    benchmark.extra_info |= {
        "parts": reports[0].design.parts,
        "checks": len(reports[0].checks),
        "bytes": file.stat().st_size,
        "cold check, seconds of processor": round(cold.cpu, 2),
        "cold check over imports and sexpdata.loads, processor": round(cold.cpu / yardstick.cpu, 2),
        "cold check over imports and sexpdata.loads, clock": round(cold.wall / yardstick.wall, 2),
        "after one value changed over the cold check, processor": round(warm / cold.cpu, 3),
        "greatest memory of the cold check in MB": round(cold.megabytes),
    }
