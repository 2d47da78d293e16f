"""Plain tables: loose headers, delimiters, encodings, lists and ranges of refdes, and what is wrong in them."""

from __future__ import annotations

import pytest

from reactance.analysis.design import Design, InputError
from reactance.analysis.exports import ExportFiles, read_export
from reactance.analysis.exports.limits import Limits
from reactance.analysis.exports.tables_parts import BadRangeError, expand

PINS = "RefDes,Pin,Net\nC1,1,+3V3\nC1,2,GND\nR1,1,+3V3\nR1,2,\n"
NETS = {"+3V3": {"C1.1", "R1.1"}, "GND": {"C1.2"}}


def read(pins: str | bytes, parts: str | bytes | None = "RefDes,Value\nC1,100n\nR1,10k\n") -> Design:
    companions = {} if parts is None else {".parts.csv": parts.encode() if isinstance(parts, str) else parts}
    return read_export(ExportFiles(pins.encode() if isinstance(pins, str) else pins, "board.pins.csv", companions))


def connections(design: Design) -> dict[str, set[str]]:
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


def values(design: Design) -> dict[str, dict[str, str]]:
    return {part.refdes: dict(part.attributes) for part in design.parts}


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-16-le", "utf-16-be", "latin-1", "cp1252"])
@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("delimiter", [",", ";", "\t"])
def test_delimiters_encodings_and_line_ends(encoding: str, newline: str, delimiter: str) -> None:
    def file(text: str) -> bytes:
        return text.replace(",", delimiter).replace("\n", newline).encode(encoding)

    design = read(file(PINS), file("RefDes,Value\nC1,4.7 µF\nR1,10k\n"))
    assert connections(design) == NETS
    assert values(design) == {"C1": {"Value": "4.7 µF"}, "R1": {"Value": "10k"}}
    assert design.part("R1") is not None and design.part("R1").pin("2").net is None
    assert design.problems == ()


@pytest.mark.parametrize(
    "header",
    [
        "RefDes,Pin,Net",
        "Reference Designator,Pin Number,Net Name",
        "REF.,PIN#,SIGNAL",
        "designator , Pin No. , net_name",
        '"Part Reference","Pad","Node"',
        "Component,Terminal,Signal Name",
        "Part,Pin Name,Net",
    ],
)
def test_header_words_are_matched_loosely(header: str) -> None:
    assert connections(read(PINS.replace("RefDes,Pin,Net", header))) == NETS


def test_columns_in_any_order_with_others_between_and_titles_before() -> None:
    text = "sep=,\nA list of pins, of a logger\n\n"
    text += "Net,Page,Pin,Direction,RefDes\n+3V3,1,1,Bidirectional,C1\nGND,2,2,in,C1\n"
    design = read(text, None)
    assert connections(design) == {"+3V3": {"C1.1"}, "GND": {"C1.2"}}
    assert [pin.direction for pin in design.parts[0].pins] == ["inout", "input"]


def test_cells_with_delimiters_quotes_and_line_breaks() -> None:
    parts = 'RefDes,Value,Description\nC1,"100n, 16 V","chip ""0603""\nsoft ends"\nR1,10k,3.5" wide\n'
    assert values(read(PINS, parts)) == {
        "C1": {"Value": "100n, 16 V", "Description": 'chip "0603" soft ends'},
        "R1": {"Value": "10k", "Description": '3.5" wide'},
    }


@pytest.mark.parametrize(
    ("cell", "expected"),
    [
        ("C1", ["C1"]),
        ("C1, C2, C7-C9", ["C1", "C2", "C7", "C8", "C9"]),
        ("C1;C2 C3\tC4", ["C1", "C2", "C3", "C4"]),
        ("C7-9", ["C7", "C8", "C9"]),
        ("C7 - C9, R1", ["C7", "C8", "C9", "R1"]),
        ("C7–C9", ["C7", "C8", "C9"]),  # an en dash, as spreadsheets make it
        ("C7..C9", ["C7", "C8", "C9"]),
        ("R009-R011", ["R009", "R010", "R011"]),
        ("C9-C7", ["C7", "C8", "C9"]),
        ("C7-R9", ["C7-R9"]),  # no range: other letters
        ("U1-A", ["U1-A"]),
        ("", []),
        (" , ", []),
    ],
)
def test_lists_and_ranges_of_refdes(cell: str, expected: list[str]) -> None:
    assert list(expand(cell, (), Limits())) == expected


