"""`reactance check`: one export, analysed once."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from reactance.daemon.cli_common import (
    WORDS,
    Refusal,
    board_named,
    existing_history,
    history_option,
    progress_bar,
    read_files,
    refusing,
    revision_named,
)

if TYPE_CHECKING:
    from reactance.analysis.report import Comparison, Report
    from reactance.analysis.study import Study
    from reactance.daemon.engine import Side


@click.command()
@click.argument("export", type=click.Path(path_type=Path))
@click.option("--brief", type=click.Path(path_type=Path), metavar="FILE", help="Another brief than the one beside it.")
@click.option("--against", metavar="ID|FILE", help="A revision of the history, or another export, to compare with.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object (reactance.check/1).")
@click.option("--curves", is_flag=True, help="Add the curves to the JSON.")
@click.option("--sarif", "sarif_file", type=click.Path(path_type=Path), metavar="FILE", help="Write SARIF 2.1.0 too.")
@click.option("--samples", type=click.IntRange(1, 1_000_000), metavar="N", help="Add the yield of N random boards.")
@history_option
def check(
    export: Path,
    *,
    brief: Path | None,
    against: str | None,
    as_json: bool,
    curves: bool,
    sarif_file: Path | None,
    samples: int | None,
    history_file: str | None,
) -> None:
    """Analyse EXPORT once and print the result.

    Exit status: 0 if all judged checks pass or are marginal, and with --against none is worse; 1 if some check
    fails, or with --against one is worse; 2 for wrong usage or an input that cannot be read.

    \b
    Examples:
      $ reactance check board.edn
      $ reactance check board.edn --json
      $ reactance check board.edn --against previous
      $ reactance check board.edn --sarif board.sarif
      $ reactance check board.edn --samples 1000
    """
    with refusing():
        from reactance.analysis.study import analyse
        from reactance.daemon.engine import limit_threads

        limit_threads()
        with progress_bar("random boards", shown=samples is not None) as progress:
            study = analyse(read_files(export, brief), samples=samples or 0, progress=progress)
        comparison, older = None, None
        if against is not None:
            older_side = _side(export, against, history_file)
            comparison, older = _compare(older_side, study, export, brief), older_side[1]
        if sarif_file is not None:
            _write_sarif(sarif_file, study)
    if as_json or curves:
        click.echo(_json(study, comparison, curves))
    else:
        from reactance.daemon.print_check import print_check

        print_check(study.report, comparison, older)
    click.get_current_context().exit(_status(study.report, comparison))


def _status(report: Report, comparison: Comparison | None) -> int:
    failing = any(found.status == "fail" for found in report.checks)
    worse = comparison is not None and any(move.verdict == "worse" for move in comparison.movements)
    return 1 if failing or worse else 0


def _side(export: Path, against: str, history_file: str | None) -> Side:
    """The older side: a revision if `against` names one, else another export (with its own brief, if it has one)."""
    from reactance.analysis.exports import read_export

    is_file = Path(against).exists()
    if not is_file and (against in WORDS or against.isdecimal()):
        with existing_history(history_file) as history:
            revision = revision_named(history, board_named(history, export), against)
            report = history.report(revision.id)
            if report is None:
                raise Refusal(f"revision {revision.id} could not be analysed: {revision.error}")
            files = history.files(revision.id)
        return read_export(files.export), report, files.brief
    from reactance.analysis.study import analyse

    files = read_files(Path(against))
    study = analyse(files)
    return study.design, study.report, files.brief


def _compare(older: Side, study: Study, export: Path, brief: Path | None) -> Comparison:
    from reactance.analysis.difference import compare

    return compare(older, (study.design, study.report, read_files(export, brief).brief))


def _write_sarif(file: Path, study: Study) -> None:
    from importlib.metadata import version

    from reactance.daemon.sarif import sarif

    try:
        file.write_bytes(sarif(study.report, study.design, version("reactance")))
    except OSError as error:
        raise Refusal(f"{file}: cannot be written: {error.strerror} (name another file after --sarif)") from None


def _json(study: Study, comparison: Comparison | None, curves: bool) -> str:
    import msgspec

    document: dict[str, Any] = msgspec.to_builtins(study.report)
    if comparison is not None:
        document |= msgspec.to_builtins(comparison)
    if curves:
        found = {check.id: study.curve(check.id) for check in study.report.checks}
        document["curves"] = {check_id: curve for check_id, curve in found.items() if curve is not None}
    return msgspec.json.format(msgspec.json.encode(document), indent=2).decode()
