"""What the commands share: the history they mean, boards and revisions by their names, how they refuse."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import IO, TYPE_CHECKING, Any, TypeVar

import click

from reactance.analysis.design import InputError
from reactance.daemon.places import board_file, default_history
from reactance.daemon.rows import BoardRow, HistoryError, RevisionRow
from reactance.daemon.text import clean

if TYPE_CHECKING:
    from reactance.analysis.files import BoardFiles
    from reactance.daemon.history import History

_Function = TypeVar("_Function", bound=Callable[..., Any])
WORDS = ("previous", "latest", "baseline")


class Refusal(click.ClickException):
    """Wrong usage or an input that cannot be read: one message on stderr, exit status 2."""

    exit_code = 2

    def show(self, file: IO[Any] | None = None) -> None:
        click.echo(f"reactance: {clean(self.message)}", err=True, file=file)


@contextmanager
def refusing() -> Iterator[None]:
    """Turns what people can mend into a message; defects of ours stay loud."""
    try:
        yield
    except (InputError, HistoryError) as error:
        raise Refusal(str(error)) from None


def history_option(function: _Function) -> _Function:
    """`--history FILE` on a command, as well as before it."""
    return click.option(
        "--history",
        "history_file",
        metavar="FILE",
        help="The history's database (or REACTANCE_HISTORY; by default in the user's data folder).",
    )(function)


def history_path(history_file: str | None) -> Path:
    """The database meant: by the command's option, the program's, the environment, or none of them."""
    outer = click.get_current_context().find_root().obj
    named = history_file or (outer if isinstance(outer, str) else None)
    return Path(named) if named else default_history()


@contextmanager
def existing_history(history_file: str | None) -> Iterator[History]:
    """The history, which must exist; what it refuses becomes a message."""
    from reactance.daemon.history import History

    with refusing(), History.open(history_path(history_file), create=False) as history:
        yield history


def read_files(export: Path, brief: Path | None = None) -> BoardFiles:
    """The board's files. Raises `InputError` with what is wrong."""
    from reactance.daemon.reading import read_board

    reading = read_board(export, brief)
    if reading.error is not None:
        raise reading.error
    assert reading.files is not None
    return reading.files


def board_named(history: History, export: Path) -> BoardRow:
    """The board of an export. Raises `HistoryError` where the history does not know it."""
    board = history.board_of(board_file(export))
    if board is None:
        raise HistoryError(
            f"{export}: the history knows no such board "
            "(`reactance history` lists those it knows, `reactance watch` adds them)"
        )
    return board


def revision_named(history: History, board: BoardRow, name: str) -> RevisionRow:
    """The revision of that id, or `previous`, `latest` or `baseline`. Raises `HistoryError` where there is none."""
    if name in WORDS:
        latest = history.latest(board.id)
        found = latest
        if latest is not None and name != "latest":
            found = history.previous(latest.id) if name == "previous" else history.baseline(board.id, latest.id)
        if found is None:
            raise HistoryError(f"{board.name} has no {name} revision yet (`reactance history` lists what there is)")
        return found
    revision = history.revision(int(name)) if name.isascii() and name.isdecimal() and len(name) < 18 else None
    if revision is None or revision.board != board.id:
        raise HistoryError(
            f"{board.name} has no revision {name} (give an id that `reactance history {board.file}` lists, "
            "or previous, latest or baseline)"
        )
    return revision


@contextmanager
def progress_bar(words: str, *, shown: bool = True) -> Iterator[Callable[[int, int], None]]:
    """A progress bar for long work, told how many are done of how many; shown on a terminal only."""
    import sys
    import threading

    if not shown or not sys.stderr.isatty():
        yield lambda done, total: None
        return
    from rich.console import Console
    from rich.progress import Progress

    bar = Progress(console=Console(stderr=True), transient=True)
    task: list[Any] = []
    guard = threading.Lock()

    def show(done: int, total: int) -> None:
        with guard:
            if total > 1 and done < total and not task:
                bar.start()
                task.append(bar.add_task(words, total=total))
            if task:
                bar.update(task[0], completed=done, total=total)
                if done >= total:
                    bar.stop()

    try:
        yield show
    finally:
        bar.stop()
