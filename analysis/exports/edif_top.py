"""Which cell of an EDIF file is the whole board."""

from __future__ import annotations

from reactance.analysis.design import InputError
from reactance.analysis.exports import edif_entries as says
from reactance.analysis.exports.edif_cells import Catalogue, View
from reactance.analysis.exports.edif_source import Source


def top_cell(
    catalogue: Catalogue, designs: list[tuple[int, says.DesignRef]], source: Source
) -> tuple[View, str]:
    """The view that is the whole board, and the design's name.

    The cell that `(design …)` names. Of several designs the last counts whose cell is not used inside another's;
    without any, the last cell that nothing instantiates.
    """
    used = _instantiated(catalogue)
    candidates: list[tuple[View, str, int]] = []
    for start, design in designs:
        cell = catalogue.find(design.cell, None)
        view = cell.contents() if cell else None
        if cell is None or view is None:
            lack = "is not in the file" if cell is None else "has no contents"
            source.problem("error", start, f"design {design.name.text}: its cell {design.cell.cell} {lack}")
        else:
            candidates.append((view, design.name.text, start))
    if candidates:
        free = [each for each in candidates if id(each[0].cell) not in used] or candidates
        view, name, start = free[-1]
        if len(candidates) > 1:
            source.problem("note", start, f"{len(candidates)} designs in one file; {name} is read")
        return view, name
    inside = [cell for cell in catalogue.cells() if cell.contents() is not None]
    free_cells = [cell for cell in inside if id(cell) not in used] or inside
    if free_cells:
        top = free_cells[-1].contents()
        assert top is not None
        if not designs:
            source.problem(
                "note", top.cell.start, f"no (design …); {top.cell.name.text} is taken as the top cell"
            )
        return top, designs[0][1].name.text if designs else top.cell.name.text
    raise InputError(
        "no cell has contents: there is no schematic in this file; expected (contents …) with instances and nets",
        source.place(designs[0][0] if designs else 0),
        "export the netlist or schematic view",
    )


def _instantiated(catalogue: Catalogue) -> set[int]:
    """The ids of all cells of which another cell holds an instance."""
    used: set[int] = set()
    seen: set[says.CellRef] = set()
    for cell in catalogue.cells():
        seen.clear()
        for view in cell.views.values():
            for scope in view.scopes or ():
                for entry in scope.entries:
                    if isinstance(entry.value, says.Instance):
                        seen.update(entry.value.cells)
        for ref in seen:
            found = catalogue.find(ref, cell.library)
            if found is not None and found is not cell:
                used.add(id(found))
    return used
