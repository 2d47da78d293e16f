"""Exports and briefs as they should not be: each gets one message with its place, exit status 2, and no traceback."""

from __future__ import annotations

import re
from collections.abc import Callable
from pathlib import Path

import pytest
from daemonkit import BRIEF, Daemon, call, run, small_export, until

GOOD = small_export()
CUT = GOOD[: len(GOOD) // 2]
CYCLE = GOOD.replace(b"(cellRef CHIP (libraryRef parts))", b"(cellRef small (libraryRef boards))")
STEERING = GOOD.replace(b'"ADC")', b'"AD\x1b[31mC")').replace(b'"+3V3"', b'"+3V3\x1b[2J"')

EXPORTS: dict[str, tuple[str, bytes]] = {
    "empty": ("board.edn", b""),
    "cut off": ("board.edn", CUT),
    "one bracket too many": ("board.edn", GOOD + b")"),
    "string without an end": ("board.edn", GOOD.replace(b'"ADC")', b'"ADC)')),
    "no schematic at all": ("board.edn", b"Dear all, please find attached the netlist.\n"),
    "an archive": ("board.edn", b"PK\x03\x04" + bytes(range(256)) * 8),
    "zeros, as a crash leaves them": ("board.edn", bytes(4096)),
    "no design in it": ("board.edn", b"(edif nothing (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0)))"),
    "a cell that contains itself": ("board.edn", CYCLE),
    "a thousand brackets deep": ("board.edn", b"(edif deep " + b"(a " * 5000 + b")" * 5001),
    "another XML": ("board.xml", b"<?xml version='1.0'?><html><body/></html>"),
    "XML without an end": ("board.xml", b'<IPC-2581 revision="C" xmlns="http://webstds.ipc.org/2581"><Content>'),
    "XML with entities": ("board.xml", b'<!DOCTYPE a [<!ENTITY b "c">]><IPC-2581 revision="C"/>'),
    "a table without nets": ("board.pins.csv", b"refdes,pin\nC1,1\n"),
}

BRIEFS: dict[str, tuple[str, str]] = {
    "no TOML": ("[[filter]\n", "board.brief.toml:1"),
    "unknown table": ("[[filters]]\nname = 'x'\n", "filters"),
    "unknown key": (BRIEF + 'colour = "blue"\n', "colour"),
    "wrong unit": (BRIEF.replace("1.6 kHz", "1.6 kohm"), "corner"),
    "no quantity": (BRIEF.replace("1.6 kHz", "soon"), "corner"),
    "missing key": (BRIEF.replace('to = "ADC"\n', ""), "to"),
    "a net that the design lacks": (BRIEF.replace('"ADC"', '"ADD"'), "ADD"),
    "a pin that the design lacks": (BRIEF + '[[pin]]\nat = "U1.99"\nresistance = "1 Mohm"\n', "U1.99"),
    "a capacitor that the design lacks": (BRIEF + '[[duty]]\ncapacitor = "C77"\nis = "timing"\n', "C77"),
    "a duty that is none": (BRIEF + '[[duty]]\ncapacitor = "C1"\nis = "decoration"\n', "duty"),
    "a file that is not there": (BRIEF + '[board]\nparts = ["team.toml"]\n', "team.toml"),
    "no text": ("\x00\x01", "board.brief.toml"),
}


def one_message(text: str, file: str) -> str:
    """The single line on stderr, which names the file and is no traceback."""
    assert "Traceback" not in text
    lines = text.strip().splitlines()
    assert len(lines) == 1, text
    assert lines[0].startswith("reactance: ")
    assert file in lines[0]
    return lines[0]


@pytest.mark.parametrize("kind", EXPORTS)
def test_a_bad_export(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, kind: str) -> None:
    monkeypatch.chdir(tmp_path)
    name, content = EXPORTS[kind]
    (tmp_path / name).write_bytes(content)
    done = call("check", name)
    message = one_message(done.stderr, name)
    assert done.returncode == 2
    assert done.stdout == ""
    assert re.search(rf"{re.escape(name)}:\d+", message), "with the line"


@pytest.mark.parametrize("kind", BRIEFS)
def test_a_bad_brief(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, kind: str) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "board.edn").write_bytes(GOOD)
    text, place = BRIEFS[kind]
    (tmp_path / "board.brief.toml").write_text(text, encoding="utf-8")
    done = call("check", "board.edn")
    message = one_message(done.stderr, "board.brief.toml")
    assert done.returncode == 2
    assert done.stdout == ""
    assert place in message


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["check", "absent.edn"], "absent.edn: there is no such file"),
        (["check", "."], "is a folder"),
        (["check", "board.edn", "--brief", "absent.toml"], "absent.toml: there is no such file"),
        (["check", "board.edn", "--against", "absent.edn"], "absent.edn: there is no such file"),
        (["check", "board.edn", "--against", "7"], "there is no history yet"),
        (["check", "board.edn", "--sarif", "no/such/folder.sarif"], "cannot be written"),
        (["check"], "Missing argument"),
        (["check", "board.edn", "--colour"], "No such option"),
        (["history", "board.edn"], "there is no history yet"),
        (["history", "--history", "board.edn"], "this is no database"),
        (["compare", "board.edn", "1", "2"], "there is no history yet"),
        (["baseline", "board.edn"], "--previous"),
        (["curve", "board.edn", "rail:+9V:droop"], "has no check rail:+9V:droop"),
        (["curve", "board.edn", "net:ADC:return", "--sine", "fast"], "--sine"),
        (["watch", "absent"], "absent: there is no such file or folder"),
        (["watch", ".", "--listen", "0.0.0.0:8462"], "answers this machine only"),
        (["watch", ".", "--listen", "here"], "expected HOST:PORT"),
        (["demo", "--folder", "."], "there is something in it already"),
        (["study", "board.edn"], "No such command"),
    ],
)
def test_wrong_usage(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, arguments: list[str], words: str) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "board.edn").write_bytes(GOOD)
    done = call(*arguments, REACTANCE_HISTORY=str(tmp_path / "none.sqlite"))
    assert done.returncode == 2
    assert words in done.stderr
    assert "Traceback" not in done.stderr
    assert not (tmp_path / "none.sqlite").exists() or arguments[0] == "watch"


