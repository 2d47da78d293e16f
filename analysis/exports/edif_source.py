"""The text of an EDIF file that is being read, its places and limits, and what was wrong in it."""

from __future__ import annotations

from bisect import bisect_right
from functools import cached_property
from itertools import accumulate

from reactance.analysis.design import InputError, Place, Problem, Severity
from reactance.analysis.exports.edif_names import harmless
from reactance.analysis.exports.limits import Limits


class Source:
    """The decoded text of one export, with line and column of every offset.

    It also collects what was wrong but did not stop the reading; the first `limits.problems` are kept.
    """

    def __init__(self, data: bytes, file: str, limits: Limits) -> None:
        self.file = file
        self.limits = limits
        limits.check("bytes", len(data), Place(file))
        self.text = _decoded(data, file)
        self._problems: list[Problem] = []
        self._not_kept = 0

    @cached_property
    def _line_starts(self) -> list[int]:
        text = self.text
        mark = "\n" if "\n" in text or "\r" not in text else "\r"
        return [0, *accumulate(len(line) + 1 for line in text.split(mark))]

    def place(self, offset: int) -> Place:
        """Line and column, both from 1, of the character at `offset`."""
        line, column = self.line_and_column(offset)
        return Place(self.file, line, column)

    def line_and_column(self, offset: int) -> tuple[int, int]:
        """Both from 1."""
        starts = self._line_starts
        line = bisect_right(starts, offset)
        return line, offset - starts[line - 1] + 1

    def check(self, what: str, count: int, offset: int) -> None:
        """Raise InputError where `count` is beyond the limit `what`."""
        if count > getattr(self.limits, what):
            self.limits.check(what, count, self.place(offset))

    def problem(self, severity: Severity, offset: int, message: str) -> None:
        """Note what is wrong at that offset."""
        if len(self._problems) >= self.limits.problems:
            self._not_kept += 1
            return
        problem = Problem(severity, str(self.place(offset)), harmless(message))
        if problem not in self._problems[-1:]:
            self._problems.append(problem)

    def problems(self) -> tuple[Problem, ...]:
        """What was noted, in the order found, and how many more there were."""
        if not self._not_kept:
            return tuple(self._problems)
        message = f"{self._not_kept} more problems are not listed (limit `problems`: {self.limits.problems})"
        return (*self._problems, Problem("note", self.file, message))


def _decoded(data: bytes, file: str) -> str:
    if not data.strip():
        raise InputError(
            "the file is empty; expected (edif …)", Place(file, 1, 1), "export the schematic again"
        )
    nul = data.find(b"\0")
    if nul >= 0:
        place = Place(file, data.count(b"\n", 0, nul) + 1, nul - data.rfind(b"\n", 0, nul))
        raise InputError(
            "a zero byte: this is no text; expected (edif …)", place, "export as EDIF 2 0 0 text"
        )
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("latin-1")
