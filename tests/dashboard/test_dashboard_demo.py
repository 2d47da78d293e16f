"""The demonstration's last regression in a real browser: a 10 µF capacitor in a smaller case, analysed for real."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from browserkit import wait
from selenium import webdriver
from selenium.webdriver.common.by import By

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.daemon.demo import FILE, STEM, Save, saves
from reactance.daemon.engine import default_engine
from reactance.daemon.history import History, Saved
from reactance.daemon.intake import Intake
from reactance.dashboard.rows import check_href
from reactance.dashboard.serve import Server, serve

DROOP = "rail:+3V3:droop"
SWAP = "C11 in a smaller case"
STORY = saves()
AT = next(place for place, save in enumerate(STORY) if save.title == SWAP)


class Desk:
    """A designer's saves, taken in as the daemon takes them."""

    def __init__(self, history: History) -> None:
        self.history = history
        self._intake = Intake(history, default_engine())
        self._when = 1_930_000_000.0

    def save(self, save: Save) -> None:
        self._when += 900.0
        files = BoardFiles(ExportFiles(save.export, FILE, {}), save.brief, f"{STEM}.brief.toml", {})
        outcome = self._intake.take(Saved(f"/home/ana/{FILE}", self._when, self._when, None), files)
        assert outcome.revision is not None, outcome.message
        self._intake.keep()


@pytest.fixture(scope="module")
def desk(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Desk]:
    """The save before the swap, and the swap."""
    with History.open(tmp_path_factory.mktemp("demo") / "history.sqlite") as history:
        desk = Desk(history)
        desk.save(STORY[AT - 1])
        desk.save(STORY[AT])
        yield desk


@pytest.fixture(scope="module")
def server(desk: Desk) -> Iterator[Server]:
    with serve(desk.history, port=0) as running:
        yield running


def test_the_regression_is_seen_without_scrolling(page: webdriver.Chrome, server: Server) -> None:
    page.get(f"{server.url}board/1")
    wait(page, "document.readyState === 'complete'")
    row = page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"]')
    assert "worse" in row.text
    assert "+3V3 droop" in row.text and "C11" in row.text
    assert page.execute_script("return arguments[0].getBoundingClientRect().bottom", row) <= 800
    assert row.find_elements(By.CSS_SELECTOR, ".strip .notch")


def test_in_two_steps_to_what_the_capacitor_is_worth_and_why(page: webdriver.Chrome, server: Server) -> None:
    page.get(f"{server.url}board/1")
    page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"] .what a').click()
    wait(page, "document.getElementById('plot')?.dataset.curves === '2'")
    assert int(page.find_element(By.ID, "plot").get_attribute("data-limits") or 0) >= 1
    parts = {row.find_element(By.TAG_NAME, "th").text.split()[0]: row for row in rows(page, "parts")}
    swapped = parts["C11"]
    assert swapped.find_elements(By.TAG_NAME, "del")
    assert "C_eff" in swapped.text and "R_s" in swapped.text and "L_s" in swapped.text
    assert "bias" in swapped.text
    assert rows(page, "assumptions")


def test_a_sine_is_drawn_through_a_filter(page: webdriver.Chrome, server: Server, desk: Desk) -> None:
    report = desk.history.report(1)
    assert report is not None
    corner = next(check for check in report.checks if check.id.startswith("filter:") and check.measure == "corner_high")
    page.get(server.url.rstrip("/") + check_href(1, corner.id))
    wait(page, "document.getElementById('sine-plot').dataset.curves === '3'")
    note = page.find_element(By.ID, "sine-note").text
    assert "ratio" in note and "lag" in note


def test_the_next_save_comes_by_itself(page: webdriver.Chrome, server: Server, desk: Desk) -> None:
    page.get(f"{server.url}board/1")
    wait(page, "document.readyState === 'complete'")
    page.execute_script("window.kept = true")
    desk.save(STORY[AT - 1])
    wait(page, "document.getElementById('main').textContent.includes('Save 3')")
    assert page.execute_script("return window.kept") is True
    assert "better" in page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"]').text


def rows(page: webdriver.Chrome, table: str) -> list[webdriver.remote.webelement.WebElement]:
    return page.find_elements(By.CSS_SELECTOR, f"table.{table} tbody tr")
