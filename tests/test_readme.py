"""The README held to the code: commands and options, keys of the brief, measures, statuses, pictures."""

from __future__ import annotations

import re
import typing
from collections.abc import Iterator
from pathlib import Path

import click
import msgspec
import pytest

from reactance.analysis.brief_tables import BriefTables, Table
from reactance.analysis.measures import MEASURES, Measure
from reactance.analysis.parts.attributes import ALIASES
from reactance.analysis.report import (
    AssumptionEntry,
    CapacitorEntry,
    Check,
    Curve,
    DesignSummary,
    Duty,
    DutyKind,
    Edit,
    Movement,
    NetEntry,
    PartEntry,
    ProblemEntry,
    Report,
    Status,
    Verdict,
)
from reactance.daemon.cli import reactance

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
# Names of attributes that only exports have: a description is taken apart, a part number is what `match` looks at.
ONLY_IN_EXPORTS = {"description", "number"}
ANCHORS = {"rail": "NET", "coupling": "A", "filter": "A", "part": "REF", "net": "NET"}
SUFFIXES = {"attenuation": "@F", "rejection": "@NET"}


def section(heading: str) -> str:
    """The text below a heading line, to the next heading of its level or a higher one."""
    level = heading.index(" ")
    found = re.search(rf"^{re.escape(heading)}\n(.*?)(?=^#{{1,{level}}} |\Z)", README, re.DOTALL | re.MULTILINE)
    assert found, f"README has no section {heading!r}"
    return found[1]


def first_cells(text: str) -> list[str]:
    """Every code word in the first column of the tables in a text."""
    rows = re.findall(r"^\| (`[^|]*?(?:\\\|[^|]*?)*) \|", text, re.MULTILINE)
    return [word for row in rows for word in re.findall(r"`([^`]+)`", row)]


def keys(table: type[msgspec.Struct], prefix: str = "") -> Iterator[str]:
    """The keys of a table of the brief; those of a table inside it with its name before a dot."""
    hints = typing.get_type_hints(table)
    for entry in msgspec.structs.fields(table):
        nested = [t for t in flattened(hints[entry.name]) if isinstance(t, type) and issubclass(t, Table)]
        if nested:
            yield from keys(nested[0], f"{prefix}{entry.encode_name}.")
        else:
            yield prefix + entry.encode_name


def flattened(hint: object) -> Iterator[object]:
    """A type and all the types that it is made of."""
    yield hint
    for inner in typing.get_args(hint):
        yield from flattened(inner)


def table_types() -> dict[str, type[msgspec.Struct]]:
    """The brief's tables with keys of their own, by name."""
    found = {}
    for name, hint in typing.get_type_hints(BriefTables).items():
        tables = [t for t in flattened(hint) if isinstance(t, type) and issubclass(t, Table)]
        if tables:
            found[name] = tables[0]
    return found


def commands() -> dict[str, click.Command]:
    """The program's commands by name."""
    context = click.Context(reactance)
    found = {name: reactance.get_command(context, name) for name in reactance.list_commands(context)}
    return {name: command for name, command in found.items() if command is not None}


COMMANDS = commands()
TABLES = table_types()


def test_the_first_commands_are_for_a_fresh_machine() -> None:
    printed = re.findall(r"^    (python3 -m venv .*)$", README, re.MULTILINE)
    assert printed == [
        "python3 -m venv .venv && .venv/bin/pip install . && .venv/bin/reactance demo",
        "python3 -m venv .venv && .venv/bin/pip install -e '.[test]' && .venv/bin/python -m pytest",
    ]
    assert README.index(printed[1]) < 2000
    assert "chromium-driver" in README[: README.index(printed[1])]


def test_the_check_of_a_clone_runs_the_printed_command() -> None:
    script = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert r"^    \(python3 -m venv .*pytest\)$" in script
    assert len(re.findall(r"^    (python3 -m venv .*pytest)$", README, re.MULTILINE)) == 1


