"""The one table of attribute names: what exports call things, and what they are called here."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from reactance.analysis.parts.base import Kind, Stated

# Canonical attribute -> names met in exports, most telling first; compared without case, spaces or marks.
# Common practice of schematic authors; there is no published list.
ALIASES: dict[str, tuple[str, ...]] = {
    "value": ("value", "val", "part value", "nominal value", "nominal", "comment", "rated value"),
    "tolerance": ("tolerance", "tol", "tolerance %", "accuracy"),
    "technology": ("technology", "tech", "capacitor type", "cap type", "type", "construction"),
    "dielectric": (
        "dielectric",
        "dielectric material",
        "dielectric type",
        "dielectric code",
        "temperature characteristic",
        "temp characteristic",
        "temp char",
        "characteristic",
        "tempco",
        "temp co",
        "temp coeff",
        "temperature coefficient",
        "tc",
        "material",
    ),
    "rated_voltage": (
        "rated voltage",
        "voltage rating",
        "voltage rated",
        "rated voltage dc",
        "voltage rating dc",
        "voltage",
        "rating",
        "vrated",
        "v rating",
        "volt",
        "volts",
        "working voltage",
        "wvdc",
        "vdc",
        "wv",
        "max voltage",
        "dc voltage",
    ),
    "package": (
        "package",
        "case",
        "case size",
        "case code",
        "package / case",
        "size code",
        "size",
        "chip size",
        "pcb footprint",
        "footprint",
        "land pattern",
        "pattern",
        "pcb package",
        "package name",
    ),
    "polarised": ("polarised", "polarized", "polarity"),
    "fitted": (
        "fitted",
        "populate",
        "populated",
        "mounted",
        "mount",
        "assemble",
        "assembled",
        "assembly",
        "stuff",
        "stuffed",
        "installed",
        "install",
        "placed",
        "fit",
        "fitting",
    ),
    "esr": ("esr", "equivalent series resistance", "esr max", "max esr"),
    "esl": ("esl", "equivalent series inductance"),
    "leakage_resistance": ("leakage resistance", "insulation resistance"),
    "leakage_current": ("leakage current", "leakage", "dc leakage", "dcl"),
    "half_voltage": ("half voltage",),
    "bias_curve": ("bias curve", "dc bias curve"),
    "ageing": ("ageing", "aging", "ageing per decade", "aging rate", "ageing rate"),
    "temperature_coefficient": ("temperature coefficient", "tempco", "temp co", "temp coeff", "tcr", "tc", "tcc"),
    "touchstone": ("touchstone",),
    "dcr": ("dcr", "dc resistance", "series resistance", "rdc", "dcr max", "max dcr", "resistance dc"),
    "self_resonance": ("self resonance", "self resonant frequency", "srf", "self resonance frequency"),
    "saturation_current": ("saturation current", "isat", "i sat", "saturation"),
    "resistance": ("resistance",),
    "inductance": ("inductance",),
    "capacitance": ("capacitance",),
    "description": ("description", "desc", "part description", "long description", "detailed description", "title"),
    "number": (
        "mpn",
        "manufacturer part number",
        "manufacturer part",
        "mfr part number",
        "mfr pn",
        "mfg pn",
        "mfpn",
        "part number",
        "part no",
        "pn",
        "number",
        "ordering code",
        "part",
    ),
}

# What the part itself is named by, further names of its value by kind.
VALUE_BY_KIND: dict[Kind, tuple[str, ...]] = {
    "capacitor": ("capacitance", "cap", "c"),
    "resistor": ("resistance", "res", "r", "ohms"),
    "inductor": ("inductance", "ind", "l"),
    "bead": ("impedance", "impedance at 100 mhz", "impedance @ 100mhz", "z"),
    "other": (),
}

# Which attributes each kind of part has.
ATTRIBUTES: dict[str, tuple[str, ...]] = {
    "all": ("value", "tolerance", "package", "fitted"),
    "capacitor": (
        *("technology", "dielectric", "rated_voltage", "polarised", "esr", "esl", "leakage_resistance"),
        *("leakage_current", "half_voltage", "bias_curve", "ageing", "temperature_coefficient", "touchstone"),
    ),
    "resistor": ("temperature_coefficient",),
    "inductor": ("dcr", "self_resonance", "saturation_current", "touchstone"),
    "bead": ("dcr", "resistance", "inductance", "capacitance", "bias_curve", "touchstone"),
}

# Attributes whose presence with a true value means that a part is not fitted.
NOT_FITTED = (
    "dnp",
    "dnf",
    "dni",
    "dnm",
    "dns",
    "do not populate",
    "do not fit",
    "do not place",
    "do not install",
    "do not mount",
    "do not stuff",
    "no fit",
    "no pop",
    "no stuff",
    "not fitted",
    "not mounted",
    "not placed",
    "unfitted",
    "nf",
    "nm",
)

# Words that say so in place of a value or beside it.
NOT_FITTED_WORDS = frozenset(
    "".join(filter(str.isalnum, name)) for name in (*NOT_FITTED, "unpopulated", "not populated", "open")
)

TRUE_WORDS = frozenset(("true", "yes", "y", "1", "x", "t", "on", "fitted", "populated", "mounted", "pol"))
FALSE_WORDS = frozenset(("false", "no", "n", "0", "f", "off", "none", "nonpolar", "bipolar", "unpolarised"))


def folded(name: str) -> str:
    """A raw name without case, spaces and marks: `Part Number`, `PART_NUMBER` and `part-number` are one."""
    return "".join(filter(str.isalnum, name.casefold()))


def _meanings() -> dict[str, tuple[tuple[int, str], ...]]:
    """Folded raw name -> what it can stand for, each with its rank among the names for that."""
    table: dict[str, tuple[tuple[int, str], ...]] = {}
    for canonical, names in ALIASES.items():
        for rank, name in enumerate(names):
            table[folded(name)] = (*table.get(folded(name), ()), (rank, canonical))
    return table


_MEANINGS = _meanings()
_FOLDED_VALUE: dict[Kind, tuple[str, ...]] = {kind: tuple(map(folded, names)) for kind, names in VALUE_BY_KIND.items()}
_FOLDED_NOT_FITTED = tuple(map(folded, NOT_FITTED))


@dataclass(frozen=True, slots=True)
class RawAttributes:
    """A part's attributes as the export has them, found by canonical name or by folded raw name."""

    by_name: Mapping[str, Stated]
    by_canonical: Mapping[str, tuple[Stated, ...]]

    @classmethod
    def of(cls, attributes: Mapping[str, str], extra: Mapping[str, tuple[str, ...]]) -> RawAttributes:
        """Of an export's part, with the aliases that the brief adds going before the known ones."""
        by_name: dict[str, Stated] = {}
        for name, text in attributes.items():
            plain = text.strip()
            if plain:
                by_name.setdefault(folded(name), Stated(plain, f"export {name}"))
        ranked: dict[str, list[tuple[int, Stated]]] = {}
        for canonical, names in extra.items():
            for name in names:
                if folded(name) in by_name:
                    ranked.setdefault(canonical, []).append((-1, by_name[folded(name)]))
        for name, stated in by_name.items():
            for rank, canonical in _MEANINGS.get(name, ()):
                ranked.setdefault(canonical, []).append((rank, stated))
        by_rank = {canonical: sorted(found, key=_rank) for canonical, found in ranked.items()}
        return cls(by_name, {canonical: tuple(stated for _, stated in found) for canonical, found in by_rank.items()})

    def find(self, canonical: str, kind: Kind = "other") -> tuple[Stated, ...]:
        """Every text stated under a name of `canonical`, the most telling first."""
        found = self.by_canonical.get(canonical, ())
        if canonical != "value":
            return found
        return (*found, *(self.by_name[name] for name in _FOLDED_VALUE[kind] if name in self.by_name))

    def not_fitted(self) -> Stated | None:
        """The attribute that says that the part is not fitted, if there is one."""
        for name in _FOLDED_NOT_FITTED:
            found = self.by_name.get(name)
            if found and folded(found.text) not in FALSE_WORDS:
                return found
        for stated in self.find("fitted"):
            word = folded(stated.text)
            if word in FALSE_WORDS or word in NOT_FITTED_WORDS:
                return stated
        return None


def _rank(entry: tuple[int, Stated]) -> int:
    return entry[0]
