"""The stream of changes over a real socket: ids, resuming, heartbeats, viewers who have gone, the end of the server."""

from __future__ import annotations

import socket
import time
from collections.abc import Callable, Iterator

import pytest
from pagekit import Keeper, figures

from reactance.daemon.history import History
from reactance.dashboard.events import Stream, Streams, state
from reactance.dashboard.serve import ServeError, Server, serve

PATIENCE = 20.0  # seconds until a test gives up; nothing is expected to take that long


class Viewer:
    """A browser's half of a stream, as raw bytes."""

    def __init__(self, server: Server, query: str, last: str = "") -> None:
        self.socket = socket.create_connection(("127.0.0.1", server.port), timeout=PATIENCE)
        seen = f"Last-Event-ID: {last}\r\n" if last else ""
        self.socket.sendall(f"GET /events{query} HTTP/1.1\r\nHost: 127.0.0.1:{server.port}\r\n{seen}\r\n".encode())
        self.text = ""

    def until(self, wanted: str) -> str:
        """Reads on until `wanted` has come."""
        while wanted not in self.text:
            data = self.socket.recv(65536)
            if not data:
                break
            self.text += data.decode()
        assert wanted in self.text
        return self.text

    def close(self) -> None:
        self.socket.close()


@pytest.fixture
def server(keeper: Keeper) -> Iterator[Server]:
    with serve(keeper.history, port=0) as running:
        yield running


def until(condition: Callable[[], bool]) -> None:
    end = time.monotonic() + PATIENCE
    while not condition():
        assert time.monotonic() < end, "waited in vain"
        time.sleep(0.02)


def test_a_save_is_announced_with_an_id(server: Server, keeper: Keeper) -> None:
    viewer = Viewer(server, f"?board=1&seen={state(keeper.history, 1)}")
    head = viewer.until("retry: ")
    assert "text/event-stream" in head
    assert "event: change" not in head
    keeper.save(figures(0.09))
    now = state(keeper.history, 1)
    assert "event: change" in viewer.until(f"id: {now}\n")
    viewer.close()


def test_what_happened_while_away_is_told_at_once(server: Server, keeper: Keeper) -> None:
    before = state(keeper.history, 1)
    keeper.save(figures(0.09))
    late = Viewer(server, f"?board=1&seen={before}")
    late.until(f"id: {state(keeper.history, 1)}\n")
    late.close()
    resumed = Viewer(server, "?board=1&seen=older", last=state(keeper.history, 1))
    resumed.until("retry: ")
    keeper.save(figures(0.1))
    text = resumed.until(f"id: {state(keeper.history, 1)}\n")
    assert text.count("event: change") == 1
    resumed.close()


def test_another_board_is_none_of_its_business(server: Server, keeper: Keeper) -> None:
    viewer = Viewer(server, f"?board=1&seen={state(keeper.history, 1)}")
    everybody = Viewer(server, f"?seen={state(keeper.history, None)}")
    viewer.until("retry: ")
    everybody.until("retry: ")
    other = Keeper(keeper.history, "/home/ana/other.edn", number=50)
    other.save(figures(0.09))
    everybody.until("event: change")
    keeper.save(figures(0.1))
    assert viewer.until("event: change").count("event: change") == 1
    viewer.close()
    everybody.close()


def test_pinning_and_going_are_changes_too(keeper: Keeper) -> None:
    states = [state(keeper.history, 1)]
    keeper.history.pin(1, keeper.seen[0])
    states.append(state(keeper.history, 1))
    keeper.history.mark_gone(keeper.file)
    states.append(state(keeper.history, 1))
    keeper.fail("broken")
    states.append(state(keeper.history, 1))
    assert len(set(states)) == 4


def test_a_gone_viewer_gives_the_place_back(keeper: Keeper) -> None:
    with serve(keeper.history, port=0) as server:
        server.streams.heartbeat = 0.0  # as often as it looks
        viewer = Viewer(server, "?board=1&seen=x")
        viewer.until(": here")
        assert server.streams.open == 1
        viewer.close()
        until(lambda: server.streams.open == 0)


def test_too_many_viewers_are_told_to_ask_again(keeper: Keeper) -> None:
    streams = Streams(keeper.history, viewers=2)
    first, second = streams.stream(1, ""), streams.stream(1, "")
    assert isinstance(first, Stream) and isinstance(second, Stream)
    assert streams.stream(1, "") is None
    first.close()
    first.close()
    assert streams.stream(1, "") is not None
    assert streams.stream(1, "") is None


def test_a_server_that_stops_ends_its_streams(keeper: Keeper) -> None:
    server = serve(keeper.history, port=0).start()
    viewers = [Viewer(server, f"?board=1&seen={state(keeper.history, 1)}") for _ in range(5)]
    for viewer in viewers:
        viewer.until("retry: ")
    server.stop()
    for viewer in viewers:
        while viewer.socket.recv(65536):
            pass
    assert server.streams.open == 0


def test_pages_are_answered_while_every_stream_is_open(keeper: Keeper) -> None:
    import urllib.request

    from reactance.dashboard.events import VIEWERS

    with serve(keeper.history, port=0) as server:
        viewers = [Viewer(server, f"?board=1&seen={state(keeper.history, 1)}") for _ in range(VIEWERS)]
        for viewer in viewers:
            viewer.until("retry: ")
        assert b"greenhouse" in urllib.request.urlopen(f"{server.url}board/1", timeout=PATIENCE).read()
        for viewer in viewers:
            viewer.close()


def test_only_this_machine_is_served(history: History) -> None:
    for host in ("0.0.0.0", "192.0.2.1", "example.org", "::"):
        with pytest.raises(ServeError, match=r"127\.0\.0\.1"):
            serve(history, host, 0)


def test_a_port_that_is_taken_is_named(history: History) -> None:
    with serve(history, port=0) as running, pytest.raises(ServeError, match=f":{running.port}: .*--listen"):
        serve(history, port=running.port)


def test_the_port_is_free_again_after_stopping(history: History) -> None:
    first = serve(history, port=0).start()
    first.stop()
    with serve(history, port=first.port) as second:
        assert second.port == first.port
