"""From the end of a save to the stored revision, for a board of 2,000 parts that is watched warm.

The breakdown is in the report's `extra_info`, in seconds per stage, and each as a share of the whole.
"""

from __future__ import annotations

import itertools
import queue
import statistics
import threading
from pathlib import Path

from boardkit import edif
from pytest_benchmark.fixture import BenchmarkFixture

from reactance.daemon.engine import default_engine
from reactance.daemon.history import History
from reactance.daemon.intake import Intake
from reactance.daemon.outcome import Outcome, Timings
from reactance.daemon.watcher import Watcher

CHANNELS = 285  # of seven parts each
STAGES = tuple(Timings.__dataclass_fields__)
ROUNDS = 7


def board(resistance: str) -> bytes:
    """2,001 parts: 285 channels, each a filter before an amplifier with its own decoupling, and six supply parts."""
    parts: list[tuple[str, str, dict[str, str]]] = []
    for n in range(CHANNELS):
        value = resistance if n == 0 else "10k"
        rail = f"+{n % 3 + 1}V8"
        parts += [
            (f"R{2 * n}", f"{value}|TOLERANCE=1%", {"1": f"IN{n}", "2": f"F{n}"}),
            (f"C{4 * n}", "10nF|DIELECTRIC=C0G|VOLTAGE=50V", {"1": f"F{n}", "2": "GND"}),
            (f"R{2 * n + 1}", "100k|TOLERANCE=1%", {"1": f"F{n}", "2": "GND"}),
            (f"C{4 * n + 1}", "100nF|DIELECTRIC=X7R|VOLTAGE=16V|PACKAGE=0402", {"1": rail, "2": "GND"}),
            (f"C{4 * n + 2}", "1uF|DIELECTRIC=X7R|VOLTAGE=16V|PACKAGE=0603", {"1": rail, "2": "GND"}),
            (f"C{4 * n + 3}", "1uF|DIELECTRIC=X7R|VOLTAGE=16V|PACKAGE=0603", {"1": f"F{n}", "2": f"OUT{n}"}),
            (f"U{n}", "AMPLIFIER", {"1": rail, "2": f"F{n}", "3": "GND", "4": f"OUT{n}"}),
        ]
    bulk = "47uF|DIELECTRIC=X5R|VOLTAGE=6.3V|PACKAGE=1206"
    parts += [(f"C{9000 + n}", bulk, {"1": f"+{n % 3 + 1}V8", "2": "GND"}) for n in range(6)]
    return edif(parts)


def brief() -> bytes:
    """Three rails with a load step each, and forty filters."""
    text = ""
    for volts in (1, 2, 3):
        text += (
            f'[[rail]]\nnet = "+{volts}V8"\nvoltage = "{volts}.8 V"\n'
            'source = { resistance = "20 mohm", inductance = "30 nH" }\n'
            'step = { current = "0.8 A", rise = "10 ns" }\nallowed = "5 %"\n'
        )
    for n in range(40):
        text += (
            f'[[filter]]\nname = "channel {n}"\nfrom = "IN{n}"\nto = "F{n}"\ncorner = "1.6 kHz"\ntolerance = "30 %"\n'
        )
    return text.encode()


def test_save_to_stored_revision(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    place = tmp_path / "boards"
    place.mkdir()
    export = place / "board.edn"
    (place / "board.brief.toml").write_bytes(brief())
    outcomes: queue.SimpleQueue[Outcome] = queue.SimpleQueue()
    with History.open(tmp_path / "history.sqlite") as history:
        intake = Intake(history, default_engine())
        watcher = Watcher([place], history, intake, tell=outcomes.put, announce=print)
        thread = threading.Thread(target=watcher.run)
        thread.start()
        export.write_bytes(board("10k"))
        cold = outcomes.get(timeout=300)
        assert cold.kind == "stored", cold.message
        found: list[Outcome] = []
        contents = itertools.count(11)
        try:
            benchmark.pedantic(
                lambda data: (export.write_bytes(data), found.append(outcomes.get(timeout=300))),
                setup=lambda: ((board(f"{next(contents)}k"),), {}),
                rounds=ROUNDS,
            )
        finally:
            watcher.stop()
            thread.join(30)
    assert all(outcome.kind == "stored" for outcome in found)
    assert cold.report is not None and cold.report.design.parts >= 2000
    middle = {stage: statistics.median(getattr(outcome.timings, stage) for outcome in found) for stage in STAGES}
    whole = sum(middle.values())
    benchmark.extra_info |= {
        "parts": cold.report.design.parts,
        "checks": len(cold.report.checks),
        "seconds": {stage: round(seconds, 4) for stage, seconds in middle.items()},
        "share": {stage: round(seconds / whole, 3) for stage, seconds in middle.items()},
        "first_analysis_over_warm": round(cold.timings.total / whole, 2),
    }
