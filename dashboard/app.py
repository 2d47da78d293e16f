"""The dashboard as a web application: which address shows what. It only reads the history."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

import msgspec
from flask import Blueprint, Flask, Response, current_app, render_template, request, send_file
from werkzeug.exceptions import HTTPException

from reactance.analysis.design import InputError
from reactance.analysis.quantity import QuantityError, parse_quantity
from reactance.analysis.report import Curve
from reactance.daemon.history import BoardRow, History, HistoryError, RevisionRow
from reactance.dashboard import pages, plots
from reactance.dashboard.archive import Analyse, Archive
from reactance.dashboard.capacitors import capacitor_rows
from reactance.dashboard.check_page import check_page
from reactance.dashboard.events import RETRY_MS, Streams, state
from reactance.dashboard.groups import page_of_group
from reactance.dashboard.guard import protect
from reactance.dashboard.rows import numbered
from reactance.dashboard.shown import Shown, shown
from reactance.dashboard.strip import svg

if TYPE_CHECKING:
    from reactance.analysis.study import Study

PART = "X-Page-Part"  # a page that updates itself asks for its main part only
_IN_GROUP = 40

views = Blueprint("views", __name__)


def create_app(history: History, *, hosts: tuple[str, ...], analyse: Analyse | None = None) -> Flask:
    """The application over `history`, answering only to `hosts` (values of the Host header, with port).

    `analyse` analyses a stored revision again for its curves; the program's own unless another is given.
    """
    here = str(Path(__file__).parent)  # stated, because Flask looks for packages where their names say
    app = Flask("reactance.dashboard", root_path=here, instance_path=here)
    app.jinja_env.trim_blocks = app.jinja_env.lstrip_blocks = True
    app.jinja_env.filters["strip"] = svg
    app.extensions["reactance.archive"] = Archive(history, analyse)
    app.extensions["reactance.streams"] = Streams(history)
    app.extensions["reactance.script"] = plots.PlotScript()
    app.register_blueprint(views)
    app.register_error_handler(HistoryError, _unreadable)
    app.register_error_handler(HTTPException, _refused)
    protect(app, hosts)
    return app


def _archive() -> Archive:
    found = current_app.extensions["reactance.archive"]
    assert isinstance(found, Archive)
    return found


def _script() -> plots.PlotScript:
    found = current_app.extensions["reactance.script"]
    assert isinstance(found, plots.PlotScript)
    return found


def _streams() -> Streams:
    found = current_app.extensions["reactance.streams"]
    assert isinstance(found, Streams)
    return found


@views.get("/")
def boards() -> Response:
    """All boards."""
    history = _archive().history
    seen = state(history, None)
    return _page("boards.html", "/events", seen, lines=pages.board_lines(history))


@views.get("/board/<int:board>")
def board(board: int) -> Response:
    """One board: what the last save changed and did, what fails, every check, every capacitor."""
    seen = _state(board)
    found = shown(_archive(), board)
    if not isinstance(found, Shown):
        return _nothing(found, seen)
    return _page("board.html", _events(board), seen, page=pages.board_page(found))


@views.get("/board/<int:board>/checks/<scope>")
def checks(board: int, scope: str) -> Response:
    """All checks of one kind, in pages."""
    seen = _state(board)
    found = shown(_archive(), board)
    if not isinstance(found, Shown):
        return _nothing(found, seen)
    start = max(0, request.args.get("from", 0, type=int))
    group = page_of_group(found, "" if scope == "other" else scope, start, _IN_GROUP)
    if group is None:
        return _missing("This board has no such checks.")
    return _page("checks.html", _events(board), seen, head=pages.head(found), group=group, start=start, size=_IN_GROUP)


@views.get("/board/<int:board>/capacitors")
def capacitors(board: int) -> Response:
    """What each capacitor does, all of them."""
    seen = _state(board)
    found = shown(_archive(), board)
    if not isinstance(found, Shown):
        return _nothing(found, seen)
    rows = capacitor_rows(board, found.report)
    return _page("capacitors.html", _events(board), seen, head=pages.head(found), rows=rows)


@views.get("/board/<int:board>/saves")
def saves(board: int) -> Response:
    """All saves of one board."""
    history, seen = _archive().history, _state(board)
    row = history.board(board)
    if row is None:
        return _missing("There is no such board.")
    found = pages.save_list(_archive(), history.revisions(board))
    return _page("saves.html", _events(board), seen, board=row, saves=found)


@views.get("/board/<int:board>/revision/<int:revision>")
def revision(board: int, revision: int) -> Response:
    """What one save changed and did."""
    history, seen = _archive().history, _state(board)
    row, place = history.board(board), history.revision(revision)
    if row is None or place is None or place.board != board:
        return _missing("There is no such save of this board.")
    listed = next(save for save in pages.save_list(_archive(), history.revisions(board)) if save.revision == revision)
    found = shown(_archive(), board, revision, alone=True)
    if not isinstance(found, Shown):
        return _page("unusable.html", _events(board), seen, board=row, save=listed)
    change = pages.change(found, found.strips(), most=len(found.comparison.movements) if found.comparison else 0)
    return _page("revision.html", _events(board), seen, head=pages.head(found), change=change, save=listed)


@views.get("/board/<int:board>/check")
def check(board: int) -> Response:
    """One check: what changed, its curves, where its number comes from."""
    seen = _state(board)
    found = shown(_archive(), board, request.args.get("at", type=int))
    if not isinstance(found, Shown):
        return _nothing(found, seen)
    page = check_page(found, request.args.get("id", ""))
    if page is None:
        return _missing("This board has no such check.")
    return _page("check.html", _events(board), seen, page=page, script="curve.js", style_ids=_script().style_ids)


@views.get("/board/<int:board>/curve")
def curve(board: int) -> Response:
    """The curves of a check before and after, as arrays."""
    found = shown(_archive(), board, request.args.get("at", type=int))
    if not isinstance(found, Shown):
        return _missing("There is no such save of this board.")
    sides, notes = _two_sides(found, lambda study: study.curve(request.args.get("id", "")))
    if not any(sides) and not notes:
        notes.append("This check has no curve: its figure does not come from one over frequency or time.")
    return _json(plots.plot(sides[0], sides[1], " ".join(notes)))


@views.get("/board/<int:board>/sine")
def sine(board: int) -> Response:
    """In and out over time for a sine of the asked frequency."""
    found = shown(_archive(), board, request.args.get("at", type=int))
    if not isinstance(found, Shown):
        return _missing("There is no such save of this board.")
    try:
        frequency = parse_quantity(request.args.get("f", ""), "Hz")
    except QuantityError as error:
        return _json(plots.plot(None, None, str(error)))
    if not 0 < frequency < 1e12:
        return _json(plots.plot(None, None, "The frequency has to be above 0 Hz and below 1 THz."))
    sides, notes = _two_sides(found, lambda study: study.sine(request.args.get("id", ""), frequency))
    if sides[1] is None:
        notes.append("There is no signal path behind this check to send a sine through.")
        return _json(plots.plot(None, None, " ".join(notes)))
    return _json(plots.sine_plot(sides[0], sides[1]))


def _two_sides(
    found: Shown, curve: Callable[[Study], Curve | None]
) -> tuple[tuple[tuple[str, Curve] | None, tuple[str, Curve] | None], list[str]]:
    """A curve of the baseline and of the shown revision, each under its name, and what hindered."""
    numbers = numbered(found.revisions)
    notes: list[str] = []

    def side(row: RevisionRow | None) -> tuple[str, Curve] | None:
        if row is None:
            return None
        name = f"save {numbers[row.id]}"
        try:
            made = curve(found.archive.study(row))
        except (InputError, HistoryError) as error:
            notes.append(f"{name} cannot be analysed again by this version: {error}")
            return None
        return (name, made) if made is not None else None

    return (side(found.baseline), side(found.revision)), notes


@views.get("/events")
def events() -> Response:
    """The stream of changes of one board, or of all."""
    board = request.args.get("board", type=int)
    seen = request.headers.get("Last-Event-ID") or request.args.get("seen", "")
    stream = _streams().stream(board, seen)
    if stream is None:
        answer = Response("All places are taken; ask for the page again now and then.\n", 503, mimetype="text/plain")
        answer.headers["Retry-After"] = str(RETRY_MS // 1000 * 5)
        return answer
    answer = Response(stream, mimetype="text/event-stream")
    answer.call_on_close(stream.close)
    return answer


@views.get("/plotly.js")
def plotly_script() -> Response:
    """The plotting script that comes inside the plotly package."""
    answer = send_file(_script().path, mimetype="text/javascript", max_age=86400, conditional=True)
    answer.headers["Cache-Control"] = "private, max-age=86400"
    return answer


def _state(board: int) -> str:
    return state(_archive().history, board)


def _events(board: int) -> str:
    return f"/events?board={board}"


def _page(template: str, events: str, seen: str, status: int = 200, **values: object) -> Response:
    layout = "part.html" if request.headers.get(PART) == "main" else "layout.html"
    text = render_template(template, layout=layout, events=events, seen=seen, **values)
    answer = Response(text, status, mimetype="text/html")
    answer.headers["Vary"] = PART
    return answer


def _nothing(found: BoardRow | None, seen: str) -> Response:
    if found is None:
        return _missing("There is no such board.")
    listed = pages.save_list(_archive(), _archive().history.revisions(found.id))
    return _page("unjudged.html", _events(found.id), seen, board=found, saves=listed)


def _missing(message: str) -> Response:
    return _page("message.html", "", "", 404, title="Not here", message=message)


def _unreadable(error: HistoryError) -> Response:
    return _page("message.html", "", "", 500, title="The history cannot be read", message=str(error))


def _refused(error: HTTPException) -> Response:
    return _page("message.html", "", "", error.code or 500, title=error.name, message=error.description or "")


def _json(value: msgspec.Struct) -> Response:
    return Response(msgspec.json.encode(value), mimetype="application/json")
