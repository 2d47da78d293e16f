"""The history's SQLite file: opening, one connection per thread, one writer at a time, noticing changes."""

from __future__ import annotations

import sqlite3
import threading
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from reactance.daemon.places import network_file_system
from reactance.daemon.rows import HistoryError
from reactance.daemon.schema import migrate

_BUSY_SECONDS = 20.0  # a writer waits this long for another process's write, which takes milliseconds
_MAGIC = b"SQLite format 3\0"  # https://www.sqlite.org/fileformat.html, 1.3.1
_POLL_SECONDS = 0.25  # how often a waiter looks for writes of other processes


class Database:
    """One SQLite file in WAL mode. Every thread that asks gets its own connection in autocommit mode.

    Reads are single statements fetched whole, so none holds a snapshot open; writes go through `writing()`.
    """

    def __init__(self, path: Path, *, create: bool) -> None:
        self.path = path
        self._local = threading.local()
        self._connections: dict[int, tuple[threading.Thread, sqlite3.Connection]] = {}
        self._guard = threading.Lock()
        self._write = threading.Lock()
        self._changed = threading.Condition()
        self._latest = 0
        self._closed = False
        self._prepare(create)

    def _prepare(self, create: bool) -> None:
        if not create and not self.path.is_file():
            raise HistoryError(f"{self.path}: there is no history yet (`reactance watch` makes one)")
        kind = network_file_system(self.path)
        if kind is not None:
            raise HistoryError(
                f"{self.path}: the history cannot live on a network file system ({kind}), because SQLite cannot "
                "lock it there (name a file on a local disk with --history or REACTANCE_HISTORY)"
            )
        try:
            self._refuse_other_files()
            if create:
                self.path.parent.mkdir(parents=True, exist_ok=True)
            connection = self.connection()
            mode = connection.execute("PRAGMA journal_mode = WAL").fetchone()[0]
            migrate(connection, str(self.path))
        except HistoryError:
            self.close()
            raise
        except (sqlite3.Error, OSError) as error:
            self.close()
            raise self._refusal(error) from error
        if mode != "wal":
            self.close()
            raise HistoryError(
                f"{self.path}: this file system does not allow SQLite's write-ahead log "
                "(name a file on a local disk with --history or REACTANCE_HISTORY)"
            )

    def _refuse_other_files(self) -> None:
        """SQLite takes a file of a few bytes for an empty database, and would write over it."""
        half_made = self.path.with_name(f"{self.path.name}-journal").exists()  # killed while it was being made
        if self.path.is_file() and not half_made:
            with self.path.open("rb") as file:
                head = file.read(len(_MAGIC))
            if head and head != _MAGIC:
                raise HistoryError(
                    f"{self.path}: this is no database (name another file with --history or REACTANCE_HISTORY)"
                )

    def _refusal(self, error: BaseException) -> HistoryError:
        return HistoryError(
            f"{self.path}: the history cannot be used: {error} "
            "(check the file, its folder's permissions and the free space, or name another with --history)"
        )

    def connection(self) -> sqlite3.Connection:
        """This thread's connection, opened when first asked for; those of ended threads are closed."""
        mine: sqlite3.Connection | None = getattr(self._local, "connection", None)
        if mine is not None:
            return mine
        if self._closed:
            raise HistoryError(f"{self.path}: the history is closed")
        connection = sqlite3.connect(self.path, timeout=_BUSY_SECONDS, isolation_level=None, check_same_thread=False)
        # NORMAL: a power cut may take the last revisions, never the file's soundness; they are analysed again.
        connection.execute("PRAGMA synchronous = NORMAL")
        connection.execute("PRAGMA foreign_keys = ON")
        with self._guard:
            for key, (thread, old) in list(self._connections.items()):
                if not thread.is_alive():
                    old.close()
                    del self._connections[key]
            self._connections[threading.get_ident()] = (threading.current_thread(), connection)
        self._local.connection = connection
        return connection

    def close(self) -> None:
        """Closes every thread's connection."""
        with self._guard:
            self._closed = True
            for _, connection in self._connections.values():
                connection.close()
            self._connections.clear()
        self._local = threading.local()
        with self._changed:
            self._changed.notify_all()

    def rows(self, sql: str, values: Sequence[object] = ()) -> list[tuple[Any, ...]]:
        """All rows of one query."""
        try:
            return self.connection().execute(sql, values).fetchall()
        except sqlite3.Error as error:
            raise self._refusal(error) from error

    def row(self, sql: str, values: Sequence[object] = ()) -> tuple[Any, ...] | None:
        """The first row of one query, or None."""
        found = self.rows(sql, values)
        return found[0] if found else None

    @contextmanager
    def writing(self, *, announce: bool = True) -> Iterator[sqlite3.Connection]:
        """One whole write: committed at the end, undone on any exception, seen by `wait`ers if announced."""
        with self._write:
            connection = self.connection()
            try:
                connection.execute("BEGIN IMMEDIATE")
                try:
                    before = connection.total_changes
                    yield connection
                    if connection.total_changes == before:
                        connection.execute("ROLLBACK")
                        return
                    if not announce:
                        connection.execute("COMMIT")
                        return
                    connection.execute("UPDATE state SET version = version + 1")
                    version = connection.execute("SELECT version FROM state").fetchone()[0]
                    connection.execute("COMMIT")
                except BaseException:
                    if connection.in_transaction:
                        connection.execute("ROLLBACK")
                    raise
            except sqlite3.Error as error:
                raise self._refusal(error) from error
        with self._changed:
            self._latest = version
            self._changed.notify_all()

    def version(self) -> int:
        """Grows with every committed write of any process."""
        found = self.row("SELECT version FROM state")
        return int(found[0]) if found else 0

    def wait(self, since: int, timeout: float) -> int:
        """Blocks until `version() > since` or `timeout` seconds have passed; the version then.

        Writes of this process wake it at once; those of others are looked for while somebody waits.
        """
        deadline = time.monotonic() + timeout
        seen = -1
        version = self.version()
        while version <= since and not self._closed:
            with self._changed:
                left = deadline - time.monotonic()
                if left <= 0:
                    break
                if self._latest <= since:
                    self._changed.wait(min(left, _POLL_SECONDS))
            if self._closed:
                break
            found = self.row("PRAGMA data_version")
            stamp = int(found[0]) if found else 0
            if stamp != seen or self._latest > since:
                seen, version = stamp, self.version()
        return version
