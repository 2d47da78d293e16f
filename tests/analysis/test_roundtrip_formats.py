"""A design written in each format and read again is the same design."""

from __future__ import annotations

from collections.abc import Mapping

import pytest
from hypothesis import HealthCheck, given, settings
from writers.designs import content, designs, logger_board, pin_words
from writers.edif import HABITS, edif
from writers.flat import ipc356
from writers.formats import WRITERS

from reactance.analysis.design import Design
from reactance.analysis.exports import ExportFiles, companion_names, kind_of, read_export, stem

KINDS = {"IPC-D": "IPC-D-356", "IPC-2": "IPC-2581", "table": "tables", "EDIF,": "EDIF"}


def words_of(writer: str) -> Mapping[str, str]:
    """The attribute names that this writer uses for others."""
    habit = HABITS.get(writer.removeprefix("EDIF, "))
    return habit.names if habit else {}


@pytest.mark.parametrize("writer", WRITERS)
def test_fifty_parts_are_the_same_in_every_format(writer: str) -> None:
    board = logger_board()
    assert len(board.parts) == 50
    read = read_export(WRITERS[writer](board))
    assert content(read, words_of(writer)) == content(board)
    assert [problem for problem in read.problems if problem.severity == "error"] == []


@settings(max_examples=60, deadline=None, suppress_health_check=list(HealthCheck))
@given(design=designs())
def test_written_and_read_again_is_the_same(design: Design) -> None:
    for writer, write in WRITERS.items():
        if writer != "EDIF, instance names":
            assert content(read_export(write(design)), words_of(writer)) == content(design), writer


@settings(max_examples=30, deadline=None, suppress_health_check=list(HealthCheck))
@given(design=designs(odd_refdes=False))
def test_instances_named_by_their_refdes_are_read_again_the_same(design: Design) -> None:
    # Without a designator, what is called like no refdes and has one pin is a mark, no part.
    assert content(read_export(WRITERS["EDIF, instance names"](design))) == content(design)


@settings(max_examples=20, deadline=None, suppress_health_check=list(HealthCheck))
@given(design=designs(most=12, odd_refdes=False))
def test_pin_names_and_directions_are_kept_where_the_format_has_them(design: Design) -> None:
    for writer, write in WRITERS.items():
        if not writer.startswith("IPC"):
            assert pin_words(read_export(write(design))) == pin_words(design), writer


@pytest.mark.parametrize("writer", WRITERS)
def test_content_tells_the_format_whatever_the_name(writer: str) -> None:
    files = WRITERS[writer](logger_board())
    for name in (files.name, "board.txt", "board.net", "board"):
        assert kind_of(name, files.main[:8192]) == KINDS[writer[:5]]
        renamed = ExportFiles(files.main, name, files.companions)
        assert content(read_export(renamed), words_of(writer)) == content(logger_board())
    assert {stem(files.name) + suffix for suffix in files.companions} == set(companion_names(files.name))


def test_hierarchy_in_the_path_is_read_back_from_blocks() -> None:
    board = logger_board()
    read = read_export(edif(board, HABITS["hierarchy"]))
    assert {part.refdes: part.path for part in read.parts} == {part.refdes: part.path for part in board.parts}


def test_refdes_cut_to_six_columns_are_found_again_in_the_parts_table() -> None:
    board = logger_board()
    longer = {part.refdes: f"{part.refdes}_SENSOR" if part.refdes[0] in "JU" else part.refdes for part in board.parts}
    renamed = _renamed(board, longer)
    for cut in (lambda name: name[:6], lambda name: name[:6].replace("_", "-")):
        read = read_export(ipc356(renamed, cut=cut))
        assert content(read) == content(renamed)
        assert any("U1_SENSOR" in problem.message for problem in read.problems)


def _renamed(design: Design, names: Mapping[str, str]) -> Design:
    from dataclasses import replace

    from writers.designs import design_of

    return design_of([replace(part, refdes=names[part.refdes]) for part in design.parts], design.name)
