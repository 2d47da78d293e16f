"""The tables of the history and the way from each version of them to the next.

A step is never edited once released: a new version is a new step at the end of `STEPS`. Each runs inside the
one transaction that also raises the version, so that a kill leaves the old version or the new one.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from typing import TYPE_CHECKING

from reactance.daemon.rows import HistoryError

if TYPE_CHECKING:
    from sqlite_utils import Database

# Marks the file as ours ("reac" in ASCII), so that another program's database is never taken for a history.
APPLICATION_ID = 0x72656163


def _first(db: Database) -> None:
    """Boards, revisions with all they were read from, figures per check, and what is kept between runs."""
    db.table("blob").create({"id": int, "sha256": str, "data": bytes}, pk="id", not_null=("sha256", "data"))
    db.table("blob").create_index(["sha256"], unique=True)
    db.table("board").create(
        {"id": int, "name": str, "file": str, "gone": int, "pinned": int},
        pk="id",
        not_null=("name", "file", "gone"),
        defaults={"gone": 0},
    )
    db.table("board").create_index(["file"], unique=True)
    db.table("revision").create(
        {
            "id": int,
            "board": int,
            "sha256": str,
            "saved": float,
            "read": float,
            "author": str,
            "parts": int,
            "status": str,
            "worse": int,
            "error": str,
            "baseline": int,
            "report": bytes,
            "comparison": bytes,
        },
        pk="id",
        not_null=("board", "sha256", "saved", "read", "parts", "status", "worse"),
        foreign_keys=[("board", "board", "id")],
    )
    db.table("revision").create_index(["board", "id"])
    db.table("content").create(
        {"id": int, "revision": int, "role": str, "name": str, "blob": int},
        pk="id",
        not_null=("revision", "role", "name"),
        foreign_keys=[("revision", "revision", "id"), ("blob", "blob", "id")],
    )
    db.table("content").create_index(["revision"])
    db.table("measured").create(
        {"id": int, "board": int, "check_id": str},
        pk="id",
        not_null=("board", "check_id"),
        foreign_keys=[("board", "board", "id")],
    )
    db.table("measured").create_index(["board", "check_id"], unique=True)
    # One row per check and revision is the bulk of the rows: WITHOUT ROWID keeps a revision's together, once.
    db.execute(
        "CREATE TABLE figure (revision INTEGER NOT NULL REFERENCES revision(id), "
        "measured INTEGER NOT NULL REFERENCES measured(id), nominal REAL, low REAL, high REAL, margin REAL, "
        "status TEXT NOT NULL, verdict TEXT, PRIMARY KEY (revision, measured)) WITHOUT ROWID"
    )
    db.table("solved").create(
        {"id": int, "board": int, "data": bytes},
        pk="id",
        not_null=("board", "data"),
        foreign_keys=[("board", "board", "id")],
    )
    db.table("solved").create_index(["board"])
    db.table("state").create({"id": int, "version": int}, pk="id", not_null=("version",))
    db.table("state").insert({"id": 1, "version": 0})


STEPS: tuple[Callable[[Database], None], ...] = (_first,)


def migrate(connection: sqlite3.Connection, file: str) -> None:
    """Brings the tables to the newest version; refuses a newer one and a file that is no history.

    Needs a connection in autocommit mode (`isolation_level=None`).
    """
    if _version(connection, file) == len(STEPS):
        return
    from sqlite_utils import Database  # slow to import, and needed only when the tables change

    connection.execute("BEGIN IMMEDIATE")
    try:
        version = _version(connection, file)  # another process may have been quicker
        db = Database(connection, execute_plugins=False)
        for step in STEPS[version:]:
            step(db)
        connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version = {len(STEPS)}")
    except BaseException:
        connection.execute("ROLLBACK")
        raise
    connection.execute("COMMIT")


def _version(connection: sqlite3.Connection, file: str) -> int:
    application = int(connection.execute("PRAGMA application_id").fetchone()[0])
    version = int(connection.execute("PRAGMA user_version").fetchone()[0])
    empty = connection.execute("SELECT count(*) FROM sqlite_master").fetchone()[0] == 0
    if application != APPLICATION_ID and not (empty and version == 0):
        raise HistoryError(
            f"{file}: this is another program's database, not a history "
            "(name another file with --history or REACTANCE_HISTORY)"
        )
    if version > len(STEPS):
        raise HistoryError(
            f"{file}: the history was written by a newer version of reactance (its tables are version "
            f"{version}, this program knows up to {len(STEPS)}); nothing was touched "
            "(update reactance, or name another file with --history)"
        )
    return version
