"""Writes the demonstration board as an EDIF 2 0 0 netlist (ANSI/EIA-548-1988), as an editor exports it."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator
from datetime import datetime

from reactance.daemon.demo.board import CHANNEL_PORTS, PROBES, LoggerBoard
from reactance.daemon.demo.parts import SYMBOLS, Placed, Symbol

_VIEW = "(viewRef netlist (cellRef {cell} (libraryRef {library})))"
_PLAIN = re.compile(r"[A-Za-z][A-Za-z0-9_]*")
_LABELS = {"PART_NUMBER": "Part Number", "FITTED": "Fitted", "TECHNOLOGY": "Technology"}


def write_edif(board: LoggerBoard, saved: datetime) -> bytes:
    """The board as the bytes of a `.edn` file that says it was written at `saved`."""
    lines = [
        '(edif (rename greenhouse_logger "greenhouse-logger")',
        "  (edifVersion 2 0 0)",
        "  (edifLevel 0)",
        "  (keywordMap (keywordLevel 0))",
        "  (status (written",
        f"    (timeStamp {saved.year} {saved.month} {saved.day} {saved.hour} {saved.minute} {saved.second})",
        '    (comment "Invented board, parts and part numbers, for demonstration")))',
        *_library("SYMBOLS", (line for symbol in SYMBOLS for line in _symbol(symbol))),
        *_library("SHEETS", (*_channel(board), *_top(board))),
        '  (design (rename greenhouse_logger "greenhouse-logger") (cellRef LOGGER (libraryRef SHEETS))))',
    ]
    return ("\n".join(lines) + "\n").encode("ascii")


def _library(name: str, cells: Iterable[str]) -> Iterator[str]:
    yield f"  (library {name} (edifLevel 0) (technology (numberDefinition))"
    yield from cells
    yield "  )"


def _symbol(symbol: Symbol) -> Iterator[str]:
    yield f"    (cell {symbol.name} (cellType GENERIC)"
    yield "      (view netlist (viewType NETLIST)"
    yield "        (interface"
    for port in symbol.ports:
        yield f'          (port {port.name} (designator "{port.designator}") (direction {port.direction}))'
    yield f'          (designator "{symbol.prefix}?"))))'


def _channel(board: LoggerBoard) -> Iterator[str]:
    """The shared cell. Its parts carry no designators: each is known by the channel it stands in."""
    yield from _sheet("PROBE_CHANNEL", CHANNEL_PORTS)
    for part in board.channel:
        yield from _instance(part, designator=False)
    yield from _nets(board.channel, {name: (name,) for name in CHANNEL_PORTS}, {})
    yield "      )))"


def _top(board: LoggerBoard) -> Iterator[str]:
    yield from _sheet("LOGGER", ())
    for part in board.parts:
        yield from _instance(part, designator=True)
    channel = _VIEW.format(cell="PROBE_CHANNEL", library="SHEETS")
    further: dict[str, list[tuple[str, str]]] = {}
    for number in range(1, PROBES + 1):
        yield f"          (instance PROBE{number} {channel})"
        for port, net in zip(CHANNEL_PORTS, (f"SOIL{number}_RAW", f"ADC_SOIL{number}", "GND"), strict=True):
            further.setdefault(net, []).append((port, f"PROBE{number}"))
    yield from _nets(board.parts, {}, further)
    yield "      )))"


def _sheet(name: str, ports: Iterable[str]) -> Iterator[str]:
    yield f"    (cell {name} (cellType GENERIC)"
    yield "      (view netlist (viewType NETLIST)"
    yield f"        (interface{''.join(f' (port {port} (direction INOUT))' for port in ports)})"
    yield "        (contents"


def _instance(part: Placed, *, designator: bool) -> Iterator[str]:
    yield f"          (instance {part.refdes} {_VIEW.format(cell=part.symbol.name, library='SYMBOLS')}"
    if designator:
        yield f'            (designator "{part.refdes}")'
    for name, text in part.properties.items():
        label = f'(rename {name} "{_LABELS[name]}")' if name in _LABELS else name
        yield f'            (property {label} (string "{text}"))'
    yield "          )"


def _nets(
    parts: Iterable[Placed], own_ports: dict[str, tuple[str, ...]], further: dict[str, list[tuple[str, str]]]
) -> Iterator[str]:
    """Every net with the pins that it joins, in the order in which the parts first use it."""
    joined: dict[str, list[str]] = {}
    for part in parts:
        for port, net in zip(part.symbol.ports, part.nets, strict=True):
            if net:
                joined.setdefault(net, []).append(f"(portRef {port.name} (instanceRef {part.refdes}))")
    for net, places in joined.items():
        places += [f"(portRef {port})" for port in own_ports.get(net, ())]
        places += [f"(portRef {port} (instanceRef {instance}))" for port, instance in further.get(net, ())]
        yield f"          (net {net_name(net)} (joined"
        yield from (f"            {place}" for place in places)
        yield "          ))"


def net_name(net: str) -> str:
    """A net's name as EDIF writes it: an identifier, and the real name where that is none."""
    if _PLAIN.fullmatch(net):
        return net
    return f'(rename N_{re.sub("[^A-Za-z0-9]", "", net)} "{net}")'