@pytest.mark.parametrize("content", [CUT, CYCLE])
def test_the_process_itself_ends_with_2_and_one_message(tmp_path: Path, content: bytes) -> None:
    (tmp_path / "board.edn").write_bytes(content)
    done = run("check", "board.edn", cwd=tmp_path)
    one_message(done.stderr, "board.edn")
    assert (done.returncode, done.stdout) == (2, "")


def test_names_in_files_cannot_steer_the_terminal(tmp_path: Path) -> None:
    (tmp_path / "board.edn").write_bytes(
        GOOD.replace(b'"ADC")', b'"AD\x1b[31mC")').replace(b'"+3V3"', b'"+3V3\x1b[2J"')
    )
    done = run("check", "board.edn", cwd=tmp_path)
    assert "\x1b" not in done.stdout + done.stderr
    assert done.returncode in (0, 1, 2) and "Traceback" not in done.stderr


def test_under_watch_the_last_good_revision_stays_the_one_shown(folder: Path, daemon: Callable[..., Daemon]) -> None:
    export, brief = folder / "board.edn", folder / "board.brief.toml"
    export.write_bytes(GOOD)
    brief.write_text(BRIEF, encoding="utf-8")
    started = daemon()
    history = started.history

    def errors() -> list[str | None]:
        return [row.error for board in history.boards() for row in history.revisions(board.id)]

    until(lambda: errors() == [None])
    good = history.latest(1)
    assert good is not None
    for number, (path, content) in enumerate(
        [(export, CUT), (export, b""), (brief, b"[[filter]\n"), (brief, BRIEF.replace("SENSE", "SENSA").encode())], 1
    ):
        before = path.read_bytes()
        path.write_bytes(content)
        until(lambda number=number: len(errors()) == 2 * number)  # type: ignore[misc]
        message = errors()[-1]
        assert message is not None and str(path) in message and re.search(r"(:\d+| line \d+|SENSA)", message)
        shown = history.latest(1)
        assert shown is not None and shown.error is None and history.report(shown.id) is not None
        path.write_bytes(before)
        until(lambda number=number: len(errors()) == 2 * number + 1)  # type: ignore[misc]
        assert errors()[-1] is None
    status, _, err = started.stop()
    assert status == 0
    assert "Traceback" not in err
