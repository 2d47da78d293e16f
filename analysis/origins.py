"""Where a check's figure comes from: which parts, which model, which assumptions."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import TYPE_CHECKING

from reactance.analysis.bias import Bias
from reactance.analysis.board import Board, Section
from reactance.analysis.measures import MEASURES
from reactance.analysis.parts.band import Band
from reactance.analysis.parts.models import BeadModel, CapacitorModel, InductorModel, Model, ResistorModel
from reactance.analysis.quantity import format_quantity
from reactance.analysis.report import AssumptionEntry, Origin, PartLine

if TYPE_CHECKING:
    from reactance.analysis.study import Study

NO_VOLTS = 1e-9  # V: below this a solved voltage is rounding

MODELS = {
    "rail": (
        "Modified nodal analysis of the rail and everything that beads, inductors and small resistors join to it, "
        "seen by a load between the rail and ground (Ho, Ruehli and Brennan 1975).",
        "Frequency: impedance at every frequency, peaks polished. Time: poles and residues of the same network, R_s "
        "alone without dielectric loss.",
    ),
    "coupling": (
        "Modified nodal analysis between the two nets; rails with a known voltage and grounds stand still, pins that "
        "nobody described are open.",
        "Start: all sources step from zero to their DC level with every capacitor empty.",
    ),
    "filter": (
        "Modified nodal analysis from the source behind `from` to `to`; rails with a known voltage and grounds stand "
        "still, pins that nobody described are open.",
        "Step and settling from poles and residues; noise is 4kTR of every resistance, summed over all frequencies.",
    ),
    "part": ("DC operating point: capacitors open but for leakage, inductors by their DC resistance.",),
    "net": ("A DC path leads through resistors, inductors, beads and described pins.",),
}


def origin_of(study: Study, check_id: str) -> Origin:
    """The origin of a check. Raises KeyError where the study has no such check."""
    check = study.check(check_id)
    if check is None:
        raise KeyError(check_id)
    scope = check_id.partition(":")[0]
    words = next((m.words for m in MEASURES if (m.scope, m.name) == (scope, check.measure)), check.measure)
    names = parts_of(study, check_id)
    sections = [section for section in study.board.sections if section.name in names]
    lines = tuple(part_line(study.board, study.bias, section) for section in sections)
    refdes = {section.refdes for section in sections}
    assumptions = tuple(
        AssumptionEntry(a.about, a.attribute, a.value, a.because)
        for name in sorted(refdes)
        for a in study.board.models[name].assumptions
    )
    networks = tuple(e for e in study.report.assumptions if e.attribute in ("network", "source", "time response"))
    touching = tuple(e for e in networks if e.about in nets_of(study, check_id) or refdes & set(e.about.split(", ")))
    return Origin(check_id, (words, *MODELS[scope], *_notes(study, check_id)), lines, merged(assumptions) + touching)


def merged(entries: Iterable[AssumptionEntry]) -> tuple[AssumptionEntry, ...]:
    """Equal assumptions about several parts as one entry."""
    groups: dict[tuple[str, str, str], list[str]] = {}
    for entry in entries:
        groups.setdefault((entry.attribute, entry.value, entry.because), []).append(entry.about)
    return tuple(AssumptionEntry(", ".join(dict.fromkeys(about)), *what) for what, about in groups.items())


def parts_of(study: Study, check_id: str) -> frozenset[str]:
    """The names of the sections that a check's figure depends on."""
    scope, _, rest = check_id.partition(":")
    if scope == "rail":
        for rail in study.rails:
            if any(check.id == check_id for check in rail.checks):
                if rail.network is not None:
                    return frozenset(section.name for section in rail.network.region.sections)
                return frozenset(s.name for s in study.board.sections_by_net.get(rail.net, ()))
    if scope in ("coupling", "filter"):
        for path in study.paths:
            if any(check.id == check_id for check in path.checks) and not path.failure:
                region = path.networks.region
                started = check_id.endswith((":settling", ":startup_peak", ":dc")) and scope == "coupling"
                sections = path.networks.start_region.sections if started else region.sections
                return frozenset(section.name for section in sections)
    name = rest.rpartition(":")[0]
    if scope == "part":
        return frozenset({name})
    if scope == "net":
        return frozenset(section.name for section in study.board.sections_by_net.get(name, ()))
    return frozenset()


