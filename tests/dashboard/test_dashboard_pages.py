"""What the pages say, in which order, and that they say it without a script."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from html.parser import HTMLParser

import pytest
from flask.testing import FlaskClient
from pagekit import DROOP, FILE, LOSS, SWAP, Keeper, figures, make_check

from reactance.analysis.report import Limit, ProblemEntry
from reactance.daemon.history import History
from reactance.dashboard.rows import check_href

Clients = Callable[[History], FlaskClient]


class Text(HTMLParser):
    """The text of a page as people read it."""

    def __init__(self) -> None:
        super().__init__()
        self.words: list[str] = []

    def handle_data(self, data: str) -> None:
        self.words.append(data)


def text_of(client: FlaskClient, path: str, status: int = 200) -> str:
    answer = client.get(path)
    assert answer.status_code == status
    parser = Text()
    parser.feed(answer.get_data(as_text=True))
    return " ".join(" ".join(parser.words).split())


def test_boards_are_listed_with_how_they_stand(client: FlaskClient) -> None:
    text = text_of(client, "/")
    assert "greenhouse" in text
    assert "1 fails" in text
    assert "the last save made 1 check worse" in text


def test_no_board_yet(history: History, client_of: Clients) -> None:
    assert "No export has been saved" in text_of(client_of(history), "/")


def test_the_board_answers_in_its_order(client: FlaskClient) -> None:
    text = text_of(client, "/board/1")
    asked = ("What the last save changed", "What that did", "What fails", "What each capacitor does")
    places = [text.index(question) for question in asked]
    assert places == sorted(places)


def test_the_board_says_what_the_save_changed_and_did(client: FlaskClient) -> None:
    text = text_of(client, "/board/1")
    assert "C14 100 nF → 10 nF" in text
    assert "+3V3 droop 82 → 181 mV of 165 mV: C14 100 nF → 10 nF" in text
    assert "since save 4" in text
    assert "between +3V3 and ground at U4" in text
    assert "71 nF" in text and "52 nF to 89 nF" in text


def test_a_cell_names_save_figure_and_edit(client: FlaskClient) -> None:
    page = client.get("/board/1").get_data(as_text=True)
    assert re.search(r"<title>save 4, [^<]*: 181 mV of 165 mV, fails, worse after C14 100 nF → 10 nF</title>", page)


def test_failing_bars_are_hatched_and_only_they(client: FlaskClient) -> None:
    page = client.get("/board/1").get_data(as_text=True)
    cells = re.findall(r'<a class="cell (\w+)[^"]*".*?</a>', page, re.DOTALL)
    hatched = re.findall(r'<a class="cell (\w+)[^"]*"(?:(?!</a>).)*url\(#hatch\)', page, re.DOTALL)
    assert "fail" in cells and "pass" in cells
    assert set(hatched) == {"fail"}


def test_the_first_save_has_nothing_to_compare_with(history: History, client_of: Clients) -> None:
    Keeper(history).save(figures(0.08))
    text = text_of(client_of(history), "/board/1")
    assert "first save" in text
    assert "Nothing." in text


def test_a_broken_save_leaves_the_last_good_one_shown(keeper: Keeper, client_of: Clients) -> None:
    broken = keeper.fail("greenhouse-logger.edn:12:4: a bracket is never closed (save again)")
    client = client_of(keeper.history)
    text = text_of(client, "/board/1")
    assert "The newest save could not be judged" in text
    assert "greenhouse-logger.edn:12:4: a bracket is never closed" in text
    assert "+3V3 droop 82 → 181 mV" in text
    assert "a bracket is never closed" in text_of(client, f"/board/1/revision/{broken}")
    assert "a bracket is never closed" in text_of(client, "/")


def test_a_board_never_judged_shows_its_message(history: History, client_of: Clients) -> None:
    Keeper(history).fail("greenhouse-logger.edn:1:1: no netlist in it")
    client = client_of(history)
    for path in ("/board/1", "/board/1/check?id=x", "/board/1/capacitors", "/board/1/checks/rail", "/"):
        assert "no netlist in it" in text_of(client, path)


def test_a_board_that_is_gone_says_so(keeper: Keeper, client_of: Clients) -> None:
    keeper.history.mark_gone(FILE)
    client = client_of(keeper.history)
    assert "The export is gone." in text_of(client, "/board/1")
    assert "The export is gone." in text_of(client, "/")


def test_a_pinned_baseline_is_named(keeper: Keeper, client_of: Clients) -> None:
    keeper.history.pin(1, keeper.seen[-2])
    text = text_of(client_of(keeper.history), "/board/1")
    assert "What changed since the pinned baseline" in text
    assert "the pinned baseline, save 3" in text


def test_a_pinned_baseline_does_not_blur_what_one_save_changed(keeper: Keeper, client_of: Clients) -> None:
    """Saves stored while another baseline was pinned say since when; one save's page compares with the one before."""
    first = keeper.seen[0]
    report = keeper.history.report(first)
    assert report is not None
    keeper.history.pin(1, first)
    keeper.before = (first, report)
    keeper.save(figures(0.19), (SWAP,), {DROOP: "worse"})
    client = client_of(keeper.history)
    assert "since save 1: C14 100 nF → 10 nF" in text_of(client, "/board/1/saves")
    assert "Compared with the pinned baseline, save 1" in text_of(client, "/board/1")
    # The exports of these saves are no real ones, so the comparison with the save before cannot be made now.
    assert "Compared with the pinned baseline, save 1" in text_of(client, "/board/1/revision/5")


