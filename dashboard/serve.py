"""The dashboard as a server of this machine, on threads of its own."""

from __future__ import annotations

import threading
from typing import Any

from cheroot import wsgi

from reactance.daemon.history import History
from reactance.dashboard.app import create_app
from reactance.dashboard.archive import Analyse
from reactance.dashboard.events import VIEWERS, Streams

_WORKERS = 8  # threads for answers beside those that open pages hold
_QUEUE = 2 * VIEWERS  # all pages come back at once when a server starts again
_OWN_NAMES = ("127.0.0.1", "localhost", "[::1]")


class ServeError(Exception):
    """The dashboard cannot be served there: why, and what would mend it."""


class Server:
    """A dashboard that is bound to its port from the beginning and answers between `start` and `stop`."""

    def __init__(self, history: History, host: str, port: int, analyse: Analyse | None = None) -> None:
        if host not in ("127.0.0.1", "localhost", "::1"):
            raise ServeError(
                f"{host}: the dashboard is for this machine only and listens on 127.0.0.1 "
                f"(give --listen 127.0.0.1:{port})"
            )
        self._server = wsgi.Server(
            (host, port), _not_yet, numthreads=_WORKERS + VIEWERS, request_queue_size=_QUEUE, shutdown_timeout=3
        )
        try:
            self._server.prepare()
        except OSError as error:
            raise ServeError(
                f"{host}:{port}: the dashboard cannot listen there: {error} "
                "(another watch may be running; give --listen another port, or --no-dashboard)"
            ) from error
        self.port = int(self._server.bind_addr[1])
        self._host = f"[{host}]" if ":" in host else host
        app = create_app(history, hosts=own_hosts(self.port), analyse=analyse)
        self.streams: Streams = app.extensions["reactance.streams"]
        self._server.wsgi_app = app
        self._thread: threading.Thread | None = None

    @property
    def url(self) -> str:
        """Where a browser finds it."""
        return f"http://{self._host}:{self.port}/"

    def start(self) -> Server:
        """Serves in the background."""
        self._thread = threading.Thread(target=self._server.serve, name="dashboard", daemon=True)
        self._thread.start()
        return self

    def stop(self) -> None:
        """Ends open streams, finishes what is being answered, frees the port."""
        self.streams.close()
        self._server.stop()
        if self._thread is not None:
            self._thread.join(timeout=10)
            self._thread = None

    def __enter__(self) -> Server:
        return self.start()

    def __exit__(self, *_: object) -> None:
        self.stop()


def own_hosts(port: int) -> tuple[str, ...]:
    """The values of a Host header that mean this server."""
    named = tuple(f"{name}:{port}" for name in _OWN_NAMES)
    return (*named, *_OWN_NAMES) if port == 80 else named


def serve(history: History, host: str = "127.0.0.1", port: int = 8462, *, analyse: Analyse | None = None) -> Server:
    """A server for the history, bound and ready to `start()`. Raises ServeError where it cannot be.

    `analyse` is how stored revisions are analysed again for their curves, the program's own if None.
    """
    return Server(history, host, port, analyse)


def _not_yet(environ: Any, start_response: Any) -> list[bytes]:
    start_response("503 Service Unavailable", [("Content-Type", "text/plain")])
    return [b"starting\n"]
