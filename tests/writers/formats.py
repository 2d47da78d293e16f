"""Every way of writing a design that the tests know. For tests only."""

from __future__ import annotations

from collections.abc import Callable, Mapping

from writers.edif import HABITS, edif
from writers.flat import TableHabit, ipc356, ipc2581, tables

from reactance.analysis.design import Design
from reactance.analysis.exports import ExportFiles

TABLE_HABITS: Mapping[str, TableHabit] = {
    "tables": TableHabit(),
    "tables, semicolons, turned": TableHabit(
        ";", "utf-8-sig", "\n", refdes="Reference Designator", pin="PIN NO.", net="net_name", turned=True
    ),
    "tables, tabs, UTF-16": TableHabit("\t", "utf-16", refdes="Ref", pin="Pin#", net="Signal"),
}

WRITERS: Mapping[str, Callable[[Design], ExportFiles]] = {
    "IPC-D-356": ipc356,
    "IPC-2581": ipc2581,
    "IPC-2581, prefix, UTF-16": lambda design: ipc2581(design, prefix="ipc", encoding="utf-16"),
    **{name: lambda design, habit=habit: tables(design, habit) for name, habit in TABLE_HABITS.items()},
    **{f"EDIF, {name}": lambda design, habit=habit: edif(design, habit) for name, habit in HABITS.items()},
}