def nets_of(study: Study, check_id: str) -> frozenset[str]:
    """The nets that a check is about."""
    for rail in study.rails:
        if any(check.id == check_id for check in rail.checks):
            return frozenset(rail.network.block.nets if rail.network else (rail.net,))
    for path in study.paths:
        if any(check.id == check_id for check in path.checks):
            return frozenset((path.path.from_net, path.path.to_net))
    return frozenset()


def _notes(study: Study, check_id: str) -> tuple[str, ...]:
    for rail in study.rails:
        if rail.network is not None and any(check.id == check_id for check in rail.checks):
            return rail.network.block.notes
    for path in study.paths:
        if any(check.id == check_id for check in path.checks):
            why = f"{path.path.from_net} to {path.path.to_net}: {path.path.because}"
            return (why, *(path.networks.ac.notes if not path.failure else (path.failure,)))
    return ()


def part_line(board: Board, bias: Bias, section: Section) -> PartLine:
    """One part's electrical figures at its operating point, with the reasons behind them."""
    model = section.model
    volts = bias.across(section)
    figures: list[tuple[str, str]] = []
    because: tuple[str, ...] = ()
    if model.value is None and not isinstance(model, BeadModel):
        because = (f"value {model.text!r} is not understood: left out",)
    elif isinstance(model, CapacitorModel):
        figures, because = _capacitor(model, volts)
    elif isinstance(model, ResistorModel):
        figures, because = [("R", _band(model.resistance, "ohm"))], model.explain()
    elif isinstance(model, InductorModel):
        amps = bias.currents.get(section.name, 0.0)
        figures = [("L", _band(model.inductance_at(amps), "H")), ("DCR", format_quantity(model.dcr, "ohm"))]
        if model.self_resonance:
            figures.append(("self-resonance", format_quantity(model.self_resonance, "Hz")))
    elif isinstance(model, BeadModel) and model.usable:
        amps = bias.currents.get(section.name, 0.0)
        figures = [
            ("R", _band(model.resistance_at(amps), "ohm")),
            ("L", _band(model.inductance_at(amps), "H")),
            ("DCR", format_quantity(model.dcr, "ohm")),
        ]
    stated = _stated(model)
    return PartLine(
        section.name, model.kind, model.text, (section.a, section.b), tuple(figures), (*because, *stated)
    )


def _capacitor(model: CapacitorModel, volts: float | None) -> tuple[list[tuple[str, str]], tuple[str, ...]]:
    figures = [
        ("C_eff", _band(model.effective(abs(volts or 0.0)), "F")),
        ("R_s", format_quantity(model.esr, "ohm")),
        ("L_s", format_quantity(model.esl, "H")),
        ("DC", "not known" if volts is None else format_quantity(volts if abs(volts) > NO_VOLTS else 0.0, "V")),
    ]
    if model.loss_tangent:
        figures.append(("tan δ", f"{model.loss_tangent:g}"))
    if math.isfinite(model.leakage_resistance):
        figures.append(("leakage", format_quantity(model.leakage_resistance, "ohm")))
    return figures, model.explain(abs(volts or 0.0))


def _stated(model: Model) -> tuple[str, ...]:
    sources: dict[str, list[str]] = {}
    for attribute, stated in model.stated.items():
        sources.setdefault(stated.source, []).append(f"{attribute} {stated.text}")
    return tuple(f"{source}: {', '.join(texts)}" for source, texts in sources.items())


def _band(band: Band, unit: str) -> str:
    nominal = format_quantity(band.nominal, unit)
    if band.is_exact:
        return nominal
    return f"{nominal} ({format_quantity(band.low, unit)} to {format_quantity(band.high, unit)})"
