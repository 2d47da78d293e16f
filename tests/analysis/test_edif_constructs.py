"""EDIF 2 0 0 constructs, one hand-written file each from the standard's grammar (ANSI/EIA-548-1988).

The connectivity that each must give is written out by hand.
"""

from __future__ import annotations

from reactance.analysis.design import Design
from reactance.analysis.exports.edif import read_edif

HEAD = "(edif made (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))"
LEAVES = """
 (external PARTS (edifLevel 0) (technology (numberDefinition (scale 1 (e 1 -12) (unit CAPACITANCE))))
  (cell CAP (cellType GENERIC) (view V (viewType NETLIST)
   (interface (port P1 (designator "1")) (port P2 (designator "2")) (designator "C?"))))
  (cell HUB (cellType GENERIC) (view V (viewType NETLIST)
   (interface (port (array (rename D "D[3:0]") 4) (direction OUTPUT)) (port EN (designator "9") (direction INPUT))
    (designator "U?"))))
  (cell PLUG (cellType GENERIC) (view V (viewType NETLIST)
   (interface (portBundle PAIR (listOfPorts (port P (designator "1")) (port N (designator "2"))))
    (port SH (designator "3"))
    (designator "J?")))))
"""


def cap(name: str, more: str = "") -> str:
    return f"(instance {name} (viewRef V (cellRef CAP (libraryRef PARTS))) {more})"


def hub(name: str, more: str = "") -> str:
    return f"(instance {name} (viewRef V (cellRef HUB (libraryRef PARTS))) {more})"


def plug(name: str) -> str:
    return f"(instance {name} (viewRef V (cellRef PLUG (libraryRef PARTS))))"


def read(text: str) -> Design:
    return read_edif(text.encode(), "board.edn")


def board(
    contents: str, *, interface: str = "", cells: str = "", view: str = "NETLIST", more: str = ""
) -> Design:
    return read(
        f"{HEAD} {LEAVES} (library MAIN (edifLevel 0) (technology (numberDefinition)) {cells}"
        f" (cell TOP (cellType GENERIC) (view V (viewType {view}) (interface {interface}) (contents {contents}))"
        f" {more}))"
        " (design board (cellRef TOP (libraryRef MAIN))))"
    )


def nets(design: Design) -> dict[str, set[str]]:
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


def messages(design: Design) -> list[str]:
    return [problem.message for problem in design.problems]


def test_arrays_and_members() -> None:
    design = board(
        hub("U1")
        + "".join(cap(f"C{n}") for n in range(4))
        + '(net (rename X3 "D3") (joined (portRef (member D 0) (instanceRef U1)) (portRef P1 (instanceRef C3))))'
        + "(net X0 (joined (portRef (member D 3) (instanceRef U1)) (portRef P1 (instanceRef C0))))"
    )
    assert nets(design) == {"D3": {"U1.D[3]", "C3.1"}, "X0": {"U1.D[0]", "C0.1"}}
    u1 = design.part("U1")
    assert u1 is not None
    assert [(pin.number, pin.direction) for pin in u1.pins] == [
        ("D[3]", "output"),
        ("D[2]", "output"),
        ("D[1]", "output"),
        ("D[0]", "output"),
        ("9", "input"),
    ]
    assert messages(design) == []


def test_a_net_array_joins_bit_by_bit() -> None:
    design = board(
        hub("U1")
        + hub("U2")
        + cap("C1")
        + '(net (array (rename B "BUS<0:3>") 4) (joined (portRef D (instanceRef U1)) (portRef D (instanceRef U2))))'
        + "(net BUS_2 (joined (portRef (member D 2) (instanceRef U1)) (portRef P1 (instanceRef C1))))"
    )
    assert nets(design) == {
        "BUS<0>": {"U1.D[3]", "U2.D[3]"},
        "BUS<1>": {"U1.D[2]", "U2.D[2]"},
        "BUS<2>": {"U1.D[1]", "U2.D[1]", "C1.1"},
        "BUS<3>": {"U1.D[0]", "U2.D[0]"},
    }
    assert len(messages(design)) == 1  # the pin in two nets
    net = design.net("BUS_2")
    assert net is not None
    assert net.name == "BUS<2>"


