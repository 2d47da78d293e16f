"""The pages in a real browser: what is seen without scrolling, what happens on a save, how a keyboard gets about."""

from __future__ import annotations

from collections.abc import Iterator

import pytest
from browserkit import look, wait
from pagekit import DROOP, LOSS, SWAP, Keeper, figures, make_study
from selenium import webdriver
from selenium.webdriver.common.by import By
from selenium.webdriver.common.keys import Keys

from reactance.dashboard.rows import check_href
from reactance.dashboard.serve import Server, serve


@pytest.fixture
def server(keeper: Keeper) -> Iterator[Server]:
    with serve(keeper.history, port=0, analyse=make_study) as running:
        yield running


def open_board(driver: webdriver.Chrome, server: Server) -> None:
    driver.get(f"{server.url}board/1")
    wait(driver, "document.readyState === 'complete'")


def text(driver: webdriver.Chrome) -> str:
    return driver.find_element(By.ID, "main").text


def test_what_got_worse_is_seen_without_scrolling(page: webdriver.Chrome, server: Server) -> None:
    open_board(page, server)
    row = page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"]')
    assert "+3V3 droop 82 → 181 mV of 165 mV: C14 100 nF → 10 nF" in row.text
    bottom = page.execute_script("return arguments[0].getBoundingClientRect().bottom", row)
    assert bottom <= 800
    assert row.find_elements(By.CSS_SELECTOR, ".strip .fail .bar")
    assert row.find_elements(By.CSS_SELECTOR, ".strip .notch")


def test_a_save_changes_the_open_page_without_a_reload(page: webdriver.Chrome, server: Server, keeper: Keeper) -> None:
    open_board(page, server)
    page.execute_script("window.kept = 'the same page'")
    link = page.find_element(By.CSS_SELECTOR, f'[data-key="{LOSS}"] .what a')
    page.execute_script("arguments[0].focus()", link)
    page.execute_script("window.scrollTo(0, 300)")
    keeper.save(figures(0.07), (SWAP,), {DROOP: "better"})
    wait(page, "document.getElementById('main').textContent.includes('Save 5')")
    assert "181 → 70 mV of 165 mV" in text(page)
    assert page.execute_script("return window.kept") == "the same page"
    assert page.execute_script("return window.scrollY") == 300
    focused = "document.activeElement.closest('[data-key]').dataset.key"
    assert page.execute_script(f"return {focused}") == LOSS
    assert "Save 5" in page.find_element(By.ID, "live").get_attribute("textContent")


def test_the_list_of_boards_follows_too(page: webdriver.Chrome, server: Server, keeper: Keeper) -> None:
    page.get(server.url)
    Keeper(keeper.history, "/home/ana/pump.edn", number=70).save(figures(0.09), name="pump")
    wait(page, "document.getElementById('main').textContent.includes('pump')")


def test_the_check_page_shows_two_curves_and_the_limit(page: webdriver.Chrome, server: Server) -> None:
    page.get(server.url.rstrip("/") + check_href(1, DROOP))
    wait(page, "document.getElementById('plot').dataset.curves === '2'")
    names = [item.text for item in page.find_elements(By.CSS_SELECTOR, "#plot .legendtext")]
    assert names == ["save 3", "save 4", "target"]
    lines = page.find_elements(By.CSS_SELECTOR, "#plot .scatterlayer .js-line")
    assert len([line for line in lines if line.get_attribute("d")]) >= 3
    assert page.find_elements(By.CSS_SELECTOR, "#plot .js-fill")
    wait(page, "[...document.querySelectorAll('#plot .xtick text')].some((one) => one.textContent === '100 kHz')")
    assert not page.find_elements(By.CSS_SELECTOR, "#plot .modebar *")
    assert not page.find_elements(By.CSS_SELECTOR, "head style")


def test_the_curves_follow_a_save(page: webdriver.Chrome, server: Server, keeper: Keeper) -> None:
    page.get(server.url.rstrip("/") + check_href(1, DROOP))
    wait(page, "document.getElementById('plot').dataset.curves === '2'")
    keeper.save(figures(0.07), (SWAP,), {DROOP: "better"})
    wait(page, "[...document.querySelectorAll('#plot .legendtext')].some((one) => one.textContent === 'save 5')")


