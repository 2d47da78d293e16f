"""Whatever an export states, a part has a model, and every figure in it is usable."""

from __future__ import annotations

import math

from hypothesis import given, settings
from hypothesis import strategies as st

from reactance.analysis.design import Part, Pin
from reactance.analysis.parts.attributes import ALIASES, NOT_FITTED
from reactance.analysis.parts.knowledge import Knowledge
from reactance.analysis.parts.models import BeadModel, CapacitorModel, Conditions, InductorModel, ResistorModel
from reactance.analysis.parts.resolve import resolve_part
from reactance.analysis.parts.sections import sections, through

PIECES = [
    *("10", "0", "4.7", "1e-7", "104", "22", "-5", "999999999999", "0.1", "±", "+", "/", "-", "%", "@", " ", ",", "."),
    *("u", "n", "p", "m", "k", "M", "R", "F", "H", "V", "A", "Hz", "ohm", "Ω", "µ", "ppm", "K", "Z", "J", "C0G", "X7R"),
    *("M4G", "0805", "CAPC1608X90N", "CAPC1608X0N", "DNP", "TANT", "ELEC", "FILM", "PP", "100MHz", "²", "١٠", "ESR "),
]
TEXT = st.one_of(st.lists(st.sampled_from(PIECES), max_size=8).map("".join), st.text(max_size=12))
NAMES = st.sampled_from(sorted({name for names in ALIASES.values() for name in names} | set(NOT_FITTED)))
REFDES = st.one_of(st.sampled_from(("C1", "R1", "L1", "FB1", "CN1", "RN1", "U1", "I7", "C?", "")), st.text(max_size=5))
PIN = st.builds(Pin, st.sampled_from("12345678"), st.sampled_from(("", "+", "-", "A", "IN", "OUT", "GND", "1A", "1B")))


@settings(max_examples=400, deadline=None)
@given(REFDES, st.dictionaries(NAMES, TEXT, max_size=6), st.lists(PIN, max_size=8))
def test_any_texts_make_a_usable_model(refdes: str, attributes: dict[str, str], pins: list[Pin]) -> None:
    part = Part(refdes, tuple(pins), attributes)
    model = resolve_part(part, Knowledge(), Conditions(-40.0, 85.0, 1e5))
    numbers = {pin.number for pin in pins}
    assert all({one, other} <= numbers for one, other in (*sections(model, part), *through(model, part)))
    assert model.value is None or math.isfinite(model.value)
    if isinstance(model, CapacitorModel):
        assert math.isfinite(model.esr)
        assert math.isfinite(model.esl)
        assert model.leakage_resistance > 0
        if model.value is not None:
            for volts in (0.0, -3.3, 1e3):
                band = model.effective(volts)
                assert 0.0 <= band.low <= band.nominal <= band.high < math.inf
            assert float(model.charge(5.0)) > 0.0
        assert model.explain(5.0)
    if isinstance(model, ResistorModel) and model.value is not None:
        assert model.resistance.low <= model.resistance.nominal <= model.resistance.high
        assert model.explain()
    if isinstance(model, InductorModel) and model.value is not None:
        assert 0.0 < model.inductance_at(1.0).nominal < math.inf
    if isinstance(model, BeadModel) and model.usable:
        assert 0.0 < model.inductance.low <= model.inductance.high
