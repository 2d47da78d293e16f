"""A small history made by hand, for pages: its figures are invented and mean nothing."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from reactance.analysis.design import InputError, Place
from reactance.analysis.exports import ExportFiles
from reactance.analysis.files import BoardFiles
from reactance.analysis.report import (
    FORMAT_CHECK,
    AssumptionEntry,
    CapacitorEntry,
    Check,
    Comparison,
    Curve,
    DesignSummary,
    Duty,
    Edit,
    Effective,
    Figure,
    Limit,
    LimitLine,
    Movement,
    Origin,
    PartLine,
    ProblemEntry,
    Report,
    Verdict,
)
from reactance.daemon.history import History, Saved

FILE = "/home/ana/greenhouse/greenhouse-logger.edn"
HOST = "localhost"  # what the test client says
NOON = 1_780_000_000.0


def make_check(
    id: str, nominal: float | None, unit: str = "V", limit: Limit | None = None, spread: float = 0.1
) -> Check:
    """A check judged by the plain rule, its band `spread` to both sides."""
    measure = id.rpartition(":")[2].partition("@")[0]
    if nominal is None:
        return Check(id, measure, None, None, None, unit, limit, None, "unknown", "no figure")
    low, high = sorted((nominal * (1 - spread), nominal * (1 + spread)))
    if limit is None:
        return Check(id, measure, nominal, low, high, unit, None, None, "watched", "")
    if limit.max is not None:
        margin, held = (limit.max - high) / (abs(limit.max) or 1), nominal <= limit.max
    else:
        assert limit.min is not None
        margin, held = (low - limit.min) / (abs(limit.min) or 1), nominal >= limit.min
    status = "fail" if not held else ("marginal" if margin < 0 else "pass")
    return Check(id, measure, nominal, low, high, unit, limit, margin, status, "spread mostly by C14 71%, C9 12%")


def make_report(checks: tuple[Check, ...], problems: tuple[ProblemEntry, ...] = (), name: str = "greenhouse") -> Report:
    """A report of these checks with two capacitors."""
    return Report(
        format=FORMAT_CHECK,
        design=DesignSummary(name, "greenhouse-logger.edn", "0" * 64, 64, 40),
        nets=(),
        parts=(),
        capacitors=(
            CapacitorEntry(
                "C14", ("+3V3", "GND"), 1e-7, "ceramic", "X7R", 6.3, 3.3, "decoupling",
                Effective(7.1e-8, 5.2e-8, 8.9e-8), 0.02, 5e-10,
            ),
            CapacitorEntry(
                "C9", ("MIC_OUT", "AMP_IN"), 1e-6, "film", None, None, None, "coupling", None, None, None
            ),
        ),
        duties=(
            Duty("decoupling:C14", "decoupling", ("C14",), ("+3V3", "GND"), "between +3V3 and ground at U4"),
            Duty("coupling:C9", "coupling", ("C9",), ("MIC_OUT", "AMP_IN"), "between two bias points"),
        ),
        checks=checks,
        assumptions=(),
        problems=problems,
    )  # fmt: skip


def make_files(number: int) -> BoardFiles:
    """Distinct contents for each save."""
    return BoardFiles(ExportFiles(f"(edif {number})".encode(), "greenhouse-logger.edn"), None, "greenhouse.brief.toml")


@dataclass(frozen=True)
class MadeStudy:
    """Stands in for an analysis: curves and origins made by hand from the number in the export."""

    number: float

    def curve(self, check_id: str) -> Curve | None:
        if check_id.startswith("net:"):
            return None
        x = tuple(1000.0 * 10 ** (step / 20) for step in range(100))
        y = tuple(0.05 * self.number + 0.2 / (1 + (f / 1e5) ** 2) + 1e-9 * f for f in x)
        return Curve(
            check_id, "impedance of +3V3", "frequency", "Hz", "impedance", "Ω", x, y,
            tuple(0.8 * v for v in y), tuple(1.2 * v for v in y),
            (LimitLine("target", (x[0], x[-1]), (0.6, 0.6), "above"),), True, True,
        )  # fmt: skip

    def sine(self, check_id: str, frequency: float) -> Curve | None:
        x = tuple(step / 100 / frequency for step in range(300))
        return Curve(check_id, f"ratio 0.5 at {frequency:g} Hz", "time", "s", "voltage", "V", x, x, low=x, log_x=False)

    def origin(self, check_id: str) -> Origin:
        parts = (
            PartLine(
                "C14", "capacitor", "100nF", ("+3V3", "GND"),
                (("C_eff", f"{70 + self.number:g} nF"), ("R_s", "20 mΩ"), ("L_s", "0.5 nH")),
                ("bias 3.3 V keeps 71 %",),
            ),
        )  # fmt: skip
        return Origin(
            check_id, ("Modified nodal analysis.",), parts, (AssumptionEntry("C14", "esl", "0.5 nH", "size 0402"),)
        )


def make_study(files: BoardFiles) -> MadeStudy:
    """The stand-in for `analyse`."""
    text = files.export.main.decode()
    if "refused" in text:
        raise InputError("not readable any more", Place("greenhouse-logger.edn", 1, 1), "save it again")
    return MadeStudy(float(text.removeprefix("(edif ").removesuffix(")")))


@dataclass
class Keeper:
    """Writes saves into a history, each compared with the one before."""

    history: History
    file: str = FILE
    number: int = 0
    before: tuple[int, Report] | None = None
    seen: list[int] = field(default_factory=list)

    def save(
        self,
        figures: Mapping[str, Check],
        edits: tuple[Edit, ...] = (),
        verdicts: Mapping[str, Verdict] | None = None,
        problems: tuple[ProblemEntry, ...] = (),
        name: str = "greenhouse",
    ) -> int:
        """Stores the next save and returns its id."""
        self.number += 1
        report = make_report(tuple(figures.values()), problems, name)
        comparison = None
        if self.before is not None:
            older = {check.id: check for check in self.before[1].checks}
            moves = tuple(_movement(check, verdict, older, figures) for check, verdict in (verdicts or {}).items())
            comparison = Comparison(edits, moves)
        when = NOON + 3600.0 * self.number
        row = self.history.store(
            Saved(self.file, when, when + 0.2, "Ana"),
            make_files(self.number),
            report,
            comparison,
            self.before[0] if self.before else None,
        )
        assert row is not None
        self.before = (row.id, report)
        self.seen.append(row.id)
        return row.id

    def fail(self, message: str) -> int:
        """Stores a save that could not be read."""
        self.number += 1
        when = NOON + 3600.0 * self.number
        row = self.history.store_error(Saved(self.file, when, when + 0.2, None), make_files(self.number), message)
        assert row is not None
        return row.id


def _movement(id: str, verdict: Verdict, older: Mapping[str, Check], newer: Mapping[str, Check]) -> Movement:
    def figure(check: Check | None) -> Figure:
        return Figure(check.nominal, check.status, check.margin) if check else Figure(None, None, None)

    return Movement(id, verdict, figure(older.get(id)), figure(newer.get(id)))


DROOP = "rail:+3V3:droop"
LOSS = "coupling:MIC_OUT>AMP_IN:loss"
DRIFT = "rail:+3V3:capacitance"
SWAP = Edit("C14.VALUE", "attribute changed", "C14", "VALUE", "100 nF", "10 nF")


def figures(droop: float, capacitance: float = 1e-5, loss: float = 0.3) -> dict[str, Check]:
    """Six checks of several kinds."""
    checks = (
        make_check(DROOP, droop, "V", Limit(max=0.165)),
        make_check(DRIFT, capacitance, "F"),
        make_check(LOSS, loss, "dB", Limit(max=0.5)),
        make_check("filter:PROBE>ADC:attenuation@100kHz", 41.0, "dB", Limit(min=35.0), 0.05),
        make_check("part:C14:stress", 0.52, "1", Limit(max=0.8), 0.02),
        make_check("net:AMP_IN:return", 1.0, "1", Limit(min=1.0), 0.0),
    )
    return {check.id: check for check in checks}
