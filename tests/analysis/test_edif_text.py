"""Atoms, strings and characters of EDIF, and that nothing of Lisp gets into them."""

from __future__ import annotations

import string

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reactance.analysis.design import Design
from reactance.analysis.exports.edif import FormMemory, read_edif
from reactance.analysis.exports.edif_forms import parsed
from reactance.analysis.exports.edif_names import Name, member_names, visible


def board(contents: str, encoding: str = "utf-8") -> Design:
    text = (
        "(edif made (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))"
        " (library L (edifLevel 0) (technology (numberDefinition))"
        ' (cell CAP (cellType GENERIC) (view V (viewType NETLIST) (interface (port A (designator "1"))'
        ' (port B (designator "2")))))'
        f" (cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents {contents}))))"
        " (design board (cellRef TOP)))"
    )
    return read_edif(text.encode(encoding), "board.edn")


@pytest.mark.parametrize(
    "atom", ["t", "nil", "T", "NIL", "001", "1e5", "1E5", "-0", "+7", ".5", "inf", "nan", "1_000"]
)
def test_atoms_that_lisp_reads_otherwise_stay_as_they_are(atom: str) -> None:
    design = board(
        f'(instance {atom} (viewRef V (cellRef CAP)) (designator "{atom}") (property {atom} (string "{atom}")))'
        f"(net {atom} (joined (portRef A (instanceRef {atom}))))"
    )
    (part,) = design.parts
    assert (part.refdes, dict(part.attributes)) == (atom, {atom: atom})
    assert [(net.name, net.pins) for net in design.nets] == [(atom, ((atom, "1"),))]


@pytest.mark.parametrize(
    "atom", ["t", "nil", "001", "1e5", "A\\B", "A;B", "A#B", "#t", "A'B", "'A", "A|B", "A[1]", "`A", ",A"]
)
def test_pins_by_any_name(atom: str) -> None:
    text = (
        "(edif made (edifVersion 2 0 0) (library L (edifLevel 0) (cell U (cellType GENERIC) (view V (viewType NETLIST)"
        f' (interface (port {atom}) (port (rename P2 "{atom}x") (designator "{atom}y")))))'
        " (cell TOP (view V (viewType NETLIST) (interface) (contents (instance U1 (viewRef V (cellRef U)))"
        f" (net N (joined (portRef {atom} (instanceRef U1)))) (net M (joined (portRef P2 (instanceRef U1)))))))))"
    )
    design = read_edif(text.encode(), "board.edn")
    assert {net.name: net.pins for net in design.nets} == {"N": (("U1", atom),), "M": (("U1", f"{atom}y"),)}
    assert [pin.name for pin in design.parts[0].pins] == [atom, f"{atom}x"]


# Anything that is no bracket, quote or white space may stand in an atom here, whatever the standard allows.
ATOMS = st.text(st.sampled_from(string.digits + string.ascii_letters + "_&'\\;#|[]`,.+-%{}@?!:"), min_size=1)
STRINGS = st.text(st.characters(codec="utf-8", exclude_characters='"'))


@given(
    st.recursive(
        ATOMS | STRINGS.map(lambda text: f'"{text}"'),
        lambda inner: st.lists(inner, min_size=1),
        max_leaves=20,
    )
)
@settings(max_examples=60, deadline=None)
def test_forms_come_out_as_they_stand(form: object) -> None:
    def written(item: object) -> str:
        return f"({' '.join(map(written, item))})" if isinstance(item, list) else str(item)

    def expected(item: object) -> object:
        return (
            [expected(each) for each in item]
            if isinstance(item, list)
            else str(item).strip('"')
            if str(item).startswith('"')
            else item
        )

    assert parsed(f"({written(form)})") == [[expected(form)]]


