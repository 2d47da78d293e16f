"""IPC-2581: hand-written files with what they say written out by hand, and what is refused."""

from __future__ import annotations

import pytest
from writers.designs import design_of
from writers.flat import ipc2581

from reactance.analysis.design import Design, InputError, Part, Pin
from reactance.analysis.exports import ExportFiles, read_export

BOM = """<Bom name="bill"><BomHeader assembly="logger" revision="1"><StepRef name="main"/></BomHeader>
<BomItem OEMDesignNumberRef="CAP-1" quantity="2" category="ELECTRICAL" description="chip capacitor">
<RefDes name="C1" packageRef="0603" populate="true" layerRef="TOP"/>
<RefDes name="C2" packageRef="0603" populate="false" layerRef="TOP"/>
<Characteristics category="ELECTRICAL">
<Textual textualCharacteristicName="VALUE" textualCharacteristicValue="100 nF"/>
<Measured measuredCharacteristicName="RATED VOLTAGE" measuredCharacteristicValue="16" engineeringUnitOfMeasure="VOLTS"/>
<Enumerated enumeratedCharacteristicName="DIELECTRIC" enumeratedCharacteristicValue="X7R"/>
<Ranged rangedCharacteristicName="TEMPERATURE" rangedCharacteristicLowerValue="-55" rangedCharacteristicUpperValue="125"
 engineeringUnitOfMeasure="CELSIUS"/>
</Characteristics></BomItem></Bom>"""

STEP = """<Step name="main">
<Package name="0603"><Pin number="1" type="SURFACE"/><Pin number="2" name="K" type="SURFACE"/></Package>
<Component refDes="C1" packageRef="0603" part="CAP-1" layerRef="TOP">
<Xform rotation="90"/><Location x="1.5" y="-2"/></Component>
<Component refDes="C2" packageRef="0603" part="CAP-1" layerRef="L4">
<NonstandardAttribute name="HEIGHT" value="0.9 mm"/></Component>
<LogicalNet name="+3V3"><PinRef componentRef="C1" pin="1"/><PinRef componentRef="C2" pin="1"/></LogicalNet>
<LogicalNet name="GND"><PinRef componentRef="C1" pin="2"/></LogicalNet>
<LayerFeature layerRef="TOP"><Set net="GND">
<Pad><PinRef componentRef="C2" pin="2"/><Location x="9" y="9"/></Pad></Set></LayerFeature>
</Step>"""


def document(
    bom: str = BOM, steps: str = STEP, units: str = "MILLIMETER", head: str = "", revision: str = "B"
) -> bytes:
    """A whole file around a bill of materials and steps."""
    return f"""<?xml version="1.0" encoding="UTF-8"?>{head}
<IPC-2581 revision="{revision}" xmlns="http://webstds.ipc.org/2581">
<Content roleRef="owner"><StepRef name="other"/></Content>{bom}
<Ecad name="e"><CadHeader units="{units}"/><CadData><Layer name="TOP" side="TOP"/><Layer name="L4" side="BOTTOM"/>
{steps}</CadData></Ecad></IPC-2581>""".encode()


def read(data: bytes) -> Design:
    return read_export(ExportFiles(data, "board.xml"))


def connections(design: Design) -> dict[str, set[str]]:
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


@pytest.mark.parametrize("revision", ["B", "C"])
def test_bill_placement_and_nets(revision: str) -> None:
    design = read(document(revision=revision))
    assert connections(design) == {"+3V3": {"C1.1", "C2.1"}, "GND": {"C1.2"}}
    first, second = design.parts
    assert dict(first.attributes) == {
        "description": "chip capacitor",
        "VALUE": "100 nF",
        "RATED VOLTAGE": "16 V",
        "DIELECTRIC": "X7R",
        "TEMPERATURE": "-55 degC to 125 degC",
        "package": "0603",
    }
    assert (first.cell, first.position, first.side) == ("CAP-1", pytest.approx((1.5e-3, -2e-3)), "top")
    assert (second.position, second.side) == (None, "bottom")
    assert second.attributes["populate"] == "false" and second.attributes["HEIGHT"] == "0.9 mm"
    assert [(pin.number, pin.name, pin.net) for pin in second.pins] == [("1", "", "+3V3"), ("2", "K", None)]
    assert design.name == "main"
    assert design.problems == ()


@pytest.mark.parametrize(("units", "metres"), [("MILLIMETER", 1e-3), ("INCH", 25.4e-3), ("MICRON", 1e-6)])
def test_positions_are_in_metres(units: str, metres: float) -> None:
    assert read(document(units=units)).parts[0].position == pytest.approx((1.5 * metres, -2 * metres))


def test_the_board_is_read_and_not_the_panel() -> None:
    panel = '<Step name="panel"><Component refDes="FID1"/><StepRepeat stepRef="main" x="0" y="0"/></Step>'
    net = '<LogicalNet name="A"><PinRef componentRef="X1" pin="1"/></LogicalNet>'
    other = f'<Step name="other"><Component refDes="X1"/>{net}</Step>'
    design = read(document(steps=panel + other + STEP))
    assert [part.refdes for part in design.parts] == ["C1", "C2"]
    assert any("panel" in problem.message and "other" in problem.message for problem in design.problems)


