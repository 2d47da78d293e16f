"""Size codes of chip parts, inch and metric, and the names of land patterns built on them."""

from __future__ import annotations

import re
from dataclasses import dataclass

# Body length and width in mm by inch code, with the metric code (EIA-481 / IEC 60115-8, rounded as makers do).
CHIP_SIZES: dict[str, tuple[str, float, float]] = {
    "008004": ("0201", 0.25, 0.125),
    "01005": ("0402", 0.4, 0.2),
    "0201": ("0603", 0.6, 0.3),
    "0402": ("1005", 1.0, 0.5),
    "0603": ("1608", 1.6, 0.8),
    "0805": ("2012", 2.0, 1.25),
    "1206": ("3216", 3.2, 1.6),
    "1210": ("3225", 3.2, 2.5),
    "1218": ("3246", 3.2, 4.6),
    "1808": ("4520", 4.5, 2.0),
    "1812": ("4532", 4.5, 3.2),
    "1825": ("4564", 4.5, 6.4),
    "2010": ("5025", 5.0, 2.5),
    "2220": ("5750", 5.7, 5.0),
    "2225": ("5764", 5.7, 6.4),
    "2512": ("6332", 6.3, 3.2),
    "0204": ("0510", 0.5, 1.0),
    "0306": ("0816", 0.8, 1.6),
    "0508": ("1220", 1.25, 2.0),
    "0612": ("1632", 1.6, 3.2),
}

# Series inductance of ceramic capacitors by size, H: the first six common practice, the others from memory.
CHIP_INDUCTANCE: dict[str, float] = {
    "0201": 0.3e-9,
    "0402": 0.35e-9,
    "0603": 0.5e-9,
    "0805": 0.6e-9,
    "1206": 0.8e-9,
    "1210": 0.9e-9,
    "008004": 0.2e-9,
    "01005": 0.25e-9,
    "1808": 1.2e-9,
    "1812": 1.2e-9,
    "1825": 1.3e-9,
    "2220": 1.5e-9,
    "2225": 1.6e-9,
    "0204": 0.2e-9,
    "0306": 0.25e-9,
    "0508": 0.3e-9,
    "0612": 0.35e-9,
}
CHIP_INDUCTANCE_UNKNOWN = 0.6e-9  # as 0805

_METRIC = {metric: inch for inch, (metric, _, _) in CHIP_SIZES.items()}
_ONLY_METRIC = {metric: inch for metric, inch in _METRIC.items() if metric not in CHIP_SIZES}
# Land patterns after IPC-7351: CAPC1608X90N is a chip capacitor of 1.6 by 0.8 mm, at most 0.90 mm high.
_LAND_PATTERN = re.compile(r"(?:CAPC|RESC|INDC|BEADC|FBC)(\d{4})(?:X(\d+))?[LMN]?B?")
# Moulded and can bodies share numbers with chips: 3216-18 is a tantalum case, CAPMP3216 its land pattern.
_NO_CHIP = re.compile(r"(?<!\d)\d{4}-\d{2}(?!\d)|CAPMP?\d|CAPAE|INDM|SOD|SOT|TO-?\d|QFN|MELF")
_METRIC_MARK = re.compile(r"(?<!\d)(\d{4,6})\s*-?_?(?:M|METRIC)(?![A-Z0-9])")
_INCH = re.compile(r"(?<![\d.])(\d{4,6})(?![\d.])")


@dataclass(frozen=True, slots=True)
class ChipSize:
    """A chip body: inch code, and length, width and height in metres (height = width where unknown)."""

    code: str
    length: float
    width: float
    height: float

    @property
    def volume(self) -> float:
        """Of the body, in m^3."""
        return self.length * self.width * self.height


def chip_size(code: str, height: float | None = None) -> ChipSize:
    """The chip of an inch code in CHIP_SIZES, `height` in metres."""
    _, length, width = CHIP_SIZES[code]
    return ChipSize(code, length / 1e3, width / 1e3, height or width / 1e3)


def parse_size(text: str) -> ChipSize | None:
    """The chip size that a package or footprint name contains, or None.

    `0603`, `C0603`, `SMD_0603`, `1608M`, `1608`, `CAPC1608X90N`, `0603 (1608 metric)`. 0402 and 0603 without a
    mark for metric are inch codes (common practice).
    """
    name = text.strip().upper()
    if _NO_CHIP.search(name):
        return None
    pattern = _LAND_PATTERN.search(name)
    if pattern and pattern[1] in _METRIC:
        height = int(pattern[2]) / 1e5 if pattern[2] else None
        return chip_size(_METRIC[pattern[1]], height)
    inches = [code for code in _INCH.findall(name) if code in CHIP_SIZES]
    metric = _METRIC_MARK.search(name)
    if metric and metric[1] in _METRIC:
        return chip_size(_METRIC[metric[1]])
    if inches:
        return chip_size(inches[0])
    for code in _INCH.findall(name):
        if code in _ONLY_METRIC:
            return chip_size(_ONLY_METRIC[code])
    return None