def test_port_bundles_and_port_lists() -> None:
    design = board(
        plug("J1")
        + plug("J2")
        + cap("C1")
        + cap("C2")
        + "(net (array LINE 2) (joined (portRef PAIR (instanceRef J1))"
        + " (portList (portRef P1 (instanceRef C1)) (portRef P1 (instanceRef C2)))))"
        + "(net LONE (joined (portRef N (portRef PAIR (instanceRef J2))) (portRef P2 (instanceRef C2))))"
        + "(net SHIELD (joined (portList (portRef SH (instanceRef J1)) (portRef SH (instanceRef J2)))"
        + " (portRef P2 (instanceRef C1))))"
    )
    assert nets(design) == {
        "LINE[0]": {"J1.1", "C1.1"},
        "LINE[1]": {"J1.2", "C2.1"},
        "LONE": {"J2.2", "C2.2"},
        "SHIELD": {"J1.3", "J2.3", "C1.2"},
    }
    assert messages(design) == []


def test_net_bundles_and_nested_nets() -> None:
    design = board(
        cap("C1")
        + cap("C2")
        + cap("C3")
        + "(netBundle DIFF (listOfNets (net DP (joined (portRef P1 (instanceRef C1))))"
        + " (net DN (joined (portRef P2 (instanceRef C1))))))"
        + "(net OUTER (joined (portRef P1 (instanceRef C2)))"
        + " (net INNER (joined (portRef P1 (instanceRef C3))) (net INMOST (joined (portRef P2 (instanceRef C3))))))"
    )
    assert nets(design) == {"DP": {"C1.1"}, "DN": {"C1.2"}, "OUTER": {"C2.1", "C3.1", "C3.2"}}
    outer = design.net("INMOST")
    assert outer is not None
    assert outer.name == "OUTER"


def test_global_ports_tie_blocks_without_wires() -> None:
    block = (
        "(cell BLOCK (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents "
        + cap("C1")
        + "(net VDD (joined (globalPortRef VCC) (portRef P1 (instanceRef C1))))"
        + "(net own (joined (portRef P2 (instanceRef C1)))))))"
    )
    contents = (
        "(instance B1 (viewRef V (cellRef BLOCK))) (instance B2 (viewRef V (cellRef BLOCK)))"
        + cap("C9")
        + '(net (rename N5 "+5V") (joined (globalPortRef VCC) (portRef P1 (instanceRef C9))))'
    )
    design = board(contents, cells=block)
    assert nets(design) == {
        "+5V": {"B1/C1.1", "B2/C1.1", "C9.1"},
        "B1/own": {"B1/C1.2"},
        "B2/own": {"B2/C1.2"},
    }
    vcc = design.net("VCC")
    assert vcc is not None
    assert vcc.name == "+5V"


def test_pages_and_off_page_connectors() -> None:
    design = board(
        "(offPageConnector OPC)"
        + "(page P1 (pageSize (rectangle (pt 0 0) (pt 100 100))) "
        + cap("I1", '(designator "C1")')
        + '(net (rename N1 "SUPPLY") (joined (portRef P1 (instanceRef I1))))'
        + "(net A (joined (portRef P2 (instanceRef I1)) (portRef OPC))) (commentGraphics (figure X (dot (pt 1 1)))))"
        + "(page P2 "
        + cap("I1", '(designator "C2")')
        + '(net (rename N7 "SUPPLY") (joined (portRef P1 (instanceRef I1))))'
        + "(net B (joined (portRef P2 (instanceRef I1)) (portRef OPC))))"
        + "(page P3 "
        + cap("I1", '(designator "C3")')
        + '(offPageConnector (rename O3 "LINK")) (net N1 (joined (portRef P1 (instanceRef I1)) (portRef O3))))'
        + "(page P4 "
        + cap("I1", '(designator "C4")')
        + '(offPageConnector (rename O4 "LINK")) (net N2 (joined (portRef P1 (instanceRef I1)) (portRef O4))))',
        view="SCHEMATIC",
    )
    assert nets(design) == {"SUPPLY": {"C1.1", "C2.1"}, "A": {"C1.2", "C2.2"}, "N1": {"C3.1", "C4.1"}}
    assert messages(design) == []


