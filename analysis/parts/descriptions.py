"""The attributes in a part's description: `CAP CER 4.7UF 25V X7R 1206 10%`, `10u/16V/X5R/0805`.

Every piece that is understood is returned as the text of one canonical attribute; the pieces are interpreted
by the same rules as attributes stated one by one.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from functools import lru_cache
from types import MappingProxyType

from reactance.analysis.parts.attributes import NOT_FITTED_WORDS, folded
from reactance.analysis.parts.base import Kind
from reactance.analysis.parts.dielectrics import COMMON_CLASS1, FILM, parse_dielectric
from reactance.analysis.parts.sizes import CHIP_SIZES, parse_size
from reactance.analysis.parts.values import parse_value
from reactance.analysis.quantity import QuantityError

# Words for technologies (common practice).
TECHNOLOGY_WORDS: dict[str, str] = {
    "CER": "ceramic",
    "CERAM": "ceramic",
    "CERAMIC": "ceramic",
    "CERCAP": "ceramic",
    "MLCC": "ceramic",
    "MLC": "ceramic",
    "FILM": "film",
    "FOIL": "film",
    "ELEC": "aluminium",
    "ELECT": "aluminium",
    "ELECTRO": "aluminium",
    "ELECTROLYTIC": "aluminium",
    "ELCAP": "aluminium",
    "ELCO": "aluminium",
    "ECAP": "aluminium",
    "ALUM": "aluminium",
    "ALUMINUM": "aluminium",
    "ALUMINIUM": "aluminium",
    "ALU": "aluminium",
    "AL": "aluminium",
    "ALEL": "aluminium",
    "ALELEC": "aluminium",
    "TANT": "tantalum",
    "TANTALUM": "tantalum",
    "TAN": "tantalum",
    "TA": "tantalum",
    "POLYMER": "polymer",
    "POLY": "polymer",
    "CONDPOLY": "polymer",
    **dict.fromkeys((name for name in FILM if len(name) > 3), "film"),
}
_STRONGER = {("polymer", "aluminium"), ("polymer", "tantalum")}  # a polymer tantalum is a polymer

_UNPOLARISED = frozenset(("BIPOLAR", "NONPOLAR", "NONPOLARISED", "NONPOLARIZED", "UNPOLARISED", "UNPOLARIZED", "BP"))
_POLARISED = frozenset(("POL", "POLAR", "POLARISED", "POLARIZED"))

_KEEP = re.IGNORECASE
_OHMS = r"\d[\d.,]*\s*[munk]?\s*(?:OHMS?|R|Ω)"
_N = r"\d+(?:[.,]\d+)?"
_START = r"(?<![A-Za-z0-9.])(?<!\d,)"  # a number begins here: not inside a word, nor behind a decimal mark

# Phrases that span blanks and separators, cut out before the rest is split: attribute ("" to ignore), pattern.
_PHRASES: tuple[tuple[str, re.Pattern[str]], ...] = (
    (
        "fitted",
        re.compile(
            r"\b(?:NOT\s+(?:FITTED|POPULATED|MOUNTED|PLACED)|NO[ -]?(?:STUFF|POP|FIT)"
            r"|DO\s+NOT\s+(?:FIT|POPULATE|PLACE|INSTALL|MOUNT|STUFF))\b",
            _KEEP,
        ),
    ),
    ("", re.compile(r"[-+]?\d+\s*°?C?\s*(?:~|TO|\.\.\.?|/)\s*\+?\d+\s*(?:°\s*C|C|DEGC)\b", _KEEP)),
    ("tolerance", re.compile(rf"\+\s*{_N}\s*%?\s*[/,]?\s*-\s*{_N}\s*%", _KEEP)),
    ("tolerance", re.compile(rf"-\s*{_N}\s*%?\s*[/,]?\s*\+\s*{_N}\s*%", _KEEP)),
    ("tolerance", re.compile(rf"(?:±|\+\s*/?\s*-)\s*{_N}\s*(?:%|pF)", _KEEP)),
    ("tolerance", re.compile(rf"{_START}{_N}\s*(?:%|PCT\b)", _KEEP)),
    ("esr", re.compile(rf"ESR\s*(?:MAX)?\s*[=:<≤]?\s*({_OHMS})", _KEEP)),
    ("dcr", re.compile(rf"(?:DCR|RDC)\s*(?:MAX)?\s*[=:<≤]?\s*({_OHMS})", _KEEP)),
    ("dcr", re.compile(rf"({_OHMS})\s*(?:DCR|RDC)\b", _KEEP)),
    ("self_resonance", re.compile(rf"SRF\s*[=:>≥]?\s*({_N}\s*[kMG]?Hz)", _KEEP)),
    ("saturation_current", re.compile(rf"I\s?SAT\s*[=:]?\s*({_N}\s*m?A)\b", _KEEP)),
    ("saturation_current", re.compile(rf"({_N}\s*m?A)\s*(?:SAT|ISAT)\b", _KEEP)),
    ("temperature_coefficient", re.compile(rf"(?:±|\+\s*/?\s*-|\+|-)?\s*{_N}\s*PPM(?:\s*/\s*(?:K|°?C))?\b", _KEEP)),
    ("", re.compile(r"\b\d+\s*/\s*\d+\s*W(?:ATTS?)?\b", _KEEP)),
    ("", re.compile(rf"{_START}{_N}\s*m?W(?:ATTS?)?\b", _KEEP)),
    ("", re.compile(rf"{_START}\d{{2,3}}\s*(?:°\s*C|C|DEGC)\b", _KEEP)),
)
_HYPHENED = re.compile(r"\b(NON|UN|E|AL)[- ](POLAR\w*|CAP|ELEC\w*)\b", _KEEP)
_BEAD_IMPEDANCE = re.compile(rf"({_N}\s*k?\s*(?:R|OHMS?|Ω)?\s*(?:@|\bAT\b)\s*{_N}\s*[kMG]?HZ)", _KEEP)
_TEST_FREQUENCY = re.compile(rf"(?:@|\bAT\b)\s*{_N}\s*[kMG]?HZ", _KEEP)

_JOIN = re.compile(
    rf"{_START}({_N})\s+(?=(?:[pnuµμm]?F|[pnuµμ]FD|MFD|[pnuµμm]?H|[mk]?V|VDC|VAC|WV|WVDC|[mkM]?(?:OHMS?|Ω))(?![A-Za-z0-9]))",
    _KEEP,
)
_JOIN_RESISTOR = re.compile(rf"{_START}(\d{{1,3}}(?:[.,]\d+)?)\s+(?=[kKMR]\b)")
_DECIMAL_COMMA = re.compile(r"(?<![\d,.])(0|[1-9]\d{0,2}),(\d{1,3}(?=[A-Za-zµμΩ]))")
_SPLIT = re.compile(r"[\s/;|()\[\]{}_=:,]+|(?<=[A-Za-z%])-(?=[A-Za-z0-9])|(?<=\d)-(?=[\d.]+[A-Za-z])")
_VOLTAGE = re.compile(r"(\d+(?:\.\d+)?k?)(?:VDC|VAC|WVDC|WV|VW|V)|(\d+V\d+)", _KEEP)
_PACKAGE = re.compile(r"(?:C|R|L|FB|SMD|SMT|CAP|RES|IND|CASE)?-?(\d{4,6})(?:M|METRIC)?", _KEEP)
_LAND_PATTERN = re.compile(r"(?:CAPC|RESC|INDC|BEADC)\d{4}\w*", _KEEP)
_VALUE_START = re.compile(r"\d|\.\d|R\d|[pnuµμ]\d")


@lru_cache(maxsize=4096)  # a board states the same descriptions over and over
def parse_description(text: str, kind: Kind) -> Mapping[str, str]:
    """The attributes that `text` contains, by canonical name, each as its piece of the text.

    The first piece that can be an attribute is taken for it. What is not understood is left out.
    """
    found: dict[str, str] = {}
    rest = " " + text.replace("\u2212", "-").replace("\u00a0", " ") + " "
    rest = _HYPHENED.sub(lambda match: f"{match[1]}{match[2]}", rest)
    if kind == "bead":
        rest = _cut(rest, "value", _BEAD_IMPEDANCE, found)
    rest = _cut(rest, "", _TEST_FREQUENCY, found)
    for attribute, pattern in _PHRASES:
        rest = _cut(rest, attribute, pattern, found)
    rest = _JOIN.sub(r"\1", rest)
    if kind == "resistor":
        rest = _JOIN_RESISTOR.sub(r"\1", rest)
    rest = _DECIMAL_COMMA.sub(r"\1.\2", rest)
    for piece in _SPLIT.split(rest):
        token = piece.strip("'\"#").rstrip(".-").lstrip("-")
        if token:
            _sort_in(token, kind, found)
    return MappingProxyType(found)


def _cut(text: str, attribute: str, pattern: re.Pattern[str], found: dict[str, str]) -> str:
    match = pattern.search(text)
    while match:
        if attribute:
            found.setdefault(attribute, (match[1] if match.lastindex else match[0]).strip())
        text = f"{text[: match.start()]} {text[match.end() :]}"
        match = pattern.search(text)
    return text


def _sort_in(token: str, kind: Kind, found: dict[str, str]) -> None:
    """Put one token under the attribute that it states, if it states one that is not there yet."""
    for attribute, text in _meanings(token, kind):
        if attribute == "technology" and (text, found.get(attribute)) in _STRONGER:
            found[attribute] = text
        if attribute not in found:
            found[attribute] = text
            return


def _meanings(token: str, kind: Kind) -> list[tuple[str, str]]:
    upper = token.upper()
    voltage = _VOLTAGE.fullmatch(token)
    package = _PACKAGE.fullmatch(token)
    words = _capacitor_words(upper) if kind == "capacitor" else []
    meanings: list[tuple[str, str]] = []
    if folded(token) in NOT_FITTED_WORDS and upper not in ("NM", "OPEN"):
        meanings = [("fitted", token)]
    elif voltage:
        meanings = [("rated_voltage", f"{voltage[1]}V" if voltage[1] else voltage[2])]
    elif _LAND_PATTERN.fullmatch(token) or (package and _is_size(package[1], upper)):
        meanings = [("package", token)]
    elif words:
        meanings = words
    elif _is_value(token, kind):
        meanings = [("value", token)]
    elif len(token) == 1 and upper in "JKMGZ" + ("F" if kind == "resistor" else ""):
        meanings = [("tolerance", upper)]
    return meanings


def _is_size(digits: str, upper: str) -> bool:
    size = parse_size(upper)
    return size is not None and (digits in CHIP_SIZES or digits in (CHIP_SIZES[size.code][0],))


def _capacitor_words(upper: str) -> list[tuple[str, str]]:
    word = upper.replace("-", "")
    dielectric = parse_dielectric(upper)
    if dielectric and (dielectric.family != 1 or upper in COMMON_CLASS1):
        return [("dielectric", upper)]
    if word in TECHNOLOGY_WORDS:
        return [("technology", TECHNOLOGY_WORDS[word])]
    if word in _UNPOLARISED:
        return [("polarised", "no")]
    if word in _POLARISED:
        return [("polarised", "yes")]
    return []


def _is_value(token: str, kind: Kind) -> bool:
    """Whether a token of a description is the value: it must carry its unit, or be a code with a tolerance."""
    if kind == "other" or not _VALUE_START.match(token) or token.replace(".", "").replace(",", "").isdigit():
        return False
    if kind == "capacitor" and "R" in token.upper():
        return False
    try:
        return parse_value(token, kind).value > 0.0 or kind == "resistor"
    except QuantityError:
        return False
