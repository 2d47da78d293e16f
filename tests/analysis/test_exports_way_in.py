"""The one way in: content decides, temporary files are none, companions, and what importing costs."""

from __future__ import annotations

import pickle
import subprocess
import sys

import pytest

from reactance.analysis.design import InputError
from reactance.analysis.exports import ExportFiles, companion_names, is_export, kind_of, read_export, stem

EDIF = b"(edif board (edifVersion 2 0 0) (edifLevel 0) (library L (edifLevel 0)))"
RECORD = b"3173V3              C1    -1    D0400PA00X+006000Y+018000X0600Y0000R000S0\n"
XML = b'<?xml version="1.0"?>\n<IPC-2581 revision="C" xmlns="http://webstds.ipc.org/2581">'


@pytest.mark.parametrize(
    ("head", "kind"),
    [
        (EDIF, "EDIF"),
        (b"\xef\xbb\xbf\r\n  ( EDIF\n x", "EDIF"),
        (b"(edif", "EDIF"),
        (b"(edifact (x))", None),
        (b"{:a 1}", None),
        (b"P  JOB  board\n", "IPC-D-356"),
        (b"C  made today\nC\n\n" + RECORD, "IPC-D-356"),
        (RECORD, "IPC-D-356"),
        (b"C  IPC-D-356A\n" + b"C  a long story\n" * 1000, "IPC-D-356"),
        (b"C  a long story\n" * 1000, None),
        (b"317,1,2,3,4,5,6,7,8,9,10,11,12\n", None),
        (b"Parts of the board\n", None),
        (XML, "IPC-2581"),
        ('\ufeff<?xml version="1.0" encoding="UTF-16"?><IPC-2581>'.encode("utf-16-le"), "IPC-2581"),
        (b'<!-- x --><ipc:IPC-2581 xmlns:ipc="http://webstds.ipc.org/2581">', "IPC-2581"),
        (b'<!DOCTYPE a [<!ENTITY b "c">]><IPC-2581/>', "IPC-2581"),
        (b"<svg xmlns='http://www.w3.org/2000/svg'/>", None),
        (b"<html><body>", None),
        (b"refdes,pin,net\nC1,1,GND\n", "tables"),
        (b"Net;Pin;Part\n", "tables"),
        (b"refdes,value\nC1,100n\n", None),
        (b"Notes\n\nPart, pin, net\nare the words of this trade.\n", None),
        (b"Net, pin, part and " + b"much more that is said here of nothing in particular " * 3 + b"\n", None),
        (b"", None),
        (b"   \n", None),
        (b"\x00\x01\x02\x03", None),
        (b"\x89PNG\r\n\x1a\n", None),
        (bytes(range(256)) * 32, None),
    ],
)
def test_content_decides(head: bytes, kind: str | None) -> None:
    for name in ("board.edn", "board.ipc", "board.xml", "board.pins.csv", "board", "folder/board.txt"):
        assert kind_of(name, head) == kind
        assert is_export(name, head) == (kind is not None)


@pytest.mark.parametrize(
    "name",
    [
        "board.parts.csv",
        ".board.edn.swp",
        ".board.edn",
        "board.edn~",
        "~board.edn",
        "#board.edn#",
        "~$board.pins.csv",
        ".~lock.board.pins.csv#",
        "board.edn.tmp",
        "BOARD.EDN.BAK",
        "board.edn.part",
        "board.edn.crdownload",
        "folder/board.tmp",
        "C:\\boards\\~board.edn",
    ],
)
def test_temporary_files_and_parts_tables_are_no_exports(name: str) -> None:
    assert kind_of(name, EDIF) is None
    assert not is_export(name, EDIF)


@pytest.mark.parametrize(
    ("name", "expected", "companions"),
    [
        ("board.edn", "board", ()),
        ("board.v2.EDF", "board.v2", ()),
        ("board.xml", "board", ()),
        ("board.ipc", "board", ("board.parts.csv",)),
        ("board.d356", "board", ("board.parts.csv",)),
        ("board.pins.csv", "board", ("board.parts.csv",)),
        ("Board.PINS.CSV", "Board", ("Board.parts.csv",)),
        ("board", "board", ("board.parts.csv",)),
        ("a.b/board", "a.b/board", ("a.b/board.parts.csv",)),
        (".pins.csv", ".pins.csv", (".pins.csv.parts.csv",)),
    ],
)
def test_stem_and_companions(name: str, expected: str, companions: tuple[str, ...]) -> None:
    assert stem(name) == expected
    assert companion_names(name) == companions


@pytest.mark.parametrize(
    ("name", "data", "message"),
    [
        ("board.edn", b"(edf x)", "expected"),
        ("board.edn", b"", "expected"),
        ("board.ipc", b"nothing", "999"),
        ("board.xml", b"<foo/>", "IPC-2581"),
        ("board.pins.csv", b"foo", "refdes, pin and net"),
        ("board.doc", b"foo", "no open export"),
        ("board.doc", b"", "no open export"),
    ],
)
def test_what_is_no_export_is_one_error_that_says_what_was_expected(name: str, data: bytes, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        read_export(ExportFiles(data, name))
    assert caught.value.place.file == name
    assert caught.value.remedy


def test_importing_the_way_in_imports_no_reader() -> None:
    code = (
        "import sys; before = set(sys.modules); import reactance.analysis.exports; "
        "print(sorted(set(sys.modules) - before))"
    )
    loaded = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True).stdout
    for module in ("csv", "xml", "sexpdata", "pyexpat", "numpy", "exports.edif", "exports.ipc2581", "exports.tables"):
        assert f"'{module}" not in loaded and f".{module}'" not in loaded


def test_errors_and_files_travel_between_processes() -> None:
    with pytest.raises(InputError) as caught:
        read_export(ExportFiles(b"", "board.edn"))
    again = pickle.loads(pickle.dumps(caught.value))
    assert str(again) == str(caught.value)