@pytest.mark.parametrize(
    ("written", "shown"),
    [
        ("%34%", '"'),
        ("%34 65%", '"A'),
        ("%  34   65 %", '"A'),
        ("10%37%", "10%"),
        ("5%", "5%"),
        ("a\\b", "a\\b"),
        ("one\ntwo\r\nthree", "onetwothree"),
        ("%937%", "Ω"),
        ("%7%", "%7%"),
        ("%99999999999999%", "%99999999999999%"),
        ("%27%[31m", "%27%[31m"),
        ("a\x1bb", "a%27%b"),
        ("a\u202eb", "a%8238%b"),
        ("a\tb", "a b"),
        ("<b>&amp;", "<b>&amp;"),
    ],
)
def test_strings_as_people_see_them(written: str, shown: str) -> None:
    assert visible(written) == shown
    design = board(f'(instance C1 (viewRef V (cellRef CAP)) (property VALUE (string "{written}")))')
    assert design.parts[0].attributes["VALUE"] == shown


def test_code_of_a_character_in_a_name() -> None:
    design = board('(net (rename N "A%34 66%C") (joined))')
    assert [net.name for net in design.nets] == ['A"BC']


@given(STRINGS)
@settings(max_examples=100, deadline=None)
def test_no_name_can_act_on_a_terminal(text: str) -> None:
    assert not any(ord(character) < 32 or 127 <= ord(character) < 160 for character in visible(text))


@given(
    st.text(st.characters(min_codepoint=32, max_codepoint=0x10FFFF, exclude_categories=["Cs"]), min_size=1)
)
def test_every_string_can_be_written_in_codes(text: str) -> None:
    coded = f"%{' '.join(str(ord(character)) for character in text)}%"
    assert visible(coded).replace("%", "") == visible(text).replace("%", "")


def test_utf8_and_latin1_and_byte_order_mark() -> None:
    contents = '(instance C1 (viewRef V (cellRef CAP)) (property VALUE (string "4,7 µF ±5 %")))'
    for encoding in ("utf-8", "latin-1", "utf-8-sig"):
        assert board(contents, encoding).parts[0].attributes["VALUE"] == "4,7 µF ±5 %"


def test_an_ampersand_is_no_part_of_what_people_see() -> None:
    design = board(
        "(instance &1C (viewRef V (cellRef CAP))) (net &3V3 (joined (portRef A (instanceRef &1C))))"
    )
    assert [(net.name, net.pins) for net in design.nets] == [("3V3", (("1C", "1"),))]


@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_line_endings(ending: str) -> None:
    text = "\n".join(
        [
            "(edif made (edifVersion 2 0 0)",
            " (library L (edifLevel 0) (cell CAP (view V (viewType NETLIST) (interface (port A))))",
            "  (cell TOP (view V (viewType NETLIST) (interface) (contents",
            "   (instance C1 (viewRef V (cellRef CAP)))",
            "   (net N (joined (portRef A (instanceRef C1)))))))))",
        ]
    )
    design = read_edif(text.replace("\n", ending).encode(), "board.edn")
    assert [str(part.place) for part in design.parts] == ["board.edn:4:4"]
    assert [str(net.place) for net in design.nets] == ["board.edn:5:4"]


@pytest.mark.parametrize(
    ("text", "size", "names"),
    [
        ("D[3:0]", (4,), ["D[3]", "D[2]", "D[1]", "D[0]"]),
        ("D(1..2)", (2,), ["D(1)", "D(2)"]),
        ("D<1:0>", (3,), ["D<1:0>[0]", "D<1:0>[1]", "D<1:0>[2]"]),
        ("M", (2, 2), ["M[0,0]", "M[0,1]", "M[1,0]", "M[1,1]"]),
        ("S", (), ["S"]),
    ],
)
def test_names_of_members(text: str, size: tuple[int, ...], names: list[str]) -> None:
    assert member_names(Name(text.lower(), text, size)) == names


def test_the_memory_gives_what_a_fresh_reading_gives() -> None:
    memory = FormMemory(size=300)  # small, so that it forgets on the way
    for value in ("10n", "22n", "10n", "47n"):
        text = "".join(
            f'(instance C{n} (viewRef V (cellRef CAP)) (property VALUE (string "{value if n == 3 else n}")))'
            for n in range(20)
        )
        data = (
            "(edif made (edifVersion 2 0 0) (library L (cell CAP (view V (viewType NETLIST) (interface (port A))))"
            f" (cell TOP (view V (viewType NETLIST) (interface) (contents {text})))))"
        ).encode()
        assert read_edif(data, "board.edn", memory=memory) == read_edif(data, "board.edn")
        assert len(memory) < 15
