"""A report for people: what fails first, then the rest, then what was assumed and what was odd."""

from __future__ import annotations

from collections import Counter

import click

from reactance.analysis.report import Check, Comparison, Report, Status
from reactance.daemon.sentences import edit_sentence, movement_sentences
from reactance.daemon.tables import Column, Row, Tone, show
from reactance.daemon.text import band, bounds, clean, figure, plural, share

_ORDER: dict[Status, int] = {"fail": 0, "marginal": 1, "unknown": 2, "pass": 3, "watched": 4}
_TONES: dict[Status, Tone] = {"fail": "bad", "marginal": "near", "pass": "good", "watched": "quiet", "unknown": "quiet"}
_COLUMNS = (
    Column("status"),
    Column("check"),
    Column("nominal", right=True),
    Column("band"),
    Column("limit"),
    Column("margin", right=True),
    Column("remark"),
)


def print_check(report: Report, comparison: Comparison | None, older: Report | None) -> None:
    """Prints a report, and with a comparison what was edited and what that moved."""
    design = report.design
    click.echo(clean(f"{design.name}: {plural(design.parts, 'part')}, {plural(design.nets, 'net')} ({design.file})"))
    click.echo()
    show(_COLUMNS, [_row(check) for check in sorted(report.checks, key=_rank)])
    if comparison is not None and older is not None:
        print_comparison(comparison, older, report)
    _print_problems(report)
    click.echo()
    click.echo(_summary(report))


def print_comparison(comparison: Comparison, older: Report, newer: Report) -> None:
    """Prints what was edited and, in a sentence each, what that moved."""
    click.echo()
    click.echo("edits:" if comparison.edits else "edits: none")
    for edit in comparison.edits:
        click.echo(f"  {clean(edit_sentence(edit))}")
    click.echo("movements:" if comparison.movements else "movements: none")
    for verdict, words in movement_sentences(comparison, older, newer):
        click.echo(f"  {verdict}: {clean(words)}")


def _rank(check: Check) -> tuple[int, float]:
    return _ORDER[check.status], check.margin if check.margin is not None else float("inf")


def _row(check: Check) -> Row:
    remark = check.explain if check.status in ("fail", "marginal", "unknown") else ""
    if check.yield_ is not None:
        found = check.yield_
        words = f"yield {found.share:.2%} ({found.low:.2%} to {found.high:.2%} of {found.samples})"
        remark = f"{words}; {remark}" if remark else words
    cells = (
        check.status,
        check.id,
        figure(check.nominal, check.unit),
        band(check),
        bounds(check.limit, check.unit),
        share(check.margin, check),
        remark,
    )
    return Row(cells, _TONES[check.status])


def _print_problems(report: Report) -> None:
    if report.problems:
        click.echo()
    for problem in report.problems:
        where = f"{problem.where}: " if problem.where else ""
        click.echo(clean(f"{problem.severity}: {where}{problem.message}"))


def _summary(report: Report) -> str:
    counts = Counter(check.status for check in report.checks)
    words = ", ".join(f"{counts[status]} {status}" for status in _ORDER if counts[status])
    checks = f"{plural(len(report.checks), 'check')}: {words}" if words else "no checks"
    return f"{checks}; {plural(len(report.assumptions), 'assumption')}"
