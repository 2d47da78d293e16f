"""EDIF 2 0 0 (ANSI/EIA-548-1988): netlist and schematic views into one Design."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Mapping
from contextlib import contextmanager

from reactance.analysis.design import Design, InputError
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_again import LastReading, last_reading, same_but_attributes
from reactance.analysis.exports.edif_build import declaration
from reactance.analysis.exports.edif_cells import Catalogue
from reactance.analysis.exports.edif_flatten import Flat, flatten
from reactance.analysis.exports.edif_forms import FormMemory, Sexp, declared
from reactance.analysis.exports.edif_hierarchy import netlists
from reactance.analysis.exports.edif_scan import Container, Entry, outline
from reactance.analysis.exports.edif_source import Source
from reactance.analysis.exports.edif_top import top_cell
from reactance.analysis.exports.limits import DEFAULT_LIMITS, Limits
from reactance.analysis.exports.text import visible

__all__ = ["FormMemory", "read_edif"]


def read_edif(
    data: bytes, file: str, *, limits: Limits = DEFAULT_LIMITS, memory: FormMemory | None = None
) -> Design:
    """The design in an EDIF 2 0 0 export.

    `file` is the name that places are given under. `memory`, kept by the caller from one reading to the next,
    saves reading again what has not changed. Entries that cannot be understood are among the design's
    problems, with their place.

    Raises InputError, with line, column and remedy, for what is no EDIF 2 0 0, ends too early, contains itself or
    goes beyond `limits`.
    """
    with _no_collection():
        return _read(Source(data, file, limits), memory)


@contextmanager
def _no_collection() -> Iterator[None]:
    """No search for cycles meanwhile: the many small objects of a reading live on, so that each search goes through
    all of them and frees nothing."""
    was_enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_enabled:
            gc.enable()


def _read(source: Source, memory: FormMemory | None) -> Design:
    top, aliases = outline(source)
    entries = list(_entries(top))
    _declare(entries, source, aliases, memory)
    if memory is None or aliases:
        return _design(source, top).design
    last = memory.kept(source.file)
    reading = same_but_attributes(last, source, top, entries) if isinstance(last, LastReading) else None
    if reading is not None:
        memory.keep(source.file, reading)
        return reading.design
    scanned = source.problems()
    made = _design(source, top)
    memory.keep(source.file, last_reading(source, top, entries, made, scanned))
    return made.design


def _design(source: Source, top: Container) -> Flat:
    _check_version(top, source)
    catalogue = Catalogue(source)
    for form in top.inner:
        catalogue.add_library(form)
    designs = [(entry.start, entry.value) for entry in top.entries if isinstance(entry.value, says.DesignRef)]
    view, name = top_cell(catalogue, designs, source)
    return flatten(view, name, netlists(view, catalogue, source), source)


def _entries(top: Container) -> Iterator[Entry]:
    waiting = [top]
    while waiting:
        container = waiting.pop()
        yield from container.entries
        waiting.extend(reversed(container.inner))


def _declare(
    entries: list[Entry], source: Source, aliases: Mapping[str, str], memory: FormMemory | None
) -> None:
    """Fill in what each entry declares."""
    text = source.text
    texts = [text[entry.start : entry.end] for entry in entries]
    if aliases:
        # The text of a form says what it does only together with the aliases: nothing is remembered.
        values = declared(texts, lambda form: declaration(_standard(form, aliases)), None, prune=False)
    else:
        values = declared(texts, declaration, memory)
    for entry, value in zip(entries, values, strict=True):
        entry.value = value
        if isinstance(value, says.Bad):
            source.problem("error", entry.start, value.message)


def _standard(form: list[Sexp], aliases: Mapping[str, str]) -> list[Sexp]:
    """The form with the standard's keywords for the file's own."""
    head, *rest = form or [""]
    word = aliases.get(head.lower(), head) if isinstance(head, str) else head
    return [word, *(_standard(item, aliases) if isinstance(item, list) else item for item in rest)]


def _check_version(top: Container, source: Source) -> None:
    for entry in top.entries:
        if isinstance(entry.value, says.Version) and entry.value.numbers[:2] != ("2", "0"):
            written = visible(" ".join(entry.value.numbers)[:40]) or "none"
            raise InputError(
                f"EDIF version {written}; only EDIF 2 0 0 is read",
                source.place(entry.start),
                "export as EDIF 2 0 0",
            )
