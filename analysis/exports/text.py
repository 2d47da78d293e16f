"""Bytes of plain-text exports as characters, and names that cannot act on a terminal or a page."""

from __future__ import annotations

import codecs
import re

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports.limits import Limits

# Longest marks first: the mark of UTF-32 little-endian begins with that of UTF-16.
_MARKS: tuple[tuple[bytes, str], ...] = (
    (codecs.BOM_UTF32_LE, "utf-32"),
    (codecs.BOM_UTF32_BE, "utf-32"),
    (codecs.BOM_UTF8, "utf-8-sig"),
    (codecs.BOM_UTF16_LE, "utf-16"),
    (codecs.BOM_UTF16_BE, "utf-16"),
)

# Control characters, and marks that are unseen or turn the reading direction (Unicode categories Cc and Cf).
_UNSAFE = re.compile(r"[\x00-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff\ud800-\udfff]")
_BLANKS = re.compile(r"[\t\r\n\v\f]+")


def lines_of(data: bytes, file: str, limits: Limits, expected: str) -> list[str]:
    """The lines of a text export without their ends, whichever of the three usual ends they have.

    Raises InputError for what is no text (see `decoded`) or beyond the limits.
    """
    limits.check("bytes", len(data), Place(file))
    text = decoded(data, file, expected)
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    limits.check("lines", text.count("\n"), Place(file))
    return text.split("\n")


def visible(text: str) -> str:
    """Text as people may see it: line breaks and tabs as a blank, other controls as their code between `%`."""
    if text.isprintable():
        return text
    return _UNSAFE.sub(lambda match: f"%{ord(match.group())}%", _BLANKS.sub(" ", text))


def decoded(data: bytes, file: str, expected: str) -> str:
    """The text of an export: UTF-8 or UTF-16 (with or without a mark), else Windows-1252, else Latin-1.

    Raises InputError for what is no text; `expected` says what should stand there.
    """
    encoding = encoding_of(data)
    try:
        text = data.decode(encoding or "utf-8")
    except UnicodeDecodeError:
        text = _eight_bit(data) if encoding is None else data.decode(encoding, "replace")
    nul = text.find("\0")
    if nul >= 0:
        place = Place(file, text.count("\n", 0, nul) + 1, nul - text.rfind("\n", 0, nul))
        raise InputError(f"a zero byte: this is no text; expected {expected}", place, "export the board again")
    return text


def encoding_of(data: bytes) -> str | None:
    """The encoding that a byte order mark, or every other byte being zero, shows; None where nothing does."""
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            return encoding
    head = data[:64]
    if len(head) >= 4 and b"\0" in head:
        if head[1::2].count(0) > 0.7 * len(head[1::2]) and 0 not in head[::2]:
            return "utf-16-le"
        if head[::2].count(0) > 0.7 * len(head[::2]) and 0 not in head[1::2]:
            return "utf-16-be"
    return None


def _eight_bit(data: bytes) -> str:
    try:
        return data.decode("cp1252")
    except UnicodeDecodeError:
        return data.decode("latin-1")
