"""Exports broken in many ways, the same for the same number, and what may come of reading them. For tests only."""

from __future__ import annotations

import random
import re
import time
import unicodedata
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType

from writers.designs import design_of, logger_board
from writers.edif import HABITS, edif
from writers.flat import TableHabit, ipc356, ipc2581, tables

from reactance.analysis.design import Design, InputError, Part, Pin
from reactance.analysis.exports import ExportFiles, read_export

SLOW = 2.0
"""Seconds of processor time that no input may take."""

# Control characters and line separators; marks that turn the reading direction (Unicode Standard Annex 9).
_ACTING = frozenset(("Cc", "Cs", "Zl", "Zp"))
_TURNING = frozenset("\u061c\u200e\u200f\u202a\u202b\u202c\u202d\u202e\u2066\u2067\u2068\u2069")

_TOKEN = re.compile(rb'[()]|"[^"]*"|<[^>]*>|[\w.%+-]+|[,;\t\n]|\s+|.', re.DOTALL)

_INSERTED: Sequence[bytes] = (
    b"(", b")", b'"', b"((((((((", b"))))", b"%34%", b"%", b"(rename", b"(array A 99999)", b"(member D -1)",
    b"(portRef", b"(property VALUE (number (e 1 99999)))", b"(keywordMap (keywordLevel 3))", b"(joined)",
    b"<", b">", b"</Step>", b"<Step>", b"&", b"&lt;", b"&bomb;", b"<!DOCTYPE x [", b"<!--", b"]]>", b"<![CDATA[",
    b"\x00", b"\x1a", b"\x1b[31m", b"\xff\xfe", b"\xef\xbb\xbf", b"\xe2\x80\xae", b"\xc2\x85", b"\xed\xa0\x80", b"\r",
    b"\n", b"\n\n", b"\t", b",", b";", b",,,,,,,,", b"999\n", b"P  NNAME1  X\n", b"3x7", b"C1-C99999999", b"-1",
    b"1e999",
    b"99999999999999999999", b"0", b"N/C", b"VIA", b"", b"A" * 2000, b"(" * 300, b"<a>" * 300, b'"' * 51, b"-" * 40,
)  # fmt: skip


@dataclass(frozen=True)
class Seed:
    """A sound export to begin from, as it is and as its tokens."""

    name: str
    files: ExportFiles
    tokens: tuple[bytes, ...]


@dataclass
class Tally:
    """What came out of so many inputs."""

    outcomes: Counter[str] = field(default_factory=Counter)
    slowest: float = 0.0
    slowest_input: int = -1
    failures: list[str] = field(default_factory=list)

    def add(self, other: Tally) -> None:
        """Count in what came out elsewhere."""
        self.outcomes.update(other.outcomes)
        self.failures += other.failures
        if other.slowest > self.slowest:
            self.slowest, self.slowest_input = other.slowest, other.slowest_input


def small_board() -> Design:
    """A handful of parts: mutations of a small file reach more of its meaning."""
    chip = Part("U1", (Pin("1", "IN", "VIN"), Pin("2", "GND", "GND"), Pin("3", "OUT", "+3V3"), Pin("4", "D[0]", None)))
    value = MappingProxyType({"VALUE": "100 nF", "TOLERANCE": "10 %", "DESCRIPTION": 'chip "X7R", 16 V ±10 %'})
    caps = [
        Part(f"C{n}", (Pin("1", "A", net), Pin("2", "B", "GND")), value, "CAP", ("SUPPLY",))
        for n, net in ((1, "VIN"), (2, "+3V3"), (3, "A net with a longer name"))
    ]
    return design_of([chip, *caps])


def seeds() -> tuple[Seed, ...]:
    """Both boards in every format and habit."""
    found = []
    for board in (small_board(), small_board(), logger_board()):
        written = {f"EDIF {name}": edif(board, habit) for name, habit in HABITS.items()}
        written["IPC-D-356"] = ipc356(board)
        written["IPC-2581"] = ipc2581(board)
        written["IPC-2581 UTF-16"] = ipc2581(board, encoding="utf-16", prefix="p")
        written["tables"] = tables(board)
        written["tables UTF-16"] = tables(board, TableHabit(";", "utf-16", turned=True))
        found += [Seed(name, files, tuple(_TOKEN.findall(files.main))) for name, files in written.items()]
    return tuple(found)


def broken(seeds: Sequence[Seed], number: int) -> ExportFiles:
    """The input of that number: a seed with one to six mutations in it, or in the table beside it."""
    chance = random.Random(number)
    seed = seeds[number % len(seeds)]
    files = seed.files
    if files.companions and chance.random() < 0.2:
        table = files.companions[".parts.csv"]
        return ExportFiles(files.main, files.name, {".parts.csv": _mutated(table, _TOKEN.findall(table), chance)})
    return ExportFiles(_mutated(files.main, seed.tokens, chance), files.name, files.companions)


