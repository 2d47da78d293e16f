"""The commands: every example in their help runs; what they print for programs has the shape that is promised."""

from __future__ import annotations

import csv
import io
import json
import shlex
from pathlib import Path

import click
import pytest
from daemonkit import BRIEF, call, run, small_export

from reactance.daemon.cli import reactance

RAIL = """
[[rail]]
net = "+3V3"
voltage = "3.3 V"
source = { resistance = "20 mohm", inductance = "30 nH" }
step = { current = "20 mA", rise = "100 ns" }
allowed = "10 %"
"""


def furnish(place: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Puts a board there and saves it twice, with a history beside the folder."""
    place.mkdir()
    monkeypatch.chdir(place)
    monkeypatch.setenv("REACTANCE_HISTORY", str(place.parent / "history.sqlite"))
    (place / "board.brief.toml").write_text(BRIEF + RAIL, encoding="utf-8")
    for resistance in ("10k", "20k"):
        (place / "board.edn").write_bytes(small_export(resistance))
        assert call("watch", "--once", "board.edn").returncode == 0
    return place


@pytest.fixture(scope="module")
def furnished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a board that was saved twice, shared by tests that only look."""
    with pytest.MonkeyPatch.context() as monkeypatch:
        return furnish(tmp_path_factory.mktemp("shared") / "desk", monkeypatch)


@pytest.fixture
def desk(furnished: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """That folder as the current one, and its history as the default one."""
    monkeypatch.chdir(furnished)
    monkeypatch.setenv("REACTANCE_HISTORY", str(furnished.parent / "history.sqlite"))
    return furnished


@pytest.fixture
def own_desk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The same for a test that changes things."""
    return furnish(tmp_path / "desk", monkeypatch)


def commands() -> dict[str, click.Command]:
    """All commands by name, the program itself among them."""
    ctx = click.Context(reactance)
    found = {name: reactance.get_command(ctx, name) for name in reactance.list_commands(ctx)}
    return {"": reactance, **{name: command for name, command in found.items() if command}}


def examples() -> list[tuple[str, str]]:
    """The examples in all help texts, with the command whose help they are in."""
    found = []
    for name, command in commands().items():
        lines = [line.strip() for line in (command.help or "").splitlines()]
        found += [(name, line.removeprefix("$ reactance ")) for line in lines if line.startswith("$ reactance ")]
    return found


def test_every_command_has_an_example_that_names_it() -> None:
    with_example = {name for name, line in examples() if name in line}
    assert with_example == set(commands())
    assert set(commands()) == {"", "watch", "check", "history", "compare", "baseline", "curve", "demo"}


@pytest.mark.parametrize("line", [line for _, line in examples() if not line.startswith("demo")])
def test_examples_run(desk: Path, line: str) -> None:
    line = line.replace("filter:anti-alias:gain", "filter:anti-alias:corner_high")
    done = call(*shlex.split(line))
    assert done.returncode in (0, 1), done.stderr
    assert done.stderr == "" or "--sine" in line
    assert done.stdout or line.startswith("watch")


@pytest.mark.parametrize("name", commands())
def test_help_is_printed(name: str) -> None:
    done = call(*name.split(), "--help")
    assert done.returncode == 0
    assert "Usage: reactance" in done.stdout and "$ reactance" in done.stdout


def test_version() -> None:
    assert call("--version").stdout.startswith("reactance, version ")


def test_check_json_has_the_promised_shape(desk: Path) -> None:
    done = call("check", "board.edn", "--json")
    found = json.loads(done.stdout)
    assert list(found) == [
        "format", "design", "nets", "parts", "capacitors", "duties", "checks", "assumptions", "problems",
    ]  # fmt: skip
    assert found["format"] == "reactance.check/1"
    assert set(found["design"]) == {"name", "file", "sha256", "parts", "nets"}
    assert found["design"]["parts"] == 4
    keys = {"id", "measure", "nominal", "low", "high", "unit", "limit", "margin", "status", "explain"}
    assert all(set(check) == keys for check in found["checks"])
    corner = next(check for check in found["checks"] if check["id"] == "filter:anti-alias:corner_high")
    # 1 / (2 pi R C), R = 20 kohm, C = 10 nF; the dissipation factor assumed of C is 0.001, and moves it by as much
    assert corner["nominal"] == pytest.approx(795.775, rel=1.5e-3)
    assert corner["status"] == "fail"
    assert done.returncode == 1


def test_check_exit_status_follows_the_checks(own_desk: Path) -> None:
    (own_desk / "board.edn").write_bytes(small_export("10k"))
    assert call("check", "board.edn").returncode == 0
    (own_desk / "board.edn").write_bytes(small_export("20k"))
    assert call("check", "board.edn").returncode == 1


def test_against_a_revision_and_against_a_file_agree(desk: Path) -> None:
    (desk / "older.edn").write_bytes(small_export("10k"))
    (desk / "older.brief.toml").write_bytes((desk / "board.brief.toml").read_bytes())
    outputs = [
        json.loads(call("check", "board.edn", "--json", "--against", name).stdout) for name in ("1", "older.edn")
    ]
    assert outputs[0]["edits"] == outputs[1]["edits"]
    assert outputs[0]["movements"] == outputs[1]["movements"]
    (edit,) = outputs[0]["edits"]
    assert (edit["kind"], edit["part"], edit["before"], edit["after"]) == ("attribute changed", "R1", "10k", "20k")
    moved = {movement["check"]: movement for movement in outputs[0]["movements"]}
    assert moved["filter:anti-alias:corner_high"]["verdict"] == "worse"
    assert set(moved["filter:anti-alias:corner_high"]) == {"check", "verdict", "before", "after", "causes"}


def test_against_decides_the_exit_status_too(own_desk: Path) -> None:
    wide = (BRIEF + RAIL).replace('tolerance = "10 %"', 'tolerance = "30 %"')
    for name, resistance in (("board", "12k"), ("same", "12k"), ("worse", "14k"), ("better", "10k")):
        (own_desk / f"{name}.edn").write_bytes(small_export(resistance))
        (own_desk / f"{name}.brief.toml").write_text(wide, encoding="utf-8")
    assert call("check", "board.edn", "--against", "same.edn").returncode == 0
    from_worse = call("check", "board.edn", "--against", "worse.edn")
    assert from_worse.returncode == 0 and "  better: " in from_worse.stdout
    from_better = call("check", "board.edn", "--against", "better.edn")
    assert from_better.returncode == 1 and "  worse: " in from_better.stdout
    assert "\nfail" not in from_better.stdout, "all pass, but with less to spare"


def test_curves_come_with_the_json(desk: Path) -> None:
    found = json.loads(call("check", "board.edn", "--json", "--curves").stdout)
    curve = found["curves"]["filter:anti-alias:corner_high"]
    assert len(curve["x"]) == len(curve["nominal"]) > 10
    assert curve["x_unit"] == "Hz"


def test_curve_prints_csv(desk: Path) -> None:
    done = call("curve", "board.edn", "rail:+3V3:impedance")
    rows = list(csv.reader(io.StringIO(done.stdout)))
    assert rows[0] == ["x", "nominal", "low", "high"]
    figures = [[float(cell) for cell in row] for row in rows[1:]]
    assert len(figures) > 10
    assert all(low <= nominal <= high for _, nominal, low, high in figures)
    assert [row[0] for row in figures] == sorted(row[0] for row in figures)


def test_sine_prints_in_and_out(desk: Path) -> None:
    done = call("curve", "board.edn", "filter:anti-alias:corner_high", "--sine", "10 kHz")
    rows = list(csv.reader(io.StringIO(done.stdout)))
    assert rows[0] == ["x", "in", "out"]
    assert max(float(row[1]) for row in rows[1:]) == pytest.approx(1.0, rel=1e-3)
    # |H| = 1 / sqrt(1 + (f / fc)^2), fc = 795.8 Hz: 0.0793
    assert "amplitude ratio 0.079" in done.stderr


def test_history_json_has_the_promised_shape(desk: Path) -> None:
    found = json.loads(call("history", "--json").stdout)
    assert found["format"] == "reactance.history/1"
    (board,) = found["boards"]
    assert Path(board["file"]) == (desk / "board.edn").resolve()
    keys = {"id", "sha256", "saved", "read", "author", "parts", "status", "worse", "error"}
    assert all(keys == set(revision) for revision in board["revisions"])
    first, second = board["revisions"]
    assert first["error"] is None and second["worse"] >= 1 and second["status"]["fail"] == 1
    assert first["saved"] <= second["saved"] and len(first["sha256"]) == 64


def test_compare_json_has_the_promised_shape(desk: Path) -> None:
    found = json.loads(call("compare", "board.edn", "previous", "latest", "--json").stdout)
    assert list(found) == ["format", "older", "newer", "edits", "movements"]
    assert (found["format"], found["older"]["id"], found["newer"]["id"]) == ("reactance.compare/1", 1, 2)
    assert [edit["part"] for edit in found["edits"]] == ["R1"]
    turned = json.loads(call("compare", "board.edn", "2", "1", "--json").stdout)
    assert {move["verdict"] for move in turned["movements"]} <= {"better", "moved"}


def test_baseline_is_pinned_and_unpinned(own_desk: Path) -> None:
    assert call("baseline", "board.edn", "1").returncode == 0
    (own_desk / "board.edn").write_bytes(small_export("20.1k"))
    call("watch", "--once", "board.edn")
    against = json.loads(call("compare", "board.edn", "baseline", "latest", "--json").stdout)
    assert (against["older"]["id"], against["newer"]["id"]) == (1, 3)
    newest = json.loads(call("history", "board.edn", "--json").stdout)["boards"][0]["revisions"][-1]
    assert newest["worse"] >= 1, "compared with the pinned revision when it was stored"
    assert call("baseline", "board.edn", "--previous").returncode == 0
    against = json.loads(call("compare", "board.edn", "baseline", "latest", "--json").stdout)
    assert against["older"]["id"] == 2
    done = call("baseline", "board.edn", "99")
    assert done.returncode == 2 and "no revision 99" in done.stderr


def test_piped_output_is_plain_and_puts_failures_first(desk: Path) -> None:
    done = call("check", "board.edn")
    assert "\x1b" not in done.stdout
    lines = done.stdout.splitlines()
    statuses = [line.split()[0] for line in lines if line.split()[:1] and line.split()[0] in ORDER]
    assert statuses[0] == "fail"
    assert statuses == sorted(statuses, key=ORDER.index)
    assert "assumption" in lines[-1]
    assert "795 Hz" in done.stdout, "engineering units"


ORDER = ["fail", "marginal", "unknown", "pass", "watched"]


def test_sarif_names_the_failures_and_where_they_are(desk: Path) -> None:
    call("check", "board.edn", "--sarif", "out.sarif")
    log = json.loads((desk / "out.sarif").read_text(encoding="utf-8"))
    assert log["version"] == "2.1.0"
    (one_run,) = log["runs"]
    assert one_run["tool"]["driver"]["name"] == "reactance"
    failures = [result for result in one_run["results"] if result["level"] == "error"]
    assert [result["partialFingerprints"]["check/v1"] for result in failures] == ["filter:anti-alias:corner_high"]
    for result in one_run["results"]:
        rule = one_run["tool"]["driver"]["rules"][result["ruleIndex"]]
        assert rule["id"] == result["ruleId"]
        assert result["message"]["text"]
        location = result["locations"][0]["physicalLocation"]
        assert location["artifactLocation"]["uri"] == "board.edn"
        assert location.get("region", {"startLine": 1})["startLine"] >= 1


def test_demo_plays_its_saves_and_prints_what_each_did(tmp_path: Path) -> None:
    done = run("demo", "--once", "--folder", tmp_path / "new")
    assert (done.returncode, done.stderr) == (0, "")
    from reactance.daemon.demo import FILE, saves

    told = [line for line in done.stdout.splitlines() if line.startswith("save ")]
    assert told == [f"save {number}: {save.title}" for number, save in enumerate(saves(), 1)]
    assert "worse: " in done.stdout and "better: " in done.stdout
    listed = json.loads(run("history", "--history", tmp_path / "new" / "history.sqlite", "--json").stdout)
    (board,) = listed["boards"]
    assert board["file"].endswith(FILE) and len(board["revisions"]) == len(saves())
