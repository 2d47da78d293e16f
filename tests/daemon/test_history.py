"""The history: what goes in comes out, whole or not at all, whatever happens to the process."""

from __future__ import annotations

import random
import sqlite3
import subprocess
import sys
import textwrap
import threading
import time
from pathlib import Path

import pytest
from daemonkit import board_files, report

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Comparison, Edit, Figure, Movement
from reactance.daemon.history import History, HistoryError, Saved
from reactance.daemon.schema import APPLICATION_ID, STEPS

FILE = "/boards/board.edn"
SAVE = Saved(FILE, 1000.0, 1001.0, "A. Designer")
WORSE = Comparison(
    (Edit("1", "attribute changed", "C1", "value", "100 nF", "10 nF"),),
    (Movement("rail:+3V3:droop", "worse", Figure(0.1, "pass", 0.9), Figure(0.2, "pass", 0.8)),),
)


def filled(history: History) -> tuple[int, int, int]:
    """A board with two good revisions and a broken one between them: their ids."""
    first = history.store(SAVE, board_files(b"(1)"), report(0.1))
    broken = history.store_error(SAVE, board_files(b"(2"), "board.edn:1:2: unexpected end")
    assert first and broken
    second = history.store(SAVE, board_files(b"(3)", b"# brief"), report(0.2), WORSE, first.id)
    assert second
    return first.id, broken.id, second.id


def test_what_is_stored_comes_back(history: History) -> None:
    files = BoardFiles(
        ExportFiles(b"main", "board.pins.csv", {".parts.csv": b"parts"}),
        b"brief",
        "board.brief.toml",
        {"/team/parts.toml": b"team", "c10u.s2p": b"measured"},
    )
    row = history.store(SAVE, files, report(0.3), WORSE)
    assert row is not None
    assert history.files(row.id) == files
    assert history.files(row.id).sha256 == files.sha256 == row.sha256
    assert history.report(row.id) == report(0.3)
    assert history.comparison(row.id) == WORSE
    assert (row.saved, row.read, row.author, row.parts, row.worse) == (1000.0, 1001.0, "A. Designer", 3, 1)
    assert dict(row.status) == {"pass": 1}


def test_a_board_without_brief_differs_from_one_with_an_empty_brief(history: History) -> None:
    none, empty = board_files(brief=None), board_files(brief=b"")
    first, second = history.store(SAVE, none, report()), history.store(SAVE, empty, report())
    assert first and second
    assert history.files(first.id).brief is None
    assert history.files(second.id).brief == b""


def test_same_contents_make_no_revision(history: History) -> None:
    assert history.store(SAVE, board_files(), report()) is not None
    assert history.store(SAVE, board_files(), report()) is None
    assert history.store_error(SAVE, board_files(b"("), "broken") is not None
    assert history.store_error(SAVE, board_files(b"("), "broken") is None
    assert history.store(SAVE, board_files(), report()) is not None, "a repair is news even with old contents"


def test_identical_blobs_are_kept_once(history: History, tmp_path: Path) -> None:
    brief = bytes(range(256)) * 100
    for number in range(20):
        history.store(SAVE, board_files(str(number).encode(), brief), report())
    counted = sqlite3.connect(history.path).execute("SELECT count(*) FROM blob").fetchone()[0]
    assert counted == 21


def test_a_broken_save_leaves_the_last_good_one_in_place(history: History) -> None:
    first, broken, second = filled(history)
    board = history.board_of(FILE)
    assert board is not None
    assert [row.error is None for row in history.revisions(board.id)] == [True, False, True]
    assert history.report(broken) is None
    assert history.previous(second) == history.revision(first)
    assert set(history.strip(board.id)) == {"rail:+3V3:droop"}
    assert [cell.revision for cell in history.strip(board.id)["rail:+3V3:droop"]] == [first, second]
    assert [cell.verdict for cell in history.strip(board.id)["rail:+3V3:droop"]] == [None, "worse"]


