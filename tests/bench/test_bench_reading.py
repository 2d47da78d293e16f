"""Reading an EDIF export, as a ratio to `sexpdata.loads` of the same bytes in the same run.

Aims: at most 1.2 cold without graphics, 0.3 cold with four fifths graphics, 0.1 after one instance changed. The
ratios stand in `extra_info`; nothing is asserted on time. A plain run reads 0.2 MB; REACTANCE_BENCH=full reads 1 MB and
10 MB.
"""

from __future__ import annotations

import os
import time
from collections.abc import Callable
from typing import Any

import pytest
import sexpdata

from reactance.analysis.exports.edif import FormMemory, read_edif

SIZES = [1_000_000, 10_000_000] if os.environ.get("REACTANCE_BENCH") == "full" else [200_000]
_DISPLAY = """(display STYLE (justify CENTERLEFT) (origin (pt {n} 20)) (orientation R0)
      (figureGroupOverride TEXT (textHeight 10) (visible (true)) (color 0 0 255)))"""
_SYMBOL = """(transform (orientation R90) (origin (pt {n} 400)))
    (commentGraphics (figure BODY (rectangle (pt 0 0) (pt 60 20)) (path (pointList (pt 0 10) (pt 20 10) (pt 40 12)))
      (path (pointList (pt 1 1) (pt 2 2) (pt 3 3) (pt 4 4))) (circle (pt 0 0) (pt 5 5))))"""
_WIRE = "(figure WIRE (path (pointList (pt {n} 10) (pt {n} 90) (pt 400 90))) (path (pointList (pt 1 {n}) (pt 7 {n})))"
_WIRE += " (path (pointList (pt 11 {n}) (pt 17 {n}))) (path (pointList (pt 12 {n}) (pt 19 {n}) (pt 20 {n}))))"


def export(size: int, *, graphics: bool) -> bytes:
    """An invented board of about `size` bytes: capacitors and resistors in short chains, and a ground."""
    lines: list[str] = []
    ground: list[str] = []
    length = 0
    number = 0
    while length < size:
        chunk = _stage(number, graphics=graphics)
        ground.append(f"(portRef B (instanceRef I{number}c))")
        lines.append(chunk)
        length += len(chunk) + len(ground[-1])
        number += 1
    cell = '(cell {0} (cellType GENERIC) (view V (viewType NETLIST) (interface (port A (designator "1"))' + (
        ' (port B (designator "2")) (designator "{1}?"))))'
    )
    return "\n".join(
        [
            "(edif bench (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))",
            "(library L (edifLevel 0) (technology (numberDefinition))",
            cell.format("CAP", "C"),
            cell.format("RES", "R"),
            "(cell TOP (cellType GENERIC) (view V (viewType SCHEMATIC) (interface) (contents (page P1",
            *lines,
            "(net GND (joined ",
            *ground,
            "))))))) (design bench (cellRef TOP (libraryRef L))))",
        ]
    ).encode()


def _stage(number: int, *, graphics: bool) -> str:
    display = _DISPLAY.format(n=number) if graphics else ""
    symbol = _SYMBOL.format(n=number) if graphics else ""
    wire = _WIRE.format(n=number) if graphics else ""

    def text(value: str) -> str:
        return f'(string (stringDisplay "{value}" {display}))' if graphics else f'(string "{value}")'

    def instance(key: str, cell: str, refdes: str, value: str) -> str:
        shown = f'(stringDisplay "{refdes}" {display})' if graphics else f'"{refdes}"'
        return f"""(instance I{number}{key} (viewRef V (cellRef {cell} (libraryRef L))) {symbol}
   (designator {shown})
   (property VALUE {text(value)})
   (property (rename PCB_FOOTPRINT "PCB Footprint") {text("0603")})
   (property (rename PART_NUMBER "Part Number") {text(f"GH-{number % 91:05}")})
   (property TOLERANCE {text("10%37%")}))"""

    joined = f"(joined (portRef B (instanceRef I{number}r)) (portRef A (instanceRef I{number}c)))"
    onward = f"(joined (portRef A (instanceRef I{number}r)))"
    return "\n".join(
        [
            instance("c", "CAP", f"C{number}", f"{number % 9 + 1}0n"),
            instance("r", "RES", f"R{number}", f"{number % 9 + 1}k"),
            f'(net (rename N{number} "NODE {number}") {joined} {wire})',
            f'(net (rename M{number} "IN {number}") {onward} {wire})',
        ]
    )


def seconds(work: Callable[[], object], rounds: int) -> float:
    """The least time of so many rounds."""
    best = float("inf")
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - start)
    return best


@pytest.mark.parametrize("size", SIZES, ids=lambda size: f"{size / 1e6:g}MB")
@pytest.mark.parametrize("graphics", [False, True], ids=["plain", "graphics"])
def test_reading(benchmark: Any, size: int, graphics: bool) -> None:
    """The benchmark's own figure is the reading after one instance changed; the cold one stands beside it."""
    data = export(size, graphics=graphics)
    rounds = 3 if size < 2_000_000 else 1
    memory = FormMemory()
    loads = seconds(lambda: sexpdata.loads(data.decode()), rounds)
    cold = seconds(lambda: read_edif(data, "bench.edn"), rounds)
    first = read_edif(data, "bench.edn", memory=memory)
    changed_values = iter(range(1, 6))

    def changed() -> tuple[tuple[bytes, str], dict[str, FormMemory]]:
        value = f'"{next(changed_values)}p"'.encode()
        return (data.replace(b'"10n"', value, 1), "bench.edn"), {"memory": memory}

    design = benchmark.pedantic(read_edif, setup=changed, rounds=5 if size < 2_000_000 else 3)
    assert first.problems == ()
    assert len(design.parts) == len(first.parts)
    assert sum(one != other for one, other in zip(design.parts, first.parts, strict=True)) == 1
    plain = len(_stage(1000, graphics=False)) / len(_stage(1000, graphics=True))
    benchmark.extra_info["bytes"] = len(data)
    benchmark.extra_info["parts"] = len(design.parts)
    benchmark.extra_info["share of graphics"] = round(1 - plain, 3) if graphics else 0
    benchmark.extra_info["cold over sexpdata.loads"] = round(cold / loads, 3)
    if benchmark.stats is not None:  # as with --benchmark-disable
        again = benchmark.stats.stats.min
        benchmark.extra_info["after one instance changed over sexpdata.loads"] = round(again / loads, 3)
