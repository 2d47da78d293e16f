"""A board of any number of parts, written as EDIF, and its brief. Invented; for benchmarks and tests only.

A board is a row of blocks, each a cell of its own under the top: a converter with its supply pins decoupled, filters
before its inputs, couplings to bias points, pull-ups and dividers. Four blocks share a supply domain with two rails,
and values turn from block to block, so that few circuits are alike in all of them.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

BLOCKS_PER_DOMAIN = 4
FILTERS, COUPLINGS, PULL_UPS, BYPASSES = 16, 10, 12, 8
PARTS_PER_BLOCK = 2 + 2 * FILTERS + 3 * COUPLINGS + PULL_UPS + BYPASSES + 4
_RESISTANCES = ("1k", "2k2", "4k7", "10k", "22k")
_CAPACITANCES = ("100p", "470p", "1n", "4n7", "10n", "22n", "47n")
_SERIES = {"R": "GHL-R", "C": "GHL-C"}


@dataclass
class _Block:
    """One block's parts and nets while it is written; names of its own nets begin with its number."""

    number: int
    lines: list[str] = field(default_factory=list)
    nets: dict[str, list[str]] = field(default_factory=dict)
    used: dict[str, int] = field(default_factory=dict)

    def part(self, letter: str, cell: str, pins: Mapping[str, str], properties: Mapping[str, str]) -> None:
        order = self.used[letter] = self.used.get(letter, 0) + 1
        refdes = f"{letter}{self.number * 100 + order}"
        told = "".join(f'\n    (property {name} (string "{text}"))' for name, text in properties.items())
        self.lines.append(
            f"   (instance I{refdes} (viewRef net (cellRef {cell} (libraryRef PARTS)))\n"
            f'    (designator "{refdes}"){told})'
        )
        for pin, net in pins.items():
            self.nets.setdefault(net, []).append(f"(portRef {pin} (instanceRef I{refdes}))")

    def resistor(self, value: str, a: str, b: str, tolerance: str = "1%37%") -> None:
        series = f"{_SERIES['R']}-0402-{value}"
        more = {"VALUE": value, "TOLERANCE": tolerance, "PCB_FOOTPRINT": "RES-0402", "PART_NUMBER": series}
        self.part("R", "RES", {"A": a, "B": b}, {**more, "DESCRIPTION": f"RES {value} 1%37% 0402"})

    def capacitor(self, value: str, a: str, b: str, dielectric: str, volts: str, size: str) -> None:
        series = f"{_SERIES['C']}-{size}-{dielectric}-{value}"
        more = {"VALUE": value, "TOLERANCE": "10%37%", "VOLTAGE": volts, "DIELECTRIC": dielectric}
        self.part("C", "CAP", {"A": a, "B": b}, {**more, "PCB_FOOTPRINT": f"CAP-{size}", "PART_NUMBER": series})


def export(parts: int, *, first_filter: str = "1k") -> bytes:
    """EDIF 2 0 0 of about so many parts (whole blocks). `first_filter` is the value of the first filter's resistor."""
    blocks = [_block(number, first_filter) for number in range(_blocks(parts))]
    text = [_HEAD, *map(_library_cell, ("CAP", "RES"), ("AB", "AB"))]
    text.append(_chip("CONV", [f"IN{n}" for n in range(FILTERS)] + [f"A{n}" for n in range(COUPLINGS)] + _SUPPLY_PINS))
    text.append(_chip("CONN", [f"P{n}" for n in range(40)]))
    text += [" )\n (library BOARD (edifLevel 0) (technology (numberDefinition))"]
    text += [line for block in blocks for line in _cell(block)]
    text += _top(blocks)
    text.append(" )\n (design MANY (cellRef TOP (libraryRef BOARD))))\n")
    return "\n".join(text).encode()


