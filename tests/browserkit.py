"""A browser for tests: Debian's Chromium without a window."""

from __future__ import annotations

import shutil
from pathlib import Path

from selenium import webdriver
from selenium.webdriver.chrome.service import Service
from selenium.webdriver.support.wait import WebDriverWait

FLAGS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-sync",
    "--disable-background-networking", "--disable-component-update", "--disable-dev-shm-usage",
)  # fmt: skip
PATIENCE = 30.0


def start(profile: Path) -> webdriver.Chrome:
    """A fresh browser with that folder for its profile."""
    options = webdriver.ChromeOptions()
    for flag in (*FLAGS, f"--user-data-dir={profile}"):
        options.add_argument(flag)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
    return webdriver.Chrome(options=options, service=Service(shutil.which("chromedriver")))


def look(driver: webdriver.Chrome, width: int = 1280, height: int = 800, scheme: str = "light") -> None:
    metrics = {"width": width, "height": height, "deviceScaleFactor": 1, "mobile": False}
    driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", metrics)
    features = [{"name": "prefers-color-scheme", "value": scheme}]
    driver.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "", "features": features})


def wait(driver: webdriver.Chrome, script: str) -> None:
    WebDriverWait(driver, PATIENCE, 0.05).until(lambda one: one.execute_script(f"return {script}"))