def test_strip_marks_a_check_that_vanished(history: History) -> None:
    first = history.store(SAVE, board_files(b"1"), report())
    assert first
    gone = Comparison((), (Movement("filter:x:corner", "worse", Figure(1.0, "pass", 1.0), Figure(None, None, None)),))
    second = history.store(SAVE, board_files(b"2"), report(), gone, first.id)
    assert second
    cell = history.strip(second.board)["filter:x:corner"][-1]
    assert (cell.revision, cell.nominal, cell.status, cell.verdict) == (second.id, None, "unknown", "worse")


def test_strip_holds_the_newest(history: History) -> None:
    for number in range(10):
        history.store(SAVE, board_files(str(number).encode()), report(number / 100))
    cells = history.strip(1, most=4)["rail:+3V3:droop"]
    assert [cell.nominal for cell in cells] == [0.06, 0.07, 0.08, 0.09]


def test_baseline_is_the_previous_or_the_pinned_one(history: History) -> None:
    first, broken, second = filled(history)
    board = history.board_of(FILE)
    assert board is not None
    assert history.baseline(board.id, second) == history.revision(first)
    assert history.baseline(board.id) == history.revision(second)
    assert history.baseline(board.id, first) is None
    history.pin(board.id, first)
    third = history.store(SAVE, board_files(b"(4)"), report())
    assert third
    assert history.baseline(board.id, third.id) == history.revision(first)
    assert history.baseline(board.id, first) is None, "nothing is compared with itself or with what came later"
    history.pin(board.id, None)
    assert history.baseline(board.id, third.id) == history.revision(second)
    for wrong in (broken, 999):
        with pytest.raises(HistoryError, match=str(wrong)):
            history.pin(board.id, wrong)


def test_gone_and_back(history: History) -> None:
    filled(history)
    assert history.mark_gone(FILE)
    assert not history.mark_gone(FILE), "no news"
    board = history.board_of(FILE)
    assert board is not None and board.gone
    assert len(history.revisions(board.id)) == 3
    history.store(SAVE, board_files(b"(5)"), report())
    board = history.board_of(FILE)
    assert board is not None and not board.gone


def test_version_grows_and_wakes_waiters(history: History) -> None:
    before = history.version()
    woken: list[int] = []
    waiter = threading.Thread(target=lambda: woken.append(history.wait(before, 30.0)))
    waiter.start()
    filled(history)
    waiter.join(30.0)
    assert woken and woken[0] > before
    assert history.wait(history.version(), 0.0) == history.version()


def test_waiters_see_writes_of_other_processes(history: History) -> None:
    before = history.version()
    other = History.open(history.path)  # stands for another process: it shares no condition with the first
    woken: list[int] = []
    waiter = threading.Thread(target=lambda: woken.append(history.wait(before, 30.0)))
    waiter.start()
    filled(other)
    other.close()
    waiter.join(30.0)
    assert woken and woken[0] > before


def test_many_threads_read_while_one_writes(history: History) -> None:
    wrong: list[object] = []
    done = threading.Event()

    def read() -> None:
        while not done.is_set():
            for board in history.boards():
                for row in history.revisions(board.id):
                    if history.report(row.id) is None or not history.files(row.id).export.main:
                        wrong.append(row)

    readers = [threading.Thread(target=read) for _ in range(4)]
    for reader in readers:
        reader.start()
    for number in range(30):
        history.store(SAVE, board_files(str(number).encode()), report(number))
    done.set()
    for reader in readers:
        reader.join()
    assert not wrong
    assert len(history.revisions(1)) == 30


def test_solved_blocks_are_kept_and_the_oldest_make_room(history: History) -> None:
    filled(history)
    for number in range(5):
        history.keep_blocks(1, bytes([number]), most=3)
    assert history.blocks(1) == (b"\2", b"\3", b"\4")


def test_newer_version_is_refused_untouched(tmp_path: Path) -> None:
    path = tmp_path / "history.sqlite"
    History.open(path).close()
    with sqlite3.connect(path) as connection:
        connection.execute(f"PRAGMA user_version = {len(STEPS) + 1}")
    connection.close()
    before = path.read_bytes()
    with pytest.raises(HistoryError, match="newer version of reactance"):
        History.open(path)
    assert path.read_bytes() == before


