"""Broken and hostile EDIF: one message with a place, or the rest kept and the bad entry listed."""

from __future__ import annotations

import random
from collections.abc import Iterator

import pytest

from reactance.analysis.design import Design, InputError
from reactance.analysis.exports.edif import FormMemory, read_edif
from reactance.analysis.exports.limits import Limits

LINES = """(edif made (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))
 (library L (edifLevel 0) (technology (numberDefinition))
  (cell CAP (cellType GENERIC) (view V (viewType NETLIST) (interface
   (port A (designator "1")) (port B (designator "2")))))
  (cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents
   (instance C1 (viewRef V (cellRef CAP (libraryRef L))) (property VALUE (string "100n")))
   (instance C2 (viewRef V (cellRef CAP (libraryRef L))))
   (net N (joined (portRef A (instanceRef C1)) (portRef A (instanceRef C2))))
   (net GND (joined (portRef B (instanceRef C1)) (portRef B (instanceRef C2))))
  ))))
 (design board (cellRef TOP (libraryRef L))))
"""


def read(text: str, limits: Limits | None = None) -> Design:
    return read_edif(text.encode(), "board.edn", limits=limits or Limits())


def fault(text: str | bytes, limits: Limits | None = None) -> InputError:
    data = text.encode() if isinstance(text, str) else text
    with pytest.raises(InputError) as caught:
        read_edif(data, "board.edn", limits=limits or Limits())
    return caught.value


def changed(old: str, new: str) -> str:
    assert LINES.count(old) == 1
    return LINES.replace(old, new)


def nets(design: Design) -> dict[str, set[str]]:
    return {net.name: {f"{refdes}.{pin}" for refdes, pin in net.pins} for net in design.nets}


GOOD = {"N": {"C1.1", "C2.1"}, "GND": {"C1.2", "C2.2"}}


def test_the_file_itself_is_good() -> None:
    design = read(LINES)
    assert (nets(design), design.problems) == (GOOD, ())


@pytest.mark.parametrize(
    ("data", "place", "said"),
    [
        (b"", "board.edn:1:1", "empty"),
        (b" \n\n ", "board.edn:1:1", "empty"),
        (b"\x89PNG\r\n\x1a\n\0\0\0\rIHDR", "board.edn:3:1", "zero byte"),
        (b"# Netlist\n(edif x)", "board.edn:1:1", "expected (edif"),
        (b"\n  (kicker x)", "board.edn:2:3", "expected (edif"),
        (b"(edif x", "board.edn:1:1", "ends inside (edif"),
        (b"(edif x (edifVersion 2 0 0", "board.edn:1:9", "ends inside (edifVersion"),
        (b'(edif x\n (comment "abc))', "board.edn:2:11", "never ends"),
        (b'(edif x "abc))', "board.edn:1:9", "never ends"),
        (b"(edif x))", "board.edn:1:9", "expected the end of the file"),
        (b"(edif x)\n(edif y)", "board.edn:2:1", "expected the end of the file"),
        (b"(edif x (edifVersion 3 0 0))", "board.edn:1:9", "EDIF version 3 0 0"),
        (b"(edif x (keywordMap (keywordLevel 2)))", "board.edn:1:9", "keyword macros"),
        (b"(edif x)", "board.edn:1:1", "no cell has contents"),
        (b"()", "board.edn:1:1", "expected (edif"),
    ],
)
def test_what_cannot_be_read_gives_one_message_with_its_place(data: bytes, place: str, said: str) -> None:
    error = fault(data)
    assert str(error.place) == place
    assert said in error.message
    assert error.remedy


def test_a_missing_bracket_is_reported_where_the_open_form_begins() -> None:
    error = fault(changed('(property VALUE (string "100n")))', '(property VALUE (string "100n"))'))
    assert "ends inside (edif" in error.message  # all brackets after it close one form too few


def test_a_cut_off_file_is_reported_where_the_innermost_open_form_begins() -> None:
    cut = LINES[: LINES.index("(portRef B (instanceRef C2))") + 11]
    error = fault(cut)
    assert (str(error.place), error.message) == (
        "board.edn:9:50",
        "the file ends inside (portRef …), which begins here; expected ')'",
    )


