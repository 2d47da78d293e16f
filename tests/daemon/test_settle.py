"""When a save is over, on a clock of the test's own."""

from __future__ import annotations

from dataclasses import dataclass, field

import pytest

from reactance.daemon.settle import BROKEN_AFTER, GONE_AFTER, Hint, Settler, Signature, Step


@dataclass
class Desk:
    """One board's file, and a settler that looks at it every 10 ms of pretended time."""

    now: float = 100.0
    content: int | None = 1
    steps: list[tuple[float, Step]] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.settler = Settler(lambda board: self.content is not None, lambda board: self.signature())

    def signature(self) -> Signature:
        return (self.content,)

    def save(self, content: int | None, hint: Hint) -> None:
        self.content = content
        self.settler.note("board", hint, self.now)

    def wait(self, seconds: float, *, breaks: bool = False) -> None:
        end = self.now + seconds
        while self.now < end:
            self.now = round(self.now + 0.01, 6)
            for board, step, _ in self.settler.due(self.now):
                self.steps.append((round(self.now, 2), step))
                if step == "read":
                    changed = self.settler.changed(board, self.now)
                    self.settler.settled(board)
                    if breaks:
                        self.settler.broken(board, self.signature(), "broken", changed)

    @property
    def kinds(self) -> list[Step]:
        return [step for _, step in self.steps]


@pytest.mark.parametrize("hint", ["arrived", "closed", "opened", "written", "found"])
def test_a_save_is_read_once_and_within_half_a_second(hint: Hint) -> None:
    desk = Desk()
    desk.save(2, hint)
    desk.wait(5.0)
    assert desk.kinds == ["read"]
    assert desk.steps[0][0] - 100.0 <= 0.5


def test_a_renamed_file_is_read_sooner_than_one_being_written() -> None:
    times = []
    for hint in ("arrived", "closed", "written"):
        desk = Desk()
        desk.save(2, hint)  # type: ignore[arg-type]
        desk.wait(1.0)
        times.append(desk.steps[0][0])
    assert times == sorted(times) and len(set(times)) == 3


def test_pieces_are_read_when_the_last_has_come() -> None:
    desk = Desk()
    for piece in range(2, 8):
        desk.save(piece, "written")
        desk.wait(0.3)
    assert desk.kinds == []
    desk.save(8, "closed")
    desk.wait(1.0)
    assert desk.kinds == ["read"]


def test_a_change_that_no_event_tells_of_starts_the_quiet_time_again() -> None:
    desk = Desk()
    desk.save(2, "closed")
    desk.wait(0.03)
    desk.content = 3
    desk.wait(0.04)
    assert desk.kinds == []
    desk.wait(1.0)
    assert desk.kinds == ["read"]


def test_no_quiet_time_starts_while_the_file_is_absent() -> None:
    desk = Desk()
    desk.save(None, "removed")
    desk.wait(GONE_AFTER - 0.2)
    assert desk.kinds == []
    desk.save(2, "opened")
    desk.wait(1.0)
    assert desk.kinds == ["read"]


def test_absent_long_enough_is_gone_and_told_once() -> None:
    desk = Desk()
    desk.save(None, "removed")
    desk.wait(5.0)
    assert desk.kinds == ["gone"]
    assert desk.settler.wait(desk.now) is None


def test_broken_is_called_so_after_two_seconds_of_rest() -> None:
    desk = Desk()
    desk.save(2, "closed")
    desk.wait(BROKEN_AFTER - 0.1, breaks=True)
    assert desk.kinds == ["read"]
    desk.wait(1.0, breaks=True)
    assert desk.kinds == ["read", "broken"]
    assert desk.steps[-1][0] - 100.0 == pytest.approx(BROKEN_AFTER, abs=0.05)


def test_a_broken_file_that_goes_on_changing_is_waited_for() -> None:
    desk = Desk()
    for piece in range(2, 8):
        desk.save(piece, "closed")
        desk.wait(BROKEN_AFTER / 2, breaks=True)
    assert "broken" not in desk.kinds
    desk.wait(BROKEN_AFTER, breaks=True)
    assert desk.kinds[-1] == "broken"


def test_a_broken_file_mended_in_time_is_never_called_broken() -> None:
    desk = Desk()
    desk.save(2, "closed")
    desk.wait(1.0, breaks=True)
    desk.save(3, "closed")
    desk.wait(10.0)
    assert desk.kinds == ["read", "read"]


def test_a_file_saved_over_and_over_is_read_meanwhile() -> None:
    desk = Desk()
    for content in range(2, 200):
        desk.save(content, "closed")
        desk.wait(0.04)
    assert desk.kinds.count("read") >= 5


def test_idle_it_asks_for_nothing() -> None:
    desk = Desk()
    assert desk.settler.wait(desk.now) is None
    desk.save(2, "closed")
    wait = desk.settler.wait(desk.now)
    assert wait is not None and 0.0 <= wait <= 0.1
    desk.wait(1.0)
    assert desk.settler.wait(desk.now) is None
