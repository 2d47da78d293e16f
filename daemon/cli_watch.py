"""`reactance watch`: the daemon in the foreground of a terminal."""

from __future__ import annotations

import ipaddress
import signal
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from reactance.daemon.cli_common import Refusal, history_option, history_path, progress_bar, refusing
from reactance.daemon.sentences import save_line
from reactance.daemon.text import clean, moment

if TYPE_CHECKING:
    from reactance.daemon.history import History
    from reactance.daemon.outcome import Outcome
    from reactance.daemon.watcher import Watcher

DEFAULT_LISTEN = "127.0.0.1:8462"


@click.command()
@click.argument("places", metavar="PLACE...", type=click.Path(path_type=Path), nargs=-1, required=True)
@click.option("--listen", metavar="HOST:PORT", help=f"Where the dashboard listens (default {DEFAULT_LISTEN}).")
@click.option("--no-dashboard", is_flag=True, help="Keep the history only.")
@click.option(
    "--polling",
    type=click.FloatRange(min=0.05, max=86400),
    metavar="SECONDS",
    help="Look at the places this often instead of waiting for word of changes (for network shares).",
)
@click.option("--once", is_flag=True, help="Analyse what is there now, store it, exit.")
@history_option
def watch(
    places: tuple[Path, ...],
    *,
    listen: str | None,
    no_dashboard: bool,
    polling: float | None,
    once: bool,
    history_file: str | None,
) -> None:
    """Watch files and folders; analyse on each save; keep the history; serve the dashboard.

    A folder is watched with everything below it, except what .reactanceignore files in it name.
    Ctrl-C ends it.

    \b
    Examples:
      $ reactance watch --once board.edn
      $ reactance watch --once --history boards.sqlite .
    """
    from reactance.daemon.history import History

    host, port = listening(listen or DEFAULT_LISTEN)
    for place in places:
        if not place.exists():
            raise Refusal(f"{place}: there is no such file or folder (name exports, or folders with exports in them)")
    with refusing(), History.open(history_path(history_file)) as history:
        if once:
            click.get_current_context().exit(_once(places, history))
        serving = not_serving() if no_dashboard else dashboard(history, host, port)
        with serving as url:
            if url:
                click.echo(f"dashboard at {url}")
            _watch(places, history, polling)


def listening(text: str) -> tuple[str, int]:
    """HOST:PORT taken apart. Refuses hosts that other machines can reach."""
    host, _, port = text.rpartition(":")
    host = host.removeprefix("[").removesuffix("]")
    if not host or not port.isdecimal() or int(port) > 65535:
        raise Refusal(f"--listen {text}: expected HOST:PORT, such as {DEFAULT_LISTEN}")
    try:
        loopback = host == "localhost" or ipaddress.ip_address(host).is_loopback
    except ValueError:
        loopback = False
    if not loopback:
        raise Refusal(
            f"--listen {text}: the dashboard answers this machine only, for anyone who reached it could read the "
            f"boards (listen on a loopback address, such as {DEFAULT_LISTEN})"
        )
    return host, int(port)


@contextmanager
def dashboard(history: History, host: str, port: int) -> Iterator[str]:
    """Serves the dashboard meanwhile; yields its address."""
    from reactance.dashboard.serve import ServeError, serve

    try:
        server = serve(history, host, port)
    except ServeError as error:
        raise Refusal(str(error)) from None
    server.start()
    try:
        yield server.url
    finally:
        server.stop()


@contextmanager
def not_serving() -> Iterator[str]:
    """No dashboard."""
    yield ""


@contextmanager
def ending_with(stop: Callable[[], None]) -> Iterator[None]:
    """Calls `stop` on Ctrl-C and on a request to end, meanwhile."""
    wanted = [signal.SIGINT, signal.SIGTERM]
    before = {number: signal.signal(number, lambda *_: stop()) for number in wanted}
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


def make_watcher(
    places: tuple[Path, ...],
    history: History,
    tell: Callable[[Outcome], None],
    *,
    polling: float | None = None,
    first_pass: Callable[[int, int], None] | None = None,
) -> Watcher:
    """A watcher with the real analysis behind it."""
    from reactance.daemon.engine import default_engine
    from reactance.daemon.intake import Intake
    from reactance.daemon.watcher import Watcher
    from reactance.daemon.workers import Workers

    return Watcher(
        places,
        history,
        Intake(history, default_engine()),
        tell=tell,
        announce=announce,
        polling=polling,
        first_pass=first_pass,
        workers=Workers(),
    )


def announce(sentence: str) -> None:
    """Something that the user should know now."""
    click.echo(f"reactance: {clean(sentence)}", err=True)


def tell(outcome: Outcome) -> None:
    """One line for one save."""
    import time

    if outcome.kind == "same":
        return
    when = outcome.revision.saved if outcome.revision else time.time()
    line = clean(save_line(outcome)).replace("\n", " ")
    click.echo(f"{moment(when)}  {line}", err=outcome.kind in ("broken", "not stored"))


def _watch(places: tuple[Path, ...], history: History, polling: float | None) -> None:
    with progress_bar("first pass") as progress:
        watcher = make_watcher(places, history, tell, polling=polling, first_pass=progress)
        click.echo(f"watching {', '.join(clean(str(place)) for place in places)}; Ctrl-C ends it")
        with ending_with(watcher.stop):
            watcher.run()


def _once(places: tuple[Path, ...], history: History) -> int:
    """Catches up with what is there now. Exit status 2 if something could not be read, else 0."""
    from reactance.daemon.catch_up import catch_up
    from reactance.daemon.engine import default_engine
    from reactance.daemon.intake import Intake
    from reactance.daemon.workers import Workers

    unreadable = False
    with progress_bar("first pass") as progress, closing(Workers()) as workers:
        for outcome in catch_up(places, history, Intake(history, default_engine()), progress, workers):
            tell(outcome)
            unreadable = unreadable or outcome.kind in ("broken", "not stored")
    return 2 if unreadable else 0
