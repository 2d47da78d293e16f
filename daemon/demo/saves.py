"""The story that `reactance demo` plays: one board, saved eight times."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import datetime, timedelta

from reactance.daemon.demo.board import LoggerBoard, first_board
from reactance.daemon.demo.brief import brief_text
from reactance.daemon.demo.edif import write_edif
from reactance.daemon.demo.parts import ceramic, resistance

STEM = "greenhouse-logger"
FILE = f"{STEM}.edn"
_FIRST = datetime(2031, 3, 4, 9, 12, 40)


@dataclass(frozen=True, slots=True)
class Save:
    """One save of the demonstration board: the bytes of export and brief, and what the designer was about."""

    title: str
    export: bytes
    brief: bytes
    story: str


@dataclass(frozen=True, slots=True)
class _Step:
    title: str
    story: str
    edit: Callable[[LoggerBoard], LoggerBoard]


def saves() -> tuple[Save, ...]:
    """The saves in the order in which they happen; each differs from every other."""
    board, brief, made = first_board(), brief_text().encode(), []
    for number, step in enumerate(_STEPS):
        board = step.edit(board)
        export = write_edif(board, _FIRST + timedelta(minutes=17 * number))
        made.append(Save(step.title, export, brief, step.story))
    return tuple(made)


def _as_drawn(board: LoggerBoard) -> LoggerBoard:
    return board


def _core_capacitor_gone(board: LoggerBoard) -> LoggerBoard:
    return board.without("C23")


def _smaller_case(board: LoggerBoard) -> LoggerBoard:
    return board.changed("C11", ceramic("10uF", "10V", "X7R", "0402"))


def _slower_probes(board: LoggerBoard) -> LoggerBoard:
    return board.channel_changed("R2", resistance("47k"))


def _stiffer_bias(board: LoggerBoard) -> LoggerBoard:
    return board.changed("R11", resistance("10k")).changed("R12", resistance("10k"))


def _core_repaired(board: LoggerBoard) -> LoggerBoard:
    core = next(part for part in first_board().parts if part.refdes == "C23")
    return LoggerBoard((*board.parts, core), board.channel)


def _cheaper_input(board: LoggerBoard) -> LoggerBoard:
    return board.changed("C1", ceramic("10uF", "10V", "X7R", "1206"))


def _repaired(board: LoggerBoard) -> LoggerBoard:
    """What was drawn first, but for the bias divider, which keeps a little of the stiffness that was wanted."""
    return first_board().changed("R11", resistance("82k")).changed("R12", resistance("82k"))


_STEPS = (
    _Step("First export", "The board as it went to review: everything that is judged holds.", _as_drawn),
    _Step(
        "C23 makes way for a connector",
        "The debug connector needed room beside the controller, and a core capacitor was in the way.",
        _core_capacitor_gone,
    ),
    _Step("C23 is back", "The connector moved instead; +1V8 holds again.", _core_repaired),
    _Step(
        "Probe filters share the 47k reel",
        "One reel fewer to load. R2 stands in the shared channel, so four corners move.",
        _slower_probes,
    ),
    _Step(
        "A stiffer bias for the microphone",
        "R11 and R12 went from 100k to 10k against leakage; they also load the coupling capacitor.",
        _stiffer_bias,
    ),
    _Step(
        "A cheaper input capacitor",
        "C1 substituted by a part rated for 10 V, on a battery that reaches 8.5 V.",
        _cheaper_input,
    ),
    _Step(
        "Review findings mended",
        "Every part back to what its duty asks for; the bias divider settles at 82k.",
        _repaired,
    ),
    _Step(
        "C11 in a smaller case",
        "A late wish for room: 0402 in place of 0805, on paper the same 10 uF, 10 V, X7R. At 3.3 V far less is left.",
        _smaller_case,
    ),
)