def test_every_command_has_its_section() -> None:
    headings = re.findall(r"^### `reactance (\w+)", README, re.MULTILINE)
    assert sorted(headings) == sorted(COMMANDS)


@pytest.mark.parametrize("name", sorted(COMMANDS))
def test_every_option_stands_in_the_table_of_its_command(name: str) -> None:
    heading = next(line for line in README.splitlines() if re.match(rf"### `reactance {name}\b", line))
    text = section(heading)
    printed = {cell.split()[0] for cell in first_cells(text)}
    real = {
        option
        for parameter in COMMANDS[name].params
        if isinstance(parameter, click.Option) and not parameter.hidden
        for option in (*parameter.opts, *parameter.secondary_opts)
    }
    assert printed == {option for option in real if option.startswith("--")} - {"--help"}
    assert re.search(rf"^    reactance {name}", text, re.MULTILINE), "no example"


def test_every_table_of_the_brief_has_its_section() -> None:
    headings = re.findall(r"^### `\[+(\w+)\]+`$", README, re.MULTILINE)
    assert sorted(headings) == sorted(entry.encode_name for entry in msgspec.structs.fields(BriefTables))


@pytest.mark.parametrize("name", sorted(TABLES))
def test_every_key_stands_in_the_table_of_its_section(name: str) -> None:
    heading = next(line for line in README.splitlines() if re.fullmatch(rf"### `\[+{name}\]+`", line))
    assert sorted(first_cells(section(heading))) == sorted(keys(TABLES[name]))


def test_every_attribute_of_a_part_stands_in_its_section() -> None:
    assert sorted(first_cells(section("### `[[part]]`"))) == sorted({"match", *ALIASES} - ONLY_IN_EXPORTS)


def check_id(measure: Measure) -> str:
    """How the README writes the id of a measure's checks."""
    return f"{measure.scope}:{ANCHORS[measure.scope]}:{measure.name}{SUFFIXES.get(measure.name, '')}"


def test_every_measure_stands_in_the_table_with_its_unit() -> None:
    rows = re.findall(r"^\| `(\w+:[^`]+)` \| ([^|]+) \|", section("## What is measured"), re.MULTILINE)
    assert sorted(rows) == sorted((check_id(measure), measure.unit) for measure in MEASURES)


def test_statuses_verdicts_and_duties_are_all_explained() -> None:
    words = first_cells(section("## How a figure is judged"))
    assert sorted(words) == sorted((*typing.get_args(Status), *typing.get_args(Verdict)))
    duty = section("### `[[duty]]`")
    assert all(f"`{kind}`" in duty for kind in typing.get_args(DutyKind))


STRUCTS = {
    "`reactance.check/1`": (Report, DesignSummary),
    "a net": (NetEntry,),
    "a part": (PartEntry,),
    "a capacitor": (CapacitorEntry,),
    "a duty": (Duty,),
    "a check": (Check,),
    "an assumption": (AssumptionEntry,),
    "a problem": (ProblemEntry,),
    "a curve": (Curve,),
    "an edit": (Edit,),
    "a movement": (Movement,),
}


@pytest.mark.parametrize("name", sorted(STRUCTS))
def test_every_member_of_the_json_is_listed(name: str) -> None:
    row = next(line for line in section("### Output as JSON").splitlines() if line.startswith(f"| {name} |"))
    words = set(re.findall(r"`([^`]+)`", row))
    members = {entry.encode_name for struct in STRUCTS[name] for entry in msgspec.structs.fields(struct)}
    assert members <= words


def test_pictures_and_links_lead_somewhere() -> None:
    for target in re.findall(r"\]\(([^)]+)\)", README):
        if target.startswith("#"):
            titles = re.findall(r"^#+ (.+)$", README, re.MULTILINE)
            assert target[1:] in {re.sub(r"[^\w -]", "", title.lower()).replace(" ", "-") for title in titles}
        else:
            assert (ROOT / target).is_file(), target
