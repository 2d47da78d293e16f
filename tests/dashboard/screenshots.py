"""Makes the README's pictures: plays the demonstration into a fresh history and photographs the dashboard.

    python tests/dashboard/screenshots.py [FOLDER]

FOLDER is where the pictures go, `.pictures` of the repository where none is named. Needs Debian's chromium and
chromium-driver.
"""

from __future__ import annotations

import shutil
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from urllib.parse import quote

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.daemon.demo import FILE, STEM, saves
from reactance.daemon.engine import default_engine
from reactance.daemon.history import History, Saved
from reactance.daemon.intake import Intake
from reactance.dashboard.serve import serve
from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.common.by import By
from selenium.webdriver.support.wait import WebDriverWait

ROOT = Path(__file__).resolve().parents[2]
EPOCH, PAUSE = 1_930_468_360.0, 17 * 60.0  # when the story begins, and how long it goes on between two saves, s
WIDE, NARROW = (1280, 1000), (390, 1000)
CHECK = "rail:+3V3:impedance"


def play(history: History, folder: Path) -> int:
    """Stores every save of the demonstration; returns the board's id in the history."""
    intake = Intake(history, default_engine())
    for number, save in enumerate(saves()):
        at = EPOCH + PAUSE * number
        files = BoardFiles(ExportFiles(save.export, FILE, {}), save.brief, f"{STEM}.brief.toml", {})
        outcome = intake.take(Saved(str(folder / FILE), at, at, None), files)
        if outcome.revision is None:
            raise SystemExit(f"{save.title}: {outcome.message}")
    return history.boards()[0].id


@contextmanager
def browser(size: tuple[int, int], *, dark: bool) -> Iterator[webdriver.Chrome]:
    """A headless Chromium of that size, in the light or in the dark."""
    options = webdriver.ChromeOptions()
    for flag in ("--headless=new", "--no-sandbox", "--disable-dev-shm-usage", "--hide-scrollbars"):
        options.add_argument(flag)
    driver = webdriver.Chrome(options=options, service=Service(shutil.which("chromedriver")))
    try:
        scheme = [{"name": "prefers-color-scheme", "value": "dark" if dark else "light"}]
        driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": scheme})
        metrics = {"width": size[0], "height": size[1], "deviceScaleFactor": 1, "mobile": False}
        driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
        yield driver
    finally:
        driver.quit()


def photograph(url: str, to: Path, size: tuple[int, int] = WIDE, *, dark: bool = False, wait_for: str = "main") -> None:
    """One page, once the element `wait_for` (a CSS selector) is there."""
    with browser(size, dark=dark) as driver:
        driver.get(url)
        WebDriverWait(driver, 20).until(lambda page: page.find_elements(By.CSS_SELECTOR, wait_for))
        driver.save_screenshot(str(to))


def main() -> None:
    """Plays and photographs."""
    to = Path(sys.argv[1]) if len(sys.argv) > 1 else ROOT / ".pictures"
    to.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory() as scratch, History.open(Path(scratch) / "history.sqlite") as history:
        board = play(history, Path(scratch))
        with serve(history, port=0) as server:
            page = f"{server.url}board/{board}"
            check = f"{page}/check?id={quote(CHECK)}"
            photograph(page, to / "board.png")
            photograph(page, to / "board-dark.png", dark=True)
            photograph(page, to / "board-narrow.png", NARROW)
            photograph(check, to / "check.png", wait_for=".main-svg")
            photograph(check, to / "check-dark.png", dark=True, wait_for=".main-svg")


if __name__ == "__main__":
    main()
