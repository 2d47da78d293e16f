"""Edits between two designs: applied to the older one they give the newer one."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reactance.analysis.design import Design, Net, Part, Pin
from reactance.analysis.difference import edits
from reactance.analysis.report import Edit


def part(refdes: str, value: str, *nets: str | None, cell: str = "", **attributes: str) -> Part:
    pins = tuple(Pin(str(number), net=net) for number, net in enumerate(nets, 1))
    return Part(refdes, pins, {"VALUE": value, **attributes}, cell or refdes[0])


def board(*parts: Part) -> Design:
    members: dict[str, list[tuple[str, str]]] = {}
    for item in parts:
        for pin in item.pins:
            if pin.net is not None:
                members.setdefault(pin.net, []).append((item.refdes, pin.number))
    nets = tuple(Net(name, tuple(pins)) for name, pins in members.items())
    return Design("board", "board.edn", "edif", parts, nets)


def supply(count: int = 6) -> list[Part]:
    """Capacitors on one rail, all alike, and a part that they serve."""
    return [part("U1", "logger", "+3V3", "GND"), *(part(f"C{n}", "100n", "+3V3", "GND") for n in range(1, count + 1))]


def kinds(found: tuple[Edit, ...]) -> list[tuple[str, str | None]]:
    return [(edit.kind, edit.part) for edit in found]


def test_a_design_against_itself_has_no_edits() -> None:
    assert edits(board(*supply()), board(*supply())) == ()


def test_a_value_is_changed_under_its_raw_name() -> None:
    older, newer = supply(), supply()
    newer[3] = replace(newer[3], attributes={"VALUE": "10n"})
    assert edits(board(*older), board(*newer)) == (Edit("C3.VALUE", "attribute changed", "C3", "VALUE", "100n", "10n"),)


def test_an_attribute_that_comes_or_goes_has_no_text_on_one_side() -> None:
    older = board(part("C1", "1u", "A", "GND", TOL="10%"))
    newer = board(part("C1", "1u", "A", "GND", RATING="16V"))
    assert {(e.attribute, e.before, e.after) for e in edits(older, newer)} == {
        ("TOL", "10%", None),
        ("RATING", None, "16V"),
    }


def test_added_and_removed_parts_carry_their_value() -> None:
    older, newer = supply(), [*supply(5), part("R9", "4k7", "+3V3", "SDA")]
    assert edits(board(*older), board(*newer)) == (
        Edit("-C6", "part removed", "C6", None, "100n", None),
        Edit("+R9", "part added", "R9", None, None, "4k7"),
    )


def test_a_pin_moved_to_another_net() -> None:
    older = board(*supply(), part("R1", "10k", "+3V3", "SDA"), part("J1", "probe", "SDA", "SCL"))
    newer = board(*supply(), part("R1", "10k", "+3V3", "SCL"), part("J1", "probe", "SDA", "SCL"))
    assert edits(older, newer) == (Edit("R1.2@SCL", "pin moved", "R1", "pin 2", "SDA", "SCL"),)


def test_a_pin_taken_off_and_one_put_on() -> None:
    older = board(*supply(), part("R1", "10k", "+3V3", None))
    newer = board(*supply(), part("R1", "10k", None, "GND"))
    assert [(e.id, e.before, e.after) for e in edits(older, newer)] == [
        ("R1.1@", "+3V3", None),
        ("R1.2@GND", None, "GND"),
    ]


def test_a_net_renamed_wholesale_moves_no_pin() -> None:
    older = board(*supply(), part("R1", "10k", "N17", "GND"), part("R2", "22k", "N17", "+3V3"))
    newer = board(*supply(), part("R1", "10k", "N81", "GND"), part("R2", "22k", "N81", "+3V3"))
    assert edits(older, newer) == ()


def test_a_renamed_net_with_one_pin_moved_away() -> None:
    rest = [part(f"R{n}", "10k", "OLD", "GND") for n in range(1, 5)]
    after = [part(f"R{n}", "10k", "NEW", "GND") for n in range(1, 5)]
    after[2] = part("R3", "10k", "+3V3", "GND")
    found = edits(board(*supply(), *rest), board(*supply(), *after))
    assert [(e.kind, e.part, e.after) for e in found] == [("pin moved", "R3", "+3V3")]


def test_a_rail_that_changes_its_name_says_so_once() -> None:
    older, newer = board(*supply()), board(*(part(p.refdes, p.attributes["VALUE"], "+2V5", "GND") for p in supply()))
    (only,) = edits(older, newer)
    assert (only.kind, only.part, only.before, only.after) == ("attribute changed", None, "+3V3", "+2V5")


def test_one_part_renumbered() -> None:
    older, newer = supply(), supply()
    newer[3] = replace(newer[3], refdes="C77")
    assert edits(board(*older), board(*newer)) == (Edit("C3→C77", "part renumbered", "C77", None, "C3", "C77"),)


def renumbered(parts: list[Part], names: dict[str, str]) -> list[Part]:
    return [replace(item, refdes=names.get(item.refdes, item.refdes)) for item in parts]


def chain() -> list[Part]:
    """Parts that are told apart by their values and places."""
    return [*supply(2), *(part(f"R{n}", f"{n}k", f"N{n}", f"N{n + 1}") for n in range(1, 31))]


def test_all_parts_renumbered_at_once() -> None:
    names = {f"R{n}": f"R{31 - n}" for n in range(1, 31)} | {"C1": "C8", "C2": "C9", "U1": "U4"}
    found = edits(board(*chain()), board(*renumbered(chain(), names)))
    assert {(e.kind, e.before, e.after) for e in found} == {
        ("part renumbered", one, other) for one, other in names.items()
    }


def test_renumbered_where_nets_are_named_after_parts() -> None:
    older = [part(f"R{n}", f"{n}k", f"Net-(R{n}-Pad1)", "GND") for n in range(1, 9)]
    older += [part(f"C{n}", f"{n}n", f"Net-(R{n}-Pad1)", "GND") for n in range(1, 9)]
    newer = [part(f"R{n + 100}", f"{n}k", f"Net-(R{n + 100}-Pad1)", "GND") for n in range(1, 9)]
    newer += [part(f"C{n}", f"{n}n", f"Net-(R{n + 100}-Pad1)", "GND") for n in range(1, 9)]
    found = edits(board(*older), board(*newer))
    assert {(e.kind, e.before, e.after) for e in found} == {
        ("part renumbered", f"R{n}", f"R{n + 100}") for n in range(1, 9)
    }


def test_shifted_by_one_after_a_deletion() -> None:
    older = chain()
    newer = [item for item in older if item.refdes != "R4"]
    newer = renumbered(newer, {f"R{n}": f"R{n - 1}" for n in range(5, 31)})
    found = edits(board(*older), board(*newer))
    assert [e.part for e in found if e.kind == "part removed"] == ["R4"]
    assert sum(e.kind == "part renumbered" for e in found) == 26
    assert len(found) == 27


def test_renumbered_and_edited_at_once() -> None:
    older = chain()
    newer = renumbered(older, {f"R{n}": f"R{n + 1}" for n in range(1, 31)})
    at = next(i for i, item in enumerate(newer) if item.refdes == "R11")
    newer[at] = replace(newer[at], attributes={"VALUE": "99k"})
    found = edits(board(*older), board(*newer))
    assert sum(e.kind == "part renumbered" for e in found) == 30
    assert [(e.part, e.before, e.after) for e in found if e.kind == "attribute changed"] == [("R11", "10k", "99k")]


def test_two_values_changed_are_no_renumbering() -> None:
    older = board(part("C1", "100n", "A", "GND"), part("C2", "10n", "A", "GND"))
    newer = board(part("C1", "10n", "A", "GND"), part("C2", "1n", "A", "GND"))
    assert [e.id for e in edits(older, newer)] == ["C1.VALUE", "C2.VALUE"]


def test_two_pins_moved_are_no_renumbering() -> None:
    rest = [part("J1", "probe", "A", "B", "D", "GND")]
    older = board(*rest, part("R1", "10k", "A", "GND"), part("R2", "10k", "B", "GND"))
    newer = board(*rest, part("R1", "10k", "B", "GND"), part("R2", "10k", "D", "GND"))
    assert [e.id for e in edits(older, newer)] == ["R1.1@B", "R2.1@D"]


def test_an_attribute_that_repeats_the_designator_is_no_edit() -> None:
    older = board(*supply(), part("C40", "1u", "+3V3", "GND", REFDES="C40", Label="C40"))
    newer = board(*supply(), part("C41", "1u", "+3V3", "GND", REFDES="C41", Label="C41"))
    assert [e.id for e in edits(older, newer)] == ["C40→C41"]


# -- edits applied to the older design give the newer one


def apply(older: Design, found: tuple[Edit, ...]) -> dict[str, tuple[dict[str, str], dict[str, str | None]]]:
    """Attributes and pins by designator after the edits. Added parts are known by their designator alone."""
    names = {e.before: e.after for e in found if e.kind == "part renumbered"}
    gone = {e.part for e in found if e.kind == "part removed"}
    made = {
        str(names.get(item.refdes, item.refdes)): (dict(item.attributes), {p.number: p.net for p in item.pins})
        for item in older.parts
        if item.refdes not in gone or item.refdes in names
    }
    for edit in found:
        if edit.kind == "part added":
            made[str(edit.part)] = ({}, {})
        elif edit.kind == "attribute changed":
            attributes = made[str(edit.part)][0]
            if edit.after is None:
                del attributes[str(edit.attribute)]
            else:
                assert attributes.get(str(edit.attribute)) == edit.before
                attributes[str(edit.attribute)] = edit.after
        elif edit.kind == "pin moved":
            pins = made[str(edit.part)][1]
            assert pins[str(edit.attribute).removeprefix("pin ")] == edit.before
            pins[str(edit.attribute).removeprefix("pin ")] = edit.after
    return made


NETS = ["GND", "N1", "N2", "N3", None]
PARTS = st.builds(
    lambda letter, number, value, nets, extra: part(f"{letter}{number}", value, *nets, cell="cell", **extra),
    st.sampled_from("RC"),
    st.integers(1, 6),
    st.sampled_from(["1k", "2k", "10n"]),
    st.tuples(st.sampled_from(NETS), st.sampled_from(NETS)),
    st.dictionaries(st.sampled_from(["TOL", "RATING"]), st.sampled_from(["5", "10"]), max_size=2),
)
# Anchors keep the four nets alive and named, so that an edit's net names are those of both designs.
ANCHORS = (part("J1", "probe", "GND", "N1", "N2", "N3"), part("J2", "probe", "GND", "N1", "N2", "N3"))
BOARDS = st.lists(PARTS, max_size=9, unique_by=lambda item: item.refdes).map(lambda parts: board(*ANCHORS, *parts))


@settings(max_examples=300)
@given(BOARDS, BOARDS)
def test_edits_applied_to_the_older_design_give_the_newer(older: Design, newer: Design) -> None:
    found = edits(older, newer)
    made = apply(older, found)
    added = {e.part for e in found if e.kind == "part added"}
    wanted = {p.refdes: (dict(p.attributes), {pin.number: pin.net for pin in p.pins}) for p in newer.parts}
    assert made.keys() == wanted.keys()
    assert {name: made[name] for name in made if name not in added} == {
        name: wanted[name] for name in wanted if name not in added
    }
    assert len({edit.id for edit in found}) == len(found)


@settings(max_examples=200)
@given(BOARDS, BOARDS)
def test_backwards_parts_come_and_go_the_other_way(older: Design, newer: Design) -> None:
    forth, back = edits(older, newer), edits(newer, older)
    for one, other in (("part added", "part removed"), ("part removed", "part added")):
        assert sum(e.kind == one for e in forth) == sum(e.kind == other for e in back)
    for kind in ("part renumbered", "pin moved", "attribute changed"):
        assert sum(e.kind == kind for e in forth) == sum(e.kind == kind for e in back)


@given(BOARDS)
def test_order_of_parts_and_pins_in_the_file_is_no_edit(older: Design) -> None:
    shuffled = board(*(replace(item, pins=item.pins[::-1]) for item in reversed(older.parts)))
    assert edits(older, shuffled) == ()


@given(BOARDS, st.permutations([f"X{n}" for n in range(20)]))
def test_any_renumbering_is_found_whole(older: Design, names: list[str]) -> None:
    table = {item.refdes: name for item, name in zip(older.parts, names, strict=False)}
    newer = board(*renumbered(list(older.parts), table))
    found = edits(older, newer)
    assert all(edit.kind == "part renumbered" for edit in found)
    assert len(found) == len(older.parts)


@pytest.mark.parametrize("seed", [1, 2])
def test_a_shuffled_board_of_many_parts_is_matched(seed: int) -> None:
    import random

    shuffle = random.Random(seed)
    older = [part(f"R{n}", f"{n % 50}k", f"N{n}", f"N{n + 1}") for n in range(3000)]
    names = [f"R{n}" for n in range(3000)]
    shuffle.shuffle(names)
    newer = renumbered(older, {f"R{n}": name for n, name in enumerate(names)})
    found = edits(board(*older), board(*newer))
    assert all(e.kind == "part renumbered" for e in found)
    assert len(found) == sum(name != f"R{n}" for n, name in enumerate(names))
