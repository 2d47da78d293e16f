"""A file at each limit and one beyond it, and files made to hurt the reader."""

from __future__ import annotations

from collections.abc import Callable, Mapping

import pytest
from writers.designs import design_of
from writers.edif import edif
from writers.flat import ipc356, ipc2581, tables

from reactance.analysis.design import Design, InputError, Part, Pin
from reactance.analysis.exports import ExportFiles, Limits, read_export

WRITERS: Mapping[str, Callable[..., ExportFiles]] = {"EDIF": edif, "356": ipc356, "2581": ipc2581, "tables": tables}


def board(parts: int, pins: int = 2, net: str = "NET") -> Design:
    """So many parts of so many pins, all on one net."""
    numbers = [str(number) for number in range(1, pins + 1)]
    return design_of(
        [Part(f"C{part}", tuple(Pin(number, f"P{number}", net) for number in numbers)) for part in range(1, parts + 1)]
    )


def refused(files: ExportFiles, limits: Limits, name: str) -> None:
    with pytest.raises(InputError, match=f"limit `{name}`") as caught:
        read_export(files, limits=limits)
    assert str(getattr(limits, name)) in caught.value.message.replace(",", "")
    assert caught.value.place.file in (files.name, "board.parts.csv")
    assert caught.value.remedy


@pytest.mark.parametrize("writer", WRITERS)
def test_bytes_at_the_limit_and_one_beyond(writer: str) -> None:
    files = WRITERS[writer](board(3))
    assert len(read_export(files, limits=Limits(bytes=len(files.main))).parts) == 3
    refused(files, Limits(bytes=len(files.main) - 1), "bytes")


@pytest.mark.parametrize("writer", WRITERS)
def test_parts_at_the_limit_and_one_beyond(writer: str) -> None:
    files = WRITERS[writer](board(5))
    assert len(read_export(files, limits=Limits(parts=5)).parts) == 5
    refused(files, Limits(parts=4), "parts")


@pytest.mark.parametrize("writer", WRITERS)
def test_pins_at_the_limit_and_one_beyond(writer: str) -> None:
    files = WRITERS[writer](board(5, 4))
    assert len(read_export(files, limits=Limits(pins=20)).nets[0].pins) == 20
    refused(files, Limits(pins=19), "pins")


@pytest.mark.parametrize("writer", WRITERS)
def test_names_at_the_limit_and_one_beyond(writer: str) -> None:
    files = WRITERS[writer](board(2, net="N" * 50))
    assert read_export(files, limits=Limits(name=50)).nets[0].name == "N" * 50
    refused(files, Limits(name=49), "name")


@pytest.mark.parametrize("writer", WRITERS)
def test_texts_beyond_the_limit_are_cut_and_noted(writer: str) -> None:
    part = Part("C1", (Pin("1", "A", "NET"), Pin("2", "B", "NET")), {"VALUE": "x" * 40})
    files = WRITERS[writer](design_of([part]))
    assert read_export(files, limits=Limits(text=40)).parts[0].attributes["VALUE"] == "x" * 40
    design = read_export(files, limits=Limits(text=39))
    assert design.parts[0].attributes["VALUE"] == "x" * 39
    assert any("limit `text`" in problem.message for problem in design.problems)


def test_depth_at_the_limit_and_one_beyond() -> None:
    def nested(depth: int) -> ExportFiles:
        net = '<Step name="s"><LogicalNet name="A"><PinRef componentRef="C1" pin="1"/></LogicalNet></Step>'
        text = "<IPC-2581>" + "<Ecad>" * (depth - 4) + net + "</Ecad>" * (depth - 4) + "</IPC-2581>"
        return ExportFiles(text.encode(), "board.xml")

    assert read_export(nested(100)).nets[0].pins == (("C1", "1"),)
    with pytest.raises(InputError, match=r"limit of 100 \(limit `depth`\)"):
        read_export(nested(101))


def test_columns_at_the_limit_and_one_beyond() -> None:
    def wide(cells: int) -> ExportFiles:
        return ExportFiles(b"refdes,pin,net\nC1,1,GND" + b"," * (cells - 3) + b"\n", "board.pins.csv")

    assert len(read_export(wide(1000)).parts) == 1
    refused(wide(1001), Limits(), "columns")


