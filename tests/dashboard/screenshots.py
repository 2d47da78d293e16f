"""Plays the demonstration into a fresh history and photographs the dashboard.

    python tests/dashboard/screenshots.py [FOLDER]            the README's pictures
    python tests/dashboard/screenshots.py FOLDER --all        every page, light and dark, wide and narrow
    python tests/dashboard/screenshots.py FOLDER --all URL    the same of a dashboard that is running

FOLDER is where the pictures go, `.pictures` of the repository where none is named. Needs Debian's chromium and
chromium-driver.
"""

from __future__ import annotations

import base64
import re
import shutil
import sys
import tempfile
import urllib.request
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from html import unescape
from pathlib import Path
from urllib.parse import quote, urljoin

from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.support.wait import WebDriverWait

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.daemon.demo import FILE, STEM, saves
from reactance.daemon.engine import default_engine
from reactance.daemon.history import History, Saved
from reactance.daemon.intake import Intake
from reactance.dashboard.serve import serve

ROOT = Path(__file__).resolve().parents[2]
EPOCH, PAUSE = 1_930_468_360.0, 17 * 60.0  # when the story begins, and how long it goes on between two saves, s
WIDE, NARROW = (1280, 1000), (390, 1000)
CHECK = "rail:+3V3:impedance"
FLAGS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-sync",
    "--disable-background-networking", "--disable-component-update", "--disable-dev-shm-usage", "--hide-scrollbars",
)  # fmt: skip
DRAWN = """
const plot = document.getElementById("plot");
if (document.readyState !== "complete") return false;
return !plot || plot.dataset.curves || document.getElementById("plot-note").textContent !== "";
"""
TELLING = {
    "droop": "%3Adroop",
    "impedance": "%3Aimpedance",
    "coupling": "coupling%3A",
    "filter": "filter%3A",
    "stress": "%3Astress",
    "return": "%3Areturn",
    "revision": "/revision/",
}


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
def browser() -> Iterator[webdriver.Chrome]:
    """A headless Chromium with a profile of its own."""
    with tempfile.TemporaryDirectory(prefix="chromium-", ignore_cleanup_errors=True) as profile:
        options = webdriver.ChromeOptions()
        for flag in (*FLAGS, f"--user-data-dir={profile}"):
            options.add_argument(flag)
        driver = webdriver.Chrome(options=options, service=Service(shutil.which("chromedriver")))
        try:
            yield driver
        finally:
            driver.quit()


def look(driver: webdriver.Chrome, size: tuple[int, int], *, dark: bool) -> None:
    """A window of that size, in the light or in the dark."""
    scheme = [{"name": "prefers-color-scheme", "value": "dark" if dark else "light"}]
    driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": scheme})
    metrics = {"width": size[0], "height": size[1], "deviceScaleFactor": 1, "mobile": False}
    driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)


def photograph(
    driver: webdriver.Chrome,
    url: str,
    to: Path,
    size: tuple[int, int] = WIDE,
    *,
    dark: bool = False,
    whole: bool = False,
) -> None:
    """One page once its curves are drawn: what the window shows of it, or the whole of it."""
    look(driver, size, dark=dark)
    driver.get(url)
    WebDriverWait(driver, 60).until(lambda page: page.execute_script(DRAWN))
    shot = driver.execute_cdp_cmd("Page.captureScreenshot", {"captureBeyondViewport": whole, "format": "png"})
    to.write_bytes(base64.b64decode(shot["data"]))


def pages(url: str, board: int) -> Mapping[str, str]:
    """Addresses worth looking at, by name."""
    page = f"{url}board/{board}"
    text = urllib.request.urlopen(page).read().decode()
    links = [unescape(link) for link in re.findall(r'href="(/board/\d+/[^"]+)"', text)]
    found = {"boards": url, "board": page, "capacitors": f"{page}/capacitors", "saves": f"{page}/saves"}
    for name, wanted in TELLING.items():
        link = next((one for one in links if wanted in one), None)
        if link:
            found[name] = urljoin(url, link)
    return found | {"missing": f"{url}board/999999"}


def readme_pictures(url: str, board: int, to: Path) -> None:
    """What the README shows."""
    page = f"{url}board/{board}"
    check = f"{page}/check?id={quote(CHECK)}"
    with browser() as driver:
        photograph(driver, page, to / "board.png")
        photograph(driver, page, to / "board-dark.png", dark=True)
        photograph(driver, page, to / "board-narrow.png", NARROW)
        photograph(driver, check, to / "check.png")
        photograph(driver, check, to / "check-dark.png", dark=True)


def all_pictures(url: str, board: int, to: Path) -> None:
    """Every page in every look, whole; prints what the browser complained about."""
    with browser() as driver:
        for name, address in pages(url, board).items():
            for width, size in (("wide", WIDE), ("narrow", NARROW)):
                for dark in (False, True):
                    picture = to / f"{name}-{width}-{'dark' if dark else 'light'}.png"
                    photograph(driver, address, picture, size, dark=dark, whole=True)
        for entry in driver.get_log("browser"):
            print(entry["message"])


def main() -> None:
    """Plays and photographs."""
    arguments = sys.argv[1:]
    everything = "--all" in arguments
    given = [word for word in arguments if word != "--all"]
    to = Path(given[0]) if given else ROOT / ".pictures"
    to.mkdir(parents=True, exist_ok=True)
    if len(given) > 1:
        all_pictures(given[1], 1, to)
        return
    with tempfile.TemporaryDirectory() as scratch, History.open(Path(scratch) / "history.sqlite") as history:
        board = play(history, Path(scratch))
        with serve(history, port=0) as server:
            (all_pictures if everything else readme_pictures)(server.url, board, to)


if __name__ == "__main__":
    main()
