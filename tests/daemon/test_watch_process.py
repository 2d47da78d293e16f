"""The daemon as it runs: a process that is started, saved under, killed and ended."""

from __future__ import annotations

import random
import signal
import sqlite3
import time
from collections.abc import Callable
from pathlib import Path

import psutil
import pytest
from daemonkit import BRIEF, Daemon, run, small_export, until

from reactance.daemon.history import History

Start = Callable[..., Daemon]


def corners(history: History, file: Path) -> list[float]:
    """The filter's corner in every revision, in kHz to one decimal."""
    board = history.board_of(str(file))
    if board is None:
        return []
    reports = [history.report(row.id) for row in history.revisions(board.id)]
    return [
        round((check.nominal or 0) / 1e3, 1)
        for found in reports
        if found
        for check in found.checks
        if check.id == "filter:anti-alias:corner_high"
    ]


@pytest.fixture
def board(folder: Path) -> Path:
    """A small board with a brief in the watched folder."""
    (folder / "board.brief.toml").write_text(BRIEF, encoding="utf-8")
    export = folder / "board.edn"
    export.write_bytes(small_export())
    return export


def in_place(file: Path, data: bytes) -> None:
    file.write_bytes(data)


def in_pieces(file: Path, data: bytes) -> None:
    with file.open("wb") as stream:
        for start in range(0, len(data), 400):
            stream.write(data[start : start + 400])
            stream.flush()
            time.sleep(0.05)


def renamed_over(file: Path, data: bytes) -> None:
    beside = file.with_name("board.edn.tmp")
    beside.write_bytes(data)
    beside.replace(file)


def backed_up(file: Path, data: bytes) -> None:
    file.replace(file.with_name("board.edn.bak"))
    time.sleep(0.1)
    file.write_bytes(data)


def deleted_first(file: Path, data: bytes) -> None:
    file.unlink()
    time.sleep(0.1)
    file.write_bytes(data)


STYLES = (in_place, in_pieces, renamed_over, backed_up, deleted_first)


def test_every_style_of_saving_makes_one_revision(board: Path, daemon: Start) -> None:
    started = daemon()
    expected = [1.6]
    until(lambda: corners(started.history, board) == expected)
    for style, (resistance, corner) in zip(
        STYLES, [("5k", 3.2), ("20k", 0.8), ("8k", 2.0), ("4k", 4.0), ("2.5k", 6.4)], strict=True
    ):
        style(board, small_export(resistance))
        expected = [*expected, corner]
        until(lambda expected=expected: corners(started.history, board) == expected)  # type: ignore[misc]
        style(board, small_export(resistance))
        time.sleep(0.5)
        assert corners(started.history, board) == expected, "the same bytes again"
    board.unlink()
    until(lambda: started.history.boards()[0].gone)
    status, out, err = started.stop()
    assert (status, err) == (0, "")
    assert len([line for line in out.splitlines() if "board #" in line or "small #" in line]) == len(expected)
    assert "gone" in out
    with History.open(started.database) as history:
        assert len(history.revisions(1)) == len(expected)


def test_a_burst_ends_with_the_newest(board: Path, daemon: Start) -> None:
    started = daemon()
    until(lambda: corners(started.history, board) == [1.6])
    for number in range(1, 41):
        board.write_bytes(small_export(f"{number}k"))
        time.sleep(0.01)
    until(lambda: corners(started.history, board)[-1:] == [0.4])


def test_killed_at_any_moment_the_next_start_catches_up(board: Path, daemon: Start) -> None:
    chance = random.Random(7)
    for number in range(1, 6):
        started = daemon()
        board.write_bytes(small_export(f"{number}k"))
        time.sleep(chance.uniform(0.0, 0.6))
        started.kill()
        connection = sqlite3.connect(started.database)
        assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
        connection.close()
    last = daemon()
    until(lambda: corners(last.history, board)[-1:] == [3.2])
    rows = last.history.revisions(1)
    for row in rows:
        found = last.history.report(row.id)
        assert found is not None and last.history.files(row.id).sha256 == row.sha256
    assert len({row.sha256 for row in rows}) == len(rows), "nothing was stored twice"


def test_two_daemons_on_one_history_store_a_save_once(board: Path, daemon: Start) -> None:
    first, second = daemon(), daemon()
    until(lambda: corners(first.history, board) == [1.6])
    board.write_bytes(small_export("5k"))
    until(lambda: len(corners(first.history, board)) == 2)
    time.sleep(1.0)
    assert corners(second.history, board) == [1.6, 3.2]
    assert first.stop()[0] == second.stop()[0] == 0


@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM])
def test_it_ends_when_asked(board: Path, daemon: Start, number: signal.Signals) -> None:
    started = daemon()
    until(lambda: corners(started.history, board) == [1.6])
    started.process.send_signal(number)
    assert started.process.wait(15) == 0


def test_idle_it_takes_no_processor_time_and_little_memory(board: Path, daemon: Start) -> None:
    started = daemon()
    until(lambda: corners(started.history, board) == [1.6])
    time.sleep(1.0)
    process = psutil.Process(started.process.pid)
    before = process.cpu_times()
    time.sleep(4.0)
    after = process.cpu_times()
    assert (after.user + after.system) - (before.user + before.system) <= 0.04
    assert process.memory_info().rss < 200e6


def test_once_stores_what_is_there_and_ends(board: Path, tmp_path: Path) -> None:
    database = tmp_path / "history.sqlite"
    first = run("watch", "--once", "--history", database, board.parent)
    assert (first.returncode, first.stderr) == (0, "")
    assert "first revision: 4 parts" in first.stdout
    second = run("watch", "--once", "--history", database, board.parent)
    assert (second.returncode, second.stdout, second.stderr) == (0, "", "")
    board.write_bytes(small_export("5k"))
    third = run("watch", "--once", "--history", database, board)
    assert "1 edit" in third.stdout and "worse" in third.stdout
    board.write_bytes(b"(edif")
    fourth = run("watch", "--once", "--history", database, board)
    assert fourth.returncode == 2
    assert "board.edn" in fourth.stderr and "Traceback" not in fourth.stderr
    board.unlink()
    fifth = run("watch", "--once", "--history", database, board.parent)
    assert fifth.returncode == 0 and "gone" in fifth.stdout
    with History.open(database) as history:
        assert [row.error is None for row in history.revisions(1)] == [True, True, False]
        assert history.boards()[0].gone


def test_solved_blocks_outlive_the_process(board: Path, tmp_path: Path) -> None:
    database = tmp_path / "history.sqlite"
    run("watch", "--once", "--history", database, board)
    with History.open(database) as history:
        kept = history.blocks(1)
    assert kept
    from reactance.analysis.study import Memory, analyse
    from reactance.daemon.reading import read_board

    memory = Memory()
    for blocks in kept:
        memory.import_blocks(blocks)
    files = read_board(board).files
    assert files is not None
    analyse(files, memory=memory)
    assert memory.solved.reused > 0
    assert memory.solved.computed == 0