def test_a_check_without_a_curve_says_why(page: webdriver.Chrome, server: Server) -> None:
    page.get(server.url.rstrip("/") + check_href(1, "net:AMP_IN:return"))
    wait(page, "document.getElementById('plot-note').textContent.includes('has no curve')")
    assert not page.find_element(By.ID, "plot").is_displayed()


def test_a_keyboard_walks_along_a_strip_and_is_told_what_is_there(page: webdriver.Chrome, server: Server) -> None:
    open_board(page, server)
    last = page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"] .cell[tabindex="0"]')
    page.execute_script("arguments[0].focus()", last)
    readout = page.find_element(By.CSS_SELECTOR, ".readout")
    assert "save 4" in readout.text
    assert "181 mV of 165 mV, fails, worse after C14 100 nF → 10 nF" in readout.text
    page.switch_to.active_element.send_keys(Keys.ARROW_LEFT)
    assert "82 mV of 165 mV, holds" in readout.text
    page.switch_to.active_element.send_keys(Keys.HOME)
    assert "save 1" in readout.text
    label = page.switch_to.active_element.get_attribute("aria-label")
    assert label == readout.text
    page.switch_to.active_element.send_keys(Keys.ENTER)
    wait(page, "location.pathname.endsWith('/check')")
    assert "at=1" in page.current_url


def test_pointing_at_a_cell_names_it(page: webdriver.Chrome, server: Server) -> None:
    open_board(page, server)
    cell = page.find_element(By.CSS_SELECTOR, f'[data-key="{DROOP}"] .cell')
    webdriver.ActionChains(page).move_to_element(cell).perform()
    readout = page.find_element(By.CSS_SELECTOR, ".readout")
    assert readout.is_displayed()
    assert "save 1" in readout.text and "81 mV of 165 mV" in readout.text


@pytest.mark.parametrize("path", ["", "board/1", "board/1/saves", "check"])
def test_nothing_sticks_out_at_390_pixels(page: webdriver.Chrome, server: Server, path: str) -> None:
    look(page, 390, 844)
    page.get(server.url.rstrip("/") + check_href(1, DROOP) if path == "check" else server.url + path)
    wait(page, "document.readyState === 'complete'")
    assert page.execute_script("return document.documentElement.scrollWidth") <= 390


def contrast(driver: webdriver.Chrome, selector: str) -> float:
    """Contrast of an element's text against the page (WCAG 2.2, relative luminance)."""
    colours = driver.execute_script(
        "const e = document.querySelector(arguments[0]);"
        "return [getComputedStyle(e).color, getComputedStyle(document.body).backgroundColor]",
        selector,
    )

    def luminance(colour: str) -> float:
        channels = [int(part) / 255 for part in colour[colour.index("(") + 1 : -1].split(",")[:3]]
        linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]

    high, low = sorted((luminance(colour) for colour in colours), reverse=True)
    return (high + 0.05) / (low + 0.05)


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_text_keeps_its_contrast(page: webdriver.Chrome, server: Server, scheme: str) -> None:
    look(page, scheme=scheme)
    open_board(page, server)
    paper = page.execute_script("return getComputedStyle(document.body).backgroundColor")
    assert (paper == "rgb(251, 249, 243)") == (scheme == "light")
    for selector in ("h1", ".standing", ".row.bad .word", ".row.watched .word", ".note", "footer", "td.outcome"):
        assert contrast(page, selector) >= 4.5, selector


def test_pages_say_everything_without_scripts(page: webdriver.Chrome, server: Server) -> None:
    page.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": True})
    try:
        page.get(f"{server.url}board/1")
        assert "+3V3 droop 82 → 181 mV of 165 mV" in text(page)
        page.get(server.url.rstrip("/") + check_href(1, DROOP))
        assert "74 nF" in text(page)
        assert "the figures are in the table" in text(page)
    finally:
        page.execute_cdp_cmd("Emulation.setScriptExecutionDisabled", {"value": False})


def test_on_paper_it_is_ink_on_white(page: webdriver.Chrome, server: Server) -> None:
    look(page, scheme="dark")
    page.execute_cdp_cmd("Emulation.setEmulatedMedia", {"media": "print"})
    open_board(page, server)
    style = page.execute_script("const s = getComputedStyle(document.body); return [s.color, s.backgroundColor]")
    assert style == ["rgb(0, 0, 0)", "rgb(255, 255, 255)"]
    assert not page.find_element(By.CSS_SELECTOR, ".masthead nav").is_displayed()
