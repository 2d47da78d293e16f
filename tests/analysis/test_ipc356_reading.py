"""IPC-D-356: hand-written records with the connectivity written out by hand."""

from __future__ import annotations

import pytest

from reactance.analysis.design import Design, InputError
from reactance.analysis.exports import ExportFiles, read_export
from reactance.analysis.exports.ipc356_names import full_names

PARTS = b"RefDes,Value\nC1,100n\nU1,GHL-1\n"


def record(net: str, refdes: str, pin: str, code: str = "327", middle: str = " ") -> str:
    """A record by the columns of the standard: net 4-17, refdes 21-26, dash 27, pin 28-31, M in 32."""
    return f"{code}{net:<14}   {refdes:<6}-{pin:<4}{middle}      A01X+006000Y+018000X0600Y0600R000S0"


def read(*lines: str, parts: bytes | None = PARTS, end: str = "999\n") -> Design:
    companions = {} if parts is None else {".parts.csv": parts}
    return read_export(ExportFiles("\n".join([*lines, end]).encode(), "board.ipc", companions))


def connections(design: Design) -> dict[str, set[str]]:
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


def test_columns_of_the_standard() -> None:
    # Typed by the column numbers: 1-3 code, 4-17 net, 21-26 refdes, 27 dash, 28-31 pin, 32 M.
    design = read(
        "C  IPC-D-356A netlist",
        "P  JOB   board",
        #        1         2         3         4
        # 2345678901234567890123456789012345678901234
        "3173V3              C1    -1    D0400PA00X+006000Y+018000X0600Y0000R000S0",
        "327ABCDEFGHIJKLMN   LONGRF-A123M      A01X+006000Y+018000",
        "327GND              C1    -2",
    )
    assert connections(design) == {"3V3": {"C1.1"}, "ABCDEFGHIJKLMN": {"LONGRF.A123"}, "GND": {"C1.2"}}


def test_unconnected_pins_and_vias() -> None:
    design = read(record("N/C", "U1", "3"), record("GND", "VIA", ""), record("GND", "U1", "1"), record("GND", "", ""))
    assert connections(design) == {"GND": {"U1.1"}}
    assert design.part("VIA") is None
    assert design.parts[0].pins[0].net is None


def test_a_pin_in_several_records_is_one_pin() -> None:
    design = read(record("GND", "U1", "1", middle="M"), record("GND", "U1", "1"), record("GND", "U1", "1", "317"))
    assert [pin.number for pin in design.parts[0].pins] == ["1"]
    assert design.nets[0].pins == (("U1", "1"),)


def test_a_pin_on_two_nets_is_listed_and_the_first_counts() -> None:
    design = read(record("GND", "C1", "1"), record("3V3", "C1", "1"), record("3V3", "U1", "1"))
    assert connections(design) == {"GND": {"C1.1"}, "3V3": {"U1.1"}}
    assert [(problem.severity, problem.where) for problem in design.problems] == [("error", "board.ipc:2:1")]
    assert "GND" in design.problems[0].message and "3V3" in design.problems[0].message


def test_a_pin_first_unconnected_then_on_a_net_is_on_the_net() -> None:
    assert connections(read(record("N/C", "C1", "1"), record("GND", "C1", "1"))) == {"GND": {"C1.1"}}


def test_names_behind_aliases() -> None:
    design = read(
        "P  NNAME1  A net with a name too long for its columns",
        record("NNAME1", "C1", "1"),
        record("NNAME00002", "C1", "2"),
        record("NNAME7", "U1", "1"),
        "P  NNAME2   ANOTHER_LONG_NAME_OF_A_NET",
    )
    assert connections(design) == {
        "A net with a name too long for its columns": {"C1.1"},
        "ANOTHER_LONG_NAME_OF_A_NET": {"C1.2"},
        "NNAME7": {"U1.1"},
    }
    assert any("NNAME7" in problem.message for problem in design.problems)


