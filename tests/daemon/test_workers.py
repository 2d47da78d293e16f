"""A first pass over many boards: worker processes analyse, one writer stores, and kills lose nothing."""

from __future__ import annotations

import signal
import sqlite3
import subprocess
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import psutil
import pytest
from daemonkit import BRIEF, Daemon, board_files, command, run, small_export, until

from reactance.analysis.design import InputError
from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.daemon.catch_up import catch_up
from reactance.daemon.engine import default_engine
from reactance.daemon.history import History
from reactance.daemon.intake import Intake
from reactance.daemon.outcome import Outcome
from reactance.daemon.workers import Workers, analyse_apart, result

BOARDS = 7


@pytest.fixture
def boards(folder: Path) -> list[Path]:
    """Small boards with different resistors, one of them broken."""
    files = []
    for number in range(BOARDS):
        below = folder / f"project{number}"
        below.mkdir()
        (below / "board.brief.toml").write_text(BRIEF, encoding="utf-8")
        files.append(below / "board.edn")
        files[-1].write_bytes(small_export(f"{number + 1}k") if number != 3 else small_export("1k")[:-20])
    return files


def small(resistance: str) -> BoardFiles:
    return BoardFiles(ExportFiles(small_export(resistance), "board.edn", {}), BRIEF.encode(), "board.brief.toml", {})


def passed(history: History, folder: Path, workers: Workers | None) -> tuple[list[Outcome], list[tuple[int, int]]]:
    told: list[tuple[int, int]] = []
    intake = Intake(history, default_engine())
    outcomes = list(catch_up([folder], history, intake, lambda done, total: told.append((done, total)), workers))
    return outcomes, told


def test_workers_find_what_one_process_finds(tmp_path: Path, folder: Path, boards: list[Path]) -> None:
    with History.open(tmp_path / "alone.sqlite") as alone, History.open(tmp_path / "shared.sqlite") as shared:
        one, _ = passed(alone, folder, None)
        with closing(Workers(2)) as workers:
            many, told = passed(shared, folder, workers)
        assert [(o.kind, o.file, o.message) for o in many] == [(o.kind, o.file, o.message) for o in one]
        assert [o.kind for o in many].count("stored") == BOARDS - 1
        assert told == [(done, BOARDS) for done in range(BOARDS + 1)]
        for file in boards:
            rows = [history.board_of(str(file)) for history in (alone, shared)]
            found = [
                [history.report(revision.id) for revision in history.revisions(row.id)]
                for history, row in zip((alone, shared), rows, strict=True)
                if row is not None
            ]
            assert len(found) == 2
            assert found[0] == found[1]
        stored = shared.board_of(str(boards[0]))
        assert stored is not None
        assert shared.blocks(stored.id), "what workers solved is kept"


def test_what_is_stored_already_is_not_analysed_again(history: History, folder: Path, boards: list[Path]) -> None:
    with closing(Workers(2)) as workers:
        passed(history, folder, workers)
        boards[0].write_bytes(small_export("9k"))
        outcomes, _ = passed(history, folder, workers)
    assert [outcome.file for outcome in outcomes if outcome.kind == "stored"] == [str(boards[0])]
    moved = next(outcome for outcome in outcomes if outcome.kind == "stored")
    assert moved.comparison is not None
    assert [edit.part for edit in moved.comparison.edits] == ["R1"]


def test_a_killed_worker_costs_time_only(history: History, folder: Path, boards: list[Path]) -> None:
    with closing(Workers(2)) as workers:
        told: list[int] = []

        def kill(done: int, total: int) -> None:
            told.append(done)
            if done == 1:
                for child in psutil.Process().children():
                    if "spawn_main" in " ".join(child.cmdline()):
                        child.kill()

        intake = Intake(history, default_engine())
        outcomes = list(catch_up([folder], history, intake, kill, workers))
    assert told[-1] == BOARDS
    assert [outcome.kind for outcome in outcomes].count("stored") == BOARDS - 1


def test_one_or_two_boards_start_no_process() -> None:
    workers = Workers(4)
    assert not workers.pay(2)
    assert workers.pay(3)
    assert not Workers(1).pay(100)


def test_a_worker_tells_what_is_wrong_with_a_board() -> None:
    with closing(Workers(2)) as workers:
        waiting = workers.begin(board_files(b"(edif broken"), ())
        assert waiting is not None
        with pytest.raises(InputError, match=r"board\.edn"):
            result(waiting)


def test_a_worker_takes_what_was_solved_before() -> None:
    first = analyse_apart(small("5k"), ())
    assert first.blocks
    again = analyse_apart(small("5k"), (first.blocks,))
    assert again.blocks == b""
    assert again.report == first.report


def test_closing_ends_workers_at_once() -> None:
    workers = Workers(2)
    started = [workers.begin(small(f"{number}k"), ()) for number in range(1, 5)]
    assert all(started)
    until(lambda: len(psutil.Process().children()) >= 2)
    children = psutil.Process().children()
    workers.close()
    _, alive = psutil.wait_procs([child for child in children if "spawn_main" in _line(child)], 10)
    assert alive == []


def _line(process: psutil.Process) -> str:
    try:
        return " ".join(process.cmdline())
    except psutil.Error:
        return ""


@pytest.mark.parametrize("kill_after", [1, 3])
def test_a_pass_killed_at_any_moment_is_taken_up_again(
    tmp_path: Path, folder: Path, boards: list[Path], kill_after: int
) -> None:
    database = tmp_path / "history.sqlite"
    process = subprocess.Popen(
        command("watch", "--once", "--history", database, folder),
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
        text=True,
    )
    assert process.stdout is not None
    for _ in range(kill_after):
        assert process.stdout.readline()
    children = psutil.Process(process.pid).children(recursive=True)
    process.kill()
    process.wait()
    process.stdout.close()
    _, alive = psutil.wait_procs(children, 15)
    assert alive == [], "workers end with the process that started them"
    with closing(sqlite3.connect(database)) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    again = run("watch", "--once", "--history", database, folder)
    assert again.returncode in {0, 2}, "2 where the broken export was not recorded before"
    with History.open(database) as history:
        good = [row for row in history.boards() if history.latest(row.id)]
        assert len(good) == BOARDS - 1
        assert all(len(history.revisions(row.id)) == 1 for row in history.boards()), "each once, the broken one too"


def test_the_daemon_passes_over_many_boards_and_keeps_no_worker(
    daemon: Callable[..., Daemon], folder: Path, boards: list[Path], tmp_path: Path
) -> None:
    running = daemon()
    with History.open(tmp_path / "data" / "history.sqlite") as history:
        until(lambda: len([row for row in history.boards() if history.latest(row.id)]) == BOARDS - 1, 60)
        main = psutil.Process(running.process.pid)
        until(lambda: not [one for one in main.children(recursive=True) if "spawn_main" in _line(one)], 30)
        boards[2].write_bytes(small_export("8k"))
        row = history.board_of(str(boards[2]))
        assert row is not None
        until(lambda: len(history.revisions(row.id)) == 2)


def test_an_interrupted_pass_leaves_no_traceback(tmp_path: Path, folder: Path, boards: list[Path]) -> None:
    """Ctrl-C reaches the whole group of processes, workers too."""
    process = subprocess.Popen(
        command("watch", "--once", "--history", tmp_path / "history.sqlite", folder),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    assert process.stdout is not None
    assert process.stdout.readline()
    for one in (*psutil.Process(process.pid).children(recursive=True), psutil.Process(process.pid)):
        one.send_signal(signal.SIGINT)
    _, errors = process.communicate(timeout=60)
    assert "Traceback" not in errors
