"""EDIF 2 0 0 into a Design: names, designators, properties, hierarchy. Connectivity is written out by hand."""

from __future__ import annotations

import pytest

from reactance.analysis.design import Design
from reactance.analysis.exports.edif import read_edif

TWO_PIN = """(cell {name} (cellType GENERIC) (view V (viewType NETLIST) (interface
  (port A (designator "1") (direction INOUT)) (port B (designator "2") (direction INOUT)) (designator "{prefix}?"))))"""


def file_of(
    cells: str, *, design: str = "(design board (cellRef TOP (libraryRef L)))", head: str = ""
) -> bytes:
    """A whole EDIF file with a capacitor and a resistor in library L."""
    parts = "\n".join(
        TWO_PIN.format(name=name, prefix=prefix) for name, prefix in (("CAP", "C"), ("RES", "R"))
    )
    return f"""(edif made (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0)) {head}
(library L (edifLevel 0) (technology (numberDefinition))
{parts}
{cells})
{design})""".encode()


def top(contents: str, interface: str = "", cells: str = "", **more: str) -> bytes:
    """A file whose cell TOP holds `contents`."""
    return file_of(
        f"{cells} (cell TOP (cellType GENERIC) (view V (viewType NETLIST)"
        f" (interface {interface}) (contents {contents})))",
        **more,
    )


def part_of(cell: str, name: str, more: str = "") -> str:
    """An instance of that cell of library L."""
    return f"(instance {name} (viewRef V (cellRef {cell} (libraryRef L))) {more})"


def connections(design: Design) -> dict[str, set[str]]:
    """Each net with its pins as REFDES.PIN."""
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


def read(data: bytes) -> Design:
    """The design in `data`, under the name `board.edn`."""
    return read_edif(data, "board.edn")


PAIR = (
    part_of("CAP", "C1", '(property VALUE (string "100n"))')
    + part_of("RES", "R1", '(property (rename P_N "Part Number") (string "R-10"))')
    + '(net (rename N1 "+3V3") (joined (portRef A (instanceRef C1)) (portRef A (instanceRef R1))))'
    + "(net GND (joined (portRef B (instanceRef C1)) (portRef B (instanceRef R1))))"
)


def test_a_flat_netlist() -> None:
    design = read(top(PAIR))
    assert design.name == "board"
    assert design.file == "board.edn"
    assert connections(design) == {"+3V3": {"C1.1", "R1.1"}, "GND": {"C1.2", "R1.2"}}
    assert design.problems == ()
    c1, r1 = design.parts
    assert dict(c1.attributes) == {"VALUE": "100n"}
    assert dict(r1.attributes) == {"Part Number": "R-10"}
    assert (c1.cell, c1.path) == ("CAP", ())
    assert [(pin.number, pin.name, pin.net, pin.direction) for pin in c1.pins] == [
        ("1", "A", "+3V3", "inout"),
        ("2", "B", "GND", "inout"),
    ]


def test_keywords_and_identifiers_without_regard_to_case() -> None:
    text = top(PAIR).decode()
    assert connections(read(text.upper().encode())) == {"+3V3": {"C1.1", "R1.1"}, "GND": {"C1.2", "R1.2"}}
    swapped = text.replace("(instanceRef C1)", "(INSTANCEREF c1)").replace("portRef A", "PortRef a")
    assert connections(read(swapped.encode())) == {"+3V3": {"C1.1", "R1.1"}, "GND": {"C1.2", "R1.2"}}


