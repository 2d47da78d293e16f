"""A small board, a stand-in for the analysis, and the daemon as a process."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from reactance.analysis.design import Design, InputError, Place
from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import FORMAT_CHECK, Check, Comparison, DesignSummary, Figure, Limit, Movement, Report
from reactance.daemon.engine import Engine, Side
from reactance.daemon.history import History

SMALL = """(edif small (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))
(library parts (edifLevel 0) (technology (numberDefinition))
(cell TWO (cellType GENERIC) (view net (viewType NETLIST)
 (interface (port A (designator "1")) (port B (designator "2")))))
(cell CHIP (cellType GENERIC) (view net (viewType NETLIST)
 (interface (port VDD (designator "1")) (port IN (designator "2")) (port GND (designator "3"))))))
(library boards (edifLevel 0) (technology (numberDefinition))
(cell small (cellType GENERIC) (view net (viewType NETLIST) (interface)
(contents
(instance R1 (viewRef net (cellRef TWO (libraryRef parts)))
 (property VALUE (string "RESISTANCE")) (property TOLERANCE (string "1%")))
(instance C1 (viewRef net (cellRef TWO (libraryRef parts)))
 (property VALUE (string "10nF")) (property DIELECTRIC (string "C0G")) (property VOLTAGE (string "50V")))
(instance C2 (viewRef net (cellRef TWO (libraryRef parts)))
 (property VALUE (string "100nF")) (property DIELECTRIC (string "X7R")) (property VOLTAGE (string "16V")))
(instance U1 (viewRef net (cellRef CHIP (libraryRef parts))) (property VALUE (string "ADC")))
(net SENSE (joined (portRef A (instanceRef R1))))
(net ADC (joined (portRef B (instanceRef R1)) (portRef A (instanceRef C1)) (portRef IN (instanceRef U1))))
(net (rename N3V3 "+3V3") (joined (portRef A (instanceRef C2)) (portRef VDD (instanceRef U1))))
(net GND (joined (portRef B (instanceRef C1)) (portRef B (instanceRef C2)) (portRef GND (instanceRef U1))))))))
(design small (cellRef small (libraryRef boards))))
"""
# 1 / (2 pi 10 kohm 10 nF) is 1.59 kHz.
BRIEF = """[[filter]]
name = "anti-alias"
from = "SENSE"
to = "ADC"
corner = "1.6 kHz"
tolerance = "10 %"

[[pin]]
at = "R1.1"
drives = "1 V"
resistance = "1 mohm"
"""
PATIENCE = 15.0


def small_export(resistance: str = "10k") -> bytes:
    """An EDIF file of four parts: a low-pass of R1 and C1 before U1, and C2 on its supply."""
    return SMALL.replace("RESISTANCE", resistance).encode()


def board_files(main: bytes = b"(1)", brief: bytes | None = None) -> BoardFiles:
    """A bundle of files as a save brings them."""
    return BoardFiles(ExportFiles(main, "board.edn"), brief, "board.brief.toml", {})


def report(value: float = 0.1, limit: float = 1.0, name: str = "board") -> Report:
    """A report with one judged check."""
    status = "pass" if value <= limit else "fail"
    check = Check("rail:+3V3:droop", "droop", value, value, value, "V", Limit(max=limit), limit - value, status, "")
    return Report(FORMAT_CHECK, DesignSummary(name, "board.edn", "0" * 64, 3, 4), (), (), (), (), (check,), (), ())


@dataclass(frozen=True)
class StandInResults:
    """What the stand-in yields."""

    design: Design
    report: Report


class StandInMemory:
    """Keeps nothing."""

    def export_blocks(self) -> bytes:
        return b""

    def import_blocks(self, blocks: bytes) -> None:
        del blocks


def stand_in(files: BoardFiles, memory: object, understood: Callable[[], None]) -> StandInResults:
    """Takes `(edif NUMBER)` for a board whose droop is NUMBER volts; what lacks the bracket is broken."""
    del memory
    understood()
    text = files.export.main.decode().strip()
    if not text.endswith(")"):
        raise InputError("unexpected end of the file", Place(files.export.name, 1, len(text)), "close the bracket")
    value = float(text.removeprefix("(edif").removesuffix(")").split()[0])
    return StandInResults(Design("board", files.export.name, "EDIF", (), ()), report(value))


def stand_in_compare(older: Side, newer: Side) -> Comparison:
    """Worse where the value is greater."""
    before, after = (side[1].checks[0] for side in (older, newer))
    if before.nominal == after.nominal or before.nominal is None or after.nominal is None:
        return Comparison((), ())
    verdict = "worse" if after.nominal > before.nominal else "better"
    sides = [Figure(check.nominal, check.status, check.margin) for check in (before, after)]
    return Comparison((), (Movement(after.id, verdict, *sides),))


ENGINE = Engine(
    stand_in, stand_in_compare, lambda files: Design("board", files.export.name, "EDIF", (), ()), StandInMemory
)


def until(condition: Callable[[], object], patience: float = PATIENCE) -> None:
    """Waits until the condition holds; fails where it does not within `patience` seconds."""
    end = time.monotonic() + patience
    while not condition():
        assert time.monotonic() < end, "waited in vain"
        time.sleep(0.01)


def command(*arguments: str | Path) -> list[str]:
    """The program as a command line."""
    return [sys.executable, "-m", "reactance.daemon", *map(str, arguments)]


def run(*arguments: str | Path, cwd: Path | None = None, **variables: str) -> subprocess.CompletedProcess[str]:
    """Runs the program to its end."""
    environment = {**os.environ, "NO_COLOR": "1", **variables}
    return subprocess.run(
        command(*arguments),
        cwd=cwd,
        env=environment,
        capture_output=True,
        encoding="utf-8",
        timeout=120,
        check=False,
    )


@dataclass(frozen=True)
class Answer:
    """What a command did."""

    returncode: int
    stdout: str
    stderr: str


def call(*arguments: str | Path, **variables: str) -> Answer:
    """Runs a command in this process, which is quicker; a traceback becomes an exception."""
    from click.testing import CliRunner

    from reactance.daemon.cli import reactance

    done = CliRunner().invoke(
        reactance, [str(argument) for argument in arguments], env=variables, prog_name="reactance"
    )
    if done.exception is not None and not isinstance(done.exception, SystemExit):
        raise done.exception
    return Answer(done.exit_code, done.stdout, done.stderr)


class Daemon:
    """`reactance watch` as a process, with its history open for reading."""

    def __init__(self, place: Path, database: Path, *options: str) -> None:
        self.database = database
        self.process = subprocess.Popen(
            command("watch", place, "--no-dashboard", "--history", database, *options),
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            encoding="utf-8",
        )
        assert self.process.stdout is not None
        assert "watching" in self.process.stdout.readline()
        self.history = History.open(database)

    def kill(self) -> None:
        """Ends it with no warning."""
        self.process.kill()
        self._gather()

    def stop(self) -> tuple[int, str, str]:
        """Asks it to end; its exit status and what it said."""
        self.process.send_signal(signal.SIGTERM)
        out, err = self._gather()
        return self.process.returncode, out, err

    def _gather(self) -> tuple[str, str]:
        try:
            return self.process.communicate(timeout=PATIENCE)
        finally:
            self.history.close()
