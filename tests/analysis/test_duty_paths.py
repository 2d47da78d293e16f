"""Couplings and filters that a design shows beyond doubt; and those that it does not."""

from __future__ import annotations

import re

import pytest

from reactance.analysis.net_kinds import classify_nets
from reactance.analysis.signal_paths import shown_paths
from reactance.analysis.topology import Branch, BranchKind, Terminal, Topology, prefix_of

KINDS: dict[str, BranchKind] = {"C": "capacitor", "R": "resistor", "L": "inductor", "FB": "bead"}
PIN = re.compile(r"(?P<refdes>\w+)\.(?P<number>\w+)(?:=(?P<name>[^>]*))?(?:>(?P<direction>\w+))?")


def circuit(text: str, amplifiers: tuple[tuple[str, str, str], ...] = ()) -> Topology:
    """A circuit from entries such as `R1 A B` and `U1.3=IN+>input AMP`, parted by semicolons."""
    branches: list[Branch] = []
    terminals: list[Terminal] = []
    for entry in text.split(";"):
        first, *nets = entry.split()
        if pin := PIN.fullmatch(first):
            refdes = pin["refdes"]
            name, way = pin["name"] or "", pin["direction"] or ""
            terminals.append(Terminal(refdes, prefix_of(refdes), pin["number"], name, way, nets[0]))
        else:
            branches.append(Branch(first, KINDS[prefix_of(first)], None, nets[0], nets[1]))
    names = dict.fromkeys([n for b in branches for n in (b.a, b.b)] + [t.net for t in terminals])
    kinds = {name: found.kind for name, found in classify_nets(names).items()}
    return Topology(tuple(branches), tuple(terminals), kinds, amplifiers)


SHOWN = {
    "output to input": ("U1.1=OUT>output A; C1 A B; R1 B VMID; U2.3>input B", ["coupling A>B"]),
    "connector to input": ("J1.1 A; C1 A B; R1 B VMID; U2.3>input B", ["coupling A>B"]),
    "output to connector": ("U1.1>output A; C1 B A; R1 B GND; J1.1 B", ["coupling A>B"]),
    "microphone to a part": ("MK1.1 A; R2 +3V3 A; C1 A B; R1 B VMID; U2.3 B", ["coupling A>B"]),
    "by the names of pins": ("U1.1=VOUT A; C1 A B; R1 B VMID; U2.3=IN+ B", ["coupling A>B"]),
    "over resistors to the ends": (
        "U1.1>output O; R3 O A; C1 A B; R1 B VMID; R2 B I; U2.3>input I",
        ["coupling O>I"],
    ),
    "no farther than a loaded net": (
        "U1.1>output A; C1 A B; R1 B VMID; R2 B D; C2 D GND; R3 D I; U2.3>input I",
        ["coupling A>B"],
    ),
    "into an inverting stage": (
        "U1.1>output A; C1 A B; R1 B M; R2 M O; U2.2>input M; U2.1>output O",
        ["coupling A>M"],
    ),
    "two in parallel once": ("U1.1>output A; C1 A B; C2 B A; R1 B VMID; U2.3>input B", ["coupling A>B"]),
    "a transistor's base": ("J1.1 A; C1 A B; R1 B +5V; Q1.1=B B", ["coupling A>B"]),
    "an RC to an input": ("J1.1 RAW; R1 RAW ADC; C1 ADC GND; U1.5>input ADC", ["filter RAW>ADC"]),
    "an RC to a part": ("J1.1 RAW; R1 RAW ADC; C1 ADC GND; U1.5 ADC", ["filter RAW>ADC"]),
    "from an output": ("U1.1>output DAC; R1 DAC LP; C1 LP GND; J1.1 LP", ["filter DAC>LP"]),
    "two sections as one": (
        "J1.1 A; R1 A B; C1 B GND; R2 B D; C2 D GND; U1.1>input D",
        ["filter A>D"],
    ),
    "a ladder of inductors with a load": (
        "U1.1>output S; R1 S A; C1 A GND; L1 A B; C2 B GND; L2 B D; C3 D GND; R2 D GND; U2.1>input D",
        ["filter S>D"],
    ),
    "a last resistor before the pin": ("J1.1 A; R1 A B; C1 B GND; R2 B D; U1.1>input D", ["filter A>D"]),
    "a trap in the ladder": (
        "U1.1>output A; L1 A B; C1 A B; C2 B GND; R1 B GND; U2.1>input B",
        ["filter A>B"],
    ),
    "two receivers, two filters": (
        "J1.1 A; R1 A B; C1 B GND; U1.1>input B; R2 A D; C2 D GND; U1.2>input D",
        ["filter A>B", "filter A>D"],
    ),
}
NOT_SHOWN = {
    "two connectors": "J1.1 A; C1 A B; R1 B GND; J2.1 B",
    "two parts of unknown direction": "U1.1 A; C1 A B; R1 B GND; U2.1 B",
    "two outputs": "U1.1>output A; C1 A B; R1 B GND; U2.1>output B",
    "nothing on one side": "U1.1>output A; C1 A B; R1 B GND",
    "a test point is nobody": "U1.1>output A; C1 A B; R1 B GND; TP1.1 B",
    "two receivers over resistors": ("U1.1>output A; C1 A B; R9 B GND; R1 B I1; R2 B I2; U2.1>input I1; U2.2>input I2"),
    "an RC between two connectors": "J1.1 A; R1 A B; C1 B GND; J2.1 B",
    "a protected connector": "J1.1 A; C1 A GND; R1 A B; U1.1>input B",
    "a debounced switch": "S1.1 A; R1 +3V3 A; C1 A GND; R2 A B; U1.1>input B",
    "a capacitor at both ends and no direction": "J1.1 A; C1 A GND; R1 A B; C2 B GND; U1.1 B",
    "a forked ladder": "J1.1 A; R1 A B; C1 B GND; R2 B D; R3 B E; C2 D GND; C3 E GND; U1.1>input D; U1.2>input E",
    "a filtered supply": "R1 +5V A; C1 A GND; U1.1>input A",
    "an active stage": ("J1.1 A; R1 A X; R2 X P; C1 X O; C2 P GND; U1.3>input P; U1.1>output O; U1.2>input O"),
    "a stage whose amplifier the names of its pins show": (
        "J1.1 A; R1 A X; R2 X P; C1 X O; C2 P GND; U8.5=INB_P P; U8.6=INB_N O; U8.7=OUTB O; U8.1=OUTA Z"
    ),
    "a reset": "R1 SW_IN NRST; J1.1 SW_IN; C1 NRST GND; U1.1=NRST>input NRST",
}