def test_cautions_stand_out_and_notes_do_not(history: History, client_of: Clients) -> None:
    problems = (ProblemEntry("caution", "C14", "keeps 31 % of it"), ProblemEntry("note", "R9", "no tolerance"))
    Keeper(history).save(figures(0.08), problems=problems)
    client = client_of(history)
    page = client.get("/board/1").get_data(as_text=True)
    assert page.index("keeps 31 % of it") < page.index("Every check") < page.index("no tolerance")
    assert "keeps 31 % of it" in text_of(client, check_href(1, DROOP))


def test_the_check_page_says_what_changed_and_where_the_number_comes_from(client: FlaskClient) -> None:
    text = text_of(client, check_href(1, DROOP))
    assert "+3V3 droop 82 → 181 mV of 165 mV: C14 100 nF → 10 nF" in text
    assert re.search(r"save 3 82 mV 73.8 mV to 90.2 mV 165 mV 45.3 % holds", text)
    assert re.search(r"save 4 181 mV 163 mV to 199 mV 165 mV −20.7 % fails", text)
    for figure in ("C_eff 73 nF → 74 nF", "R_s 20 mΩ", "L_s 0.5 nH", "bias 3.3 V keeps 71 %", "size 0402"):
        assert figure in text
    assert "Results support an engineer’s judgement" in text


def test_an_older_save_can_be_looked_at(keeper: Keeper, client: FlaskClient) -> None:
    text = text_of(client, check_href(1, LOSS, keeper.seen[2]))
    assert "bat" not in text
    assert "MIC_OUT → AMP_IN loss 0.3 → 0.35 dB of 0.5 dB: C14 100 nF → 10 nF" in text
    assert "Save before" in text and "Save after" in text


def test_check_ids_survive_the_address() -> None:
    from urllib.parse import parse_qs, urlsplit

    wild = "coupling:A/B>C&D=E#F?:loss %41+é"
    assert parse_qs(urlsplit(check_href(7, wild)).query)["id"] == [wild]


def test_two_curves_and_the_limit(client: FlaskClient) -> None:
    plot = json.loads(client.get(f"/board/1/curve?id={DROOP.replace('+', '%2B')}").data)
    assert [(side["role"], side["name"]) for side in plot["sides"]] == [("before", "save 3"), ("after", "save 4")]
    assert plot["x"] == {"label": "frequency", "unit": "Hz", "log": True}
    assert all(len(side["x"]) == len(side["y"]) == len(side["low"]) == len(side["high"]) for side in plot["sides"])
    assert plot["limits"][0]["y"] == [0.6, 0.6]