def test_pins_on_no_net_and_parts_only_in_a_net() -> None:
    nets = '<LogicalNet name="No Net"><PinRef componentRef="J1" pin="2"/></LogicalNet>'
    nets += '<LogicalNet name="A"><PinRef componentRef="J1" pin="1"/></LogicalNet>'
    design = read(document(bom="", steps=f'<Step name="s">{nets}</Step>'))
    assert connections(design) == {"A": {"J1.1"}}
    assert {pin.number: pin.net for pin in design.parts[0].pins} == {"1": "A", "2": None}
    assert any("no Bom" in problem.message for problem in design.problems)


def test_pins_referred_to_by_their_names() -> None:
    design = read(document(steps=STEP.replace('componentRef="C1" pin="2"', 'componentRef="C1" pin="K"')))
    assert connections(design)["GND"] == {"C1.2"}
    assert len(design.parts[0].pins) == 2


def test_numbers_from_the_list_of_sources() -> None:
    sources = """<Avl name="a"><AvlItem OEMDesignNumber="CAP-1"><AvlVmpn chosen="true"><AvlMpn name="GH-0603-100N"/>
    <AvlMpn name="GH-SECOND"/></AvlVmpn></AvlItem></Avl></IPC-2581>"""
    design = read(document().replace(b"</IPC-2581>", sources.encode()))
    assert [part.attributes["MPN"] for part in design.parts] == ["GH-0603-100N"] * 2


def test_placement_and_side_survive_writing_and_reading() -> None:
    placed = [
        Part("C1", (Pin("1", "A", "N"),), position=(0.0125, -0.003), side="top"),
        Part("C2", (Pin("1", "A", "N"),), position=(0.0, 0.1), side="bottom"),
        Part("C3", (Pin("1", "A", "N"),)),
    ]
    for part, again in zip(placed, read_export(ipc2581(design_of(placed))).parts, strict=True):
        assert again.side == part.side
        assert again.position == (None if part.position is None else pytest.approx(part.position))


def test_bad_entries_are_listed_and_the_rest_is_kept() -> None:
    more = '<Component part="X"/>\n<Component refDes="C1"/>\n'
    more += '<LogicalNet name="B"><PinRef pin="1"/>\n<PinRef componentRef="C1"/></LogicalNet>\n'
    design = read(document(steps=STEP.replace("<LogicalNet", more + "<LogicalNet", 1)))
    assert connections(design) == {"+3V3": {"C1.1", "C2.1"}, "GND": {"C1.2"}, "B": set()}
    messages = [problem.message for problem in design.problems]
    assert ["without refDes" in messages[0], "second Component C1" in messages[1]] == [True, True]
    assert ["without componentRef" in messages[2], "without pin" in messages[3]] == [True, True]
    assert [problem.where.count(":") for problem in design.problems] == [2, 2, 2, 2]


@pytest.mark.parametrize(
    ("head", "message"),
    [
        ('<!DOCTYPE x [<!ENTITY a "b">]>', "document type"),
        ('<!DOCTYPE x SYSTEM "file:///etc/passwd">', "document type"),
        ('<!DOCTYPE x [<!ENTITY a SYSTEM "http://127.0.0.1/">]>', "document type"),
        ("<!DOCTYPE x [<!ENTITY % a \"<!ENTITY b 'c'>\"> %a;]>", "document type"),
        ("<!DOCTYPE x>", "document type"),
    ],
)
def test_document_types_are_refused_where_they_begin(head: str, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        read(document(head="\n" + head))
    assert (caught.value.place.line, caught.value.remedy != "") == (2, True)


def test_entities_that_nobody_declared_are_an_error() -> None:
    with pytest.raises(InputError, match="undefined entity") as caught:
        read(document(steps='<Step name="&bomb;">\n</Step>'))
    assert caught.value.place.line is not None


def test_the_five_entities_of_xml_and_character_codes_are_read() -> None:
    net = '<LogicalNet name="&lt;A&amp;B&gt;&#181;"><PinRef componentRef="C1" pin="1"/></LogicalNet>'
    assert connections(read(document(bom="", steps=f'<Step name="s">{net}</Step>'))) == {"<A&B>µ": {"C1.1"}}


@pytest.mark.parametrize("cut", [100, 400, 900, 1500])
def test_a_file_cut_off_is_one_error_with_line_and_column(cut: int) -> None:
    with pytest.raises(InputError, match="expected </") as caught:
        read(document()[:cut])
    assert caught.value.place.line is not None and caught.value.place.column is not None
    assert caught.value.remedy


@pytest.mark.parametrize(
    ("data", "message"),
    [
        (b"<schematic/>", "outermost element is <schematic>"),
        (b'<?xml version="1.0" encoding="klingon"?><IPC-2581/>', "encoding"),
        (b'<?xml version="1.0" encoding="idna"?><IPC-2581/>', "encoding"),
        (b'<?xml version="1.0" encoding="utf-7"?><IPC-2581/>', "encoding"),
        (b"<IPC-2581/>", "no Step"),
        (b"<IPC-2581></Bom>", "mismatched tag"),
    ],
)
def test_what_is_no_ipc_2581(data: bytes, message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        read(data)
    assert caught.value.place.line == 1 and caught.value.remedy
