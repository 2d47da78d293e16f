"""What changed between two briefs: one edit per key, tables matched by what they are about.

The text is read as TOML without regard to what the keys mean, so that a brief of any version can be compared.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from typing import Any

from reactance.analysis.report import Edit

# What a table of an array is about: the first of these keys that it has.
_IDENTITY: Mapping[str, tuple[str, ...]] = {
    "rail": ("net",),
    "pin": ("at",),
    "coupling": ("name", "from"),
    "filter": ("name", "from"),
    "part": ("match",),
    "amplifier": ("out",),
    "duty": ("capacitor",),
}
_ORDERED = frozenset({"part"})  # the first table that matches wins, so their order counts
Tables = dict[str, Any]


def brief_edits(older: bytes | None, newer: bytes | None) -> tuple[Edit, ...]:
    """One edit per changed key; one for the whole brief where it came, went or cannot be read as TOML."""
    if older == newer:
        return ()
    before, after = _tables(older), _tables(newer)
    if before is None or after is None or older is None or newer is None:
        return (_edit("", _summary(older, before), _summary(newer, after)),)
    return tuple(_changes(before, after))


def anchors(data: bytes | None) -> frozenset[str]:
    """What the brief names as `rail:NET`, `coupling:NAME` and `filter:NAME`; empty where it cannot be read."""
    return frozenset(tables_by_anchor(data))


def tables_by_anchor(data: bytes | None) -> dict[str, Mapping[str, Any]]:
    """The tables of rails, couplings and filters, by the anchor of their checks."""
    found: dict[str, Mapping[str, Any]] = {}
    document = _document(data) or {}
    for kind in ("rail", "coupling", "filter"):
        for table in document.get(kind, ()) if isinstance(document.get(kind), list) else ():
            if isinstance(table, dict):
                ends = f"{table.get('from')}>{table.get('to')}"
                found[f"{kind}:{table.get('net') if kind == 'rail' else table.get('name') or ends}"] = table
    return found


def _document(data: bytes | None) -> Tables | None:
    try:
        return tomllib.loads((data or b"").decode("utf-8-sig"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, RecursionError):
        return None


def _tables(data: bytes | None) -> Tables | None:
    """Tables by what they are about, such as `rail +3V3`; keys outside any table stand under their own name."""
    document = _document(data)
    if document is None:
        return None
    tables: Tables = {}
    for kind, content in document.items():
        if isinstance(content, list) and all(isinstance(entry, dict) for entry in content):
            for entry in content:
                _put(tables, f"{kind} {_about(kind, entry)}".strip(), entry)
        else:
            tables[kind] = content
    for kind in _ORDERED & document.keys():
        if isinstance(document[kind], list):
            tables[f"order of [[{kind}]]"] = [_about(kind, e) if isinstance(e, dict) else e for e in document[kind]]
    return tables


def _put(tables: Tables, name: str, entry: Tables) -> None:
    count, wanted = 2, name
    while wanted in tables:
        wanted = f"{name} #{count}"
        count += 1
    tables[wanted] = entry


def _about(kind: str, entry: Tables) -> str:
    for key in _IDENTITY.get(kind, ()):
        if entry.get(key):
            text = _text(entry[key])
            return f"{text}>{_text(entry.get('to', ''))}" if key == "from" else text
    return ""


def _changes(before: Tables, after: Tables) -> Iterator[Edit]:
    for name in dict.fromkeys((*before, *after)):
        one, other = before.get(name), after.get(name)
        if name.startswith("order of "):
            if one and other and sorted(one) == sorted(other) and one != other:
                yield _edit(name, ", ".join(one), ", ".join(other))
        elif isinstance(one, dict) and isinstance(other, dict):
            yield from _keys(f"{name}: ", one, other)
        elif one != other:
            yield _edit(name, _text(one), _text(other))


def _keys(prefix: str, before: Tables, after: Tables) -> Iterator[Edit]:
    for key in dict.fromkeys((*before, *after)):
        one, other = before.get(key), after.get(key)
        if isinstance(one, dict) and isinstance(other, dict):
            yield from _keys(f"{prefix}{key}.", one, other)
        elif one != other or type(one) is not type(other):
            yield _edit(f"{prefix}{key}", _text(one), _text(other))


def _edit(attribute: str, before: str | None, after: str | None) -> Edit:
    name = f"brief, {attribute}" if attribute else "brief"
    return Edit(name, "brief changed", None, attribute or None, before, after)


def _summary(data: bytes | None, tables: Tables | None) -> str | None:
    if data is None:
        return None
    if tables is None:
        return "not readable as TOML"
    count = sum(not name.startswith("order of ") for name in tables)
    return f"{count} table{'' if count == 1 else 's'}"


def _text(value: Any) -> Any:
    """A value as one would write it in a brief, without quotes around a single text; None for what is absent."""
    if value is None or isinstance(value, str):
        return value
    return _literal(value)


def _literal(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return f'"{value}"'
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{key} = {_literal(entry)}" for key, entry in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(_literal(entry) for entry in value) + "]"
    return str(value)