def test_another_programs_database_is_refused_untouched(tmp_path: Path) -> None:
    path = tmp_path / "other.sqlite"
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE recipes (name)")
    connection.close()
    with pytest.raises(HistoryError, match="another program's database"):
        History.open(path)
    with sqlite3.connect(path) as connection:
        tables = connection.execute("SELECT name FROM sqlite_master").fetchall()
    connection.close()
    assert tables == [("recipes",)]


@pytest.mark.parametrize("content", [b"this is no database, but long enough to be taken for one" * 40, b"x"])
def test_a_file_that_is_no_database_is_refused(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "notes.txt"
    path.write_bytes(content)
    with pytest.raises(HistoryError, match=r"notes\.txt"):
        History.open(path)
    assert path.read_bytes() == content


def test_a_missing_history_is_made_only_where_asked(tmp_path: Path) -> None:
    with pytest.raises(HistoryError, match="no history yet"):
        History.open(tmp_path / "none.sqlite", create=False)
    assert list(tmp_path.iterdir()) == []


def test_the_file_says_what_it_is(history: History) -> None:
    connection = sqlite3.connect(history.path)
    assert connection.execute("PRAGMA application_id").fetchone()[0] == APPLICATION_ID
    assert connection.execute("PRAGMA user_version").fetchone()[0] == len(STEPS)
    assert connection.execute("PRAGMA journal_mode").fetchone()[0] == "wal"
    connection.close()


def test_two_writers_take_turns(history: History) -> None:
    with History.open(history.path) as other:
        both = [
            threading.Thread(target=store_many, args=(found, f"/boards/{name}.edn"))
            for name, found in (("a", history), ("b", other))
        ]
        for writer in both:
            writer.start()
        for writer in both:
            writer.join()
    assert [len(history.revisions(board.id)) for board in history.boards()] == [20, 20]


def store_many(history: History, file: str) -> None:
    """Twenty revisions of one board."""
    for number in range(20):
        history.store(Saved(file, 1.0, 2.0), board_files(str(number).encode()), report(number))


WRITER = """
    import sys
    sys.path.insert(0, sys.argv[2])
    from pathlib import Path
    from daemonkit import board_files, report
    from reactance.daemon.history import History, Saved
    history = History.open(Path(sys.argv[1]))
    print("ready", flush=True)
    for number in range(100000):
        data = str(number).encode() * 20000
        history.store(Saved("/boards/board.edn", 1.0, 2.0), board_files(data, b"brief"), report(number))
"""


def test_killed_at_any_moment_it_opens_clean_and_holds_whole_revisions(tmp_path: Path) -> None:
    path = tmp_path / "history.sqlite"
    chance = random.Random(20)
    for _ in range(6):
        writer = subprocess.Popen(
            [sys.executable, "-c", textwrap.dedent(WRITER), str(path), str(Path(__file__).parent.parent)],
            stdout=subprocess.PIPE,
        )
        assert writer.stdout is not None
        writer.stdout.readline()
        time.sleep(chance.uniform(0.0, 0.15))
        writer.kill()
        writer.communicate()
        with History.open(path) as history:
            connection = sqlite3.connect(path)
            assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
            assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
            connection.close()
            for board in history.boards():
                rows = history.revisions(board.id)
                cells = history.strip(board.id, 10**6)["rail:+3V3:droop"]
                assert [cell.revision for cell in cells] == [row.id for row in rows]
                for row in rows[-3:]:
                    found = history.report(row.id)
                    assert found is not None
                    assert history.files(row.id).sha256 == row.sha256
                    assert history.files(row.id).export.main == str(int(found.checks[0].nominal or 0)).encode() * 20000


def test_killed_while_it_is_made_it_is_made_again(tmp_path: Path) -> None:
    path = tmp_path / "history.sqlite"
    chance = random.Random(3)
    for _ in range(5):
        maker = subprocess.Popen(
            [
                sys.executable,
                "-c",
                f"from reactance.daemon.history import *; History.open(__import__('pathlib').Path({str(path)!r}))",
            ]
        )
        time.sleep(chance.uniform(0.1, 0.6))
        maker.kill()
        maker.wait()
        with History.open(path) as history:
            assert history.boards() == ()
        for leftover in tmp_path.iterdir():
            leftover.unlink()