def test_a_refdes_of_the_export_with_a_dash_is_no_range() -> None:
    assert list(expand("C7-9", {"C7-9"}, Limits())) == ["C7-9"]
    assert list(expand("CONN 1", {"CONN 1"}, Limits())) == ["CONN 1"]


def test_a_range_at_the_limit_and_one_beyond() -> None:
    assert len(list(expand("C1-C4", (), Limits(array=4)))) == 4
    with pytest.raises(BadRangeError, match="limit `array`"):
        list(expand("C1-C5", (), Limits(array=4)))
    design = read(PINS, "RefDes,Value\nC1-C999999,100n\nR1,10k\n")
    assert values(design) == {"C1": {}, "R1": {"Value": "10k"}}
    assert design.problems[0].where == "board.parts.csv:2:1"


def test_counting_columns_are_no_attributes() -> None:
    parts = 'Item,Qty,RefDes,Value,\n1,2,"C1, R1",?,\n'
    assert values(read(PINS, parts)) == {"C1": {"Value": "?"}, "R1": {"Value": "?"}}


def test_parts_told_of_twice() -> None:
    design = read(PINS, "RefDes,Value,Tol\nC1,100n,\nC1,,10 %\nC1,220n,\nR1,10k,\n")
    assert values(design)["C1"] == {"Value": "100n", "Tol": "10 %"}
    assert [problem.where for problem in design.problems] == ["board.parts.csv:4:1"]
    assert "220n" in design.problems[0].message


def test_parts_without_pins_are_kept_and_noted() -> None:
    design = read(PINS, "RefDes,Value\nC1,100n\nR1,10k\nH1,hole\n")
    assert design.part("H1") is not None
    assert [(problem.severity, "H1" in problem.message) for problem in design.problems] == [("note", True)]


def test_bad_rows_are_listed_with_line_and_column_and_the_rest_is_kept() -> None:
    design = read("Pin,RefDes,Net\n1,C1,+3V3\n1,,GND\n,C1,GND\n2,C1\n1,R1,+3V3,stray\n")
    assert connections(design) == {"+3V3": {"C1.1", "R1.1"}}
    assert [problem.where for problem in design.problems] == [
        f"board.pins.csv:{at}" for at in ("3:3", "4:1", "5:5", "6:1")
    ]


@pytest.mark.parametrize(
    ("data", "place", "message"),
    [
        (b"", "1:1", "empty"),
        (b"a,b,c\n1,2,3\n", "1:1", "refdes, pin and net"),
        (b"\n\nfoo bar\n", "3:1", "foo bar"),
        (b'RefDes,Pin,Net\nC1,1,GND\nC1,"2,GND\nC2,1,GND\n', "3:4", "quotation mark"),
        (b"RefDes,Pin,Net\nC1,1,GND\nC1,2,G\0ND\n", "3:7", "zero byte"),
        (b'RefDes,Pin,Net\nC1,1,"' + b"x" * 200_000 + b'"\n', "2:1", "limit `text`"),
    ],
)
def test_a_broken_table_is_one_error_with_a_place(data: bytes, place: str, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        read(data)
    assert str(caught.value.place) == f"board.pins.csv:{place}"
    assert caught.value.remedy


def test_names_with_markup_and_controls_are_plain_text() -> None:
    design = read("RefDes,Pin,Net\nC1,1,<b>GND</b>\nC1,2,\x1b[31mRED\nC1,3,\u202eDNG\n")
    assert [net.name for net in design.nets] == ["<b>GND</b>", "%27%[31mRED", "%8238%DNG"]