@pytest.mark.parametrize(
    ("instance", "refdes"),
    [
        ('(instance I1 (viewRef V (cellRef CAP)) (designator "C7"))', "C7"),
        ('(instance I1 (viewRef V (cellRef CAP)) (designator (stringDisplay "C7" (display D))))', "C7"),
        ('(instance (rename I1 "C7") (viewRef V (cellRef CAP)))', "C7"),
        ('(instance (rename I1 "C8") (viewRef V (cellRef CAP)) (designator "C7"))', "C7"),
        ('(instance I1 (viewRef V (cellRef CAP)) (property REFDES (string "C7")))', "C7"),
        ('(instance I1 (viewRef V (cellRef CAP)) (designator "C?") (property REF (string "C7")))', "C7"),
        ('(instance (rename I1 "C7") (viewRef V (cellRef CAP)) (property REFDES (string "C9")))', "C7"),
        ('(instance I1 (viewRef V (cellRef CAP)) (property (rename P "Ref. Des.") (string "C7")))', "C7"),
        ('(instance I1 (viewRef V (cellRef CAP)) (property (rename REFDES "Label") (string "C7")))', "C7"),
        ("(instance I1 (viewRef V (cellRef CAP)))", "I1"),
    ],
)
def test_the_refdes_that_comes_first(instance: str, refdes: str) -> None:
    design = read(top(f"{instance} (net N (joined (portRef A (instanceRef I1))))"))
    assert connections(design) == {"N": {f"{refdes}.1"}}


def test_back_annotation_stands_below_the_designator_and_above_the_name() -> None:
    cells = (
        "(cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents "
        + part_of("CAP", "I1")
        + part_of("CAP", "I2", '(designator "C2")')
        + "(net N (joined (portRef A (instanceRef I1)) (portRef A (instanceRef I2))))))"
        + '(viewMap (instanceBackAnnotate (instanceRef I1) (designator "C11") (property VALUE (string "1u")))'
        + '(instanceBackAnnotate (instanceRef I2) (designator "C22"))))'
    )
    design = read(file_of(cells))
    assert connections(design) == {"N": {"C11.1", "C2.1"}}
    assert design.parts[0].attributes["VALUE"] == "1u"


BLOCK = (
    "(cell BLOCK (cellType GENERIC) (view V (viewType NETLIST) (interface (port IN) (port OUT)) (contents "
    + part_of("RES", "R1")
    + part_of("CAP", "C1")
    + "(net IN (joined (portRef IN) (portRef A (instanceRef R1))))"
    + "(net MID (joined (portRef B (instanceRef R1)) (portRef A (instanceRef C1))))"
    + "(net OUT (joined (portRef OUT) (portRef B (instanceRef C1)))))))"
)
TWO_BLOCKS = (
    part_of("BLOCK", "B1")
    + part_of("BLOCK", "B2")
    + part_of("RES", "R9")
    + "(net SIG (joined (portRef IN (instanceRef B1))))"
    + "(net LINK (joined (portRef OUT (instanceRef B1)) (portRef IN (instanceRef B2))))"
    + "(net END (joined (portRef OUT (instanceRef B2)) (portRef A (instanceRef R9))))"
)


def test_a_shared_cell_in_two_places() -> None:
    design = read(top(TWO_BLOCKS, cells=BLOCK))
    assert connections(design) == {
        "SIG": {"B1/R1.1"},
        "LINK": {"B1/C1.2", "B2/R1.1"},
        "END": {"B2/C1.2", "R9.1"},
        "B1/MID": {"B1/R1.2", "B1/C1.1"},
        "B2/MID": {"B2/R1.2", "B2/C1.1"},
    }
    assert [(part.refdes, part.path) for part in design.parts] == [
        ("R9", ()),
        ("B1/R1", ("B1",)),
        ("B1/C1", ("B1",)),
        ("B2/R1", ("B2",)),
        ("B2/C1", ("B2",)),
    ]
    link = design.net("B2/IN")
    assert link is not None
    assert link.name == "LINK"


def test_a_block_used_once_keeps_plain_names_and_answers_to_the_path() -> None:
    contents = part_of("BLOCK", "B1") + "(net SIG (joined (portRef IN (instanceRef B1))))"
    design = read(top(contents, cells=BLOCK))
    assert connections(design) == {"SIG": {"R1.1"}, "MID": {"R1.2", "C1.1"}, "OUT": {"C1.2"}}
    net = design.net("B1/MID")
    assert net is not None
    assert net.name == "MID"
    found = design.pin("B1/C1.B")
    assert found is not None
    assert (found[0].refdes, found[1].net) == ("C1", "OUT")
