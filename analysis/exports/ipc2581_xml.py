"""The elements of an IPC-2581 file as they come, with their places; nothing that refers outside is read."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import NamedTuple
from xml.parsers import expat

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports.limits import Limits

ROOT = "IPC-2581"

_REMEDY = "export the board as IPC-2581 revision B or C again"


class Element(NamedTuple):
    """The start of an element: its name without namespace, its attributes, and where it begins (from 1)."""

    name: str
    attributes: Mapping[str, str]
    line: int
    column: int


def read_elements(
    data: bytes, file: str, limits: Limits, start: Callable[[Element], None], end: Callable[[str], None]
) -> None:
    """Call `start` and `end` for each element in turn.

    A document type, and with it every entity and external reference, is refused where it is met. Raises
    InputError for that, for what is no well-formed IPC-2581, and beyond the limits.
    """
    limits.check("bytes", len(data), Place(file))
    _Reader(file, limits, start, end).read(data)


class _Reader:
    def __init__(self, file: str, limits: Limits, start: Callable[[Element], None], end: Callable[[str], None]) -> None:
        self._file = file
        self._limits = limits
        self._start = start
        self._end = end
        self._depth = 0
        self._open: list[tuple[str, int]] = []
        # Namespaces are resolved here, so that any prefix will do.
        self._parser = parser = expat.ParserCreate(namespace_separator=" ")
        parser.ordered_attributes = True
        parser.buffer_text = True
        parser.SetParamEntityParsing(expat.XML_PARAM_ENTITY_PARSING_NEVER)
        parser.StartElementHandler = self._element
        parser.EndElementHandler = self._closed
        parser.StartDoctypeDeclHandler = self._document_type
        parser.EntityDeclHandler = self._entity
        parser.ExternalEntityRefHandler = self._external
        parser.SkippedEntityHandler = self._entity

    def read(self, data: bytes) -> None:
        try:
            self._parser.Parse(data, True)
        except expat.ExpatError as error:
            raise self._broken(error) from None
        except (LookupError, ValueError) as error:
            # The declared encoding is none, or one that is no plain table of characters.
            raise self._error(f"the encoding cannot be read: {error}", "save the file as UTF-8") from None

    def _element(self, name: str, flat: list[str]) -> None:
        local = name.rsplit(" ", 1)[-1]
        line, column = self._parser.CurrentLineNumber, self._parser.CurrentColumnNumber + 1
        if not self._open and local != ROOT:
            raise self._error(f"the outermost element is <{local[:40]}>; expected <{ROOT}>", _REMEDY)
        self._open.append((local, line))
        if len(self._open) > self._limits.depth:
            self._limits.check("depth", len(self._open), self._place())
        names = (key.rsplit(" ", 1)[-1] for key in flat[::2])
        self._start(Element(local, dict(zip(names, flat[1::2], strict=True)), line, column))

    def _closed(self, name: str) -> None:
        self._open.pop()
        self._end(name.rsplit(" ", 1)[-1])

    def _document_type(self, *_: object) -> None:
        raise self._error(
            "a document type declaration (<!DOCTYPE …>): entities and external references are refused",
            "remove it; an IPC-2581 file needs none",
        )

    def _entity(self, *_: object) -> None:
        raise self._error("an entity: only the five of XML itself are read", "write the text in its place")

    def _external(self, *_: object) -> int:
        raise self._error("a reference outside this file: it is refused", "put the content into this file")

    def _broken(self, error: expat.ExpatError) -> InputError:
        what = expat.ErrorString(error.code) or "not well-formed"
        within = f" inside <{self._open[-1][0]}> of line {self._open[-1][1]}" if self._open else ""
        expected = f"</{self._open[-1][0]}>" if self._open else f"<{ROOT} …>"
        message = f"broken XML: {what}{within}; expected {expected} or well-formed content before it"
        place = Place(self._file, error.lineno, error.offset + 1)
        return InputError(message, place, "the file is cut off or damaged: export it again")

    def _error(self, message: str, remedy: str) -> InputError:
        return InputError(message, self._place(), remedy)

    def _place(self) -> Place:
        return Place(self._file, self._parser.CurrentLineNumber, self._parser.CurrentColumnNumber + 1)
