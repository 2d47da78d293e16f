"""One pass over the brackets and strings of an EDIF file: what it contains, with offsets, graphics passed over.

Quoted strings are the only place where brackets do not count (EDIF 2 0 0, ANSI/EIA-548-1988). The pass follows
the containers (library, cell, view, …) itself and steps over each entry in them with one regular expression.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

from reactance.analysis.design import InputError
from reactance.analysis.exports.edif_forms import parsed, pruned
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_words import BALANCED, BALANCED_CONTENTS, BALANCED_DEPTH
from reactance.analysis.exports.text import visible


@dataclass(slots=True)
class Entry:
    """One form that matters, `text[start:end]`, and what it declares once it has been read."""

    keyword: str
    start: int
    end: int
    value: object = None


@dataclass(slots=True)
class Container:
    """A form that holds entries and other containers. `head` is the bare word after its keyword."""

    keyword: str
    start: int
    head: str = ""
    entries: list[Entry] = field(default_factory=list)
    inner: list[Container] = field(default_factory=list)


@dataclass(frozen=True, slots=True)
class _Rule:
    """Which forms a container may hold: containers, entries to be read, and others to be stepped over."""

    inner: frozenset[str]
    entries: frozenset[str]
    others: frozenset[str]


def _rule(inner: str, entries: str, others: str = "") -> _Rule:
    common = "comment userdata status"
    return _Rule(
        frozenset(inner.split()), frozenset(entries.split()), frozenset(f"{common} {others}".split())
    )


# From the grammar of EDIF 2 0 0; entries that real exports put one level off are taken where they stand.
_RULES: Mapping[str, _Rule] = MappingProxyType(
    {
        "edif": _rule("library external", "rename name design edifversion keywordmap", "ediflevel"),
        "library": _rule("cell", "rename name technology", "ediflevel"),
        "external": _rule("cell", "rename name technology", "ediflevel"),
        "cell": _rule("view", "rename name celltype viewmap property designator"),
        "view": _rule("interface contents", "rename name viewtype property designator"),
        "interface": _rule(
            "",
            "port portbundle designator property parameter joined",
            "symbol protectionframe arrayrelatedinfo mustjoin weakjoined permutable timing simulate",
        ),
        "contents": _rule(
            "page",
            "instance net netbundle offpageconnector",
            "figure section commentgraphics portimplementation timing simulate when follow logicport boundingbox"
            " property",
        ),
        "page": _rule(
            "",
            "rename name instance net netbundle offpageconnector",
            "figure commentgraphics portimplementation pagesize boundingbox property array",
        ),
    }
)

# ASCII throughout: the same white space as in `sexpdata`, which takes other separators as parts of words.
_HEAD = re.compile(r"\(\s*+([^\s()\"]*+)", re.ASCII)
_GAP = re.compile(r"[^()\"]*+")
_STRING = re.compile(r"\"[^\"]*+\"")
_FORM = re.compile(BALANCED)
_USUAL = re.compile(
    rf"\s*+(\(\s*+((?i:instance|net|port|property))(?=[\s()\"]){BALANCED_CONTENTS}\))", re.ASCII
)
_TOKEN = re.compile(r"[()]|\"[^\"]*+\"?")


def outline(source: Source) -> tuple[Container, Mapping[str, str]]:
    """The file's containers and entries, and its keyword aliases (new word to the standard's, lower case).

    Raises InputError, with the place, where brackets or quotes do not match, or the file is no EDIF 2 0 0.
    """
    return _Scan(source).run()


class _Scan:
    def __init__(self, source: Source) -> None:
        self.source = source
        self.text = source.text
        self.aliases: dict[str, str] = {}
        self.stack: list[Container] = []
        self.forms = 0

    def run(self) -> tuple[Container, Mapping[str, str]]:
        text, stack = self.text, self.stack
        top, position = self._opening()
        stack.append(top)
        while stack:
            position = self._usual(position)
            gap = _GAP.match(text, position)
            assert gap is not None
            start = gap.end()
            if start > position and (word := gap.group().strip()):
                self._word(word, position)
            mark = text[start : start + 1]
            if mark == "(":
                position = self._form(start)
            elif mark == ")":
                stack.pop()
                position = start + 1
            elif mark:
                position = self._stray_string(start)
            else:
                raise self._unclosed(stack[-1].start)
        rest = text[position:].strip()
        if rest:
            where = position + text[position:].index(rest[0])
            raise self._broken("text after the end of (edif …); expected the end of the file", where)
        return top, self.aliases

    def _usual(self, position: int) -> int:
        """Take the instances, nets and ports that follow one another from here: the short way for most of a file."""
        within = self.stack[-1]
        wanted = _RULES[within.keyword].entries
        if self.aliases or ("instance" not in wanted and "port" not in wanted):
            return position
        match, text, entries = _USUAL.match, self.text, within.entries
        before = len(entries)
        while (form := match(text, position)) and (keyword := form.group(2).lower()) in wanted:
            position = form.end()
            entries.append(Entry(keyword, form.start(1), position))
        self.forms += len(entries) - before
        self.source.check("forms", self.forms, position)
        return position

    def _opening(self) -> tuple[Container, int]:
        start = len(self.text) - len(self.text.lstrip())
        head = _HEAD.match(self.text, start)
        if head is None or head.group(1).lower() != "edif":
            raise InputError(
                "this is no EDIF file: expected (edif … at its beginning",
                self.source.place(start),
                "export as EDIF 2 0 0",
            )
        return Container("edif", start), head.end()

    def _form(self, start: int) -> int:
        head = _HEAD.match(self.text, start)
        assert head is not None
        keyword = head.group(1).lower()
        keyword = self.aliases.get(keyword, keyword)
        within = self.stack[-1]
        rule = _RULES[within.keyword]
        if keyword in rule.inner:
            container = Container(keyword, start)
            within.inner.append(container)
            self.stack.append(container)
            return head.end()
        form = _FORM.match(self.text, start)
        end = form.end() if form else self._deep_end(start)
        if keyword in rule.entries:
            self.forms += 1
            self.source.check("forms", self.forms, start)
            within.entries.append(Entry(keyword, start, end))
            if keyword == "keywordmap":
                self._keyword_map(start, end)
        elif keyword not in rule.others:
            shown = f"({visible(head.group(1)[:40])} …)" if head.group(1) else "a form without keyword"
            self.source.problem(
                "caution", start, f"{shown} has no meaning in ({within.keyword} …); passed over"
            )
        return end

    def _deep_end(self, start: int) -> int:
        """The end of a form that nests deeper than the regular expression follows, or that never ends."""
        outside = len(self.stack)
        opened: list[int] = []
        for token in _TOKEN.finditer(self.text, start):
            mark = self.text[token.start()]
            if mark == "(":
                opened.append(token.start())
                self.source.check("depth", outside + len(opened), token.start())
            elif mark == ")":
                opened.pop()
                if not opened:
                    return token.end()
            elif token.end() - token.start() == 1 or self.text[token.end() - 1] != '"':
                raise self._open_string(token.start())
        raise self._unclosed(opened[-1])

    def _word(self, word: str, offset: int) -> None:
        within = self.stack[-1]
        if not within.head and within.keyword not in ("interface", "contents"):
            within.head = word.split(maxsplit=1)[0]
            if len(word.split()) == 1:
                return
            word = word.split()[1]
        shown = visible(word[:40])
        self.source.problem(
            "caution", offset, f"the word {shown} has no meaning in ({within.keyword} …); passed over"
        )

    def _stray_string(self, start: int) -> int:
        string = _STRING.match(self.text, start)
        if string is None:
            raise self._open_string(start)
        within = self.stack[-1]
        if not within.head and within.keyword not in ("interface", "contents"):
            within.head = string.group()[1:-1]
        self.source.problem("caution", start, f"a string has no meaning in ({within.keyword} …)")
        return string.end()

    def _keyword_map(self, start: int, end: int) -> None:
        """Aliases of keyword level 1; the macros of level 2 and 3 are refused."""
        (form,) = parsed(pruned(self.text[start:end]))
        for item in form[1:]:
            if not isinstance(item, list) or not item or not isinstance(item[0], str):
                continue
            keyword = item[0].lower()
            words = [word for word in item[1:] if isinstance(word, str)]
            if keyword == "keywordalias" and len(words) == 2:
                new, old = words[0].lower(), words[1].lower()
                self.aliases[new] = self.aliases.get(old, old)
            elif keyword == "keyworddefine" or (
                keyword == "keywordlevel" and words[:1] not in (["0"], ["1"])
            ):
                raise InputError(
                    "keyword macros (keyword level 2 and 3) are not read; expected keyword level 0 or 1",
                    self.source.place(start),
                    "export with (keywordMap (keywordLevel 0))",
                )

    def _unclosed(self, start: int) -> InputError:
        head = _HEAD.match(self.text, start)
        shown = visible(head.group(1)[:40]) if head else ""
        message = f"the file ends inside ({shown} …), which begins here; expected ')'"
        return InputError(message, self.source.place(start), "the file is cut off, or a bracket is missing")

    def _open_string(self, start: int) -> InputError:
        message = "the string that begins here never ends; expected '\"'"
        return self._broken(message, start, "a quotation mark is missing here or before")

    def _broken(
        self, message: str, offset: int, remedy: str = "a bracket too many, or a file cut off"
    ) -> InputError:
        return InputError(message, self.source.place(offset), remedy)


assert BALANCED_DEPTH + len(_RULES) < 32  # what `Limits.depth` promises
