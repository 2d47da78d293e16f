"""IPC-D-356 and 356A bare-board test netlists: fixed columns, 80 at most, without values."""

from __future__ import annotations

import re
from collections.abc import Iterator

from reactance.analysis.design import Design, InputError, Pin, Place
from reactance.analysis.exports.collect import Collector, listed
from reactance.analysis.exports.ipc356_names import REFDES_WIDTH, full_names
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.sniff import stem
from reactance.analysis.exports.tables_parts import add_parts, note_missing_table, read_parts
from reactance.analysis.exports.text import lines_of, visible

FORMAT = "IPC-D-356"

_EXPECTED = "records of IPC-D-356, such as 317, 327 and 999"
_TEST_POINT = re.compile(r"3\d7")
_OTHER_RECORD = re.compile(r"[\d ]\d\d")
_ALIAS = re.compile(r"P\s*(NNAME\s*\d{1,9})\s+(\S.*)")
_ALIAS_USED = re.compile(r"NNAME\s*\d{1,9}")
_NET_WIDTH = 14
_LONGEST = 10_000  # no record is longer; keeps a file that is one line from being copied many times


def read_ipc356(data: bytes, file: str, parts: bytes | None = None, *, limits: Limits = DEFAULT_LIMITS) -> Design:
    """The design in an IPC-D-356 netlist, with values from the parts table beside it where there is one.

    A pin may stand in several records, one for each pad or side; it is one pin. A refdes that was cut to the six
    columns it has becomes the one in the parts table that it can only stand for.
    Raises InputError for what is no IPC-D-356, does not end with record 999, or is beyond `limits`.
    """
    collector = Collector(file, limits)
    _Records(_records(lines_of(data, file, limits, _EXPECTED), file), collector).read()
    if parts is None:
        note_missing_table(file, collector)
    else:
        entries = read_parts(parts, file, collector.parts, collector)
        _lengthen_refdes(collector, [entry.refdes for entry in entries])
        add_parts(entries, collector, file)
    return collector.design(stem(file[max(file.rfind("/"), file.rfind("\\")) + 1 :]), FORMAT)


def _records(lines: list[str], file: str) -> list[tuple[int, str]]:
    """The records up to the one that ends the file, with their line from 1."""
    records: list[tuple[int, str]] = []
    for number, line in enumerate(lines, 1):
        if line.startswith("999"):
            return records
        record = line[:_LONGEST].strip("\x1a\f").rstrip().expandtabs()
        if record and not record.startswith("C"):
            records.append((number, record))
    last = max((number for number, _ in records), default=1)
    raise InputError(
        f"the file ends without record 999 after line {last}; expected {_EXPECTED}",
        Place(file, last, 1),
        "the file is cut off, or is no IPC-D-356: export the board again",
    )


class _Records:
    """The records of one file on their way into a collector."""

    def __init__(self, lines: list[tuple[int, str]], collector: Collector) -> None:
        self._lines = lines
        self._collector = collector
        self._names = self._aliases()
        self._unknown_aliases: dict[str, None] = {}

    def read(self) -> None:
        """All test records. Raises InputError where there is none."""
        for number, line in self._lines:
            if _TEST_POINT.match(line):
                self._test_point(number, line)
            elif not (line.startswith("P") or _OTHER_RECORD.match(line)):
                message = f"no record: begins with {visible(line[:20])}; expected a three-digit code, P or C"
                self._problem(number, 1, message)
        file = self._collector.file
        if self._unknown_aliases:
            message = f"no P record gives the name behind {listed(self._unknown_aliases)}"
            self._collector.problem("caution", Place(file), message)
        if not self._collector.parts:
            message = "no record 317 or 327 has a refdes and a pin, so there is nothing on this board"
            raise InputError(message, Place(file, 1, 1), "export the netlist with components, not only with holes")
        self._note_full_columns()

    def _aliases(self) -> dict[str, str]:
        names: dict[str, str] = {}
        for number, line in self._lines:
            match = _ALIAS.match(line) if line.startswith("P") else None
            if match:
                alias, name = _alias(match[1]), visible(match[2])
                self._collector.limits.check("name", len(name), Place(self._collector.file, number, match.start(2) + 1))
                if names.setdefault(alias, name) != name:
                    message = f"{alias} stands for {names[alias][:40]} and for {name[:40]}; the first counts"
                    self._problem(number, match.start(1) + 1, message)
        return names

    def _test_point(self, number: int, line: str) -> None:
        refdes = visible(line[20:26].strip())
        pin = visible(line[27:31].strip())
        between, dash = line[17:20], line[26:27]
        if between.strip():
            message = f"columns 18 to 20 hold {visible(between)}; expected blanks after the net in 4 to 17"
            self._problem(number, 18, message)
        elif not refdes or refdes.upper() == "VIA":
            return
        elif dash not in ("", " ", "-"):
            message = f"column 27 holds {visible(dash)}; expected - after the refdes in 21 to 26"
            self._problem(number, 27, message)
        elif pin:
            net = self._net(visible(line[3:17].strip()))
            self._collector.pin(refdes, Pin(pin, net=net), Place(self._collector.file, number, 1))

    def _net(self, name: str) -> str | None:
        if not name or name.upper() == "N/C":
            return None
        if name.startswith("NNAME") and _ALIAS_USED.fullmatch(name):
            alias = _alias(name)
            if alias not in self._names:
                self._unknown_aliases[alias] = None
            return self._names.get(alias, name)
        return name

    def _note_full_columns(self) -> None:
        full = [name for name in self._full_nets() if name not in self._names.values()]
        if full:
            message = "nets whose name fills its 14 columns may have been cut off, and two of them may be one: "
            self._collector.problem("note", Place(self._collector.file), message + listed(full))

    def _full_nets(self) -> Iterator[str]:
        return (name for name in self._collector.net_names() if len(name) == _NET_WIDTH)

    def _problem(self, number: int, column: int, message: str) -> None:
        place = Place(self._collector.file, number, column)
        self._collector.problem("error", place, f"{message}; the record is left out")


def _alias(text: str) -> str:
    """`NNAME1` for `NNAME 1` and `NNAME00001`."""
    return f"NNAME{int(text.removeprefix('NNAME').strip())}"


def _lengthen_refdes(collector: Collector, full: list[str]) -> None:
    """Give parts the refdes that the parts table has where six columns were too few for it."""
    names = full_names(collector.parts, full, REFDES_WIDTH)
    if not names:
        return
    collector.relabel(names)
    pairs = [f"{short} is {name}" for short, name in names.items()]
    message = f"refdes cut to six columns, read as the parts table has them: {listed(pairs)}"
    collector.problem("note", Place(collector.file), message)
