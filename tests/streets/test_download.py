"""Downloads: every way a server fails ends soon with a clear error, and streets arrive."""

from __future__ import annotations

import contextlib
import json
import socket
import threading
import time
import warnings
from collections.abc import Callable, Iterator
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from pathlib import Path

import pytest

from routeplan.errors import InputError
from routeplan.streets import download
from routeplan.streets.download import Request, download_streets, downloaded_network

STREETS = {
    "elements": [
        {"type": "node", "id": 1, "lat": 50.0, "lon": 10.0},
        {"type": "node", "id": 2, "lat": 50.0, "lon": 10.001},
        {"type": "node", "id": 3, "lat": 50.001, "lon": 10.001},
        {"type": "way", "id": 9, "nodes": [1, 2, 3], "tags": {"highway": "residential"}},
    ]
}


@contextlib.contextmanager
def server(answer: Callable[[BaseHTTPRequestHandler], None]) -> Iterator[str]:
    """Yield the address of a server that answers every request in one way."""

    class Handler(BaseHTTPRequestHandler):
        def do_GET(self) -> None:
            with contextlib.suppress(OSError):
                answer(self)

        do_POST = do_GET  # noqa: N815

        def log_message(self, *_: object) -> None:
            pass

    with ThreadingHTTPServer(("127.0.0.1", 0), Handler) as running:
        thread = threading.Thread(target=running.serve_forever, daemon=True)
        thread.start()
        try:
            yield f"http://127.0.0.1:{running.server_address[1]}"
        finally:
            running.shutdown()
            thread.join()


def says(status: int, body: str, kind: str = "application/json") -> Callable[..., None]:
    """Return an answer of one status and body."""

    def answer(handler: BaseHTTPRequestHandler) -> None:
        content = body.encode()
        handler.send_response(status)
        handler.send_header("Content-Type", kind)
        handler.send_header("Content-Length", str(len(content)))
        handler.end_headers()
        handler.wfile.write(content)

    return answer


def in_this_process(monkeypatch: pytest.MonkeyPatch) -> None:
    """Fetch without a process of its own: what it would send back is returned."""

    def fetch(request: Request, path: Path, folder: Path, deadline_s: float) -> str | None:
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")
                download._fetch_graph(request, str(path), str(folder), deadline_s)
        except Exception as error:
            return f"{type(error).__name__}: {error}"
        return None

    monkeypatch.setattr(download, "_in_time", fetch)


def box(address: str) -> Request:
    return Request(by="box", box=(9.99, 49.99, 10.01, 50.01), server=address)


@pytest.mark.parametrize(
    ("status", "body", "kind", "said"),
    [
        (400, "no", "text/plain", "refuses"),
        (200, "<html>busy</html>", "text/html", "holds no streets"),
        (200, '{"elements": []}', "application/json", "holds no streets"),
        (200, '{"elements": [], "remark": "runtime error: timed out"}', "application/json",
         "holds no streets"),
        (500, '{"error": "inside"}', "application/json", "cannot be fetched"),
    ],
)  # fmt: skip
def test_what_a_server_answers_is_told(  # noqa: PLR0917
    status: int, body: str, kind: str, said: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Refusals, pages, empty answers and faults of a server become one clear error."""
    in_this_process(monkeypatch)
    with (
        server(says(status, body, kind)) as address,
        pytest.raises(InputError, match=said) as caught,
    ):
        download_streets(box(address), tmp_path, deadline_s=20.0)
    assert "--streets" in str(caught.value)
    assert not list(tmp_path.glob("*.graphml"))


def test_streets_arrive_and_are_kept(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What a server sends becomes a network; the second time nothing is fetched."""
    in_this_process(monkeypatch)
    with server(says(200, json.dumps(STREETS))) as address:
        request = box(address)
        network = downloaded_network(request, tmp_path, deadline_s=20.0)
    assert len(network.length_m) == 1
    assert network.class_words == ("residential",)
    again = downloaded_network(request, tmp_path, deadline_s=20.0)
    assert again.length_m.tolist() == network.length_m.tolist()


def test_a_server_that_sleeps_is_left_at_the_deadline(tmp_path: Path) -> None:
    """A server that never answers costs no more than the deadline and a moment."""

    def sleep(_: BaseHTTPRequestHandler) -> None:
        time.sleep(60.0)

    begin = time.monotonic()
    with server_left_open(sleep) as address, pytest.raises(InputError, match=r"in time|not answer"):
        download_streets(box(address), tmp_path, deadline_s=4.0)
    assert time.monotonic() - begin < 30.0
    assert list(tmp_path.glob("*.graphml")) == []


@contextlib.contextmanager
def server_left_open(_: object) -> Iterator[str]:
    """Yield the address of a socket that takes connections and says nothing."""
    with socket.create_server(("127.0.0.1", 0)) as listening:
        yield f"http://127.0.0.1:{listening.getsockname()[1]}"


def test_no_connection_is_told(tmp_path: Path) -> None:
    """Where nobody listens the error says so and what to give instead."""
    with socket.create_server(("127.0.0.1", 0)) as listening:
        free = listening.getsockname()[1]
    with pytest.raises(InputError, match="no connection") as caught:
        download_streets(box(f"http://127.0.0.1:{free}"), tmp_path, deadline_s=60.0)
    assert "Give a local file with --streets" in str(caught.value)


@pytest.mark.parametrize(
    "request_",
    [
        Request(by="place", place="  "),
        Request(by="box", box=(10.0, 50.0, 9.0, 51.0)),
        Request(by="box", box=(float("nan"), 50.0, 9.0, 51.0)),
        Request(by="radius", lon=10.0, lat=50.0, radius_m=0.0),
        Request(by="radius", lon=10.0, lat=95.0, radius_m=100.0),
        Request(by="radius", lon=10.0, lat=50.0, radius_m=1e9),
    ],
)
def test_requests_that_make_no_sense_are_not_sent(request_: Request, tmp_path: Path) -> None:
    """A place without a name, a box inside out, a circle without size are refused at once."""
    with pytest.raises(InputError):
        download_streets(request_, tmp_path)
