"""From the text of forms to nested lists, by way of `sexpdata`, each distinct form once.

`sexpdata` reads Lisp. What Lisp sees in an atom and EDIF does not (numbers, `t`, `nil`, quotes, backslashes,
semicolons, square brackets) is kept from it here, so that `001`, `1e5` and `A\\B` come out as they stand.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from typing import TypeAlias, cast

import sexpdata

from reactance.analysis.exports.edif_words import BALANCED_CONTENTS

Sexp: TypeAlias = "str | list[Sexp]"

# Graphics, remarks and timing: never needed, wherever they stand.
_PASSED_OVER = (
    "boundingbox|comment|commentgraphics|connectlocation|criticality|display|figure|figuregroupoverride"
    "|keyworddisplay|netdelay|pagesize|portimplementation|propertydisplay|protectionframe|status|symbol|timing"
    "|transform|userdata|written"
)
_HINT = re.compile(r"\(\s*+(?:" + _PASSED_OVER + r")(?=[\s()\"])", re.IGNORECASE | re.ASCII)
_PRUNE = re.compile(
    r"(\"[^\"]*+\")|\(\s*+(?i:" + _PASSED_OVER + r")(?=[\s()\"])" + BALANCED_CONTENTS + r"\)", re.ASCII
)

# Lone surrogates occur in no decoded file, so they can stand for the characters that Lisp would act upon.
_LISP = "'\\;[]"
_LISP_SEEN = re.compile(r"['\\;\[\]]")
_HIDE = {ord(character): 0xDC00 + ord(character) for character in _LISP}
_SHOW = {hidden: shown for shown, hidden in _HIDE.items()}

_BATCH = (
    400_000  # characters handed over at once: the parser has a start-up cost, and the copy should stay small
)


class _Parser(sexpdata.Parser):  # type: ignore[misc]
    """`sexpdata` with every atom left as the text it is."""

    def atom(self, token: str) -> str:
        return token


class _UnhidingParser(_Parser):
    def atom(self, token: str) -> str:
        return token.translate(_SHOW)


def _shown(text: str) -> str:
    return text.translate(_SHOW)


def parsed(text: str) -> list[list[Sexp]]:
    """All forms in `text`, whose brackets and quotes must match, as nested lists of strings.

    A quoted string and an atom of the same characters come out alike; EDIF tells them apart by where they stand.
    """
    parser = _Parser(text)
    if _LISP_SEEN.search(text):
        parser = _UnhidingParser(text.translate(_HIDE), string_to=_shown)
    return cast(list[list[Sexp]], parser.parse())


def pruned(text: str) -> str:
    """`text` without the forms that are graphics, remarks or timing."""
    if not _HINT.search(text):
        return text
    return _PRUNE.sub(lambda match: match.group(1) or " ", text)


class FormMemory:
    """What forms declared, remembered by their text from one reading of an export to the next.

    It keeps at least the last `size` characters' worth of forms that were asked for, at most twice that, and what
    `keep` was given for the last few files. Not for use by two threads at once.
    """

    _FILES = 16

    def __init__(self, size: int = 64_000_000) -> None:
        self._size = size
        self._filled = 0
        self._recent: dict[str, object] = {}
        self._older: dict[str, object] = {}
        self._kept: dict[str, object] = {}

    def keep(self, file: str, reading: object | None) -> None:
        """Keep the last reading of that file, or forget it."""
        self._kept.pop(file, None)
        if reading is not None:
            self._kept[file] = reading
            while len(self._kept) > self._FILES:
                del self._kept[next(iter(self._kept))]

    def kept(self, file: str) -> object | None:
        """The last reading of that file."""
        return self._kept.get(file)

    def __len__(self) -> int:
        return len(self._recent) + len(self._older)

    def get(self, text: str) -> object | None:
        """What the form of that text declared, or None."""
        value = self._recent.get(text)
        if value is None:
            value = self._older.pop(text, None)
            if value is not None:
                self.put(text, value)
        return value

    def put(self, text: str, value: object) -> None:
        """Remember what the form of that text declares (never None)."""
        if self._filled + len(text) > self._size:
            self._older, self._recent, self._filled = self._recent, {}, 0
        self._recent[text] = value
        self._filled += len(text)


def declared(
    texts: Sequence[str],
    build: Callable[[list[Sexp]], object],
    memory: FormMemory | None,
    *,
    prune: bool = True,
) -> list[object]:
    """What each form of `texts` declares: from `memory` where it has been seen, else through `build`."""
    memory = FormMemory() if memory is None else memory
    found: dict[str, object] = {}
    unseen: list[str] = []
    for text in texts:
        if text not in found:
            value = memory.get(text)
            found[text] = value
            if value is None:
                unseen.append(text)
    for batch in _batches(unseen):
        joined = "\n".join(batch)
        forms = parsed(pruned(joined) if prune else joined)
        for text, form in zip(batch, forms, strict=True):
            value = found[text] = build(form)
            memory.put(text, value)
    return [found[text] for text in texts]


def _batches(texts: Iterable[str]) -> Iterable[list[str]]:
    batch: list[str] = []
    length = 0
    for text in texts:
        batch.append(text)
        length += len(text)
        if length > _BATCH:
            yield batch
            batch, length = [], 0
    if batch:
        yield batch