def test_port_instances_override_pin_numbers() -> None:
    design = board(
        cap("C1", '(portInstance P1 (designator "A")) (portInstance P2 (designator (stringDisplay "K")))')
        + hub("U1", '(portInstance (member D 3) (designator "17"))')
        + "(net N (joined (portRef P1 (instanceRef C1)) (portRef (member D 3) (instanceRef U1))))"
        + "(net M (joined (portRef P2 (instanceRef C1))))"
    )
    assert nets(design) == {"N": {"C1.A", "U1.17"}, "M": {"C1.K"}}
    found = design.pin("C1.P2")
    assert found is not None
    assert found[1].number == "K"


def test_property_values_of_every_type() -> None:
    design = board(
        cap(
            "C1",
            '(property (rename PART_NUMBER "Part Number") (string "GH-1"))'
            "(property N (integer -47)) (property X (number (e 1 -7))) (property Y (number 2))"
            "(property B (boolean (true))) (property B0 (boolean (false)))"
            "(property CAPACITY (number (e 47 -1)) (unit CAPACITANCE))"
            "(property R (minomax (mnm 90 100 110)))"
            "(property HALF (miNoMax (mnm (e 9 1) (undefined) (e 11 1))))"
            "(property SHOWN (integer (integerDisplay 5 (display D))))"
            '(property BOTH (string "a" "b"))',
        )
    )
    assert dict(design.parts[0].attributes) == {
        "Part Number": "GH-1",
        "N": "-47",
        "X": "1e-7",
        "Y": "2",
        "B": "true",
        "B0": "false",
        "CAPACITY": "4.7 F",
        "R minimum": "90",
        "R": "100",
        "R maximum": "110",
        "HALF minimum": "90",
        "HALF maximum": "110",
        "SHOWN": "5",
        "BOTH": "a, b",
    }


def test_cell_properties_are_defaults_in_the_units_of_their_library() -> None:
    cells = (
        '(cell C100 (cellType GENERIC) (property VALUE (string "100n")) (property (rename V_R "Rating") (string "50V"))'
        " (view V (viewType NETLIST) (interface (port P1) (parameter SIZE (number 100) (unit CAPACITANCE)))))"
    )
    text = (
        f"{HEAD} (library MAIN (edifLevel 0)"
        f" (technology (numberDefinition (scale 1 (e 1 -12) (unit CAPACITANCE)))) {cells}"
        " (cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents"
        '  (instance C1 (viewRef V (cellRef C100)) (property VALUE (string "10n")))'
        "  (instance C2 (viewRef V (cellRef C100)) (parameterAssign SIZE (number 220) (unit CAPACITANCE)))))))"
        " (design board (cellRef TOP (libraryRef MAIN))))"
    )
    c1, c2 = read(text).parts
    assert dict(c1.attributes) == {"VALUE": "10n", "Rating": "50V", "SIZE": "1e-10 F"}
    assert dict(c2.attributes) == {"VALUE": "100n", "Rating": "50V", "SIZE": "2.2e-10 F"}


def test_external_libraries_and_forward_references() -> None:
    text = (
        f"{HEAD} (library MAIN (edifLevel 0) (technology (numberDefinition))"
        " (cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents "
        + "(instance B1 (viewRef V (cellRef LATER)))"
        + cap("C1")
        + "(net N (joined (portRef X (instanceRef B1)) (portRef P1 (instanceRef C1)))))))"
        + "(cell LATER (cellType GENERIC) (view V (viewType NETLIST) (interface (port X)) (contents "
        + cap("C2")
        + "(net X (joined (portRef X) (portRef P2 (instanceRef C2))))))))"
        + LEAVES
        + "(design board (cellRef TOP (libraryRef MAIN))))"
    )
    design = read(text)
    assert nets(design) == {"N": {"C1.1", "C2.2"}}
    assert design.parts[1].path == ("B1",)
    assert messages(design) == []