def test_other_records_are_no_pins() -> None:
    design = read(
        "P  UNITS CUST 0",
        record("GND", "C1", "1"),
        "367                 MTG1        D1250UA00X+000000Y+000000",
        "307GND              VIA         D0100PA00X+000000Y+000000L01L02",
        "378GND              X0100 X+000000Y+000000 X+000100Y+000000",
        "389BOARD_EDGE   X+000000Y+000000",
        "017                 U1    -5",
        "088",
        "",
        "   ",
    )
    assert connections(design) == {"GND": {"C1.1"}}
    assert not [problem for problem in design.problems if problem.severity == "error"]


def test_what_follows_999_is_not_read_and_line_ends_do_not_matter() -> None:
    text = "\r".join([record("GND", "C1", "1"), "999", "garbage", record("GND", "C1", "2")])
    design = read_export(ExportFiles(text.encode(), "board.ipc", {".parts.csv": PARTS}))
    assert connections(design) == {"GND": {"C1.1"}}


@pytest.mark.parametrize(
    ("line", "column", "message"),
    [
        ("hello", 1, "three-digit code"),
        ("327A_NAME_THAT_IS_TOO_LONG  C1    -1", 18, "columns 18 to 20"),
        ("327GND              CONNEC10-1", 27, "column 27"),
    ],
)
def test_a_bad_record_is_listed_and_the_rest_kept(line: str, column: int, message: str) -> None:
    design = read(record("GND", "C1", "1"), line, record("GND", "U1", "1"))
    assert connections(design) == {"GND": {"C1.1", "U1.1"}}
    assert [problem.where for problem in design.problems] == [f"board.ipc:2:{column}"]
    assert message in design.problems[0].message


def test_a_file_cut_off_is_one_error_with_line_and_remedy() -> None:
    with pytest.raises(InputError) as caught:
        read(record("GND", "C1", "1"), record("GND", "C1", "2"), end="")
    assert str(caught.value.place) == "board.ipc:2:1"
    assert "999" in caught.value.message and caught.value.remedy


def test_no_pins_at_all_is_an_error() -> None:
    with pytest.raises(InputError, match="no record 317 or 327"):
        read("P  JOB  board", record("GND", "VIA", ""))


def test_values_come_from_the_parts_table() -> None:
    design = read(record("GND", "C1", "1"), record("GND", "U1", "1"), parts=b"value;ref\n100n;C1\n")
    assert dict(design.parts[0].attributes) == {"value": "100n"}
    assert [problem.message for problem in design.problems if "U1" in problem.message]


def test_a_missing_parts_table_is_said() -> None:
    design = read(record("GND", "C1", "1"), parts=None)
    assert "board.parts.csv" in design.problems[0].message
    assert design.problems[0].severity == "caution"


def test_a_broken_parts_table_is_an_error_in_that_file() -> None:
    with pytest.raises(InputError) as caught:
        read(record("GND", "C1", "1"), parts=b'RefDes,Value\nC1,"100n\n')
    assert str(caught.value.place) == "board.parts.csv:2:4"


@pytest.mark.parametrize(
    ("short", "full", "expected"),
    [
        ("CONN_L", "CONN_LEFT", "CONN_LEFT"),  # the beginning kept
        ("N_LEFT", "CONN_LEFT", "CONN_LEFT"),  # the end kept
        ("CONN_1", "CONN_LEFT", "CONN_LEFT"),  # cut shorter, then numbered
        ("CONN-L", "CONN_LEFT", "CONN_LEFT"),  # a character replaced
        ("C_1", "C.1", "C.1"),
        ("conn_l", "CONN_LEFT", "CONN_LEFT"),
        ("CONN", "CONN_LEFT", None),  # shorter than the columns: not cut
        ("CABLE1", "CONN_LEFT", None),
    ],
)
def test_which_full_name_a_short_one_stands_for(short: str, full: str, expected: str | None) -> None:
    assert full_names([short], [full, "OTHER"], 6).get(short) == expected


def test_ambiguous_short_names_stay_as_they_are() -> None:
    assert full_names(["CONN_L"], ["CONN_LEFT", "CONN_LAST"], 6) == {}
    assert full_names(["CONN_L", "N_LEFT"], ["CONN_LEFT"], 6) == {}
    assert full_names(["CONN_L"], ["CONN_L", "CONN_LEFT"], 6) == {}
