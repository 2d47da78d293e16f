"""What the board must do: the brief, read from TOML 1.0 and validated.

The tables and their keys are in `reactance.analysis.brief_tables`; this module turns bytes into them and turns
every mistake into one message that names file, table, key and line.
"""

from __future__ import annotations

import hashlib
import re
import tomllib
from dataclasses import dataclass
from typing import Any

import msgspec

from reactance.analysis.brief_tables import Amount, BriefTables, VoltOrShare
from reactance.analysis.design import InputError, Place
from reactance.analysis.quantity import QuantityError, parse_quantity

_AT = re.compile(r" - at `\$(?P<path>[^`]*)`$")
_STEP = re.compile(r"\.(?P<key>[^.\[\]]+)|\[(?P<index>\d+|\.\.\.)\]")
_TOML_AT = re.compile(r"\s*\(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)$")
MOST_BYTES = 4_000_000


@dataclass(frozen=True)
class Brief:
    """A validated brief: its tables, the file it came from, and its text for naming lines."""

    tables: BriefTables
    file: str
    text: str
    present: bool

    @property
    def digest(self) -> str:
        """SHA-256 of the text, in hexadecimal."""
        return hashlib.sha256(self.text.encode()).hexdigest()

    def error(self, table: str, index: int | None, key: str, message: str, remedy: str = "") -> InputError:
        """An error about one key, with the line where that key stands. `index` counts from 0."""
        name = _table_name(table, index)
        line = _line_of(self.text, table, index, key)
        return InputError(f"{name}, {key}: {message}", Place(self.file, line), remedy)


def read_brief(data: bytes | None, file: str) -> Brief:
    """The brief in `data`; a board without one (`None`) gets the defaults of every table.

    Raises `InputError` for broken TOML, an unknown key, a missing key, a wrong unit or a wrong kind of value.
    """
    if data is None:
        return Brief(BriefTables(), file, "", False)
    text = _decode(data, file)
    try:
        document = tomllib.loads(text)
    except tomllib.TOMLDecodeError as problem:
        raise _broken_toml(str(problem), text, file) from None
    except RecursionError:
        raise InputError("the brief nests too deeply to be read", Place(file), "flatten its tables") from None
    for table in ("pin", "rail", "coupling", "filter", "amplifier", "duty", "part"):
        if isinstance(document.get(table), dict):
            line = _line_of(text, table, None, "")
            message = f"[{table}] is a single table, but there can be several of them"
            raise InputError(message, Place(file, line), f"write [[{table}]]")
    try:
        tables = msgspec.convert(document, BriefTables, dec_hook=_quantity, strict=True)
    except msgspec.ValidationError as problem:
        raise _invalid(str(problem), text, file) from None
    brief = Brief(tables, file, text, True)
    _consistent(brief)
    return brief


def _decode(data: bytes, file: str) -> str:
    if len(data) > MOST_BYTES:
        raise InputError(f"the brief has more than {MOST_BYTES} bytes", Place(file), "shorten it")
    try:
        return data.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as problem:
        line = data[: problem.start].count(b"\n") + 1
        raise InputError("the brief is not UTF-8 text", Place(file, line), "save it as UTF-8") from None


def _broken_toml(message: str, text: str, file: str) -> InputError:
    found = _TOML_AT.search(message)
    line: int | None = text.count("\n") + 1
    column = None
    if found and found["line"]:
        line, column = int(found["line"]), int(found["column"])
    said = _TOML_AT.sub("", message)
    return InputError(f"not valid TOML: {said}", Place(file, line, column), "mend the line; quote every text")


def _quantity(kind: type, value: Any) -> Any:
    """Read one quantity for msgspec; a ValueError here becomes its error with the path of the key."""
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise ValueError(f"expected a quantity such as a text or a number, got {value!r}")
    try:
        if kind is VoltOrShare:
            return _volt_or_share(value)
        if issubclass(kind, Amount):
            return kind(parse_quantity(value, kind.unit))
    except QuantityError as problem:
        raise ValueError(str(problem)) from None
    raise TypeError(f"no reader for {kind}")


def _volt_or_share(value: str | int | float) -> VoltOrShare:
    if isinstance(value, str) and value.rstrip().endswith("%"):
        return VoltOrShare(parse_quantity(value, "fraction"), True)
    return VoltOrShare(parse_quantity(value, "V"), False)


def _invalid(message: str, text: str, file: str) -> InputError:
    """msgspec's message, with its path turned into table, key and line."""
    found = _AT.search(message)
    said = _AT.sub("", message)
    steps = [m["key"] or m["index"] for m in _STEP.finditer(found["path"])] if found else []
    remedy = ""
    unknown = re.fullmatch(r"Object contains unknown field `(.*)`", said)
    missing = re.fullmatch(r"Object missing required field `(.*)`", said)
    if unknown:
        steps.append(unknown[1])
        said, remedy = "there is no such key", "see the README for the keys of this table"
    elif missing:
        steps.append(missing[1])
        said, remedy = "this key is missing", "state it"
    else:
        said = said.replace("`str | array`", "a text or a list of texts").replace("`", "")
    table = steps[0] if steps else ""
    index = int(steps[1]) if len(steps) > 1 and steps[1].isdigit() else None
    keys = [step for step in steps[1:] if not step.isdigit() and step != "..."]
    if not keys:
        where, key = table or "brief", table
    else:
        key = ".".join(keys)
        where = f"{_table_name(table, index)}, {key}"
    line = _line_of(text, table, index, keys[-1] if keys else "")
    return InputError(f"{where}: {said}", Place(file, line), remedy)


