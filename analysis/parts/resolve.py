"""From a part of a design, and what the team knows about it, to its electrical model."""

from __future__ import annotations

import re
from dataclasses import replace

from reactance.analysis.design import Part, Problem
from reactance.analysis.parts.attributes import ATTRIBUTES, RawAttributes
from reactance.analysis.parts.base import Conditions, Kind, OtherModel
from reactance.analysis.parts.build_capacitor import build_capacitor
from reactance.analysis.parts.build_others import build_bead, build_inductor, build_resistor
from reactance.analysis.parts.claims import Claims, gather
from reactance.analysis.parts.common import read_fitted, value_text
from reactance.analysis.parts.descriptions import parse_description
from reactance.analysis.parts.kinds import PERHAPS_CAPACITOR, class_letters, kind_by_refdes
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import PartModel
from reactance.analysis.parts.sections import sections
from reactance.analysis.parts.values import parse_value
from reactance.analysis.quantity import QuantityError

_CAPACITOR_WORD = re.compile(r"\b(?:CAP|CAPACITOR|MLCC)\b", re.IGNORECASE)
_RESISTOR_WORD = re.compile(r"\b(?:RES|RESISTOR)\b", re.IGNORECASE)
_INDUCTOR_WORD = re.compile(r"\b(?:IND|INDUCTOR|CHOKE)\b", re.IGNORECASE)
_BEAD_WORD = re.compile(r"\b(?:BEAD|FERRITE BEAD|FB)\b|@\s*100\s*MHZ", re.IGNORECASE)
_OTHER_WORD = re.compile(r"\b(?:COMMON MODE|CMC|THERMISTOR|NTC|PTC|VARISTOR|POTENTIOMETER|TRIMMER)\b", re.IGNORECASE)


def resolve_part(part: Part, knowledge: Knowledge, conditions: Conditions) -> PartModel:
    """The electrical model of `part` over the board's `conditions`.

    A `[[part]]` row of `knowledge` goes before the export, the export's own attributes before its
    descriptions. Raises nothing over bad texts: they become `problems` of the model.
    """
    kind = kind_of(part, knowledge)
    claims = gather(part, kind, knowledge)
    _tell_useless(claims)
    model = _build(part, claims, knowledge, conditions)
    if len(part.pins) > 2 and model.kind != "other" and model.fitted and not sections(model, part):
        told = Problem(
            "caution",
            part.refdes,
            f"which of its {len(part.pins)} pins its sections join is not plain: it takes no part",
        )
        return replace(model, problems=(*model.problems, told))
    return model


def _tell_useless(claims: Claims) -> None:
    """Tell what a `[[part]]` table states that a part of this kind does not have."""
    if claims.kind == "other":
        return
    for attribute, found in claims.table.items():
        if found[0].is_knowledge and attribute not in (*ATTRIBUTES["all"], *ATTRIBUTES[claims.kind]):
            claims.tell("note", f"{attribute} in {found[0].source}: {claims.kind}s have no such attribute")


def _build(part: Part, claims: Claims, knowledge: Knowledge, conditions: Conditions) -> PartModel:
    if claims.kind == "capacitor":
        return build_capacitor(part, claims, knowledge, conditions)
    if claims.kind == "resistor":
        return build_resistor(part, claims, conditions)
    if claims.kind == "inductor":
        return build_inductor(part, claims, knowledge)
    if claims.kind == "bead":
        return build_bead(part, claims, knowledge)
    fitted = read_fitted(claims)
    return OtherModel(refdes=part.refdes, fitted=fitted, text=value_text(claims), **claims.closing())


def kind_of(part: Part, knowledge: Knowledge) -> Kind:
    """What kind of part it is: by its class letters, checked against what its texts say."""
    kind = kind_by_refdes(part.refdes)
    texts = _texts(part, knowledge)
    if kind == "other" and class_letters(part.refdes) in PERHAPS_CAPACITOR and _any_value(texts, "capacitor"):
        return "capacitor"
    if kind is None:
        return _kind_by_words(class_letters(part.refdes), texts)
    if kind in ("inductor", "bead"):
        return _coil(kind, texts)
    if kind == "resistor" and any(_OTHER_WORD.search(text) for text in texts):
        return "other"
    return kind


def _texts(part: Part, knowledge: Knowledge) -> tuple[str, ...]:
    raw = RawAttributes.of(part.attributes, knowledge.aliases)
    return tuple(stated.text for name in ("value", "description") for stated in raw.find(name, "other"))


def _coil(kind: Kind, texts: tuple[str, ...]) -> Kind:
    """Beads are drawn as L and inductors as FB: the value decides."""
    if any(_OTHER_WORD.search(text) for text in texts):
        return "other"
    is_henry = _any_value(texts, "inductor")
    if kind == "inductor" and not is_henry and any(_BEAD_WORD.search(text) for text in texts):
        return "bead"
    if kind == "bead" and is_henry and not _any_value(texts, "bead"):
        return "inductor"
    return kind


def _kind_by_words(letters: str, texts: tuple[str, ...]) -> Kind:
    """The kind of a part whose designator has no known class letters (`CIN`, `I17`): by its words and value."""
    if any(_OTHER_WORD.search(text) for text in texts):
        return "other"
    for text in texts:
        for word, kind in _KINDS_BY_WORD:
            if word.search(text) and _any_value(texts, kind):
                return kind
    first = kind_by_refdes(letters[:1])
    return first if first and first != "other" and _any_value(texts, first) else "other"


_KINDS_BY_WORD: tuple[tuple[re.Pattern[str], Kind], ...] = (
    (_BEAD_WORD, "bead"),
    (_CAPACITOR_WORD, "capacitor"),
    (_RESISTOR_WORD, "resistor"),
    (_INDUCTOR_WORD, "inductor"),
)


def _any_value(texts: tuple[str, ...], kind: Kind) -> bool:
    return any(_is_value(text, kind) or "value" in parse_description(text, kind) for text in texts)


def _is_value(text: str, kind: Kind) -> bool:
    """Whether a text is a value with its unit, which a bare number is not."""
    try:
        parse_value(text, kind)
    except QuantityError:
        return False
    return any(character.isalpha() for character in text)
