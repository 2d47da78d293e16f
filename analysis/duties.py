"""What each capacitor is there for, and because of what.

The rules stand in one table, tried in order; the first that applies decides. Each looks at the capacitor's two nets
and their neighbourhood alone, so that the work grows with the number of parts. The rules are common practice; what
they do not settle stays `unassigned` with the reason, and the brief overrules everything.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

from reactance.analysis import duty_of_nets, duty_of_pins
from reactance.analysis.duty_view import BriefedPath, Found, PathKind, View
from reactance.analysis.report import DutyKind
from reactance.analysis.topology import Branch, Topology

__all__ = ["RULES", "Assigned", "BriefedPath", "PathKind", "duties", "without_brief"]


@dataclass(frozen=True, slots=True)
class Assigned:
    """One capacitor's duty and the reason in words.

    Capacitors that do one job share its `id`: `rail:NET` on one rail, `coupling:NAME` or `filter:NAME` in one path of
    the brief; else it is `duty:REFDES`. `by_brief`: the brief says so, not the design.
    """

    refdes: str
    kind: DutyKind
    because: str
    id: str
    by_brief: bool = False


Rule = Callable[[Branch, View], Found | None]

RULES: tuple[Rule, ...] = (
    duty_of_nets.overruled,
    duty_of_nets.short,
    duty_of_nets.supply,
    duty_of_nets.in_briefed_path,
    duty_of_pins.converter_pins,
    duty_of_pins.feedback,
    duty_of_pins.crystal_load,
    duty_of_pins.compensation,
    duty_of_pins.timing,
    duty_of_nets.snubber,
    duty_of_pins.held_pin,
    duty_of_nets.between_signals,
    duty_of_nets.low_pass,
    duty_of_nets.unsettled,
)
OF_BRIEF: tuple[Rule, ...] = (duty_of_nets.overruled, duty_of_nets.in_briefed_path)


def duties(
    topology: Topology, briefed: Sequence[BriefedPath] = (), overrules: Mapping[str, DutyKind] | None = None
) -> tuple[Assigned, ...]:
    """The duty of each capacitor of `topology`, in the order of its branches.

    `overrules`: duty by refdes, from the brief.
    """
    view = View(topology, tuple(briefed), overrules or {})
    return tuple(_assign(branch, view) for branch in topology.branches if branch.kind == "capacitor")


def without_brief(topology: Topology, assigned: Sequence[Assigned]) -> tuple[DutyKind, ...]:
    """The kinds of `duties(topology)`, made from `duties` under a brief: only what the brief says is undone."""
    view = View(topology, (), {})
    capacitors = [branch for branch in topology.branches if branch.kind == "capacitor"]
    return tuple(
        _assign(capacitor, view).kind if found.by_brief else found.kind
        for capacitor, found in zip(capacitors, assigned, strict=True)
    )


def _assign(capacitor: Branch, view: View) -> Assigned:
    rule, found = next((rule, found) for rule in RULES if (found := rule(capacitor, view)) is not None)
    return Assigned(
        capacitor.refdes, found.kind, found.because, found.id or f"duty:{capacitor.refdes}", rule in OF_BRIEF
    )