@pytest.mark.parametrize(
    ("old", "new", "place", "said"),
    [
        ("(instance C2 (viewRef V (cellRef CAP (libraryRef L))))", "(instance C2)", "7:4", "no cell"),
        ("(instance C2 (viewRef V (cellRef CAP (libraryRef L))))", "(instance)", "7:4", "expected a name"),
        ("(portRef A (instanceRef C2))", "(portRef A (instanceRef C9))", "8:4", "no instance C9"),
        ("(portRef A (instanceRef C2))", "(portRef Z (instanceRef C2))", "8:4", "no port Z"),
        ("(portRef A (instanceRef C2))", "(portRef Z)", "8:4", "no port Z"),
        ("(portRef A (instanceRef C2))", "(portRef (member A 3) (instanceRef C2))", "8:4", "no member"),
        ("(portRef A (instanceRef C2))", "(portRef)", "8:4", "expected the name"),
        ("(portRef A (instanceRef C2))", "(portRef A (instanceRef))", "8:4", "expected the name"),
        ('(string "100n")', "(number (e x))", "6:4", "expected a number"),
        ('(string "100n")', "(boolean maybe)", "6:4", "expected (true)"),
        ("(net N (joined", "(net (rename N) (joined", "8:4", None),
        ("(net N (joined", "(nett N (joined", "8:4", "(nett …) has no meaning"),
        ("(net N (joined", "(net (array N 0) (joined", "8:4", "size of 1 or more"),
        ("(net N (joined", "(net GND (joined", "9:4", "stands twice"),
        ("(net N (joined", '(net (rename N "GND") (joined', "9:4", "stands twice"),
        ("(instance C2 (", "(instance C1 (", "7:4", "stands twice"),
        ("(cellRef TOP (libraryRef L))", "(cellRef TOPP (libraryRef L))", "11:2", "is not in the file"),
        ("(cellRef TOP (libraryRef L))", "", "11:2", "names no top cell"),
    ],
)
def test_a_bad_entry_is_listed_and_the_rest_is_kept(old: str, new: str, place: str, said: str | None) -> None:
    design = read(changed(old, new))
    assert "C1" in design.parts_by_refdes
    assert {"C1.2"} <= nets(design)["GND"]
    if said is None:
        assert design.problems == ()
    else:
        assert any(said in each.message and each.where == f"board.edn:{place}" for each in design.problems)


def test_a_cell_that_is_missing_keeps_its_part_with_the_pins_of_its_nets() -> None:
    design = read(
        LINES.replace("(cellRef CAP (libraryRef L))))\n   (net", "(cellRef XYZ (libraryRef L))))\n   (net")
    )
    assert nets(design) == {"N": {"C1.1", "C2.A"}, "GND": {"C1.2", "C2.B"}}
    assert any("no cell XYZ of library L" in problem.message for problem in design.problems)


def test_a_cycle_of_cells_is_refused_with_their_names() -> None:
    def cell(name: str, below: str) -> str:
        inside = f"(instance I (viewRef V (cellRef {below})))"
        return f"(cell {name} (cellType GENERIC) (view V (viewType NETLIST) (interface) (contents {inside})))"

    text = f"(edif x (library L {cell('ONE', 'TWO')}\n{cell('TWO', 'THREE')}\n{cell('THREE', 'TWO')}) "
    error = fault(text + "(design d (cellRef ONE)))")
    assert error.message == "the hierarchy contains itself: TWO → THREE → TWO"
    assert error.place.line == 2
    itself = fault(f"(edif x (library L {cell('ONE', 'ONE')}))")
    assert itself.message == "the hierarchy contains itself: ONE → ONE"


def test_two_parts_of_one_refdes_are_both_kept() -> None:
    design = read(
        changed(
            "(instance C2 (viewRef V (cellRef CAP (libraryRef L))))",
            '(instance I2 (viewRef V (cellRef CAP)) (designator "C1"))',
        ).replace("instanceRef C2", "instanceRef I2")
    )
    assert nets(design) == {"N": {"C1.1", "C1#2.1"}, "GND": {"C1.2", "C1#2.2"}}
    assert [problem.severity for problem in design.problems] == ["error"]
    assert "two parts are called C1" in design.problems[0].message


# Each limit: the file at it is read, the file one beyond it is refused with the limit's name.


def nested(depth: int) -> str:
    inner = "(a " * (depth - 2) + ")" * (depth - 2)
    return LINES.replace("(design board", f"(userData {inner})\n (design board")


