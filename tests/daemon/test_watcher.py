"""Every way of saving a file, through the real watcher on real folders, with a stand-in for the analysis."""

from __future__ import annotations

import errno
import logging
import os
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path

import pytest
from daemonkit import ENGINE, stand_in, until

from reactance.analysis.files import BoardFiles
from reactance.daemon import sources
from reactance.daemon.engine import Engine
from reactance.daemon.history import History
from reactance.daemon.intake import Intake
from reactance.daemon.outcome import Outcome
from reactance.daemon.sources import Source
from reactance.daemon.walk import roots_of
from reactance.daemon.watcher import Watcher


class Watching:
    """A watcher in a thread of its own, and what it told."""

    def __init__(self, history: History, place: Path, engine: Engine, polling: float | None) -> None:
        self.outcomes: list[Outcome] = []
        self.announced: list[str] = []
        self.passes: list[tuple[int, int]] = []
        self.history = history
        self.watcher = Watcher(
            [place],
            history,
            Intake(history, engine),
            tell=self.outcomes.append,
            announce=self.announced.append,
            polling=polling,
            first_pass=lambda done, total: self.passes.append((done, total)),
        )
        self.thread = threading.Thread(target=self.watcher.run)
        self.thread.start()
        until(lambda: self.passes)

    def stop(self) -> None:
        self.watcher.stop()
        self.thread.join(30.0)
        assert not self.thread.is_alive()

    def kinds(self) -> list[str]:
        return [outcome.kind for outcome in self.outcomes if outcome.kind != "same"]

    def values(self, file: Path) -> list[float | None]:
        """The figures of all good revisions, None for those that could not be used."""
        board = self.history.board_of(str(file))
        rows = self.history.revisions(board.id) if board else ()
        reports = [self.history.report(row.id) for row in rows]
        return [found.checks[0].nominal if found else None for found in reports]


@pytest.fixture
def watch(history: History, folder: Path) -> Iterator[Callable[..., Watching]]:
    """Starts watchers; stops them at the end."""
    started: list[Watching] = []

    def start(place: Path = folder, engine: Engine = ENGINE, polling: float | None = None) -> Watching:
        started.append(Watching(history, place, engine, polling))
        return started[-1]

    yield start
    for found in started:
        if found.thread.is_alive():
            found.stop()


Start = Callable[..., Watching]


@pytest.mark.parametrize("polling", [None, 0.1])
def test_saved_in_place(watch: Start, folder: Path, polling: float | None) -> None:
    watching, file = watch(polling=polling), folder / "a.edn"
    for number in (1, 2, 3):
        file.write_text(f"(edif {number})")
        until(lambda number=number: len(watching.values(file)) == number)  # type: ignore[misc]
    assert watching.values(file) == [1.0, 2.0, 3.0]
    until(lambda: len(watching.outcomes) == 3)
    verdicts = [outcome.comparison and outcome.comparison.movements[0].verdict for outcome in watching.outcomes]
    assert verdicts == [None, "worse", "worse"]


@pytest.mark.parametrize("polling", [None, 0.1])
def test_written_elsewhere_and_renamed_over_it(watch: Start, folder: Path, polling: float | None) -> None:
    watching, file = watch(polling=polling), folder / "a.edn"
    for number in (1, 2, 3):
        beside = folder / f"a.edn.{number}.tmp"
        beside.write_text(f"(edif {number})")
        beside.replace(file)
        until(lambda number=number: len(watching.values(file)) == number)  # type: ignore[misc]
    assert watching.values(file) == [1.0, 2.0, 3.0]