def test_designs_several_or_none() -> None:
    def cell(name: str, inside: str) -> str:
        return f"(cell {name} (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents {inside})))"

    library = "(library MAIN (edifLevel 0) (technology (numberDefinition)) " + "".join(
        (
            cell("SUB", cap("C1")),
            cell("WHOLE", "(instance B (viewRef V (cellRef SUB)))" + cap("C2")),
            cell("LAST", "(instance B (viewRef V (cellRef SUB)))" + cap("C3")),
        )
    )
    none = read(f"{HEAD} {LEAVES} {library}))")
    assert (none.name, [part.refdes for part in none.parts]) == ("LAST", ["C3", "C1"])
    several = read(
        f"{HEAD} {LEAVES} {library}) (design one (cellRef WHOLE (libraryRef MAIN)))"
        " (design two (cellRef SUB (libraryRef MAIN))))"
    )
    assert (several.name, [part.refdes for part in several.parts]) == ("one", ["C2", "C1"])
    assert messages(several) == ["2 designs in one file; one is read"]


def test_back_annotation_through_the_hierarchy() -> None:
    block = (
        "(cell BLOCK (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents "
        + cap("I1")
        + "(net n (joined (portRef P1 (instanceRef I1)))))))"
    )
    design = board(
        "(instance B1 (viewRef V (cellRef BLOCK))) (instance B2 (viewRef V (cellRef BLOCK)))",
        cells=block,
        more='(viewMap (instanceBackAnnotate (instanceRef I1 (instanceRef B1)) (designator "C11"))'
        ' (instanceBackAnnotate (instanceRef I1 (instanceRef B2)) (designator "C21"))'
        ' (portBackAnnotate (portRef P1 (instanceRef I1 (instanceRef B2))) (designator "7")))',
    )
    assert nets(design) == {"B1/n": {"C11.1"}, "B2/n": {"C21.7"}}


def test_comments_and_user_data_anywhere() -> None:
    note = '(comment "(net ""; )") (userData X (net (joined)))'.replace('""', "")
    design = board(
        f"(instance {note} C1 {note} (viewRef {note} V (cellRef CAP {note} (libraryRef PARTS))) {note})"
        f"(net {note} N {note} (joined {note} (portRef {note} P1 (instanceRef {note} C1)) {note}) {note}) {note}",
    )
    assert nets(design) == {"N": {"C1.1"}}
    assert messages(design) == []


def test_keyword_aliases_of_level_one() -> None:
    text = (
        "(edif made (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 1) (keywordAlias wire net)"
        " (keywordAlias at instanceRef) (keywordAlias lib library)) "
        + LEAVES
        + "(lib MAIN (edifLevel 0) (technology (numberDefinition))"
        " (cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents "
        + cap("C1")
        + "(wire N (joined (portRef P1 (at C1))))))))"
        + "(design board (cellRef TOP (libraryRef MAIN))))"
    )
    assert nets(read(text)) == {"N": {"C1.1"}}


def test_arrays_of_instances() -> None:
    design = board(
        '(instance (array (rename R "R[1:2]") 2) (viewRef V (cellRef CAP (libraryRef PARTS))))'
        + plug("J1")
        + "(net (array X 2) (joined (portRef P1 (instanceRef R)) (portRef PAIR (instanceRef J1))))"
        + "(net G (joined (portRef P2 (instanceRef (member R 0))) (portRef P2 (instanceRef (member R 1)))))"
    )
    assert nets(design) == {
        "X[0]": {"R[1].1", "J1.1"},
        "X[1]": {"R[2].1", "J1.2"},
        "G": {"R[1].2", "R[2].2"},
    }


