"""Small boards for tests: a flat EDIF netlist from a list of parts, and its checks by id."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import Check
from reactance.analysis.study import Study, analyse

PartRow = tuple[str, str, Mapping[str, str]]  # refdes, value, pin → net; further properties after a bar in value


def edif(parts: Sequence[PartRow], name: str = "BOARD") -> bytes:
    """A flat netlist: `("C1", "100nF|DIELECTRIC=C0G", {"1": "A", "2": "GND"})` and so on."""
    cells, instances = [], []
    nets: dict[str, list[str]] = {}
    for refdes, value, pins in parts:
        ports = " ".join(f'(port &{pin} (designator "{pin}"))' for pin in pins)
        cells.append(
            f"(cell CELL_{refdes} (cellType GENERIC) (view V (viewType NETLIST) (interface {ports})))"
        )
        text, *others = value.split("|")
        properties = [f'(property VALUE (string "{text}"))'] if text else []
        properties += [f'(property {key} (string "{found}"))' for key, found in (o.split("=", 1) for o in others)]
        instances.append(
            f'(instance {refdes} (viewRef V (cellRef CELL_{refdes})) (designator "{refdes}") {" ".join(properties)})'
        )
        for pin, net in pins.items():
            nets.setdefault(net, []).append(f"(portRef &{pin} (instanceRef {refdes}))")
    joined = "\n".join(
        f'(net (rename N{order} "{net}") (joined {" ".join(refs)}))' for order, (net, refs) in enumerate(nets.items())
    )
    newline = "\n"
    return f"""(edif {name} (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))
(library PARTS (edifLevel 0) (technology (numberDefinition)) {newline.join(cells)})
(library DESIGN (edifLevel 0) (technology (numberDefinition))
(cell TOP (cellType GENERIC) (view V (viewType NETLIST) (interface)
(contents {newline.join(instances)}
{joined}))))
(design {name} (cellRef TOP (libraryRef DESIGN))))
""".encode()


def study_of(parts: Sequence[PartRow], brief: str = "") -> Study:
    """The study of a small board with a brief."""
    export = ExportFiles(edif(parts), "board.edn", {})
    return analyse(BoardFiles(export, brief.encode(), "board.brief.toml"))


def checks_of(parts: Sequence[PartRow], brief: str = "") -> dict[str, Check]:
    """Its checks by id."""
    return {check.id: check for check in study_of(parts, brief).report.checks}