def named(topology: Topology) -> list[str]:
    return [f"{shown.kind} {shown.from_net}>{shown.to_net}" for shown in shown_paths(topology)]


@pytest.mark.parametrize(("text", "wanted"), SHOWN.values(), ids=SHOWN.keys())
def test_beyond_doubt(text: str, wanted: list[str]) -> None:
    assert named(circuit(text)) == wanted


@pytest.mark.parametrize("text", NOT_SHOWN.values(), ids=NOT_SHOWN.keys())
def test_not_beyond_doubt(text: str) -> None:
    assert named(circuit(text)) == []


@pytest.mark.parametrize(("text", "wanted"), SHOWN.values(), ids=SHOWN.keys())
def test_the_order_in_the_file_makes_no_difference(text: str, wanted: list[str]) -> None:
    assert sorted(named(circuit("; ".join(reversed(text.split(";")))))) == sorted(wanted)


def test_amplifiers_of_the_brief_tell_the_direction() -> None:
    text = "U1.1 A; C1 A B; R1 B GND; U2.1 B"
    assert named(circuit(text, (("P", "M", "A"),))) == ["coupling A>B"]
    assert named(circuit(text, (("B", "M", "O"),))) == ["coupling A>B"]
    assert named(circuit(text, (("P", "M", "B"),))) == ["coupling B>A"]


def test_the_reason_names_parts_and_ends() -> None:
    (shown,) = shown_paths(circuit("J1.1 RAW; R1 RAW ADC; C1 ADC GND; U1.5=PA0>input ADC"))
    assert shown.parts == ("R1", "C1")
    for word in ("R1 and C1", "J1.1", "U1.5 (PA0)"):
        assert word in shown.because


def test_a_path_with_a_claimed_capacitor_is_not_shown_again() -> None:
    topology = circuit("J1.1 A; R1 A B; C1 B GND; U1.1>input B; C2 A D; R2 D VMID; U1.2>input D")
    assert [path.kind for path in shown_paths(topology)] == ["coupling", "filter"]
    assert [path.kind for path in shown_paths(topology, {"C2"})] == ["filter"]
    assert shown_paths(topology, {"C1", "C2"}) == ()
