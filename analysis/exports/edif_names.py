"""EDIF names and strings: identifiers, the names that people see, arrays and their members."""

from __future__ import annotations

import re
from math import prod
from typing import NamedTuple

from reactance.analysis.exports.edif_forms import Sexp


class BadEntryError(Exception):
    """A form that is well bracketed but does not say what it must. It is listed; the rest is kept."""


class Name(NamedTuple):
    """A name as declared: `key` identifies it within the file, `text` is what people see.

    `size` holds the dimensions of an array, empty for a single thing.
    """

    key: str
    text: str
    size: tuple[int, ...] = ()

    @property
    def width(self) -> int:
        """How many members there are."""
        return prod(self.size)

    @property
    def renamed(self) -> bool:
        """Whether people see another name than the identifier."""
        return self.text.lower() != self.key.lstrip("&")


_CODES = re.compile(r"%\s*(\d{1,7}(?:\s+\d{1,7})*)\s*%", re.ASCII)
_NEEDS_WORK = re.compile(r"[%\r\n\x00-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff]")
_UNSAFE = re.compile(r"[\x00-\x1f\x7f-\x9f\u061c\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff]")
_RANGE = re.compile(r"(.*?)([\[(<])\s*(\d{1,9})\s*(?::|\.\.|-)\s*(\d{1,9})\s*([])>])")


def keyword(form: Sexp) -> str:
    """The form's first word in lower case; "" for what is no form."""
    if isinstance(form, list) and form and isinstance(form[0], str):
        return form[0].lower()
    return ""


def visible(text: str) -> str:
    """A string as people see it.

    `%34 65%` are character codes and a line break is no part of the string (EDIF 2 0 0). Characters that would act
    on a terminal or turn the reading direction stay in the notation of codes, so that they cannot act anywhere.
    """
    if not _NEEDS_WORK.search(text):
        return text
    joined = text.replace("\r", "").replace("\n", "")
    return harmless(_CODES.sub(_characters, joined))


def harmless(text: str) -> str:
    """`text` with the characters that act on a terminal or turn the reading direction written as codes."""
    return _UNSAFE.sub(lambda match: " " if match.group() == "\t" else f"%{ord(match.group())}%", text)


def _characters(match: re.Match[str]) -> str:
    codes = [int(code) for code in match.group(1).split()]
    if any(code < 32 or code > 0x10FFFF or 0xD800 <= code < 0xE000 for code in codes):
        return match.group()
    return "".join(map(chr, codes))


def string(form: Sexp) -> str:
    """The text of a string or `(stringDisplay "…")`."""
    if isinstance(form, str):
        return visible(form)
    if keyword(form) == "stringdisplay" and len(form) > 1 and isinstance(form[1], str):
        return visible(form[1])
    raise BadEntryError(f"expected a string{found(form)}")


def found(form: Sexp) -> str:
    """For the end of a message: what stood there instead."""
    shown = keyword(form)
    return f", found ({visible(shown[:40])} …)" if shown else ""


def name(form: Sexp | None) -> Name:
    """The name that `form` declares: an identifier, `(rename …)`, `(name …)` or `(array …)`."""
    if isinstance(form, str):
        if not form:
            raise BadEntryError("expected a name, found an empty one")
        return Name(form.lower(), visible(form.removeprefix("&") or form))
    kind = keyword(form) if form is not None else ""
    if form is None or len(form) < 2:
        raise BadEntryError("expected a name")
    if kind == "name":
        return name(form[1])
    if kind == "rename":
        inner = name(form[1])
        shown = string(form[2]) if len(form) > 2 else ""
        return Name(inner.key, shown or inner.text)
    if kind == "array":
        inner = name(form[1])
        return Name(inner.key, inner.text, indices(list(form[2:]), least=1))
    raise BadEntryError(f"expected a name{found(form)}")


def indices(forms: list[Sexp], least: int = 0) -> tuple[int, ...]:
    """The integers of an array's size or a member's index."""
    numbers = []
    for form in forms:
        if not (isinstance(form, str) and form.isascii() and form.isdigit() and len(form) < 10):
            raise BadEntryError("expected a whole number in an array or member")
        numbers.append(int(form))
    if not numbers or min(numbers) < least:
        raise BadEntryError("an array needs a size of 1 or more, a member an index")
    return tuple(numbers)


def reference(form: Sexp | None) -> tuple[str, tuple[int, ...]]:
    """The identifier, as written, and the index of `NAME` or `(member NAME 3)`."""
    if isinstance(form, str) and form:
        return form, ()
    if form is not None and keyword(form) == "member" and len(form) > 2 and isinstance(form[1], str):
        return form[1], indices(list(form[2:]))
    if form is not None and keyword(form) == "name" and len(form) > 1 and isinstance(form[1], str):
        return form[1], ()
    raise BadEntryError("expected the name of something declared")


def member_names(declared: Name) -> list[str]:
    """What people call each member of an array, in the order of its indices.

    `D[7:0]` with eight members begins with `D[7]`; without a range the members are `D[0]`, `D[1]` …
    """
    if not declared.size:
        return [declared.text]
    match = _RANGE.fullmatch(declared.text)
    if match:
        first, last = int(match[3]), int(match[4])
        if abs(first - last) + 1 == declared.width:
            step = 1 if last >= first else -1
            return [f"{match[1]}{match[2]}{index}{match[5]}" for index in range(first, last + step, step)]
    stem = declared.text
    if len(declared.size) == 1:
        return [f"{stem}[{index}]" for index in range(declared.width)]
    return [
        f"{stem}[{','.join(map(str, _unflattened(flat, declared.size)))}]" for flat in range(declared.width)
    ]


def _unflattened(flat: int, size: tuple[int, ...]) -> list[int]:
    index = []
    for extent in reversed(size):
        flat, digit = divmod(flat, extent)
        index.append(digit)
    return index[::-1]


def flattened(index: tuple[int, ...], size: tuple[int, ...]) -> int | None:
    """The position of a member among all members, the last index running fastest; None where there is none."""
    if len(index) != len(size) or any(i >= extent for i, extent in zip(index, size, strict=True)):
        return None
    position = 0
    for i, extent in zip(index, size, strict=True):
        position = position * extent + i
    return position
