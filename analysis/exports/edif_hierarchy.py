"""The netlists of a view and of everything below it."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from reactance.analysis.design import InputError
from reactance.analysis.exports.edif_cells import Catalogue, View
from reactance.analysis.exports.edif_connect import Connector, Netlist
from reactance.analysis.exports.edif_source import Source


def netlists(top: View, catalogue: Catalogue, source: Source) -> Mapping[int, Netlist]:
    """The netlist of `top` and of every view below it, by the view's id.

    Raises InputError where a cell contains itself, naming the cells on the way.
    """
    done: dict[int, Netlist] = {}
    path: list[tuple[View, list[View]]] = []
    entering: View | None = top
    while entering is not None or path:
        if entering is not None:
            netlist = Connector(entering, catalogue, source).netlist()
            done[id(entering)] = netlist
            below = {id(part.inside): part.inside for part in netlist.parts if part.inside is not None}
            path.append((entering, list(below.values())))
            source.check("levels", len(path), entering.cell.start)
            entering = None
            continue
        below_it = path[-1][1]
        if not below_it:
            path.pop()
            continue
        following = below_it.pop()
        chain = [each for each, _ in path]
        if following in chain:
            loop = [*chain[chain.index(following) :], following]
            names = " → ".join(each.cell.name.text for each in loop)
            raise InputError(
                f"the hierarchy contains itself: {names}",
                source.place(following.cell.start),
                "take one of these instances out of its cell",
            )
        if id(following) not in done:
            entering = following
    return MappingProxyType(done)
