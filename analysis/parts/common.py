"""What is read of every part in the same way: value, tolerance, package, and whether it is fitted."""

from __future__ import annotations

from dataclasses import dataclass

from reactance.analysis.parts import reading
from reactance.analysis.parts.base import Stated
from reactance.analysis.parts.claims import Claim, Claims, says_not_fitted
from reactance.analysis.parts.sizes import ChipSize, parse_size
from reactance.analysis.parts.values import UNIT_OF_KIND, Value
from reactance.analysis.quantity import QuantityError, format_quantity

DISAGREEMENT = 1e-6  # relative: two texts that differ by more state two values


@dataclass(frozen=True, slots=True)
class Common:
    """`text` is the value as found, `value` in SI or None; `letter` a tolerance letter behind the value."""

    fitted: bool
    text: str
    value: float | None
    letter: str
    package: str | None
    size: ChipSize | None

    @property
    def used(self) -> bool:
        """Whether the part can take part in an analysis, so that what is assumed about it matters."""
        return self.fitted and self.value is not None

    def tolerance(self, claims: Claims) -> tuple[float, float] | None:
        """The stated tolerance as fractions, or None."""
        nominal = self.value if claims.kind == "capacitor" else None
        stated = claims.take("tolerance", reading.tolerance(nominal))
        if stated is None and self.letter:
            source = claims.stated["value"].source
            stated = reading.tolerance(nominal)(Claim(self.letter, source))
            claims.stated["tolerance"] = Stated(self.letter, source)
        return stated


def read_common(claims: Claims) -> Common:
    """Read what every kind of part has; a value that is not understood becomes a problem."""
    fitted = read_fitted(claims)
    text = value_text(claims)
    value = _value(claims, fitted, text)
    package, size = _package(claims)
    return Common(fitted, text, value.value if value else None, value.tolerance if value else "", package, size)


def read_fitted(claims: Claims) -> bool:
    """Whether the part is fitted; says so in a note where it is not."""
    fitted = claims.take("fitted", reading.switch)
    marked = next((claim for claim in claims.of("value") if says_not_fitted(claim.text)), None)
    if fitted is None and marked:
        fitted = False
        claims.stated["fitted"] = Stated(marked.text, marked.source)
    if fitted is False:
        claims.tell("note", "not fitted: it takes no part in any analysis")
    return fitted is not False


def value_text(claims: Claims) -> str:
    """The value as found."""
    found = [claim.text for claim in claims.of("value") if not claim.from_description]
    return (found or [claim.text for claim in claims.of("value")] or [""])[0]


def _value(claims: Claims, fitted: bool, text: str) -> Value | None:
    """The first value that is understood, with a caution where another one contradicts it."""
    read = reading.value(claims.kind)
    understood: list[tuple[Claim, Value]] = []
    refused: list[tuple[Claim, str]] = []
    for claim in claims.of("value"):
        try:
            understood.append((claim, read(claim)))
        except QuantityError as problem:
            refused.append((claim, str(problem)))
    if not understood:
        if fitted:
            claims.tell("caution", _not_understood(*refused[0]) if refused else "no value is stated")
        return None
    claim, value = understood[0]
    claims.stated["value"] = Stated(claim.text, claim.source)
    if refused and refused[0][0].source != claim.source and not says_not_fitted(refused[0][0].text):
        claims.tell("note", f"{_not_understood(*refused[0])}; {claim.text} in {claim.source} is used")
    if value.remark:
        claims.tell("note", value.remark)
    _compare(claims, understood)
    return value


def _not_understood(claim: Claim, problem: str) -> str:
    return f"value in {claim.source} is not understood: {problem}"


def _compare(claims: Claims, understood: list[tuple[Claim, Value]]) -> None:
    """Tell where the export contradicts itself; a `[[part]]` table may differ from the export."""
    own = [(claim, value) for claim, value in understood if not claim.is_knowledge]
    unit = UNIT_OF_KIND[claims.kind]
    for claim, value in own[1:]:
        first, used = own[0]
        if abs(value.value - used.value) > DISAGREEMENT * max(value.value, used.value):
            one, other = format_quantity(used.value, unit), format_quantity(value.value, unit)
            claims.tell("caution", f"{first.source} says {one}, {claim.source} says {other}; {one} is used")
            return


def _package(claims: Claims) -> tuple[str | None, ChipSize | None]:
    """The first package text that holds a size code, else the first text as it is."""
    found = claims.of("package")
    for claim in found:
        size = parse_size(claim.text)
        if size is not None:
            claims.stated["package"] = Stated(claim.text, claim.source)
            return size.code, size
    if not found:
        return None, None
    claims.stated["package"] = Stated(found[0].text, found[0].source)
    return found[0].text, None
