"""What is said to people: figures, limits, one line per save, tables in plain columns."""

from __future__ import annotations

import pytest
from daemonkit import report
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.report import Check, Edit, Limit
from reactance.daemon.outcome import Outcome
from reactance.daemon.sentences import edit_sentence, save_line
from reactance.daemon.tables import Column, Row, plain, show
from reactance.daemon.text import band, bounds, clean, figure, plural, share


def judged(limit: Limit | None, unit: str = "V", margin: float | None = 0.25) -> Check:
    """A check with a limit."""
    return Check("x:y:z", "z", 0.0815, 0.07, 0.09, unit, limit, margin, "pass", "")


@given(st.text())
def test_clean_text_steers_nothing(text: str) -> None:
    shown = clean(text)
    assert all(char.isprintable() or char == "\n" for char in shown)
    if text.isprintable():
        assert shown == text


@pytest.mark.parametrize(
    ("value", "unit", "words"),
    [(None, "V", "–"), (0.0815, "V", "81.5 mV"), (1591.5, "Hz", "1.59 kHz"), (1.0, "1", "1"), (4.7e-6, "F", "4.7 µF")],
)
def test_figures_are_in_engineering_units(value: float | None, unit: str, words: str) -> None:
    assert figure(value, unit) == words


def test_limits_bands_and_margins() -> None:
    check = judged(Limit(min=0.05, max=0.165))
    assert bounds(check.limit, check.unit) == "≥ 50 mV ≤ 165 mV"
    assert bounds(None, "V") == ""
    assert band(check) == "70 mV … 90 mV"
    assert share(0.25, check) == "25 %"
    assert share(0.25, judged(Limit(min=0.0))) == "250 mV", "a limit of 0 has no share"
    assert share(None, check) == ""


@pytest.mark.parametrize(
    ("edit", "words"),
    [
        (
            Edit("1", "attribute changed", "C14", "value", "100 nF", "10 nF"),
            "attribute changed: C14 value 100 nF → 10 nF",
        ),
        (Edit("2", "part removed", "C14", None, "100 nF", None), "part removed: C14 100 nF"),
        (Edit("3", "part added", "C15", None, None, "10 nF"), "part added: C15 10 nF"),
        (Edit("4", "brief changed", None, "rail", None, None), "brief changed: rail"),
    ],
)
def test_edits_in_words(edit: Edit, words: str) -> None:
    assert edit_sentence(edit) == words


@pytest.mark.parametrize(
    ("outcome", "words"),
    [
        (Outcome("gone", "/b/a.edn", "a.edn"), "a.edn: gone; its history is kept"),
        (Outcome("back", "/b/a.edn", "a.edn"), "a.edn: back, unchanged"),
        (Outcome("broken", "/b/a.edn", "a.edn", message="why"), "a.edn: cannot be used: why"),
        (Outcome("not stored", "/b/a.edn", "a.edn", message="why"), "a.edn: not stored: why"),
        (
            Outcome("stored", "/b/a.edn", "board", report=report(2.0)),
            "board: first revision: 3 parts, 1 check, 1 failing",
        ),
    ],
)
def test_one_line_per_save(outcome: Outcome, words: str) -> None:
    assert save_line(outcome) == words


def test_plain_tables_are_aligned() -> None:
    columns = (Column("name"), Column("size", right=True), Column("remark"))
    rows = [Row(("a", "1", "")), Row(("longer", "1000", "x"))]
    assert plain(columns, rows) == ["name    size  remark", "a          1", "longer  1000  x"]


@pytest.mark.parametrize(("variables", "colour"), [({}, True), ({"NO_COLOR": "1"}, False)])
def test_on_a_terminal_tables_are_drawn(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], variables: dict[str, str], colour: bool
) -> None:
    monkeypatch.delenv("NO_COLOR", raising=False)
    for name, value in {"TERM": "xterm-256color", "COLUMNS": "100", **variables}.items():
        monkeypatch.setenv(name, value)
    monkeypatch.setattr("sys.stdout.isatty", lambda: True)
    show((Column("status"), Column("check")), [Row(("fail", "[red]rail[/red]\x1b[2J"), "bad")])
    printed = capsys.readouterr().out
    assert ("38;2;213;94;0" in printed or "38;5;" in printed) is colour
    assert "[red]rail[/red]\\x1b[2J" in printed, "names are no markup and steer nothing"


def test_plural() -> None:
    assert (plural(1, "part"), plural(0, "part"), plural(2, "check")) == ("1 part", "0 parts", "2 checks")
