"""`reactance demo`: a small board in a new folder, its saves played as an editor would make them."""

from __future__ import annotations

import queue
import tempfile
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from reactance.daemon.cli_common import Refusal, refusing
from reactance.daemon.cli_watch import (
    DEFAULT_LISTEN,
    announce,
    dashboard,
    ending_with,
    listening,
    make_watcher,
    not_serving,
)
from reactance.daemon.print_check import print_comparison
from reactance.daemon.sentences import save_line, save_summary
from reactance.daemon.text import clean

if TYPE_CHECKING:
    from reactance.daemon.demo import Save
    from reactance.daemon.history import History
    from reactance.daemon.outcome import Outcome

_PATIENCE = 600.0  # seconds for one save, on the slowest and busiest machine


@click.command()
@click.option("--folder", type=click.Path(path_type=Path), metavar="DIR", help="A new or empty folder to make it in.")
@click.option("--listen", metavar="HOST:PORT", help=f"Where the dashboard listens (default {DEFAULT_LISTEN}).")
@click.option("--once", is_flag=True, help="Play the saves, print what each did, exit without serving.")
def demo(folder: Path | None, listen: str | None, once: bool) -> None:
    """Make a small board in a new folder, watch it, play a few saves, serve the dashboard.

    The board, a data logger for a greenhouse, is invented. Its history stays in the folder.

    \b
    Examples:
      $ reactance demo --once
      $ reactance demo --once --folder greenhouse
    """
    from reactance.daemon.history import History

    host, port = listening(listen or DEFAULT_LISTEN)
    place = _new_folder(folder)
    click.echo(f"the demonstration board is in {clean(str(place))}")
    with refusing(), History.open(place / "history.sqlite") as history:
        ended = threading.Event()
        with _dashboard(history, host, port, listen is not None, once) as url, ending_with(ended.set):
            _play(place, history, ended, url)


def _new_folder(folder: Path | None) -> Path:
    if folder is None:
        return Path(tempfile.mkdtemp(prefix="reactance-demo-"))
    try:
        folder.mkdir(parents=True, exist_ok=True)
        taken = any(folder.iterdir())
    except OSError as error:
        raise Refusal(f"--folder {folder}: cannot be made: {error.strerror} (name another folder)") from None
    if taken:
        raise Refusal(f"--folder {folder}: there is something in it already (name a new or an empty folder)")
    return folder


@contextmanager
def _dashboard(history: History, host: str, port: int, insisted: bool, once: bool) -> Iterator[str]:
    """The dashboard at that port, or at any free one if the user named none and the usual one is taken."""
    if once:
        with not_serving() as nothing:
            yield nothing
        return
    try:
        serving = dashboard(history, host, port)
        url = serving.__enter__()
    except Refusal:
        if insisted:
            raise
        serving = dashboard(history, host, 0)
        url = serving.__enter__()
    try:
        yield url
    finally:
        serving.__exit__(None, None, None)


def _play(place: Path, history: History, ended: threading.Event, url: str) -> None:
    from reactance.daemon.demo import saves

    outcomes: queue.SimpleQueue[Outcome] = queue.SimpleQueue()
    watcher = make_watcher((place,), history, outcomes.put)
    thread = threading.Thread(target=watcher.run, name="reactance-watcher", daemon=True)
    thread.start()
    if url:
        click.echo(f"dashboard at {url}")
    try:
        for number, save in enumerate(saves(), 1):
            if ended.is_set():
                return
            _write(place, save)
            _print(number, save, _awaited(outcomes, thread))
        if url:
            click.echo(f"\ndashboard at {url} (edit the board in {clean(str(place))} and see; Ctrl-C ends it)")
            while not ended.wait(0.2):
                while not outcomes.empty():
                    click.echo(clean(save_line(outcomes.get())))
    finally:
        watcher.stop()
        thread.join(30.0)


def _write(place: Path, save: Save) -> None:
    """Saves as editors do: written beside, then renamed over."""
    from reactance.daemon.demo import FILE, STEM

    brief = place / f"{STEM}.brief.toml"
    if not brief.exists() or brief.read_bytes() != save.brief:
        _replace(brief, save.brief)
    _replace(place / FILE, save.export)


def _replace(path: Path, data: bytes) -> None:
    beside = path.with_name(f"{path.name}.tmp")
    beside.write_bytes(data)
    beside.replace(path)


def _awaited(outcomes: queue.SimpleQueue[Outcome], watcher: threading.Thread) -> Outcome:
    end = time.monotonic() + _PATIENCE
    while watcher.is_alive() and time.monotonic() < end:
        try:
            return outcomes.get(timeout=1.0)
        except queue.Empty:
            continue
    raise Refusal("the save was not noticed (is the folder on a file system that announces changes?)")


def _print(number: int, save: Save, outcome: Outcome) -> None:
    click.echo(clean(f"\nsave {number}: {save.title}\n  {save.story}"))
    if outcome.kind in ("broken", "not stored"):
        announce(save_line(outcome))
        return
    click.echo(f"  {clean(save_summary(outcome))}")
    if outcome.comparison is not None and outcome.older is not None and outcome.report is not None:
        print_comparison(outcome.comparison, outcome.older, outcome.report)
