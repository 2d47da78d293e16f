"""What one revision amounts to, in the shape in which it is printed, stored and compared.

`Report` encodes to the JSON object of `reactance check --json`; all numbers are in SI base units, `None` stands
for a number that does not exist. `Study` (reactance.analysis.study) makes it; the history keeps it.
"""

from __future__ import annotations

from typing import Literal

import msgspec

from reactance.analysis.design import Severity

Status = Literal["pass", "marginal", "fail", "watched", "unknown"]
Verdict = Literal["worse", "better", "moved"]
DutyKind = Literal["decoupling", "coupling", "filter", "feedback", "timing", "snubber", "load", "unassigned"]
NetKind = Literal["ground", "rail", "signal"]
PartKind = Literal["capacitor", "resistor", "inductor", "bead", "other"]
EditKind = Literal[
    "part added", "part removed", "attribute changed", "pin moved", "part renumbered", "brief changed"
]

FORMAT_CHECK = "reactance.check/1"
FORMAT_COMPARE = "reactance.compare/1"
FORMAT_HISTORY = "reactance.history/1"


class DesignSummary(msgspec.Struct, frozen=True):
    """Which export this is; `parts` and `nets` count them."""

    name: str
    file: str
    sha256: str
    parts: int
    nets: int


class NetEntry(msgspec.Struct, frozen=True):
    """A net and what it is; `volts` where its voltage is known."""

    name: str
    kind: NetKind
    volts: float | None


class PartEntry(msgspec.Struct, frozen=True):
    """A part as understood; `tolerance` as fractions, `text` the value as found."""

    refdes: str
    kind: PartKind
    value: float | None
    tolerance: tuple[float, float] | None
    package: str | None
    fitted: bool
    text: str


class Effective(msgspec.Struct, frozen=True):
    """Effective capacitance in farads with its extremes."""

    nominal: float
    low: float
    high: float


class CapacitorEntry(msgspec.Struct, frozen=True):
    """A capacitor with its duty and what it is really worth; `dc` is the DC voltage across it."""

    refdes: str
    nets: tuple[str, ...]
    value: float | None
    technology: str | None
    dielectric: str | None
    rated_voltage: float | None
    dc: float | None
    duty: DutyKind
    effective: Effective | None
    esr: float | None
    esl: float | None


class Duty(msgspec.Struct, frozen=True):
    """A duty and the reason in words why these parts have it."""

    id: str
    kind: DutyKind
    parts: tuple[str, ...]
    nets: tuple[str, ...]
    because: str


class Limit(msgspec.Struct, frozen=True):
    """The bounds that a check's value has to keep; at least one is given."""

    min: float | None = None
    max: float | None = None


class Yield(msgspec.Struct, frozen=True):
    """The share of Monte Carlo samples within the limit, with its 95 % interval."""

    share: float
    low: float
    high: float
    samples: int


class Check(msgspec.Struct, frozen=True, omit_defaults=True, rename={"yield_": "yield"}):
    """A measure on this board: value, band, limit, margin, status; the yield where samples were asked for."""

    id: str
    measure: str
    nominal: float | None
    low: float | None
    high: float | None
    unit: str
    limit: Limit | None
    margin: float | None
    status: Status
    explain: str
    yield_: Yield | None = None


class AssumptionEntry(msgspec.Struct, frozen=True):
    """A figure that neither export nor brief states, and why it was taken."""

    about: str
    attribute: str
    value: str
    because: str


class ProblemEntry(msgspec.Struct, frozen=True):
    """Something to tell the designer about the export or the brief."""

    severity: Severity
    where: str
    message: str


class Report(msgspec.Struct, frozen=True):
    """One revision, judged."""

    format: str
    design: DesignSummary
    nets: tuple[NetEntry, ...]
    parts: tuple[PartEntry, ...]
    capacitors: tuple[CapacitorEntry, ...]
    duties: tuple[Duty, ...]
    checks: tuple[Check, ...]
    assumptions: tuple[AssumptionEntry, ...]
    problems: tuple[ProblemEntry, ...]


class Edit(msgspec.Struct, frozen=True):
    """One difference between two revisions. `before` and `after` are texts as found, None where absent."""

    id: str
    kind: EditKind
    part: str | None
    attribute: str | None
    before: str | None
    after: str | None


class Figure(msgspec.Struct, frozen=True):
    """A check's figures on one side of a movement."""

    nominal: float | None
    status: Status | None
    margin: float | None


class Cause(msgspec.Struct, frozen=True):
    """The share of a movement that one edit accounts for."""

    edit: str
    share: float


class Movement(msgspec.Struct, frozen=True):
    """A check that differs from the baseline."""

    check: str
    verdict: Verdict
    before: Figure
    after: Figure
    causes: tuple[Cause, ...] = ()


class Comparison(msgspec.Struct, frozen=True):
    """Two revisions side by side: what was edited and what moved."""

    edits: tuple[Edit, ...]
    movements: tuple[Movement, ...]


class Curve(msgspec.Struct, frozen=True):
    """The curve behind a check: `y` over `x`, the band where it was computed, and the limit as a line.

    `x_unit` is "Hz" or "s". `limit` holds (x, y) points in the curve's own units; None where there is none.
    """

    check: str
    title: str
    x_label: str
    x_unit: str
    y_label: str
    y_unit: str
    x: tuple[float, ...]
    nominal: tuple[float, ...]
    low: tuple[float, ...] = ()
    high: tuple[float, ...] = ()
    limits: tuple[LimitLine, ...] = ()
    log_x: bool = True
    log_y: bool = False


class LimitLine(msgspec.Struct, frozen=True):
    """A limit drawn into a curve; everything on the `bad` side of the line fails."""

    name: str
    x: tuple[float, ...]
    y: tuple[float, ...]
    bad: Literal["above", "below"]


class PartLine(msgspec.Struct, frozen=True):
    """One part's electrical figures as a check used them, each a line that says where it came from."""

    refdes: str
    kind: PartKind
    text: str
    nets: tuple[str, ...]
    figures: tuple[tuple[str, str], ...]
    because: tuple[str, ...]


class Origin(msgspec.Struct, frozen=True):
    """Where a check's number comes from: parts, model, assumptions."""

    check: str
    model: tuple[str, ...]
    parts: tuple[PartLine, ...]
    assumptions: tuple[AssumptionEntry, ...]
