"""Histories made by hand for the pages, and a client that asks for them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from browserkit import look, start
from flask.testing import FlaskClient
from pagekit import DRIFT, DROOP, HOST, LOSS, SWAP, Keeper, figures, make_study
from selenium import webdriver

from reactance.analysis.report import Edit
from reactance.daemon.history import History
from reactance.dashboard.app import create_app


@pytest.fixture
def history(tmp_path: Path) -> Iterator[History]:
    """An empty history."""
    with History.open(tmp_path / "history.sqlite") as opened:
        yield opened


@pytest.fixture
def keeper(history: History) -> Keeper:
    """Four saves; the last makes the droop worse by an edit of C14, and +3V3 fails."""
    kept = Keeper(history)
    kept.save(figures(0.081))
    kept.save(figures(0.083), (Edit("R3", "part added", "R3", None, None, "10k"),))
    kept.save(figures(0.082, loss=0.35), (SWAP,), {LOSS: "worse"})
    kept.save(figures(0.181, 4e-6), (SWAP,), {DROOP: "worse", DRIFT: "moved"})
    return kept


@pytest.fixture
def client_of() -> Callable[[History], FlaskClient]:
    """A client that asks under the dashboard's own name."""

    def make(history: History) -> FlaskClient:
        app = create_app(history, hosts=(HOST,), analyse=make_study)
        return app.test_client()

    return make


@pytest.fixture
def client(keeper: Keeper, client_of: Callable[[History], FlaskClient]) -> FlaskClient:
    """A client over those four saves."""
    return client_of(keeper.history)


@pytest.fixture(scope="session")
def chromium(tmp_path_factory: pytest.TempPathFactory) -> Iterator[webdriver.Chrome]:
    """One browser for all tests."""
    driver = start(tmp_path_factory.mktemp("profile"))
    yield driver
    driver.quit()


@pytest.fixture
def page(chromium: webdriver.Chrome) -> Iterator[webdriver.Chrome]:
    """The browser at 1280 × 800 in the light; afterwards it may have complained about nothing."""
    look(chromium)
    chromium.get_log("browser")
    yield chromium
    complaints = [entry["message"] for entry in chromium.get_log("browser") if entry["level"] == "SEVERE"]
    chromium.get("about:blank")
    assert not complaints