def test_lines_at_the_limit_and_one_beyond() -> None:
    table = ExportFiles(b"refdes,pin,net\nC1,1,GND\n\n", "board.pins.csv")
    records = ExportFiles(b"C  x\n317GND              C1    -1\n999\n", "board.ipc")
    for files in (table, records):
        assert len(read_export(files, limits=Limits(lines=3)).parts) == 1
        refused(files, Limits(lines=2), "lines")


def test_what_multiplies_is_counted() -> None:
    refdes = "".join(f'<RefDes name="C{number}"/>' for number in range(1, 2001))
    told = "".join(f'<Textual textualCharacteristicName="A{n}" textualCharacteristicValue="x"/>' for n in range(2000))
    item = f"<BomItem>{refdes}<Characteristics>{told}</Characteristics></BomItem>"
    net = '<Step name="s"><LogicalNet name="A"><PinRef componentRef="C1" pin="1"/></LogicalNet></Step>'
    refused(ExportFiles(f"<IPC-2581><Bom>{item}</Bom>{net}</IPC-2581>".encode(), "board.xml"), Limits(), "forms")
    pins = "".join(f'<Pin number="{number}"/>' for number in range(2000))
    parts = "".join(f'<Component refDes="C{number}" packageRef="P"/>' for number in range(2000))
    board = f'<IPC-2581><Step name="s"><Package name="P">{pins}</Package>{parts}</Step></IPC-2581>'
    refused(ExportFiles(board.encode(), "board.xml"), Limits(), "pins")


def test_entries_at_the_limit_and_one_beyond() -> None:
    steps = '<Step name="s"><LogicalNet name="A"><PinRef componentRef="C1" pin="1"/></LogicalNet></Step>'
    files = ExportFiles(f"<IPC-2581>{'<Layer/>' * 8}{steps}</IPC-2581>".encode(), "board.xml")
    assert len(read_export(files, limits=Limits(forms=10)).parts) == 1
    refused(files, Limits(forms=9), "forms")


def test_problems_beyond_the_limit_are_counted() -> None:
    rows = b"refdes,pin,net\nC1,1,GND\n" + b",1,GND\n" * 10
    design = read_export(
        ExportFiles(rows, "board.pins.csv", {".parts.csv": b"refdes\nC1\n"}), limits=Limits(problems=4)
    )
    assert len(design.problems) == 5
    assert (
        design.problems[-1].message.startswith("6 more problems") and "limit `problems`" in design.problems[-1].message
    )


def test_a_million_pins_on_one_net() -> None:
    million = 1_000_000
    rows = b"refdes,pin,net\n" + b"".join(b"C%d,%d,GND\n" % divmod(number, 500) for number in range(million))
    design = read_export(ExportFiles(rows, "board.pins.csv"))
    assert (len(design.nets), len(design.nets[0].pins), len(design.parts)) == (1, 1_000_000, 2000)


@pytest.mark.parametrize("writer", WRITERS)
def test_a_gigantic_name_is_refused(writer: str) -> None:
    refused(WRITERS[writer](board(1, net="N" * 200_000 if writer != "tables" else "N" * 50_000)), Limits(), "name")


def test_brackets_without_end() -> None:
    for data in (b"(edif " + b"(" * 2_000_000, b"(edif x " + b"(library " * 200_000):
        with pytest.raises(InputError, match=r"limit `depth`|expected"):
            read_export(ExportFiles(data, "board.edn"))
    for data in (b"<IPC-2581>" + b"<a>" * 1_000_000, b"<IPC-2581 " + b"a" * 5_000_000):
        with pytest.raises(InputError):
            read_export(ExportFiles(data, "board.xml"))


def test_an_entity_bomb_is_refused_before_it_is_built() -> None:
    entities = "".join(f'<!ENTITY e{n} "{f"&e{n - 1};" * 10}">' for n in range(1, 30))
    text = f'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY e0 "boom">{entities}]><IPC-2581>&e29;</IPC-2581>'
    with pytest.raises(InputError, match="document type") as caught:
        read_export(ExportFiles(text.encode(), "board.xml"))
    assert caught.value.place.line == 1
