"""Reading with a memory of the last save gives exactly what a fresh reading gives, places and problems included."""

from __future__ import annotations

from dataclasses import dataclass

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reactance.analysis.design import Design, InputError
from reactance.analysis.exports.edif import FormMemory, read_edif


@dataclass(frozen=True)
class Save:
    """One state of an invented board: what may change from one save to the next."""

    values: tuple[str, ...]
    ground: tuple[bool, ...]
    remark: str
    named_by: str
    block_value: str
    default: str
    mishap: str = ""

    def text(self) -> bytes:
        def instance(number: int, value: str) -> str:
            refdes = {
                "designator": f'(designator "C{number}")',
                "property": f'(property REFDES (string "C{number}"))',
                "value": f'(property REFDES (string "C{number}{value}"))',
            }.get(self.named_by, "")
            key = f"C{number}" if self.named_by == "name" else f"I{number}"
            return f'(instance {key} (viewRef V (cellRef CAP)) {refdes} (property VALUE (string "{value}")))'

        keys = [f"C{n}" if self.named_by == "name" else f"I{n}" for n in range(len(self.values))]
        net = " ".join(
            f"(portRef A (instanceRef {key}))" for key, on in zip(keys, self.ground, strict=False) if on
        )
        default = f'(property RATING (string "{self.default}"))' if self.default else ""
        return f"""(edif made (edifVersion 2 0 0) {self.remark} (library L
(cell CAP {default} (view V (viewType NETLIST) (interface (port A) (port B))))
(cell BLOCK (view V (viewType NETLIST) (interface) (contents
 (instance R1 (viewRef V (cellRef CAP)) (property VALUE (string "{self.block_value}")))
 (net n (joined (portRef A (instanceRef R1)))))))
(cell TOP (view V (viewType NETLIST) (interface) (contents
{self.remark.join(instance(number, value) for number, value in enumerate(self.values))}
(instance B1 (viewRef V (cellRef BLOCK))) (instance B2 (viewRef V (cellRef BLOCK)))
{self.mishap}
(net GND (joined {net}))))))
(design board (cellRef TOP)))""".encode()


def everything(design: Design) -> tuple[object, ...]:
    """The design with what its equality leaves out."""
    return design, [part.place for part in design.parts], [net.place for net in design.nets]


SAVES = st.builds(
    Save,
    st.lists(st.sampled_from(["1n", "2n2", "10n"]), min_size=1, max_size=4).map(tuple),
    st.lists(st.booleans(), min_size=4, max_size=4).map(tuple),
    st.sampled_from([" ", "\n", '(comment "x\ny")\n', "(figure F (path))"]),
    st.sampled_from(["designator", "designator", "name", "property", "value", "nothing"]),
    st.sampled_from(["1k", "2k"]),
    st.sampled_from(["", "", "16V", "25V"]),
    st.sampled_from(["", "", "(instance)", "(oops X)", "(net LOST (joined (portRef A (instanceRef I77))))"]),
)


@given(st.lists(SAVES, min_size=2, max_size=6))
@settings(max_examples=50, deadline=None)
def test_any_sequence_of_saves(saves: list[Save]) -> None:
    memory = FormMemory()
    for save in saves:
        fresh = read_edif(save.text(), "board.edn")
        assert everything(read_edif(save.text(), "board.edn", memory=memory)) == everything(fresh)


@given(SAVES, st.data())
@settings(max_examples=50, deadline=None)
def test_one_value_after_another(save: Save, data: st.DataObject) -> None:
    memory = FormMemory()
    for _ in range(4):
        values = list(save.values)
        values[data.draw(st.integers(0, len(values) - 1))] = data.draw(
            st.sampled_from(["1n", "4n7 X7R", "10n"])
        )
        save = Save(
            tuple(values),
            save.ground,
            data.draw(st.sampled_from([save.remark, save.remark, "\n\n"])),
            save.named_by,
            data.draw(st.sampled_from(["1k", "2k"])),
            save.default,
            save.mishap,
        )
        fresh = read_edif(save.text(), "board.edn")
        assert everything(read_edif(save.text(), "board.edn", memory=memory)) == everything(fresh)


def test_parts_that_did_not_change_are_the_same_objects() -> None:
    first = Save(("1n", "1n", "1n"), (True, True, False, False), "\n", "designator", "1k", "")
    second = Save(("1n", "2n", "1n"), (True, True, False, False), "\n", "designator", "1k", "")
    memory = FormMemory()
    before = read_edif(first.text(), "board.edn", memory=memory)
    after = read_edif(second.text(), "board.edn", memory=memory)
    assert [one is other for one, other in zip(before.parts, after.parts, strict=True)] == [
        True,
        False,
        True,
        True,
        True,
    ]
    assert after.parts[1].attributes["VALUE"] == "2n"


def test_a_broken_save_in_between_changes_nothing() -> None:
    save = Save(("1n", "2n"), (True, True, False, False), "\n", "designator", "1k", "")
    memory = FormMemory()
    read_edif(save.text(), "board.edn", memory=memory)
    with pytest.raises(InputError):
        read_edif(save.text()[:-20], "board.edn", memory=memory)
    again = read_edif(save.text(), "board.edn", memory=memory)
    assert everything(again) == everything(read_edif(save.text(), "board.edn"))


def test_files_are_kept_apart() -> None:
    one = Save(("1n",), (True, True, False, False), " ", "designator", "1k", "")
    other = Save(("2n",), (True, True, False, False), " ", "designator", "1k", "")
    memory = FormMemory()
    for _ in range(2):
        for save, file in ((one, "one.edn"), (other, "other.edn")):
            design = read_edif(save.text(), file, memory=memory)
            assert everything(design) == everything(read_edif(save.text(), file))
