"""`reactance history`, `compare` and `baseline`: what the history holds."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from reactance.daemon.cli_common import (
    Refusal,
    board_named,
    existing_history,
    history_option,
    revision_named,
)
from reactance.daemon.rows import BoardRow, RevisionRow
from reactance.daemon.tables import Column, Row, Tone, show
from reactance.daemon.text import clean, moment

if TYPE_CHECKING:
    from reactance.daemon.history import History

_BOARDS = (
    Column("board"),
    Column("revisions", right=True),
    Column("last saved"),
    Column("failing", right=True),
    Column("file"),
)
_REVISIONS = (
    Column("id", right=True),
    Column("saved"),
    Column("author"),
    Column("parts", right=True),
    Column("pass", right=True),
    Column("marginal", right=True),
    Column("fail", right=True),
    Column("worse", right=True),
    Column("remark"),
)


@click.command()
@click.argument("export", type=click.Path(path_type=Path), required=False)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object (reactance.history/1).")
@history_option
def history(export: Path | None, as_json: bool, history_file: str | None) -> None:
    """List the boards that the history knows, or the revisions of EXPORT.

    \b
    Examples:
      $ reactance history
      $ reactance history board.edn
      $ reactance history board.edn --json
    """
    with existing_history(history_file) as found:
        boards = found.boards() if export is None else (board_named(found, export),)
        if as_json:
            _print_json({"format": "reactance.history/1", "boards": [_board(found, board) for board in boards]})
        elif export is None:
            if not boards:
                click.echo("no boards yet")
            show(_BOARDS, [_board_row(found, board) for board in boards])
        else:
            rows = found.revisions(boards[0].id)
            show(_REVISIONS, [_revision_row(row, boards[0]) for row in rows])


@click.command()
@click.argument("export", type=click.Path(path_type=Path))
@click.argument("older", metavar="A")
@click.argument("newer", metavar="B")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON object (reactance.compare/1).")
@history_option
def compare(export: Path, older: str, newer: str, as_json: bool, history_file: str | None) -> None:
    """What changed between two revisions of EXPORT and what it did.

    A and B are ids, or previous, latest, baseline.

    \b
    Examples:
      $ reactance compare board.edn previous latest
      $ reactance compare board.edn baseline latest --json
    """
    with existing_history(history_file) as found:
        board = board_named(found, export)
        before, after = (revision_named(found, board, name) for name in (older, newer))
        comparison = found.compare(before.id, after.id)
        reports = found.report(before.id), found.report(after.id)
    if as_json:
        import msgspec

        document = {"format": "reactance.compare/1", "older": _revision(before), "newer": _revision(after)}
        _print_json({**document, **msgspec.to_builtins(comparison)})
        return
    from reactance.daemon.print_check import print_comparison

    click.echo(clean(f"{board.name}: {_named(before)} → {_named(after)}"))
    if reports[0] is not None and reports[1] is not None:
        print_comparison(comparison, reports[0], reports[1])


@click.command()
@click.argument("export", type=click.Path(path_type=Path))
@click.argument("revision", metavar="ID", required=False)
@click.option("--previous", is_flag=True, help="Unpin: compare every revision with the one before it.")
@history_option
def baseline(export: Path, revision: str | None, previous: bool, history_file: str | None) -> None:
    """Pin the revision ID of EXPORT as what newer ones are compared against.

    \b
    Examples:
      $ reactance baseline board.edn latest
      $ reactance baseline board.edn --previous
    """
    if (revision is None) == (not previous):
        raise Refusal("name the revision to pin, or give --previous to unpin (one of the two)")
    with existing_history(history_file) as found:
        board = board_named(found, export)
        if revision is None or previous:
            found.pin(board.id, None)
            click.echo(clean(f"{board.name}: every revision is compared with the one before it"))
            return
        pinned = revision_named(found, board, revision)
        found.pin(board.id, pinned.id)
    click.echo(clean(f"{board.name}: newer revisions are compared with {_named(pinned)}"))


def _named(revision: RevisionRow) -> str:
    return f"revision {revision.id} (saved {moment(revision.saved)})"


def _print_json(document: dict[str, Any]) -> None:
    import msgspec

    click.echo(msgspec.json.format(msgspec.json.encode(document), indent=2).decode())


def _board(found: History, board: BoardRow) -> dict[str, Any]:
    return {
        "name": board.name,
        "file": board.file,
        "gone": board.gone,
        "baseline": board.pinned,
        "revisions": [_revision(revision) for revision in found.revisions(board.id)],
    }


def _revision(revision: RevisionRow) -> dict[str, Any]:
    return {
        "id": revision.id,
        "sha256": revision.sha256,
        "saved": revision.saved,
        "read": revision.read,
        "author": revision.author,
        "parts": revision.parts,
        "status": dict(revision.status),
        "worse": revision.worse,
        "error": revision.error,
    }


def _board_row(found: History, board: BoardRow) -> Row:
    revisions = found.revisions(board.id)
    good = [revision for revision in revisions if revision.error is None]
    failing = str(good[-1].status.get("fail", 0)) if good else ""
    saved = moment(revisions[-1].saved) if revisions else ""
    file = f"{board.file} (gone)" if board.gone else board.file
    return Row((board.name, str(len(revisions)), saved, failing, file), "quiet" if board.gone else "")


def _revision_row(revision: RevisionRow, board: BoardRow) -> Row:
    remark = revision.error or ("baseline" if revision.id == board.pinned else "")
    counts = ["" if revision.error else str(revision.status.get(name, 0)) for name in ("pass", "marginal", "fail")]
    cells = (
        str(revision.id),
        moment(revision.saved),
        revision.author or "",
        "" if revision.error else str(revision.parts),
        *counts,
        "" if revision.error else str(revision.worse),
        remark,
    )
    tone: Tone = "quiet" if revision.error else "bad" if revision.status.get("fail") else ""
    return Row(cells, tone)
