"""Edits of the brief: one per key, tables matched by what they are about."""

from __future__ import annotations

import pytest

from reactance.analysis.design import Design
from reactance.analysis.difference import edits

NOTHING = Design("b", "b.edn", "edif", (), ())


def changes(older: str | bytes | None, newer: str | bytes | None) -> list[tuple[str | None, str | None, str | None]]:
    before, after = (text.encode() if isinstance(text, str) else text for text in (older, newer))
    found = edits(NOTHING, NOTHING, before, after)
    assert all((edit.kind, edit.part) == ("brief changed", None) for edit in found)
    assert len({edit.id for edit in found}) == len(found)
    return [(edit.attribute, edit.before, edit.after) for edit in found]


RAIL = '[[rail]]\nnet = "+3V3"\nallowed = "5 %"\nstep = { current = "0.8 A", rise = "10 ns" }\n'


def test_one_edit_per_changed_key() -> None:
    newer = RAIL.replace("5 %", "4 %").replace("0.8 A", "1 A")
    assert changes(RAIL, newer) == [
        ("rail +3V3: allowed", "5 %", "4 %"),
        ("rail +3V3: step.current", "0.8 A", "1 A"),
    ]


def test_keys_that_come_and_go() -> None:
    newer = RAIL.replace('allowed = "5 %"', 'band = { low = "1 kHz", high = "35 MHz" }')
    assert changes(RAIL, newer) == [
        ("rail +3V3: allowed", "5 %", None),
        ("rail +3V3: band", None, '{ low = "1 kHz", high = "35 MHz" }'),
    ]


def test_tables_in_another_order_are_no_edit() -> None:
    other = '[[rail]]\nnet = "+5V"\n'
    assert changes(RAIL + other, other + RAIL) == []


def test_comments_and_layout_are_no_edit() -> None:
    assert changes(RAIL, "# what it must do\n" + RAIL.replace(" = ", "=")) == []


def test_a_table_that_comes() -> None:
    newer = RAIL + '[[coupling]]\nfrom = "A"\nto = "B"\nlowest_frequency = "20 Hz"\n'
    assert changes(RAIL, newer) == [("coupling A>B", None, '{ from = "A", to = "B", lowest_frequency = "20 Hz" }')]


def test_the_order_of_part_knowledge_counts() -> None:
    one, other = (f'[[part]]\nmatch = {{ refdes = "{name}" }}\nesr = 1\n' for name in ("C1", "C*"))
    ((attribute, before, after),) = changes(one + other, other + one)
    assert attribute == "order of [[part]]"
    assert (before, after) == ('{ refdes = "C1" }, { refdes = "C*" }', '{ refdes = "C*" }, { refdes = "C1" }')


def test_the_board_table() -> None:
    assert changes('[board]\ntitle = "a"\n', '[board]\ntitle = "b"\nground = ["GND"]\n') == [
        ("board: title", "a", "b"),
        ("board: ground", None, '["GND"]'),
    ]


def test_equal_tables_are_told_apart() -> None:
    twice = '[[pin]]\nat = "U1.1"\nresistance = 1\n[[pin]]\nat = "U1.1"\nresistance = 2\n'
    assert changes(twice, twice.replace("= 2", "= 3")) == [("pin U1.1 #2: resistance", "2", "3")]


@pytest.mark.parametrize("broken", [b"a = [", b"\xff\xfe", b"[[["])
def test_a_brief_that_cannot_be_read_is_one_edit(broken: bytes) -> None:
    assert changes(RAIL, broken) == [(None, "1 table", "not readable as TOML")]
    assert changes(broken, RAIL) == [(None, "not readable as TOML", "1 table")]


def test_a_brief_that_comes_or_goes_is_one_edit() -> None:
    assert changes(None, RAIL) == [(None, None, "1 table")]
    assert changes(RAIL, None) == [(None, "1 table", None)]
    assert changes(None, None) == []


def test_numbers_and_texts_of_one_value_differ() -> None:
    assert changes("a = 1\n", 'a = "1"\n') == [("a", "1", "1")]