def doubling(levels: int) -> str:
    """A cell of two of a cell of two of … : 2 ** levels capacitors."""
    cells = ["(cell L0 (view V (viewType NETLIST) (interface (port A))))"]
    cells += [
        f"(cell L{n} (view V (viewType NETLIST) (interface) (contents"
        f" (instance P (viewRef V (cellRef L{n - 1}))) (instance Q (viewRef V (cellRef L{n - 1}))))))"
        for n in range(1, levels + 1)
    ]
    return f"(edif x (library L {' '.join(cells)}))"


@pytest.mark.parametrize(
    ("text", "at", "beyond"),
    [
        (LINES, Limits(bytes=len(LINES)), Limits(bytes=len(LINES) - 1)),
        (nested(60), Limits(depth=60), Limits(depth=59)),
        (LINES, Limits(forms=14), Limits(forms=13)),
        (LINES, Limits(parts=2), Limits(parts=1)),
        (LINES, Limits(pins=4), Limits(pins=3)),
        (changed("(net N ", f"(net {'N' * 40} "), Limits(name=40), Limits(name=39)),
        (
            changed("(property VALUE", f'(designator "{"C" * 40}") (property VALUE'),
            Limits(name=40),
            Limits(name=39),
        ),
        (
            changed("(property VALUE", f'(property REFDES (string "{"C" * 40}")) (property V')
            .replace("instance C1", "instance I1")
            .replace("(instanceRef C1)", "(instanceRef I1)"),
            Limits(name=40),
            Limits(name=39),
        ),
        (changed("(net N (joined", "(net (array N 20) (joined"), Limits(array=20), Limits(array=19)),
        (doubling(4), Limits(blocks=15), Limits(blocks=14)),
        (doubling(4), Limits(parts=16), Limits(parts=15)),
        (doubling(4), Limits(levels=4), Limits(levels=3)),
    ],
)
def test_at_a_limit_and_one_beyond(text: str, at: Limits, beyond: Limits) -> None:
    read(text, at)
    error = fault(text, beyond)
    (name,) = [
        name
        for name in Limits.__slots__
        if getattr(at, name) != getattr(beyond, name) and f"`{name}`" in error.message
    ]
    assert f"{getattr(beyond, name):,}" in error.message
    assert error.place.file == "board.edn"


def test_a_long_text_is_cut_and_said() -> None:
    text = changed('"100n"', f'"{"x" * 50}"')
    assert read(text, Limits(text=50)).problems == ()
    design = read(text, Limits(text=49))
    assert design.parts[0].attributes["VALUE"] == "x" * 49
    assert "limit `text`" in design.problems[0].message


def test_the_list_of_problems_has_an_end() -> None:
    text = changed("(net N (joined", "(net N (joined " + " ".join(f"(portRef X{n})" for n in range(20)))
    assert len(read(text, Limits(problems=20)).problems) == 20
    assert read(text, Limits(problems=19)).problems[-1].message.startswith("1 more problems are not listed")


def test_bombs_are_refused_before_they_grow() -> None:
    assert "limit `depth`" in fault("(edif x " + "(" * 1_000_000).message
    assert (
        "limit `depth`"
        in fault("(edif x (library L (cell C (view V (interface " + "(port (a " * 300_000).message
    )
    assert "limit `blocks`" in fault(doubling(60)).message
    huge = changed("(net N (joined", "(net (array N 999999999) (joined")
    assert "limit `array`" in fault(huge).message
    digits = changed('(string "100n")', f"(number (e {'9' * 50_000} 1))")
    assert any("expected a number" in problem.message for problem in read(digits).problems)


def test_many_parts_of_one_refdes_do_not_hang() -> None:
    again = " ".join(f'(instance I{n} (viewRef V (cellRef CAP)) (designator "C7"))' for n in range(500))
    design = read(changed("(net N (joined", f"{again} (net N (joined"))
    assert len(design.parts_by_refdes) == 502
    assert {"C7", "C7#2", "C7#500"} <= set(design.parts_by_refdes)