def test_moved_in_from_an_unwatched_folder(watch: Start, folder: Path, tmp_path: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    (tmp_path / "outside").write_text("(edif 1)")
    (tmp_path / "outside").replace(file)
    until(lambda: watching.values(file) == [1.0])


def test_written_in_pieces(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    with file.open("w") as stream:
        for piece in ("(edif 1", "2", "3", ".5", ")"):
            stream.write(piece)
            stream.flush()
            time.sleep(0.15)
    until(lambda: watching.values(file))
    assert watching.values(file) == [123.5]
    until(lambda: watching.kinds() == ["stored"])


def test_written_in_pieces_by_closing_and_appending(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    for piece in ("(edif 1", "2", "3", ".5", ")"):
        with file.open("a") as stream:
            stream.write(piece)
        time.sleep(0.3)
    until(lambda: watching.values(file))
    assert watching.values(file) == [123.5]
    until(lambda: watching.kinds() == ["stored"])


def test_renamed_to_a_backup_and_written_anew(watch: Start, folder: Path) -> None:
    file = folder / "a.edn"
    file.write_text("(edif 1)")
    watching = watch()
    until(lambda: watching.values(file) == [1.0])
    file.replace(folder / "a.edn.bak")
    time.sleep(0.4)
    file.write_text("(edif 2)")
    until(lambda: len(watching.values(file)) == 2)
    assert watching.values(file) == [1.0, 2.0]
    until(lambda: watching.kinds() == ["stored", "stored"])


def test_deleted_and_written_anew(watch: Start, folder: Path) -> None:
    file = folder / "a.edn"
    file.write_text("(edif 1)")
    watching = watch()
    until(lambda: watching.values(file) == [1.0])
    file.unlink()
    time.sleep(0.4)
    file.write_text("(edif 2)")
    until(lambda: len(watching.values(file)) == 2)
    until(lambda: watching.kinds() == ["stored", "stored"])


def test_the_same_bytes_again_make_no_revision(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    for _ in range(3):
        file.write_text("(edif 1)")
        time.sleep(0.3)
    file.write_text("(edif 2)")
    until(lambda: len(watching.values(file)) == 2)
    assert watching.values(file) == [1.0, 2.0]


def test_of_a_burst_the_newest_is_analysed(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    for number in range(1, 51):
        file.write_text(f"(edif {number})")
        time.sleep(0.005)
    until(lambda: watching.values(file)[-1:] == [50.0])


def test_no_save_is_skipped_that_could_be_read_while_another_was_analysed(watch: Start, folder: Path) -> None:
    def slow(files: BoardFiles, memory: object, understood: Callable[[], None]) -> object:
        time.sleep(1.0)
        return stand_in(files, memory, understood)

    watching, file = watch(engine=replace(ENGINE, analyse=slow)), folder / "a.edn"
    for number in (1, 2, 3, 4):
        file.write_text(f"(edif {number})")
        time.sleep(0.4)
    until(lambda: len(watching.values(file)) == 4)
    assert watching.values(file) == [1.0, 2.0, 3.0, 4.0]


def test_a_file_left_broken_is_recorded_and_the_last_good_one_stays(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1)")
    until(lambda: watching.values(file) == [1.0])
    started = time.monotonic()
    file.write_text("(edif 2")
    until(lambda: "broken" in watching.kinds())
    assert time.monotonic() - started >= 1.9, "it could still have been on its way"
    board = watching.history.board_of(str(file))
    assert board is not None
    good, bad = watching.history.latest(board.id), watching.history.latest(board.id, good=False)
    assert good is not None and bad is not None
    assert watching.history.report(good.id)
    assert bad.error is not None and f"{file}:1:" in bad.error and "close the bracket" in bad.error
    file.write_text("(edif 1)")
    until(lambda: watching.values(file) == [1.0, None, 1.0])


def test_a_broken_file_mended_within_two_seconds_is_never_called_broken(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1")
    time.sleep(1.0)
    file.write_text("(edif 1)")
    until(lambda: watching.values(file))
    time.sleep(2.5)
    assert watching.kinds() == ["stored"]


def test_a_broken_file_is_recorded_once(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1")
    until(lambda: watching.kinds() == ["broken"])
    os.utime(file)
    time.sleep(2.5)
    assert watching.values(file) == [None]


def test_a_deleted_export_is_gone_and_comes_back(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1)")
    until(lambda: watching.values(file))
    file.unlink()
    until(lambda: watching.kinds() == ["stored", "gone"])
    board = watching.history.board_of(str(file))
    assert board is not None and board.gone
    file.write_text("(edif 1)")
    until(lambda: watching.kinds() == ["stored", "gone", "back"])
    board = watching.history.board_of(str(file))
    assert board is not None and not board.gone
    assert watching.values(file) == [1.0]


def test_a_moved_folder_takes_its_boards_along(watch: Start, folder: Path) -> None:
    (folder / "old").mkdir()
    (folder / "old" / "a.edn").write_text("(edif 1)")
    watching = watch()
    until(lambda: watching.values(folder / "old" / "a.edn"))
    (folder / "old").replace(folder / "new")
    until(lambda: watching.values(folder / "new" / "a.edn") == [1.0])
    until(lambda: "gone" in watching.kinds())
    assert watching.values(folder / "old" / "a.edn") == [1.0]


def test_new_folders_are_watched_to_any_depth(watch: Start, folder: Path) -> None:
    watching = watch()
    deep = folder / "a" / "b" / "c"
    deep.mkdir(parents=True)
    (deep / "x.edn").write_text("(edif 1)")
    until(lambda: watching.values(deep / "x.edn") == [1.0])
    (deep / "x.edn").write_text("(edif 2)")
    until(lambda: watching.values(deep / "x.edn") == [1.0, 2.0])


def test_a_watched_folder_that_is_replaced_is_watched_again(watch: Start, folder: Path, tmp_path: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1)")
    until(lambda: watching.values(file))
    folder.replace(tmp_path / "aside")
    folder.mkdir()
    file.write_text("(edif 2)")
    until(lambda: watching.values(file) == [1.0, 2.0])
    time.sleep(1.5)
    file.write_text("(edif 3)")
    until(lambda: watching.values(file) == [1.0, 2.0, 3.0])


def test_brief_and_part_knowledge_are_saves_of_the_board(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "sub" / "a.edn"
    file.parent.mkdir()
    file.write_text("(edif 1)")
    until(lambda: len(watching.values(file)) == 1)
    brief = file.with_name("a.brief.toml")
    brief.write_text('[[part]]\nmatch = { refdes = "C1" }\ntouchstone = { file = "c.s2p", connection = "shunt" }\n')
    (file.parent / "c.s2p").write_text("! measured")
    until(lambda: len(watching.values(file)) == 2)
    (file.parent / "c.s2p").write_text("! measured again")
    until(lambda: len(watching.values(file)) == 3)
    (folder / "parts.toml").write_text("# the team's")
    until(lambda: len(watching.values(file)) == 4)
    (folder.parent / "parts.toml").write_text("# the company's, outside what is watched")
    until(lambda: len(watching.values(file)) == 5)
    brief.unlink()
    until(lambda: len(watching.values(file)) == 6)
    row = watching.history.latest(1)
    assert row is not None
    kept = watching.history.files(row.id)
    assert kept.brief is None and list(kept.knowledge.values()) == [
        b"# the team's",
        b"# the company's, outside what is watched",
    ]


def test_a_brief_that_names_a_missing_file_is_broken_until_the_file_comes(watch: Start, folder: Path) -> None:
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1)")
    until(lambda: watching.values(file))
    (folder / "a.brief.toml").write_text('[board]\nparts = ["team.toml"]\n')
    until(lambda: watching.kinds() == ["stored", "broken"])
    row = watching.history.latest(1, good=False)
    assert row is not None and row.error is not None
    assert "a.brief.toml:2" in row.error and "team.toml" in row.error
    (folder / "team.toml").write_text("")
    until(lambda: watching.values(file) == [1.0, None, 1.0])


def test_what_was_missed_is_analysed_at_the_next_start(watch: Start, folder: Path) -> None:
    for name in ("a", "b", "c"):
        (folder / f"{name}.edn").write_text("(edif 1)")
    first = watch()
    until(lambda: len(first.outcomes) == 3)
    first.stop()
    (folder / "a.edn").write_text("(edif 2)")
    (folder / "b.edn").unlink()
    second = watch()
    until(lambda: sorted(second.kinds()) == ["gone", "stored"])
    assert second.values(folder / "a.edn") == [1.0, 2.0]
    until(lambda: second.passes[-1] == (3, 3))
    second.stop()
    third = watch()
    until(lambda: third.passes[-1] == (3, 3))
    assert third.kinds() == [], "nothing was missed"


def test_temporary_ignored_and_other_files_are_passed_over(watch: Start, folder: Path) -> None:
    (folder / ".reactanceignore").write_text("out/\n")
    (folder / "out").mkdir()
    watching = watch()
    for name in (".a.edn.swp", "a.edn~", "a.tmp", "out/a.edn"):
        (folder / name).write_text("(edif 1)")
    (folder / "notes.edn").write_text("meet on Friday")
    (folder / "z.edn").write_text("(edif 1)")
    until(lambda: watching.values(folder / "z.edn"))
    time.sleep(0.5)
    assert [Path(board.file).name for board in watching.history.boards()] == ["z.edn"]


def test_a_defect_in_the_analysis_is_loud_and_takes_no_other_board_along(
    watch: Start, folder: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    def defective(files: BoardFiles, memory: object, understood: Callable[[], None]) -> object:
        if b"13" in files.export.main:
            raise ZeroDivisionError("a defect")
        return stand_in(files, memory, understood)

    watching = watch(engine=replace(ENGINE, analyse=defective))
    (folder / "a.edn").write_text("(edif 13)")
    until(lambda: watching.kinds() == ["broken"])
    (folder / "b.edn").write_text("(edif 1)")
    until(lambda: watching.values(folder / "b.edn") == [1.0])
    assert "ZeroDivisionError: a defect" in capfd.readouterr().err


def test_lost_events_are_made_up_for(watch: Start, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sources._Handler, "on_any_event", lambda self, event: None)
    watching, file = watch(), folder / "a.edn"
    file.write_text("(edif 1)")
    time.sleep(0.5)
    assert watching.outcomes == []
    logging.getLogger("watchdog.observers.inotify").warning("Inotify queue overflowed")
    until(lambda: watching.values(file) == [1.0])


@pytest.mark.parametrize(
    ("number", "limit"), [(errno.ENOSPC, "max_user_watches"), (errno.EMFILE, "max_user_instances")]
)
def test_out_of_watches_it_says_so_and_looks_instead(
    watch: Start, folder: Path, monkeypatch: pytest.MonkeyPatch, number: int, limit: str
) -> None:
    def refuse(self: object, *arguments: object, **options: object) -> None:
        raise OSError(number, "limit reached")

    monkeypatch.setattr(sources.Observer, "schedule", refuse)
    watching, file = watch(), folder / "a.edn"
    (sentence,) = watching.announced
    assert limit in sentence and "sysctl" in sentence and str(folder) in sentence
    file.write_text("(edif 1)")
    until(lambda: watching.values(file) == [1.0])


def test_folders_that_watchdog_passed_over_are_noticed(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for number in range(5):
        (folder / str(number)).mkdir()
    announced: list[str] = []
    source = Source(lambda path, hint, is_folder: None, lambda: None, announced.append)
    monkeypatch.setattr(sources, "watches_held", lambda: 4)
    deaf = source.start(roots_of([folder]))
    source.stop()
    assert deaf == {folder.resolve()}
    assert "6 folders, of which the system let 4" in announced[0] and "max_user_watches" in announced[0]


def test_a_network_share_is_named_and_looked_at(watch: Start, folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sources, "network_file_system", lambda path: "cifs")
    watching, file = watch(), folder / "a.edn"
    (sentence,) = watching.announced
    assert "cifs" in sentence and "--polling" in sentence
    file.write_text("(edif 1)")
    until(lambda: watching.values(file) == [1.0])


def test_each_stage_of_a_save_is_timed(watch: Start, folder: Path) -> None:
    watching = watch()
    (folder / "a.edn").write_text("(edif 1)")
    until(lambda: watching.outcomes)
    timings = watching.outcomes[0].timings
    assert timings.settle > 0 and timings.read > 0 and timings.solve > 0 and timings.store > 0
    assert timings.total >= timings.settle + timings.store
