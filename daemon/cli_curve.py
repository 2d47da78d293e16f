"""`reactance curve`: the curve behind a check, for other programs to draw."""

from __future__ import annotations

import csv
import sys
from collections.abc import Sequence
from difflib import get_close_matches
from pathlib import Path
from typing import TYPE_CHECKING

import click

from reactance.daemon.cli_common import Refusal, read_files, refusing
from reactance.daemon.text import clean

if TYPE_CHECKING:
    from reactance.analysis.report import Curve
    from reactance.analysis.study import Study


@click.command()
@click.argument("export", type=click.Path(path_type=Path))
@click.argument("check_id", metavar="CHECK")
@click.option("--brief", type=click.Path(path_type=Path), metavar="FILE", help="Another brief than the one beside it.")
@click.option("--sine", metavar="F", help='In and out over time for a sine of this frequency, such as "1.6 kHz".')
def curve(export: Path, check_id: str, brief: Path | None, sine: str | None) -> None:
    """The curve behind CHECK of EXPORT, as CSV: x, nominal, and the band's low and high where it was computed.

    x is in Hz or s, all values are in SI units. With --sine: x, in and out, for an input of 1 V.

    \b
    Examples:
      $ reactance curve board.edn "rail:+3V3:impedance"
      $ reactance curve board.edn "filter:anti-alias:gain" --sine "500 Hz"
    """
    with refusing():
        from reactance.analysis.study import analyse
        from reactance.daemon.engine import limit_threads

        limit_threads()
        study = analyse(read_files(export, brief))
        _known(study, check_id)
        if sine is None:
            found = study.curve(check_id)
            missing = "has no curve"
        else:
            found = study.sine(check_id, _frequency(sine))
            missing = "has no sine (checks of couplings and filters have)"
    if found is None:
        raise Refusal(f"{check_id} {missing}")
    (_print if sine is None else _print_sine)(found)


def _known(study: Study, check_id: str) -> None:
    known = [check.id for check in study.report.checks]
    if check_id not in known:
        close = get_close_matches(check_id, known, 3, 0.5)
        hint = f"did you mean {' or '.join(close)}?" if close else "`reactance check` lists those there are"
        raise Refusal(f"{study.report.design.file} has no check {check_id} ({hint})")


def _frequency(text: str) -> float:
    from reactance.analysis.quantity import QuantityError, parse_quantity

    try:
        frequency = parse_quantity(text, "Hz")
    except QuantityError as error:
        raise Refusal(f"--sine: {error}") from None
    if frequency <= 0:
        raise Refusal("--sine: a frequency above 0 Hz is wanted")
    return frequency


def _print(found: Curve) -> None:
    empty = ("",) * len(found.x)
    _write(("x", "nominal", "low", "high"), (found.x, found.nominal, found.low or empty, found.high or empty))


def _print_sine(found: Curve) -> None:
    click.echo(clean(found.title), err=True)  # ratio and lag, beside the CSV and not in it
    _write(("x", "in", "out"), (found.x, found.low, found.nominal))


def _write(heading: Sequence[str], columns: Sequence[Sequence[object]]) -> None:
    writer = csv.writer(sys.stdout, lineterminator="\n")
    writer.writerow(heading)
    writer.writerows(zip(*columns, strict=True))