def _mutated(data: bytes, tokens: Sequence[bytes], chance: random.Random) -> bytes:
    if chance.random() < 0.5:
        changed = list(tokens)
        for _ in range(chance.randint(1, 6)):
            chance.choice(_TOKEN_MUTATIONS)(changed, chance)
        data = b"".join(changed)
        if chance.random() < 0.7:
            return data
    mutable = bytearray(data)
    for _ in range(chance.randint(1, 6)):
        chance.choice(_BYTE_MUTATIONS)(mutable, chance)
    return bytes(mutable)


def _somewhere(things: Sequence[object], chance: random.Random) -> int:
    return chance.randrange(len(things)) if things else 0


def _tokens_dropped(tokens: list[bytes], chance: random.Random) -> None:
    at = _somewhere(tokens, chance)
    del tokens[at : at + chance.choice((1, 1, 1, 2, 5, 20))]


def _tokens_repeated(tokens: list[bytes], chance: random.Random) -> None:
    at = _somewhere(tokens, chance)
    tokens[at:at] = tokens[at : at + chance.choice((1, 2, 10, 50))] * chance.choice((1, 1, 2, 20))


def _tokens_swapped(tokens: list[bytes], chance: random.Random) -> None:
    if tokens:
        one, other = _somewhere(tokens, chance), _somewhere(tokens, chance)
        tokens[one], tokens[other] = tokens[other], tokens[one]


def _token_replaced(tokens: list[bytes], chance: random.Random) -> None:
    if tokens:
        tokens[_somewhere(tokens, chance)] = chance.choice(_INSERTED)


def _token_inserted(tokens: list[bytes], chance: random.Random) -> None:
    tokens.insert(_somewhere(tokens, chance), chance.choice(_INSERTED))


def _byte_changed(data: bytearray, chance: random.Random) -> None:
    if data:
        data[_somewhere(data, chance)] = chance.randrange(256)


def _bit_flipped(data: bytearray, chance: random.Random) -> None:
    if data:
        data[_somewhere(data, chance)] ^= 1 << chance.randrange(8)


def _bytes_inserted(data: bytearray, chance: random.Random) -> None:
    at = _somewhere(data, chance)
    data[at:at] = chance.choice(_INSERTED) if chance.random() < 0.7 else chance.randbytes(chance.randint(1, 8))


def _bytes_dropped(data: bytearray, chance: random.Random) -> None:
    at = _somewhere(data, chance)
    del data[at : at + chance.choice((1, 1, 2, 8, 64, 512))]


def _cut_off(data: bytearray, chance: random.Random) -> None:
    del data[_somewhere(data, chance) :]


def _slice_moved(data: bytearray, chance: random.Random) -> None:
    start = _somewhere(data, chance)
    piece = data[start : start + chance.randint(1, 400)]
    at = _somewhere(data, chance)
    data[at:at] = piece


_TOKEN_MUTATIONS: Sequence[Callable[[list[bytes], random.Random], None]] = (
    _tokens_dropped,
    _tokens_repeated,
    _tokens_swapped,
    _token_replaced,
    _token_inserted,
)
_BYTE_MUTATIONS: Sequence[Callable[[bytearray, random.Random], None]] = (
    _byte_changed,
    _bit_flipped,
    _bytes_inserted,
    _bytes_dropped,
    _cut_off,
    _slice_moved,
)


def run(first: int, count: int, step: int = 1) -> Tally:
    """Read the inputs `first`, `first + step` …, `count` of them; whatever may not come out is among the failures."""
    tally, known = Tally(), seeds()
    for number in range(first, first + count * step, step):
        files = broken(known, number)
        begun = time.process_time()
        outcome, wrong = judged(files)
        taken = time.process_time() - begun
        tally.outcomes[outcome] += 1
        if taken > tally.slowest:
            tally.slowest, tally.slowest_input = taken, number
        if wrong:
            tally.failures.append(f"input {number} ({known[number % len(known)].name}): {wrong}")
    return tally


def judged(files: ExportFiles) -> tuple[str, str]:
    """What came out of reading an input, and what is wrong with that ("" where nothing is)."""
    try:
        design = read_export(files)
    except InputError as error:
        return "refused", _wrong_with_error(error, files)
    except Exception as error:
        return "crashed", f"{type(error).__name__}: {error}"
    wrong = [problem.message for problem in design.problems if not _known_file(problem.where, files)]
    return ("read with problems" if design.problems else "read"), f"no place: {wrong[0]}" if wrong else ""


def _wrong_with_error(error: InputError, files: ExportFiles) -> str:
    if not error.message or not error.remedy:
        return f"no remedy: {error}"
    if not _known_file(error.place.file, files) or error.place.line is None:
        return f"no place: {error}"
    if any(unicodedata.category(ch) in _ACTING or ch in _TURNING for ch in str(error)):
        return f"a control character in the message: {error!r}"
    return ""


def _known_file(place: str, files: ExportFiles) -> bool:
    return place.startswith((files.name, "board.parts.csv"))
