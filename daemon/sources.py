"""Where words of changes come from: the operating system through watchdog, or looking every so often.

A place that cannot announce its changes (a network share, a system out of watches) is looked at instead, and
that is said: a daemon that is silently deaf would be the worst of failures.
"""

from __future__ import annotations

import errno
import logging
import os
from collections.abc import Callable, Iterable
from pathlib import Path

from watchdog.events import (
    DirCreatedEvent,
    DirDeletedEvent,
    DirMovedEvent,
    FileAttribEvent,
    FileClosedEvent,
    FileCreatedEvent,
    FileDeletedEvent,
    FileModifiedEvent,
    FileMovedEvent,
    FileSystemEvent,
    FileSystemEventHandler,
)
from watchdog.observers import Observer
from watchdog.observers.api import ObservedWatch

from reactance.daemon.places import network_file_system
from reactance.daemon.settle import Hint
from reactance.daemon.walk import Root

_WANTED: list[type[FileSystemEvent]] = [
    FileCreatedEvent,
    FileModifiedEvent,
    FileClosedEvent,
    FileMovedEvent,
    FileDeletedEvent,
    FileAttribEvent,
    DirCreatedEvent,
    DirMovedEvent,
    DirDeletedEvent,
]
_HINTS: dict[str, Hint] = {
    "created": "opened",
    "modified": "written",
    "closed": "closed",
    "moved": "removed",
    "deleted": "removed",
    "attrib": "found",
}
_INOTIFY = Path("/proc/sys/fs/inotify")

Notice = Callable[[str, Hint, bool], None]


class Source:
    """Announces changes below roots: calls `notice(path, hint, is_folder)`, and `lost()` when some went missing.

    Both are called from watchdog's threads. `announce` gets sentences for people.
    """

    def __init__(self, notice: Notice, lost: Callable[[], None], announce: Callable[[str], None]) -> None:
        self._announce = announce
        self._handler = _Handler(notice)
        self._loss = _LossListener(lost)
        self._observer = Observer()
        self._started = False
        self._deaf: set[Path] = set()
        self._watches: dict[Path, ObservedWatch] = {}

    def start(self, roots: Iterable[Root]) -> frozenset[Path]:
        """Begins; returns the folders of the roots that have to be looked at, because they cannot announce."""
        logging.getLogger("watchdog").addHandler(self._loss)
        wanted = list(roots)
        for root in wanted:
            self.add(root)
        if self._started:
            self._check_watches([root for root in wanted if root.folder not in self._deaf])
        return frozenset(self._deaf)

    def add(self, root: Root) -> None:
        """Watches one more root, or one again whose folder was replaced."""
        kind = network_file_system(root.folder)
        if kind is not None:
            self._deaf.add(root.folder)
            self._announce(
                f"{root.folder} is on a network file system ({kind}), which announces no changes: it is looked at "
                "every 2 s instead (--polling SECONDS sets how often)"
            )
            return
        try:
            if not self._started:
                self._observer.start()
                self._started = True
            self._watches[root.folder] = self._observer.schedule(
                self._handler, str(root.folder), recursive=root.deep, event_filter=_WANTED
            )
        except OSError as error:
            self._deaf.add(root.folder)
            self._announce(f"{root.folder} cannot be watched: {_limit_reached(error)}")

    def again(self, root: Root) -> None:
        """The root's folder is another one now: watches that."""
        watch = self._watches.pop(root.folder, None)
        if watch is not None:
            self._observer.unschedule(watch)
        self.add(root)

    def stop(self) -> None:
        """Ends the threads."""
        logging.getLogger("watchdog").removeHandler(self._loss)
        if self._started:
            self._observer.stop()
            self._observer.join(5.0)

    def _check_watches(self, roots: list[Root]) -> None:
        """watchdog passes over folders below a root that the system refused to watch: count them."""
        deep = [root for root in roots if root.deep]
        held = watches_held()
        if held is None or not deep:
            return
        wanted = len({folder for root in deep for folder, _, _ in os.walk(root.folder)})
        if held < wanted:
            self._deaf.update(root.folder for root in deep)
            error = OSError(errno.ENOSPC, f"{wanted} folders, of which the system let {held} be watched")
            self._announce(f"not all folders can be watched: {_limit_reached(error)}")


def watches_held() -> int | None:
    """How many inotify watches this process holds; None where there is no inotify."""
    try:
        descriptors = list(Path("/proc/self/fdinfo").iterdir())
    except OSError:
        return None
    count = 0
    for descriptor in descriptors:
        try:
            count += descriptor.read_text(encoding="ascii", errors="replace").count("inotify wd:")
        except OSError:
            continue  # closed since it was listed
    return count


def _limit_reached(error: OSError) -> str:
    """What the system refused, the limit's value where it is one, and the remedy."""
    name = {errno.ENOSPC: "max_user_watches", errno.EMFILE: "max_user_instances"}.get(error.errno or 0)
    if name is None:
        return f"{error.strerror or error}; it is looked at every 2 s instead"
    try:
        value = (_INOTIFY / name).read_text(encoding="ascii").strip()
    except OSError:
        value = "unknown"
    more = 524_288 if name == "max_user_watches" else 1024
    return (
        f"{error.strerror}: the limit fs.inotify.{name} is {value} (raise it with "
        f"`sudo sysctl fs.inotify.{name}={more}`); until then the place is looked at every 2 s"
    )


class _Handler(FileSystemEventHandler):
    """Passes on both ends of every event, as plain paths."""

    def __init__(self, notice: Notice) -> None:
        self._notice = notice

    def on_any_event(self, event: FileSystemEvent) -> None:
        hint = _HINTS.get(event.event_type)
        if hint is None:
            return
        if event.src_path:
            self._notice(os.fsdecode(event.src_path), hint, event.is_directory)
        if event.dest_path:
            self._notice(os.fsdecode(event.dest_path), "arrived", event.is_directory)


class _LossListener(logging.Handler):
    """watchdog tells only its log when events went missing."""

    def __init__(self, lost: Callable[[], None]) -> None:
        super().__init__(logging.WARNING)
        self._lost = lost

    def emit(self, record: logging.LogRecord) -> None:
        self._lost()
