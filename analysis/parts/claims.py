"""What is claimed about a part, by whom: the team's knowledge first, then the export, then its descriptions."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from fnmatch import fnmatchcase
from functools import lru_cache
from types import MappingProxyType
from typing import TYPE_CHECKING, TypedDict, TypeVar

from reactance.analysis.design import Part, Problem, Severity
from reactance.analysis.parts.attributes import NOT_FITTED_WORDS, RawAttributes, folded
from reactance.analysis.parts.base import Assumption, Kind, Stated
from reactance.analysis.parts.descriptions import parse_description
from reactance.analysis.parts.values import parse_value
from reactance.analysis.quantity import QuantityError

if TYPE_CHECKING:
    from reactance.analysis.parts.knowledge import Knowledge, KnowledgeRow

T = TypeVar("T")

# Names under which a text may stand for something else, so that not understanding it is no fault of the export.
# A temperature coefficient's names also stand over dielectric codes.
_LOOSE = frozenset(
    (
        *("type", "rating", "material", "characteristic", "tc", "tempco", "size", "comment", "part"),
        *("temperaturecoefficient", "tempcoeff"),
    )
)


@dataclass(frozen=True, slots=True)
class Claim:
    """One text about one attribute. `raw` is the TOML value where it comes from a `[[part]]` table."""

    text: str
    source: str
    raw: object = None
    from_description: bool = False

    @property
    def is_knowledge(self) -> bool:
        """Whether it comes from a `[[part]]` table."""
        return self.raw is not None

    @property
    def is_loose(self) -> bool:
        """Whether it stands under a name that is used for many things."""
        return self.from_description or folded(self.source.partition(" ")[2]) in _LOOSE


class Closing(TypedDict):
    """The fields of a model that tell where its figures come from."""

    stated: Mapping[str, Stated]
    assumptions: tuple[Assumption, ...]
    problems: tuple[Problem, ...]


@dataclass(slots=True)
class Claims:
    """All claims about one part in order of precedence, and the notes that reading them leaves."""

    refdes: str
    kind: Kind
    table: Mapping[str, tuple[Claim, ...]]
    stated: dict[str, Stated] = field(default_factory=dict)
    assumptions: list[Assumption] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)

    def of(self, attribute: str) -> tuple[Claim, ...]:
        """The claims about an attribute, most telling first."""
        return self.table.get(attribute, ())

    def take(self, attribute: str, read: Callable[[Claim], T]) -> T | None:
        """The first claim about `attribute` that `read` understands; the ones before it become problems."""
        for claim in self.of(attribute):
            try:
                found = read(claim)
            except QuantityError as problem:
                if not claim.is_loose:
                    self.tell("caution", f"{attribute} in {claim.source}: {problem}")
                continue
            self.stated[attribute] = Stated(claim.text, claim.source)
            return found
        return None

    def assume(self, attribute: str, value: str, because: str) -> None:
        """Note that something is used that nobody stated."""
        self.assumptions.append(Assumption(self.refdes, attribute, value, because))

    def forget(self, *attributes: str) -> None:
        """Take back what was assumed about attributes that turn out not to be used."""
        self.assumptions[:] = [entry for entry in self.assumptions if entry.attribute not in attributes]

    def closing(self, used: bool = True) -> Closing:
        """What reading the claims left behind, as the last fields of a model; no assumptions if it is not `used`."""
        return {
            "stated": MappingProxyType(dict(self.stated)),
            "assumptions": tuple(self.assumptions) if used else (),
            "problems": tuple(self.problems),
        }

    def tell(self, severity: Severity, message: str) -> None:
        """Note something for the designer."""
        self.problems.append(Problem(severity, self.refdes, message))


def gather(part: Part, kind: Kind, knowledge: Knowledge) -> Claims:
    """Everything that is claimed about `part`, taken as one of `kind`."""
    raw = RawAttributes.of(part.attributes, knowledge.aliases)
    table: dict[str, list[Claim]] = {}
    for row in knowledge.rows:
        if matches(row, part.refdes, raw, kind):
            for attribute, value in row.attributes.items():
                table.setdefault(attribute, []).append(Claim(toml_text(value), row.source, value))
    for attribute in dict.fromkeys((*raw.by_canonical, "value")):
        for stated in raw.find(attribute, kind):
            table.setdefault(attribute, []).append(Claim(stated.text, stated.source))
    not_fitted = raw.not_fitted()
    if not_fitted:
        table.setdefault("fitted", []).append(Claim("not fitted", not_fitted.source))
    if kind != "other":
        _add_descriptions(table, kind)
    return Claims(part.refdes, kind, {attribute: tuple(claims) for attribute, claims in table.items()})


def _add_descriptions(table: dict[str, list[Claim]], kind: Kind) -> None:
    """Add what descriptions contain, and what values say beyond the value itself, behind all else."""
    texts = [claim for claim in table.get("value", ()) if not _is_plain(claim.text, kind)]
    texts += [*table.get("description", ()), *table.get("technology", ()), *table.get("dielectric", ())]
    for claim in texts:
        if claim.is_knowledge:
            continue
        for attribute, piece in parse_description(claim.text, kind).items():
            table.setdefault(attribute, []).append(Claim(piece, claim.source, from_description=True))


def _is_plain(text: str, kind: Kind) -> bool:
    try:
        parse_value(text, kind)
    except QuantityError:
        return False
    return True


def toml_text(value: object) -> str:
    """A TOML value as people would write it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, list):
        return f"[{', '.join(toml_text(item) for item in value)}]"
    if isinstance(value, dict):
        return ", ".join(f"{key} {toml_text(item)}" for key, item in value.items())
    return str(value)


def matches(row: KnowledgeRow, refdes: str, raw: RawAttributes, kind: Kind) -> bool:
    """Whether a `[[part]]` table is about a part: every pattern that it gives must match."""
    texts: dict[str, Callable[[], Iterable[str]]] = {
        "refdes": lambda: (refdes,),
        "value": lambda: (stated.text for stated in raw.find("value", kind)),
        "number": lambda: (stated.text for stated in raw.find("number")),
    }
    if not row.match or not set(row.match) <= set(texts):
        return False
    return all(
        any(_matches(pattern, text, name, kind) for text in texts[name]()) for name, pattern in row.match.items()
    )


def _matches(pattern: str, text: str, name: str, kind: Kind) -> bool:
    if fnmatchcase(text.strip(), pattern.strip()):
        return True
    if name == "refdes":
        return False
    plain = "".join(text.split()).casefold(), "".join(pattern.split()).casefold()
    if fnmatchcase(*plain):
        return True
    return name == "value" and kind != "other" and _same_value(pattern, text, kind)


def _same_value(one: str, other: str, kind: Kind) -> bool:
    """Whether two texts are one value in two spellings, such as `10uF` and `10 µF`."""
    a, b = _value_in(one, kind), _value_in(other, kind)
    return a is not None and b is not None and abs(a - b) <= 1e-9 * abs(a)


@lru_cache(maxsize=4096)  # each table's pattern meets every part, and most parts share their texts
def _value_in(text: str, kind: Kind) -> float | None:
    """The value that a text is or contains, or None."""
    for piece in (text, parse_description(text, kind).get("value", "")):
        try:
            return parse_value(piece, kind).value
        except QuantityError:
            continue
    return None


def says_not_fitted(text: str) -> bool:
    """Whether a value's text is nothing but a mark for a part that is not fitted."""
    return folded(text) in NOT_FITTED_WORDS