def test_sections_of_one_package_are_one_part() -> None:
    cells = "".join(
        f'(cell G{n} (cellType GENERIC) (view V (viewType NETLIST) (interface (port A (designator "{a}"))'
        f' (port Y (designator "{y}")) (port VCC (designator "14")))))'
        for n, a, y in ((1, 1, 2), (2, 3, 4))
    )
    design = board(
        '(instance I1 (viewRef V (cellRef G1)) (designator "U1") (property VALUE (string "gate")))'
        '(instance I2 (viewRef V (cellRef G2)) (designator "U1"))'
        "(net A (joined (portRef A (instanceRef I1))))"
        "(net M (joined (portRef Y (instanceRef I1)) (portRef A (instanceRef I2))))"
        "(net P (joined (portRef VCC (instanceRef I1)) (portRef VCC (instanceRef I2))))",
        cells=cells,
    )
    assert nets(design) == {"A": {"U1.1"}, "M": {"U1.2", "U1.3"}, "P": {"U1.14"}}
    assert [(part.refdes, dict(part.attributes)) for part in design.parts] == [("U1", {"VALUE": "gate"})]


def test_supply_symbols_are_no_parts() -> None:
    cells = (
        "(cell GND (cellType GENERIC) (view V (viewType SCHEMATIC) (interface (port GND))))"
        "(cell RIP (cellType RIPPER) (view V (viewType NETLIST) (interface (port X) (port Y)"
        " (joined (portRef X) (portRef Y)))))"
    )
    design = board(
        "(instance GND_1 (viewRef V (cellRef GND))) (instance I7 (viewRef V (cellRef RIP)))"
        + cap("C1")
        + "(net GND (joined (portRef GND (instanceRef GND_1)) (portRef P1 (instanceRef C1))))"
        + "(net A (joined (portRef P2 (instanceRef C1)) (portRef X (instanceRef I7))))"
        + "(net B (joined (portRef Y (instanceRef I7))))",
        cells=cells,
    )
    assert [part.refdes for part in design.parts] == ["C1"]
    assert nets(design) == {"GND": {"C1.1"}, "A": {"C1.2"}}


def test_contents_in_another_view_than_the_one_referred_to() -> None:
    block = (
        "(cell BLOCK (cellType GENERIC)"
        " (view SYM (viewType SCHEMATIC) (interface (port OUT) (port IN) (symbol (figure F (path)))))"
        " (view NET (viewType NETLIST) (interface (port IN) (port OUT)) (contents "
        + cap("C1")
        + "(net IN (joined (portRef IN) (portRef P1 (instanceRef C1))))"
        + "(net OUT (joined (portRef OUT) (portRef P2 (instanceRef C1)))))))"
    )
    design = board(
        "(instance B (viewRef SYM (cellRef BLOCK))) (net A (joined (portRef IN (instanceRef B))))"
        " (net Z (joined (portRef OUT (instanceRef B))))",
        cells=block,
    )
    assert nets(design) == {"A": {"C1.1"}, "Z": {"C1.2"}}


def test_nets_go_on_over_pages_by_visible_name_or_identifier() -> None:
    def page(number: int, net: str) -> str:
        inside = cap("I", f'(designator "C{number}")') + f"(net {net} (joined (portRef P1 (instanceRef I))))"
        return f"(page P{number} {inside})"

    design = board(
        page(1, "GND")
        + page(2, '(rename N9 "GND")')
        + page(3, "gnd")
        + page(4, '(rename GND "gnd2")')
        + page(5, '(rename A "+5v")')
        + page(6, '(rename A "+5V")'),
        view="SCHEMATIC",
    )
    assert nets(design) == {
        "GND": {"C1.1", "C2.1", "C3.1"},
        "gnd2": {"C4.1"},
        "+5v": {"C5.1"},
        "+5V": {"C6.1"},
    }
    assert messages(design) == []