def test_a_package_of_many_sections_is_one_part() -> None:
    cells = " ".join(f"(cell S{n} (view V (viewType NETLIST) (interface (port P{n}))))" for n in range(500))
    sections = " ".join(f'(instance I{n} (viewRef V (cellRef S{n})) (designator "J1"))' for n in range(500))
    design = read(changed("  (cell TOP", f"  {cells} (cell TOP").replace("(net N (", f"{sections} (net N ("))
    part = design.part("J1")
    assert part is not None
    assert [pin.number for pin in part.pins] == [f"P{n}" for n in range(500)]
    assert len(design.parts) == 3


def test_arrays_that_multiply_are_refused() -> None:
    many = "(instance (array R 16000) (viewRef V (cellRef BIG)))"
    cell = "(cell BIG (view V (viewType NETLIST) (interface (port (array D 16000)))))"
    error = fault(changed("  (cell TOP", f"  {cell} (cell TOP").replace("(net N (", f"{many} (net N ("))
    assert "256,000,004 pins" in error.message  # 16,000 × 16,000, and two each of C1 and C2


def everything_shown(design: Design) -> Iterator[str]:
    """Every text that a page or a terminal may show."""
    yield design.name
    for part in design.parts:
        yield from (part.refdes, part.cell, *part.path, *part.attributes, *part.attributes.values())
        yield from (text for pin in part.pins for text in (pin.number, pin.name))
    for net in design.nets:
        yield from (net.name, *net.aliases)
    yield from (problem.message for problem in design.problems)


def acts_on_nothing(text: str) -> bool:
    return bool(text) and not any(ord(each) < 32 or 127 <= ord(each) < 160 for each in text)


def mutations(count: int, seed: int) -> Iterator[bytes]:
    """The good file with bytes, brackets and words changed, cut off, doubled or swapped."""
    rng = random.Random(seed)
    whole = LINES.encode()
    words = whole.replace(b"(", b" ( ").replace(b")", b" ) ").split(b" ")
    for _ in range(count):
        kind = rng.randrange(6)
        data = bytearray(whole)
        if kind == 0:
            for _ in range(rng.randint(1, 8)):
                data[rng.randrange(len(data))] = rng.randrange(256)
        elif kind == 1:
            at = [n for n, byte in enumerate(data) if byte in b'()"']
            for n in rng.sample(at, rng.randint(1, 3)):
                data[n : n + 1] = rng.choice([b"", b"(", b")", b'"', b"((", b"))"])
        elif kind == 2:
            del data[rng.randrange(len(data)) :]
        elif kind == 3:
            mixed = list(words)
            for _ in range(rng.randint(1, 4)):
                mixed[rng.randrange(len(mixed))] = rng.choice(words)
            data = bytearray(b" ".join(mixed))
        elif kind == 4:
            start = rng.randrange(len(data))
            piece = data[start : start + rng.randint(1, 200)]
            at_byte = rng.randrange(len(data))
            data[at_byte:at_byte] = piece * rng.randint(1, 3)
        else:
            start = rng.randrange(len(data))
            del data[start : start + rng.randint(1, 60)]
        yield bytes(data)


def test_mutations_end_in_a_design_or_in_one_message() -> None:
    memory = FormMemory()
    for data in mutations(1500, seed=1):
        try:
            design = read_edif(data, "board.edn", memory=memory)
        except InputError as error:
            assert error.place.file == "board.edn"
            assert acts_on_nothing(str(error))
        else:
            assert acts_on_nothing("".join(everything_shown(design)))
            known = {(part.refdes, pin.number) for part in design.parts for pin in part.pins}
            assert all(pin in known for net in design.nets for pin in net.pins)
            assert len(design.parts_by_refdes) == len(design.parts)
            assert len({net.name for net in design.nets}) == len(design.nets)


def test_names_are_shown_as_text_and_cannot_act() -> None:
    design = read(changed("(net N (", '(net (rename N "<script>%27%[2J%10%") ('))
    assert design.nets[0].name == "<script>%27%[2J%10%"
    wild = (
        LINES.replace("CAP", "C\x1b[2JAP")
        .replace("board", "bo\x9bard")
        .replace("(instanceRef C2)", "(instanceRef \x07)")
    )
    for text in (wild, wild.replace("(cell C", "(cell X"), wild.replace("(port A", "(port X"), wild[:-40]):
        try:
            assert acts_on_nothing("".join(everything_shown(read(text))))
        except InputError as error:
            assert acts_on_nothing(str(error))
