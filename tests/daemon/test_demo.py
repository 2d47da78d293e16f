"""The demonstration board and its story, analysed for real."""

from __future__ import annotations

import re
from collections import Counter
from itertools import pairwise

import pytest
import sexpdata

from reactance.analysis.brief import read_brief
from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Check, Report
from reactance.analysis.study import Memory, Study, analyse
from reactance.daemon.demo import FILE, STEM, Save, saves
from reactance.daemon.demo.edif import net_name

SAVES = saves()
TITLES = [save.title for save in SAVES]
RANK = {"pass": 2, "marginal": 1, "fail": 0}

# What each save of the story is to do: checks that get worse, and checks that get better.
STORY: dict[str, tuple[tuple[str, ...], tuple[str, ...]]] = {
    "C23 makes way for a connector": (("rail:+1V8:droop", "rail:+1V8:impedance"), ()),
    "C23 is back": ((), ("rail:+1V8:droop", "rail:+1V8:impedance")),
    "Probe filters share the 47k reel": (
        tuple(f"filter:soil probe {n}:{m}" for n in (1, 2, 3, 4) for m in ("corner_high", "settling")),
        (),
    ),
    "A stiffer bias for the microphone": (("coupling:bat microphone:loss",), ("coupling:bat microphone:settling",)),
    "A cheaper input capacitor": (("part:C1:stress",), ()),
    "Review findings mended": (
        (),
        ("coupling:bat microphone:loss", "part:C1:stress", "filter:soil probe 3:corner_high"),
    ),
    "C11 in a smaller case": (("rail:+3V3:droop", "rail:+3V3:impedance"), ()),
}
# What the story leaves failing for its reader to see, by save.
FAILING = {
    "C23 makes way for a connector": "rail:+1V8:impedance",
    "C11 in a smaller case": "rail:+3V3:impedance",
    "Probe filters share the 47k reel": "filter:soil probe 1:corner_high",
    "A stiffer bias for the microphone": "coupling:bat microphone:loss",
    "A cheaper input capacitor": "part:C1:stress",
}


def board_files(save: Save) -> BoardFiles:
    """A save as the daemon would read it."""
    return BoardFiles(ExportFiles(save.export, FILE, {}), save.brief, f"{STEM}.brief.toml", {})


@pytest.fixture(scope="module")
def studies() -> dict[str, Study]:
    """Every save, analysed with what the one before left in memory, by title."""
    memory = Memory()
    return {save.title: analyse(board_files(save), memory=memory) for save in SAVES}


def checks(report: Report) -> dict[str, Check]:
    """A report's checks by id."""
    return {check.id: check for check in report.checks}


def test_every_save_differs_and_says_what_it_is_about() -> None:
    assert len(SAVES) >= 6
    assert len({save.export for save in SAVES}) == len({save.title for save in SAVES}) == len(SAVES)
    assert all(len(save.story) > 20 for save in SAVES)
    assert set(STORY) == set(TITLES[1:])


@pytest.mark.parametrize("save", SAVES, ids=TITLES)
def test_exports_are_plain_s_expressions_and_say_that_they_are_invented(save: Save) -> None:
    text = save.export.decode("ascii")
    assert sexpdata.loads(text)[0] == sexpdata.Symbol("edif")
    assert "Invented" in text
    assert b"invented" in save.brief
    assert read_brief(save.brief, "demo.brief.toml").tables.rail


def test_net_names_that_edif_lacks_are_renamed() -> None:
    assert net_name("VREF") == "VREF"
    assert net_name("+3V3") == '(rename N_3V3 "+3V3")'


def test_the_board_is_as_varied_as_a_real_one(studies: dict[str, Study]) -> None:
    study = studies[TITLES[0]]
    report = study.report
    assert report.design.name == STEM
    assert len(report.parts) >= 60
    rails = {net.name: net.volts for net in report.nets if net.kind == "rail"}
    assert rails["+5V"] == 5.0 and rails["+3V3"] == 3.3 and rails["+1V8"] == 1.8
    assert Counter(part.fitted for part in report.parts)[False] == 1
    duties = {capacitor.duty for capacitor in report.capacitors}
    assert {"decoupling", "coupling", "filter", "timing", "load", "feedback", "snubber"} <= duties
    assert {"ceramic", "polymer", "aluminium"} <= {capacitor.technology for capacitor in report.capacitors}
    assert {"C0G", "X7R", "X5R"} <= {capacitor.dielectric for capacitor in report.capacitors}
    channels = [part for part in study.design.parts if re.fullmatch(r"PROBE\d/C\d", part.refdes)]
    assert len(channels) == 8 and all(part.cell == "CAPACITOR" for part in channels)


def test_the_first_export_holds_everywhere(studies: dict[str, Study]) -> None:
    report = studies[TITLES[0]].report
    assert not [check.id for check in report.checks if check.status == "fail"]
    assert not [check.id for check in report.checks if check.status == "unknown" and check.limit is not None]
    assert sum(check.status == "pass" for check in report.checks) > 30
    assert not [problem for problem in report.problems if problem.severity == "error"]


@pytest.mark.parametrize(("before", "after"), pairwise(TITLES))
def test_each_save_does_what_its_story_tells(before: str, after: str, studies: dict[str, Study]) -> None:
    older, newer = checks(studies[before].report), checks(studies[after].report)
    worse, better = STORY[after]
    for names, sign in ((worse, -1), (better, 1)):
        for name in names:
            was, now = older[name], newer[name]
            assert was.margin is not None and now.margin is not None
            assert sign * (now.margin - was.margin) > 0.05, name
            assert sign * (RANK[now.status] - RANK[was.status]) >= 0, name
    if after in FAILING:
        assert newer[FAILING[after]].status == "fail"
        assert older[FAILING[after]].status in ("pass", "marginal")


def test_the_repair_brings_everything_back(studies: dict[str, Study]) -> None:
    first, last = checks(studies[TITLES[0]].report), checks(studies["Review findings mended"].report)
    assert first.keys() == last.keys()
    fallen = [name for name, check in last.items() if RANK.get(check.status, 3) < RANK.get(first[name].status, 3)]
    assert not fallen


def test_bias_is_why_the_smaller_case_holds_less(studies: dict[str, Study]) -> None:
    def kept(title: str) -> float:
        entry = next(c for c in studies[title].report.capacitors if c.refdes == "C11")
        assert entry.value == pytest.approx(10e-6) and entry.rated_voltage == 10.0 and entry.effective
        return entry.effective.nominal / entry.value

    assert kept(TITLES[0]) > 0.8
    assert kept("C11 in a smaller case") < 0.5