def _table_name(table: str, index: int | None) -> str:
    return f"[{table}]" if index is None else f"[[{table}]] {index + 1}"


def _line_of(text: str, table: str, index: int | None, key: str) -> int | None:
    """Line (from 1) of `key` in the index-th `table`, else of the table's head, else None."""
    head = re.compile(rf"^\s*(\[{{1,2}})\s*{re.escape(table)}\s*(?:[.\]].*)?$")
    any_head = re.compile(r"^\s*\[{1,2}[^\[\]]+\]{1,2}\s*(?:#.*)?$")
    last = re.escape(key.rsplit(".", 1)[-1])
    wanted = re.compile(rf"(?:^|[\s{{,.\"'])(?:{last})[\"']?\s*=") if last else None
    bare = re.compile(rf"\s*{re.escape(table)}\s*[=.]")
    count, at, inside = -1, None, False
    for number, line in enumerate(text.split("\n"), 1):
        if any_head.match(line):
            found = head.match(line)
            inside = found is not None and (index is None or found[1] == "[[")
            if inside:
                count += 1
                inside = index is None or count == index
                at = number if inside and at is None else at
        elif (inside and wanted and wanted.search(line)) or (index is None and wanted is None and bare.match(line)):
            return number
    return at


def _consistent(brief: Brief) -> None:
    """What no single key can say: orders, doubles, signs."""
    tables = brief.tables
    temperature = tables.board.temperature
    if temperature and temperature.low > temperature.high:
        raise brief.error("board", None, "temperature", "low is above high", "exchange them")
    for key in ("service_life", "mounting_inductance", "movement"):
        _at_least_zero(brief, "board", None, key, getattr(tables.board, key))
    _rails(brief)
    for index, pin in enumerate(tables.pin):
        _at_least_zero(brief, "pin", index, "resistance", pin.resistance)
        _at_least_zero(brief, "pin", index, "capacitance", pin.capacitance)
    for index, coupling in enumerate(tables.coupling):
        _above_zero(brief, "coupling", index, "lowest_frequency", coupling.lowest_frequency)
        if coupling.loss is not None and coupling.lowest_frequency is None:
            raise brief.error("coupling", index, "loss", "lowest_frequency is missing", "state lowest_frequency")
        if coupling.tilt:
            _above_zero(brief, "coupling", index, "tilt.pulse", coupling.tilt.pulse)
    for index, table in enumerate(tables.filter):
        _above_zero(brief, "filter", index, "corner", table.corner)
        for entry in table.attenuation:
            _above_zero(brief, "filter", index, "attenuation.at", entry.at)
    for index, amplifier in enumerate(tables.amplifier):
        _above_zero(brief, "amplifier", index, "gain_bandwidth", amplifier.gain_bandwidth)
    _anchors(brief)


def _rails(brief: Brief) -> None:
    seen: set[str] = set()
    for index, rail in enumerate(brief.tables.rail):
        if rail.net in seen:
            raise brief.error("rail", index, "net", f"{rail.net} has two [[rail]] tables", "join them")
        seen.add(rail.net)
        _at_least_zero(brief, "rail", index, "tolerance", rail.tolerance)
        if rail.source:
            _at_least_zero(brief, "rail", index, "source.resistance", rail.source.resistance)
            _at_least_zero(brief, "rail", index, "source.inductance", rail.source.inductance)
        if rail.step:
            _above_zero(brief, "rail", index, "step.current", rail.step.current)
            _at_least_zero(brief, "rail", index, "step.rise", rail.step.rise)
        if rail.band and not 0 < rail.band.low < rail.band.high:
            raise brief.error("rail", index, "band", "low must be above 0 and below high", "mend the band")
        for key in ("allowed", "allowed_rhythm"):
            limit = getattr(rail, key)
            if limit is not None and limit <= 0:
                raise brief.error("rail", index, key, "must be above 0", "state the greatest excursion")
            if limit is not None and limit.share and rail.voltage is None:
                raise brief.error("rail", index, key, "is a share of a voltage that is not stated", "state voltage")


def _anchors(brief: Brief) -> None:
    for name in ("coupling", "filter"):
        seen: set[str] = set()
        for index, table in enumerate(getattr(brief.tables, name)):
            anchor = table.name or f"{table.from_}>{table.to}"
            if anchor in seen:
                raise brief.error(name, index, "name", f"{anchor!r} stands twice", "give each its own name")
            seen.add(anchor)


def _above_zero(brief: Brief, table: str, index: int | None, key: str, value: float | None) -> None:
    if value is not None and not value > 0:
        raise brief.error(table, index, key, "must be above 0", "mend the value")


def _at_least_zero(brief: Brief, table: str, index: int | None, key: str, value: float | None) -> None:
    if value is not None and not value >= 0:
        raise brief.error(table, index, key, "must not be negative", "mend the value")
