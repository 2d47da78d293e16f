"""Who gets an answer: the dashboard's own names, GET, its own pages. Every answer carries the policy."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import pytest
from flask.testing import FlaskClient
from pagekit import Keeper, make_check

from reactance.analysis.report import Edit, Limit, ProblemEntry
from reactance.daemon.history import History
from reactance.dashboard.app import create_app
from reactance.dashboard.rows import check_href
from reactance.dashboard.serve import own_hosts

PATHS = ("/", "/board/1", "/board/1/check?id=rail:%2B3V3:droop", "/static/page.css", "/plotly.js", "/nowhere")
STATIC = Path(__file__).resolve().parents[2] / "dashboard"


@pytest.mark.parametrize("path", PATHS)
@pytest.mark.parametrize("host", ["evil.example", "evil.example:8462", "127.0.0.1", "127.0.0.1:8463", "localhost.", ""])
def test_a_strange_name_gets_nothing(history: History, path: str, host: str) -> None:
    client = create_app(history, hosts=own_hosts(8462)).test_client()
    answer = client.get(path, headers={"Host": host})
    assert answer.status_code == 421
    assert b"<" not in answer.data


@pytest.mark.parametrize("host", ["127.0.0.1:8462", "localhost:8462", "LOCALHOST:8462", "[::1]:8462"])
def test_its_own_names_are_answered(history: History, host: str) -> None:
    client = create_app(history, hosts=own_hosts(8462)).test_client()
    assert client.get("/", headers={"Host": host}).status_code == 200


@pytest.mark.parametrize("method", ["POST", "PUT", "DELETE", "PATCH", "OPTIONS", "TRACE"])
def test_nothing_but_reading(client: FlaskClient, method: str) -> None:
    answer = client.open("/board/1", method=method)
    assert answer.status_code == 405
    assert "Access-Control-Allow-Origin" not in answer.headers


@pytest.mark.parametrize("path", PATHS)
def test_every_answer_carries_the_policy(client: FlaskClient, path: str) -> None:
    headers = client.get(path).headers
    policy = headers["Content-Security-Policy"]
    assert "default-src 'none'" in policy
    assert "frame-ancestors 'none'" in policy
    assert "unsafe" not in policy
    assert headers["Cross-Origin-Resource-Policy"] == "same-origin"
    assert headers["X-Content-Type-Options"] == "nosniff"
    assert headers["Referrer-Policy"] == "no-referrer"
    assert "Access-Control-Allow-Origin" not in headers


@pytest.mark.parametrize("site", ["cross-site", "same-site"])
def test_a_page_from_elsewhere_cannot_fetch(client: FlaskClient, site: str) -> None:
    fetched = client.get("/board/1", headers={"Sec-Fetch-Site": site, "Sec-Fetch-Mode": "no-cors"})
    followed = client.get("/board/1", headers={"Sec-Fetch-Site": site, "Sec-Fetch-Mode": "navigate"})
    assert (fetched.status_code, followed.status_code) == (403, 200)


def test_pages_hold_no_script_and_no_style_in_line(client: FlaskClient) -> None:
    for path in PATHS[:3]:
        text = client.get(path).get_data(as_text=True)
        assert not re.search(r"<script(?![^>]*\ssrc=)", text)
        assert not re.search(r"<style|\sstyle=|\son\w+=", text)


def test_nothing_is_fetched_from_outside() -> None:
    own = [*STATIC.glob("static/*"), *STATIC.glob("templates/*.html")]
    assert own
    for file in own:
        text = file.read_text(encoding="utf-8").replace("http://www.w3.org/2000/svg", "")
        assert "http://" not in text and "https://" not in text and "//cdn" not in text, file


def test_names_with_markup_are_shown_as_text(history: History, client_of: Callable[[History], FlaskClient]) -> None:
    nasty = "<img src=x onerror=alert(1)>\"'&"
    keeper = Keeper(history)
    first, second = (make_check(f"rail:{nasty}:droop", volts, "V", Limit(max=0.2)) for volts in (0.1, 0.3))
    edit = Edit("e", "attribute changed", nasty, nasty, nasty, nasty)
    keeper.save({first.id: first}, name=nasty)
    problem = ProblemEntry("caution", nasty, nasty)
    keeper.save({second.id: second}, (edit,), {second.id: "worse"}, (problem,), nasty)
    keeper.fail(f"{nasty}: cannot be read")
    client = client_of(history)
    paths = ("/", "/board/1", "/board/1/saves", "/board/1/revision/2", "/board/1/revision/3", "/board/1/checks/rail")
    for path in (*paths, check_href(1, second.id)):
        text = client.get(path).get_data(as_text=True)
        assert "<img" not in text, path
        assert "&lt;img" in text, path
