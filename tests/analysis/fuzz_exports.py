"""Reads broken exports by the hundred thousand: `python tests/analysis/fuzz_exports.py COUNT [PROCESSES [FIRST]]`.

Prints how many were read and refused, the slowest, the peak memory of a process, and every input that did anything
but become a Design or one InputError. Exit status 1 where there was one. The same number is always the same input.
"""

from __future__ import annotations

import faulthandler
import multiprocessing
import os
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent.parent))

from writers.fuzzing import SLOW, Tally, run

CHUNK = 1000


def chunk(first: int) -> tuple[Tally, int]:
    """A thousand inputs, and the memory that this process has needed at most, in bytes."""
    faulthandler.dump_traceback_later(300, exit=True)  # a hang names itself
    tally = run(first, CHUNK)
    faulthandler.cancel_dump_traceback_later()
    return tally, peak()


def peak() -> int:
    """The greatest resident memory of this process so far, in bytes."""
    import psutil

    memory = psutil.Process().memory_info()
    if sys.platform == "win32":
        return int(memory.peak_wset)
    import resource

    unit = 1 if sys.platform == "darwin" else 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit


def main() -> int:
    """Run as many inputs as the first argument says."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 5000
    processes = int(sys.argv[2]) if len(sys.argv) > 2 else os.cpu_count() or 1
    first = int(sys.argv[3]) if len(sys.argv) > 3 else 0
    begun, whole, memory = time.perf_counter(), Tally(), 0
    firsts = range(first, first + count, CHUNK)
    with multiprocessing.Pool(processes) as pool:
        for done, (tally, used) in enumerate(pool.imap_unordered(chunk, firsts), 1):
            whole.add(tally)
            memory = max(memory, used)
            if sys.stderr.isatty():
                print(f"\r{done * CHUNK:,} of {count:,}", end="", file=sys.stderr)
    total = whole.outcomes.total()
    print(f"{total:,} inputs in {time.perf_counter() - begun:.0f} s: {dict(whole.outcomes)}")
    print(f"slowest {whole.slowest:.3f} s of processor time (input {whole.slowest_input}), peak {memory / 1e6:.0f} MB")
    for failure in whole.failures[:50]:
        print(failure)
    print(f"{len(whole.failures)} failures")
    return 1 if whole.failures or whole.slowest > SLOW or memory > 1e9 else 0


if __name__ == "__main__":
    raise SystemExit(main())