def brief(parts: int) -> bytes:
    """Both rails of every domain, the digital one with a load step; a filter's and a coupling's demands per block."""
    text = '[board]\ntemperature = { low = "-20 degC", high = "60 degC" }\n'
    for domain in range(-(-_blocks(parts) // BLOCKS_PER_DOMAIN)):
        text += (
            f'[[rail]]\nnet = "+3V3_{domain}"\nvoltage = "3.3 V"\ntolerance = "2 %"\n'
            'source = { resistance = "20 mohm", inductance = "30 nH" }\n'
            'step = { current = "0.4 A", rise = "20 ns" }\nallowed = "5 %"\n'
            f'[[rail]]\nnet = "+5V_{domain}"\nvoltage = "5 V"\n'
        )
    for number in range(_blocks(parts)):
        inputs = ", ".join(f'"J{number * 100 + 1}.{n + 1}"' for n in range(FILTERS + COUPLINGS))
        text += f'[[pin]]\nat = [{inputs}]\ndrives = "1 V"\nresistance = "100 ohm"\n'
        text += (
            f'[[filter]]\nfrom = "B{number}/RAW0"\nto = "B{number}/IN0"\n'
            'attenuation = [{ at = "1 MHz", least = "20 dB" }]\n'
            f'[[coupling]]\nfrom = "B{number}/LINE0"\nto = "B{number}/A0"\nlowest_frequency = "20 Hz"\nloss = "3 dB"\n'
        )
    return text.encode()


def _blocks(parts: int) -> int:
    return max(round(parts / PARTS_PER_BLOCK), 1)


_SUPPLY_PINS = [*(f"VDD{n}" for n in range(4)), *(f"VA{n}" for n in range(2)), *(f"VSS{n}" for n in range(6))]
_HEAD = """(edif MANY (edifVersion 2 0 0) (edifLevel 0) (keywordMap (keywordLevel 0))
 (library PARTS (edifLevel 0) (technology (numberDefinition))"""


def _block(number: int, first_filter: str) -> _Block:
    block, supply, analogue = _Block(number), "V33", "V5"
    pins = {f"IN{n}": f"IN{n}" for n in range(FILTERS)} | {f"A{n}": f"A{n}" for n in range(COUPLINGS)}
    for pin in _SUPPLY_PINS:
        pins[pin] = "GND" if pin.startswith("VSS") else analogue if pin.startswith("VA") else supply
    block.part("U", "CONV", pins, {"VALUE": "GHL-CONV", "DESCRIPTION": "CONVERTER 38 PINS"})
    outward = [*(f"RAW{n}" for n in range(FILTERS)), *(f"LINE{n}" for n in range(COUPLINGS)), supply, "GND"]
    block.part("J", "CONN", {f"P{n}": net for n, net in enumerate(outward)}, {"VALUE": "GHL-CONN-40"})
    for n in range(FILTERS):
        turn = number + n
        value = first_filter if number == n == 0 else _RESISTANCES[turn % len(_RESISTANCES)]
        block.resistor(value, f"RAW{n}", f"IN{n}")
        block.capacitor(_CAPACITANCES[turn % len(_CAPACITANCES)], f"IN{n}", "GND", "C0G", "50V", "0603")
    for n in range(COUPLINGS):
        block.capacitor("1u" if n % 2 else "470n", f"LINE{n}", f"A{n}", "X7R", "16V", "0805")
        block.resistor("100k", f"A{n}", analogue)
        block.resistor("100k", f"A{n}", "GND")
    for n in range(PULL_UPS):
        block.resistor("10k", f"D{n}", supply, "5%37%")
    for n in range(BYPASSES):
        rail = analogue if n % 4 == 3 else supply
        value, size = (("100n", "0402"), ("100n", "0402"), ("4u7", "0603"), ("1u", "0603"))[n % 4]
        block.capacitor(value, rail, "GND", "X7R", "16V", size)
    block.resistor("4k7", supply, "SENSE")
    block.resistor("4k7", "SENSE", "GND")
    block.capacitor("10n", "SENSE", "GND", "X7R", "50V", "0402")
    bulk = ("22u", "47u", "100u", "220u", "33u")[number // BLOCKS_PER_DOMAIN % 5]
    block.capacitor(bulk, supply, "GND", "X5R", "6.3V", "1206")
    return block


_SHARED = ("V33", "V5", "GND")


def _cell(block: _Block) -> Iterator[str]:
    ports = "".join(f" (port {name} (direction INOUT))" for name in _SHARED)
    yield f"  (cell B{block.number} (cellType GENERIC) (view net (viewType NETLIST) (interface{ports}) (contents"
    yield from block.lines
    for net, ends in block.nets.items():
        outer = [f"(portRef {net})"] if net in _SHARED else []
        yield f"   (net {net} (joined {' '.join(outer + ends)}))"
    yield "  )))"


def _top(blocks: list[_Block]) -> Iterator[str]:
    yield "  (cell TOP (cellType GENERIC) (view net (viewType NETLIST) (interface) (contents"
    for block in blocks:
        yield f"   (instance B{block.number} (viewRef net (cellRef B{block.number})))"
    for domain in range(0, len(blocks), BLOCKS_PER_DOMAIN):
        members = blocks[domain : domain + BLOCKS_PER_DOMAIN]
        for port, name in (("V33", "+3V3"), ("V5", "+5V")):
            ends = " ".join(f"(portRef {port} (instanceRef B{block.number}))" for block in members)
            number = domain // BLOCKS_PER_DOMAIN
            yield f'   (net (rename {port}_{number} "{name}_{number}") (joined {ends}))'
    ends = " ".join(f"(portRef GND (instanceRef B{block.number}))" for block in blocks)
    yield f"   (net GND (joined {ends}))"
    yield "  )))"


def _library_cell(name: str, pins: str) -> str:
    ports = " ".join(f'(port {pin} (designator "{n}"))' for n, pin in enumerate(pins, 1))
    return f"  (cell {name} (cellType GENERIC) (view net (viewType NETLIST) (interface {ports})))"


def _chip(name: str, pins: list[str]) -> str:
    ports = " ".join(f'(port {pin} (designator "{n}") (direction INPUT))' for n, pin in enumerate(pins, 1))
    return f"  (cell {name} (cellType GENERIC) (view net (viewType NETLIST) (interface {ports})))"