def test_a_check_without_a_curve_says_why(client: FlaskClient) -> None:
    plot = json.loads(client.get("/board/1/curve?id=net:AMP_IN:return").data)
    assert plot["sides"] == []
    assert "has no curve" in plot["note"]


@pytest.mark.parametrize(("frequency", "says"), [("ten", "not a frequency"), ("0", "above 0 Hz"), ("", "frequency")])
def test_a_wrong_frequency_is_answered_in_words(client: FlaskClient, frequency: str, says: str) -> None:
    plot = json.loads(client.get(f"/board/1/sine?id=x&f={frequency}").data)
    assert plot["sides"] == []
    assert says in plot["note"]


def test_a_sine_goes_in_and_comes_out(client: FlaskClient) -> None:
    plot = json.loads(client.get("/board/1/sine?id=x&f=1.5k").data)
    assert [side["role"] for side in plot["sides"]] == ["input", "before", "after"]
    assert "1500 Hz" in plot["note"]


@pytest.mark.parametrize(
    "path",
    ["/board/9", "/board/9/saves", "/board/1/check?id=rail:none:droop", "/board/1/checks/teapot", "/nowhere",
     "/board/1/revision/99", "/board/1/check", "/board/x"],
)  # fmt: skip
def test_what_is_not_there_is_said_plainly(client: FlaskClient, path: str) -> None:
    assert "Boards" in text_of(client, path, 404)


def test_a_check_that_vanished_keeps_its_page(keeper: Keeper, client_of: Clients) -> None:
    rest = {id: check for id, check in figures(0.08).items() if id != LOSS}
    keeper.save(rest, (SWAP,), {LOSS: "worse"})
    client = client_of(keeper.history)
    assert "no longer there" in text_of(client, "/board/1")
    assert "no longer there" in text_of(client, check_href(1, LOSS))


def test_a_large_board_shows_what_presses_and_links_the_rest(history: History, client_of: Clients) -> None:
    many = [make_check(f"part:C{n}:stress", 0.1 + n / 2000, "1", Limit(max=0.8)) for n in range(1500)]
    Keeper(history).save({check.id: check for check in many})
    client = client_of(history)
    page = client.get("/board/1").get_data(as_text=True)
    assert len(page) < 200_000
    assert page.count('class="strip') <= 60
    assert ">C1499 voltage stress<" in page
    assert "All 1500" in page
    first = client.get("/board/1/checks/part").get_data(as_text=True)
    assert first.count('data-key="part:') == 40
    assert "?from=40" in first
    assert "C1459 voltage stress" in client.get("/board/1/checks/part?from=40").get_data(as_text=True)


def test_a_part_of_a_page_is_its_main_element(client: FlaskClient) -> None:
    part = client.get("/board/1", headers={"X-Page-Part": "main"})
    text = part.get_data(as_text=True).strip()
    assert text.startswith("<main") and text.endswith("</main>")
    assert 'data-title="greenhouse, 1 worse, reactance"' in text
    assert "X-Page-Part" in part.headers["Vary"]


def test_pages_have_landmarks_captions_and_a_way_past_the_head(client: FlaskClient) -> None:
    for path in ("/board/1", check_href(1, DROOP)):
        page = client.get(path).get_data(as_text=True)
        for mark in ('<html lang="en">', "<header", "<main", "<footer", '<nav aria-label="', 'href="#main"'):
            assert mark in page
        assert page.count("<table") == page.count("<caption>")
        assert page.count("<h1") == 1
        ids = re.findall(r'\sid="([^"]+)"', page)
        assert len(ids) == len(set(ids))


def test_the_cells_of_one_check_are_those_of_its_strip(keeper: Keeper) -> None:
    Keeper(keeper.history, "/home/ana/other.edn", number=60).save(figures(0.5))
    for check_id, cells in keeper.history.strip(1).items():
        assert keeper.history.cells(1, check_id) == cells
    assert [cell.revision for cell in keeper.history.cells(1, DROOP, 2)] == keeper.seen[-2:]
    assert keeper.history.cells(1, "rail:none:droop") == ()
