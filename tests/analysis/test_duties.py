"""Circuits that everyone draws (common practice), and the duty of each capacitor in them."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reactance.analysis.duties import Assigned, BriefedPath, duties, without_brief
from reactance.analysis.net_kinds import classify_nets
from reactance.analysis.report import DutyKind
from reactance.analysis.topology import Branch, BranchKind, Terminal, Topology, nets_between, prefix_of

KINDS: dict[str, BranchKind] = {"C": "capacitor", "R": "resistor", "L": "inductor", "FB": "bead"}


def circuit(text: str, amplifiers: tuple[tuple[str, str, str], ...] = ()) -> Topology:
    """A circuit from lines such as `R1 A B` and `U1.3=IN+>input AMP`."""
    branches: list[Branch] = []
    terminals: list[Terminal] = []
    for line in filter(None, map(str.strip, text.splitlines())):
        first, *nets = line.split()
        pin = re.fullmatch(r"(?P<refdes>\w+)\.(?P<number>\w+)(?:=(?P<name>[^>]*))?(?:>(?P<direction>\w+))?", first)
        if pin:
            refdes = pin["refdes"]
            name, direction = pin["name"] or "", pin["direction"] or ""
            terminals += [Terminal(refdes, prefix_of(refdes), pin["number"], name, direction, net) for net in nets]
        else:
            branches.append(Branch(first, KINDS[prefix_of(first)], None, nets[0], nets[1]))
    names = dict.fromkeys([n for b in branches for n in (b.a, b.b)] + [t.net for t in terminals])
    kinds = {name: found.kind for name, found in classify_nets(names).items()}
    return Topology(tuple(branches), tuple(terminals), kinds, amplifiers)


def found(text: str, **others: object) -> dict[str, Assigned]:
    return {item.refdes: item for item in duties(circuit(text), **others)}  # type: ignore[arg-type]


CASES: dict[str, tuple[str, DutyKind, str]] = {
    "a rail to ground": ("C1 +3V3 GND", "decoupling", "+3V3"),
    "a rail of unknown voltage": ("C1 VBAT AGND", "decoupling", "VBAT"),
    "between two rails": ("C1 +12V -12V", "decoupling", "-12V"),
    "between two grounds": ("C1 AGND CHASSIS", "unassigned", "CHASSIS"),
    "both ends together": ("C1 A A", "unassigned", "A"),
    "an RC to an input": ("J1.1 RAW\nR1 RAW ADC\nC1 ADC GND\nU1.5=PA0 ADC", "filter", "R1"),
    "an LC": ("L1 A B\nC1 B GND\nU1.5 B", "filter", "L1"),
    "behind a bead": ("FB1 A B\nC1 B GND\nU1.5 B", "filter", "FB1"),
    "on a divider": ("R1 +5V MID\nR2 MID GND\nC1 MID GND", "filter", "R1"),
    "to a rail": ("R1 RAW ADC\nC1 ADC +5V\nU1.5 ADC", "filter", "R1"),
    "in series between two bias points": (
        "J1.1 LINE\nR1 LINE GND\nC1 LINE AMP\nR2 AMP VMID\nU1.3=+ AMP",
        "coupling",
        "R2",
    ),
    "a far side with no DC path": ("J1.1 LINE\nC1 LINE AMP\nU1.3=+ AMP", "coupling", "U1.3"),
    "one side left open": ("U1.1=OUT A\nC1 A B", "unassigned", "B"),
    "across a resistor in a signal": ("R1 A B\nC1 A B\nU1.3 B\nJ1.1 A", "filter", "R1"),
    "over a bridged T": ("R1 A M\nR2 M B\nC1 A B\nU1.3 B\nJ1.1 A", "filter", "bridges"),
    "across a differential input": (
        "R1 S_P AINP\nR2 S_N AINN\nC1 AINP AINN\nU1.1=AINP AINP\nU1.2=AINN AINN",
        "filter",
        "pair",
    ),
    "around an amplifier": (
        "R1 IN M\nR2 M OUT\nC1 M OUT\nU1.1=OUT>output OUT\nU1.2=IN->input M",
        "feedback",
        "R2",
    ),
    "a leg that sets the gain": ("R1 M OUT\nR2 M L\nC1 L GND\nU1.1=OUT>output OUT\nU1.2=IN- M", "feedback", "R2"),
    "the same leg, capacitor first": (
        "R1 M OUT\nC1 M L\nR2 L VREF_2V5\nU1.1=OUT>output OUT\nU1.2=IN- M",
        "feedback",
        "R2",
    ),
    "into an inverting stage": (
        "J1.1 A\nC1 A L\nR2 L M\nR1 M OUT\nU1.1=OUT>output OUT\nU1.2=IN- M",
        "coupling",
        "J1.1",
    ),
    "an integrator": ("R1 IN M\nC1 M OUT\nU1.1=OUT>output OUT\nU1.2=IN->input M", "feedback", "inverting"),
    "around pins without names": ("R1 IN M\nR2 M OUT\nC1 M OUT\nU1.1 OUT\nU1.2 M", "feedback", "R2"),
    "an active filter around a follower": (
        "J1.1 A\nR1 A X\nR2 X P\nC1 X OUT\nU8.5=INB_P P\nU8.6=INB_N OUT\nU8.7=OUTB OUT\nU8.1=OUTA Z",
        "feedback",
        "same amplifier",
    ),
    "from one stage over a resistor to the next": (
        "U8.1=OUTA A\nC1 A X\nR1 X P\nU8.5=INB_P P\nU8.7=OUTB Z",
        "coupling",
        "U8.1",
    ),
    "an integrator in a package of two": (
        "C1 M O\nR1 A M\nU8.2=INA- M\nU8.1=OUTA O\nU8.7=OUTB Z\nJ1.1 A",
        "feedback",
        "inverting",
    ),
    "from one stage to the next in one package": (
        "U1.1=OUTA>output A\nC1 A B\nR1 B VMID\nU1.5=INB+>input B",
        "coupling",
        "R1",
    ),
    "into a differentiator in one package": (
        "U1.1=OUTA>output A\nC1 A B\nR1 B D\nU1.6=INB->input B\nU1.7=OUTB>output D",
        "coupling",
        "R1",
    ),
    "over a regulator's upper resistor": ("R1 +5V N1\nR2 N1 GND\nC1 +5V N1\nU1.4=FB N1", "feedback", "U1.4"),
    "at a compensation pin": ("R1 N1 N2\nC1 N2 GND\nU1.3=COMP N1", "feedback", "U1.3"),
    "straight at a compensation pin": ("C1 N1 GND\nU1.3=ITH N1", "feedback", "U1.3"),
    "at a crystal": ("Y1.1 XI\nY1.2 XO\nC1 XI GND\nC2 XO GND\nU1.1=XIN XI\nU1.2=XOUT XO", "load", "Y1.1"),
    "a reset": ("R1 +3V3 NRST\nC1 NRST GND\nU1.7=NRST NRST", "timing", "R1"),
    "a reset by the net's name": ("R1 +3V3 MCU_RESET\nC1 MCU_RESET GND\nU1.7 MCU_RESET", "timing", "MCU_RESET"),
    "a soft start": ("C1 N7 GND\nU1.7=SS/TR N7", "timing", "U1.7"),
    "a timer": ("R1 +5V N1\nC1 N1 GND\nU1.6=THRES N1\nU1.2=TRIG N1", "timing", "R1"),
    "a monostable": ("C1 N1 N2\nR1 N2 +5V\nU1.14=CEXT N1\nU1.15=RCEXT N2", "timing", "U1.14"),
    "a delayed enable": ("R1 +5V N1\nC1 N1 GND\nU1.3=EN N1", "timing", "U1.3"),
    "a snubber at a switch node": ("U1.2=SW SW\nL1 SW +3V3\nC1 SW M\nR1 M GND", "snubber", "R1"),
    "a snubber, resistor first": ("U1.2=SW N1\nL1 N1 +3V3\nR1 N1 M\nC1 M GND", "snubber", "R1"),
    "a snubber over an inductor": ("L1 A B\nR1 A M\nC1 M B\nJ1.1 A\nJ1.2 B", "snubber", "L1"),
    "a snubber over a transistor": ("Q1.1=D N1\nQ1.2=S GND\nR1 N1 M\nC1 M GND\nJ1.1 N1", "snubber", "Q1"),
    "a damper over a supply": ("C1 +12V M\nR1 M GND", "snubber", "R1"),
    "a bootstrap": ("U1.1=BST N1\nU1.2=SW N2\nC1 N1 N2\nL1 N2 +5V", "decoupling", "U1.1"),
    "a charge pump": ("U1.1=C1+ N1\nU1.2=C1- N2\nC1 N1 N2", "unassigned", "charge pump"),
    "a supply pin behind a bead": ("FB1 +3V3 N1\nC1 N1 GND\nU1.9=VDDA N1", "decoupling", "U1.9"),
    "an inner regulator": ("C1 N1 GND\nU1.9=VCAP N1", "decoupling", "U1.9"),
    "a regulator's input": ("C1 N1 GND\nU1.1=VIN N1\nU1.3=EN N1\nU1.5=VOUT +3V3", "decoupling", "U1.1"),
    "straight across a connector": ("J1.1 N1\nC1 N1 GND", "unassigned", "J1.1"),
    "alone on its net": ("C1 N1 GND", "unassigned", "nowhere"),
    "a tank": ("L1 N1 GND\nC1 N1 GND\nJ1.1 N1", "filter", "L1"),
    "an emitter's bypass": ("Q1.3=E N1\nR1 N1 GND\nC1 N1 GND", "unassigned", "R1"),
}


@pytest.mark.parametrize(("text", "kind", "word"), CASES.values(), ids=CASES.keys())
def test_duty_and_reason(text: str, kind: DutyKind, word: str) -> None:
    item = found(text)["C1"]
    assert item.kind == kind, item.because
    assert word in item.because


@pytest.mark.parametrize(("text", "kind", "word"), CASES.values(), ids=CASES.keys())
def test_ends_exchanged_and_order_reversed_make_no_difference(text: str, kind: DutyKind, word: str) -> None:
    whole = circuit(text)
    turned = Topology(
        tuple(Branch(b.refdes, b.kind, b.value, b.b, b.a) for b in reversed(whole.branches)),
        whole.terminals[::-1],
        whole.kinds,
    )
    assert {d.refdes: d.kind for d in duties(turned)} == {d.refdes: d.kind for d in duties(whole)}


@pytest.mark.parametrize(("text", "kind", "word"), CASES.values(), ids=CASES.keys())
def test_the_brief_overrules_everything(text: str, kind: DutyKind, word: str) -> None:
    item = found(text, overrules={"C1": "timing"})["C1"]
    assert (item.kind, "brief" in item.because) == ("timing", True)


def test_an_oscillator_with_a_supply_has_no_load_capacitor() -> None:
    text = "Y1.1=EN +3V3\nY1.2=GND GND\nY1.3=OUT CK\nY1.4=VDD +3V3\nC1 CK GND\nR1 CK MCK\nU1.2 MCK"
    assert found(text)["C1"].kind == "filter"


SALLEN_KEY = "J1.1 RAW\nR1 RAW X\nR2 X P\nC1 X OUT\nC2 P GND\nU1.1=OUT>output OUT\nU1.3=+>input P\nU2.1 OUT"
FOLLOWER = (("P", "OUT", "OUT"),)


def test_a_briefed_filter_claims_its_capacitors_also_around_an_amplifier() -> None:
    path = BriefedPath("anti-alias", "filter", "RAW", "OUT")
    given = duties(circuit(SALLEN_KEY, FOLLOWER), [path])
    assert {item.refdes: (item.kind, item.id) for item in given} == {
        "C1": ("filter", "filter:anti-alias"),
        "C2": ("filter", "filter:anti-alias"),
    }
    assert all("anti-alias" in item.because for item in given)


def test_without_a_brief_the_same_capacitor_is_feedback() -> None:
    assert duties(circuit(SALLEN_KEY, FOLLOWER))[0].kind == "feedback"


def test_what_the_brief_says_can_be_undone() -> None:
    topology = circuit(SALLEN_KEY + "\nC3 RAW GND\nC4 +3V3 GND", FOLLOWER)
    briefed = duties(topology, [BriefedPath("anti-alias", "filter", "RAW", "OUT")], {"C4": "timing"})
    alone = tuple(found.kind for found in duties(topology))
    assert without_brief(topology, briefed) == alone
    assert tuple(found.kind for found in briefed) != alone


def test_a_briefed_coupling_claims_what_blocks_dc_and_nothing_else() -> None:
    text = """
        J1.1 LINE
        R1 LINE A
        C1 A GND
        C2 A B
        R3 B VMID
        R4 B M
        R5 M OUT
        C3 M OUT
    """
    path = BriefedPath("line in", "coupling", "LINE", "OUT")
    given = {d.refdes: d.kind for d in duties(circuit(text, (("P", "M", "OUT"),)), [path])}
    assert given == {"C1": "filter", "C2": "coupling", "C3": "feedback"}


def test_a_stub_belongs_to_the_briefed_filter_it_hangs_on() -> None:
    text = "J1.1 RAW\nR1 RAW ADC\nR2 ADC Z\nC1 Z GND\nU1.1 ADC\nR3 ADC FAR\nC2 FAR GND\nU2.1 FAR"
    given = {d.refdes: d.id for d in duties(circuit(text), [BriefedPath("f", "filter", "RAW", "ADC")])}
    assert given == {"C1": "filter:f", "C2": "duty:C2"}


def test_capacitors_of_one_rail_share_their_duty() -> None:
    given = found("C1 +3V3 GND\nC2 GND +3V3\nC3 +5V GND\nC4 A B")
    assert [given[name].id for name in ("C1", "C2", "C3", "C4")] == ["rail:+3V3", "rail:+3V3", "rail:+5V", "duty:C4"]


# -- nets between


def test_nets_between_follow_simple_paths_alone() -> None:
    whole = circuit("R1 A B\nR2 B D\nR3 B STUB\nC1 STUB GND\nR4 A +5V\nR5 +5V D\nC2 A E\nC3 E D")
    assert nets_between(whole, "A", "D") == {"A", "B", "D", "E"}
    assert nets_between(whole, "A", "STUB") == {"A", "B", "D", "E", "STUB"}
    assert nets_between(whole, "A", "A") == {"A"}


def test_nets_between_where_only_ground_joins() -> None:
    assert nets_between(circuit("R1 A GND\nR2 B GND"), "A", "B") == frozenset()


EDGES = st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)), max_size=12)


@given(EDGES)
def test_nets_between_agree_with_walking_every_path(edges: list[tuple[int, int]]) -> None:
    """Against the definition: every simple path, found by exhaustive search."""
    whole = Topology(
        tuple(Branch(f"R{k}", "resistor", None, f"N{a}", f"N{b}") for k, (a, b) in enumerate(edges)), (), {}
    )
    joined: dict[int, set[int]] = {}
    for a, b in edges:
        joined.setdefault(a, set()).add(b)
        joined.setdefault(b, set()).add(a)
    reached: set[int] = set()

    def walk(path: list[int]) -> None:
        if path[-1] == 1:
            reached.update(path)
            return
        for onward in joined.get(path[-1], ()):
            if onward not in path:
                walk([*path, onward])

    walk([0])
    assert nets_between(whole, "N0", "N1") == {f"N{net}" for net in reached}


def test_the_class_letters_of_a_designator() -> None:
    assert [prefix_of(name) for name in ("C12", "FB3", "probe/U3A", "12", "", "c4")] == ["C", "FB", "U", "", "", "C"]
