"""Pictures of every page, light and dark, wide and narrow, for looking at: `python screenshots.py URL FOLDER`.

`URL` is a running dashboard, as `reactance demo` serves it. Pages are found from its first board.
"""

from __future__ import annotations

import base64
import json
import re
import sys
import tempfile
import urllib.request
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from html import unescape
from pathlib import Path
from urllib.parse import urljoin

from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.support.ui import WebDriverWait

FLAGS = (
    "--headless=new",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--hide-scrollbars",
)
WIDTHS = {"wide": (1280, 800), "narrow": (390, 844)}


@contextmanager
def browser() -> Iterator[webdriver.Chrome]:
    """Debian's Chromium without a window, with a profile of its own."""
    with tempfile.TemporaryDirectory(prefix="chromium-", ignore_cleanup_errors=True) as profile:
        options = webdriver.ChromeOptions()
        options.binary_location = "/usr/bin/chromium"
        for flag in (*FLAGS, f"--user-data-dir={profile}"):
            options.add_argument(flag)
        options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
        driver = webdriver.Chrome(options=options, service=Service("/usr/bin/chromedriver"))
        try:
            yield driver
        finally:
            driver.quit()


def look(driver: webdriver.Chrome, width: str, dark: bool) -> None:
    """Sets the window's size and the colour scheme that the page sees."""
    wide, high = WIDTHS[width]
    driver.execute_cdp_cmd(
        "Emulation.setDeviceMetricsOverride",
        {"width": wide, "height": high, "deviceScaleFactor": 1, "mobile": width == "narrow"},
    )
    scheme = {"name": "prefers-color-scheme", "value": "dark" if dark else "light"}
    driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"features": [scheme]})


def picture(driver: webdriver.Chrome, path: Path) -> None:
    """The whole page as a PNG."""
    shot = driver.execute_cdp_cmd("Page.captureScreenshot", {"captureBeyondViewport": True, "format": "png"})
    path.write_bytes(base64.b64decode(shot["data"]))


def settled(driver: webdriver.Chrome) -> None:
    """Waits until curves are drawn, where the page has any."""
    WebDriverWait(driver, 60).until(
        lambda page: page.execute_script(
            "const p = document.getElementById('plot');"
            "return document.readyState === 'complete' && (!p || p.dataset.curves"
            " || document.getElementById('plot-note').textContent !== '')"
        )
    )


def found_pages(url: str) -> Mapping[str, str]:
    """Addresses worth a picture, by name."""
    start = urllib.request.urlopen(url).read().decode()
    board = re.search(r'href="(/board/\d+)"', start)
    pages = {"boards": url}
    if board is None:
        return pages
    pages["board"] = urljoin(url, board[1])
    text = urllib.request.urlopen(pages["board"]).read().decode()
    links = [unescape(link) for link in re.findall(r'href="(/board/\d+/[^"]+)"', text)]
    for name, wanted in (
        ("droop", "%3Adroop"),
        ("coupling", "coupling%3A"),
        ("filter", "filter%3A"),
        ("stress", "%3Astress"),
        ("revision", "/revision/"),
    ):
        link = next((one for one in links if wanted in one), None)
        if link:
            pages[name] = urljoin(url, link)
    pages["capacitors"] = pages["board"] + "/capacitors"
    pages["saves"] = pages["board"] + "/saves"
    pages["missing"] = urljoin(url, "/board/999999")
    return pages


def main(url: str, folder: Path) -> None:
    """Takes all pictures and prints what the browser complained about."""
    folder.mkdir(parents=True, exist_ok=True)
    with browser() as driver:
        for name, address in found_pages(url).items():
            for width in WIDTHS:
                for dark in (False, True):
                    look(driver, width, dark)
                    driver.get(address)
                    settled(driver)
                    picture(driver, folder / f"{name}-{width}-{'dark' if dark else 'light'}.png")
        for line in driver.get_log("browser"):
            print(json.dumps(line))


if __name__ == "__main__":
    main(sys.argv[1], Path(sys.argv[2]))
