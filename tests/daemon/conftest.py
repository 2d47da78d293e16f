"""Histories, folders and daemons for the tests of the daemon."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from daemonkit import Daemon

from reactance.daemon.history import History


@pytest.fixture
def history(tmp_path: Path) -> Iterator[History]:
    """A new history beside the watched folder, not in it."""
    with History.open(tmp_path / "data" / "history.sqlite") as found:
        yield found


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A folder to watch."""
    place = tmp_path / "boards"
    place.mkdir()
    return place


@pytest.fixture
def daemon(folder: Path, tmp_path: Path) -> Iterator[Callable[..., Daemon]]:
    """Starts daemons on the folder; ends those that the test leaves running."""
    started: list[Daemon] = []

    def start(*options: str) -> Daemon:
        started.append(Daemon(folder, tmp_path / "data" / "history.sqlite", *options))
        return started[-1]

    yield start
    for found in started:
        if found.process.poll() is None:
            found.kill()
