"""Typed values of EDIF properties as the text an attribute carries."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from decimal import Decimal, InvalidOperation
from types import MappingProxyType
from typing import NamedTuple

from reactance.analysis.exports.edif_forms import Sexp
from reactance.analysis.exports.edif_names import BadEntryError, found, keyword, name, string, visible

# EDIF 2 0 0 `unit` names and the SI symbol of each, as quantities are written elsewhere.
UNITS: Mapping[str, str] = MappingProxyType(
    {
        "capacitance": "F",
        "charge": "C",
        "conductance": "S",
        "current": "A",
        "distance": "m",
        "energy": "J",
        "flux": "Wb",
        "frequency": "Hz",
        "inductance": "H",
        "mass": "kg",
        "power": "W",
        "resistance": "ohm",
        "temperature": "degC",
        "time": "s",
        "voltage": "V",
    }
)

_TYPES = frozenset(("string", "integer", "number", "boolean", "minomax", "point"))


class Attribute(NamedTuple):
    """A property: `key` identifies it, `name` is what people see, `unit` (lower case) scales the number `text`."""

    key: str
    name: str
    text: str
    unit: str = ""


def attributes(form: Sexp) -> Iterator[Attribute]:
    """The attributes that `(property …)`, `(parameter …)` or `(parameterAssign …)` gives.

    A `miNoMax` gives its nominal value under the property's name and the others as `NAME minimum`, `NAME maximum`.
    """
    if len(form) < 2:
        raise BadEntryError("a property without a name")
    declared = name(form[1])
    unit = ""
    value: list[Sexp] | None = None
    for item in form[2:]:
        kind = keyword(item)
        if kind in _TYPES and value is None and isinstance(item, list):
            value = item
        elif kind == "unit" and len(item) > 1 and isinstance(item[1], str):
            unit = item[1].lower()
    if value is None:
        return
    for suffix, text, numeric in _texts(value):
        key = declared.key + suffix.lower()
        yield Attribute(key, declared.text + suffix, text, unit if numeric else "")


def _texts(value: list[Sexp]) -> Iterator[tuple[str, str, bool]]:
    kind = keyword(value)
    if kind == "string":
        yield "", ", ".join(string(item) for item in value[1:]), False
    elif kind in ("integer", "number"):
        numbers = [_number(item) for item in value[1:]]
        yield "", ", ".join(numbers), len(numbers) == 1
    elif kind == "boolean":
        yield "", ", ".join(_boolean(item) for item in value[1:]), False
    elif kind == "point":
        yield "", ", ".join(" ".join(map(_number, item[1:])) for item in value[1:]), False
    else:
        yield from _spread(value)


def _spread(value: list[Sexp]) -> Iterator[tuple[str, str, bool]]:
    for item in value[1:2]:
        shown = item[1] if keyword(item) == "minomaxdisplay" and len(item) > 1 else item
        if keyword(shown) != "mnm":
            yield "", _number(shown), True
            continue
        texts = [
            "" if keyword(bound) in ("undefined", "unconstrained") else _number(bound) for bound in shown[1:]
        ]
        for suffix, text in zip((" minimum", "", " maximum"), texts, strict=False):
            if text:
                yield suffix, text, True


def _boolean(form: Sexp) -> str:
    kind = keyword(form)
    if kind == "booleandisplay" and len(form) > 1:
        return _boolean(form[1])
    if kind in ("true", "false"):
        return kind
    raise BadEntryError(f"expected (true) or (false){found(form)}")


def _number(form: Sexp) -> str:
    """`4`, `(e 47 -1)` or a display of one, as a decimal number."""
    kind = keyword(form)
    if isinstance(form, list) and kind in ("integerdisplay", "numberdisplay") and len(form) > 1:
        return _number(form[1])
    try:
        if isinstance(form, str):
            return written(Decimal(form))
        if kind == "e" and len(form) == 3 and isinstance(form[1], str) and isinstance(form[2], str):
            exponent = int(form[2])
            if abs(exponent) < 1000:
                return written(Decimal(form[1]).scaleb(exponent))
    except (InvalidOperation, ValueError):
        pass
    shown = visible(form[:40]) if isinstance(form, str) else f"({kind[:40]} …)"
    raise BadEntryError(f"expected a number such as 100 or (e 1 -7), found {shown}")


def written(number: Decimal) -> str:
    """A decimal number without needless digits, `1e-7` where that is shorter than zeros."""
    if not number.is_finite():
        raise InvalidOperation
    exponent = number.adjusted()
    if not number:
        return "0"
    if abs(exponent) > 300:
        raise InvalidOperation
    plain = number.normalize()
    if -5 <= exponent <= 6:
        return format(plain, "f")
    return f"{format(plain.scaleb(-exponent), 'f')}e{exponent}"


def scales(form: list[Sexp]) -> Mapping[str, Decimal]:
    """What one EDIF unit is worth in SI, by unit, from a `(technology (numberDefinition (scale …)))`."""
    factors: dict[str, Decimal] = {}
    for definition in form[1:]:
        if keyword(definition) != "numberdefinition":
            continue
        for scale in definition[1:]:
            if keyword(scale) != "scale" or len(scale) < 4 or keyword(scale[3]) != "unit":
                continue
            unit = scale[3][1] if len(scale[3]) > 1 else ""
            edif, si = Decimal(_number(scale[1])), Decimal(_number(scale[2]))
            if isinstance(unit, str) and edif:
                factors[unit.lower()] = si / edif
    return MappingProxyType(factors)


def attribute_text(attribute: Attribute, factors: Mapping[str, Decimal]) -> str:
    """The attribute's text with its unit, in SI."""
    if not attribute.unit:
        return attribute.text
    number = Decimal(attribute.text) * factors.get(attribute.unit, Decimal(1))
    return f"{written(number)} {UNITS.get(attribute.unit, '')}".rstrip()
