"""The service as a process: stops in good order, and slow clients keep nobody else from it."""

from __future__ import annotations

import contextlib
import http.client
import os
import signal
import socket
import subprocess
import sys
import threading
import time
import urllib.request
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from web_tools import TOKEN

PROGRAM = """
import sys, threading, time
from webapp import serve
from webapp.views import help
slow = help.pages
@slow.get("/slow")
def wait():
    print("SLOW", file=sys.stderr, flush=True)
    time.sleep(float(sys.argv[1]))
    return "done"
serve.run(port=0)
"""
Serve = Callable[..., "Running"]


class Running:
    """A service in a process of its own; ``/help/slow`` takes some seconds."""

    def __init__(self, folder: Path, seconds: float, **environment: str) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-c", PROGRAM, str(seconds)],
            env={"CANT_DATA": str(folder), "PATH": "/usr/bin:/bin", **environment},
            stderr=subprocess.PIPE,
            text=True,
        )
        self.said: list[str] = []
        self._slow = threading.Event()
        self._ready = threading.Event()
        self._reader = threading.Thread(target=self._read, daemon=True)
        self._reader.start()
        assert self._ready.wait(60), "".join(self.said)
        line = next(one for one in self.said if "open http" in one)
        self.port = int(line.split("127.0.0.1:")[1].split("/")[0])
        self.base = f"http://127.0.0.1:{self.port}"

    def _read(self) -> None:
        assert self.process.stderr is not None
        for line in self.process.stderr:
            self.said.append(line)
            if "open http" in line:
                self._ready.set()
            if line.startswith("SLOW"):
                self._slow.set()
        self._ready.set()

    def ask_slowly(self) -> tuple[threading.Thread, list[bytes]]:
        """Ask for what takes long; give the thread that waits for it and what it gets."""
        found: list[bytes] = []

        def ask() -> None:
            found.append(self.get("/help/slow")[1].encode())

        thread = threading.Thread(target=ask)
        thread.start()
        assert self._slow.wait(30)
        return thread, found

    def get(self, path: str) -> tuple[int, str]:
        """Ask for a page."""
        connection = http.client.HTTPConnection("127.0.0.1", self.port, timeout=30)
        connection.request("GET", path)
        answer = connection.getresponse()
        found = answer.status, answer.read().decode()
        connection.close()
        return found

    def children(self) -> list[int]:
        """Give the processes that it has started."""
        number = self.process.pid
        return [int(n) for n in Path(f"/proc/{number}/task/{number}/children").read_text().split()]

    def end(self) -> None:
        """End it whatever it does."""
        self.process.kill()
        self.process.wait()
        self._reader.join(timeout=10)
        if self.process.stderr is not None:
            self.process.stderr.close()


@pytest.fixture
def serve(tmp_path: Path) -> Iterator[Serve]:
    """Give a function that starts a service."""
    started: list[Running] = []

    def start(seconds: float = 0.0, **environment: str) -> Running:
        started.append(Running(tmp_path / "data", seconds, **environment))
        return started[-1]

    yield start
    for one in started:
        one.end()


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT])
def test_told_to_stop_it_finishes_what_is_under_way(serve: Serve, number: int) -> None:
    service = serve(2.0)
    kept = http.client.HTTPConnection("127.0.0.1", service.port, timeout=30)
    kept.request("GET", "/readyz")
    assert kept.getresponse().read() == b"ready\n"
    thread, found = service.ask_slowly()
    workers = service.children()
    assert workers
    service.process.send_signal(number)
    time.sleep(0.3)
    kept.request("GET", "/readyz")
    answer = kept.getresponse()
    assert (answer.status, answer.read()) == (503, b"not ready: stopping\n")
    kept.close()
    with pytest.raises(OSError, match="refused"):
        socket.create_connection(("127.0.0.1", service.port), timeout=5)
    thread.join(timeout=30)
    assert found == [b"done"]
    assert service.process.wait(timeout=20) == 0
    assert are_gone(workers)


def test_what_takes_too_long_is_not_waited_for(serve: Serve) -> None:
    service = serve(60.0, CANT_SECONDS_TO_STOP="1")
    connection = http.client.HTTPConnection("127.0.0.1", service.port, timeout=30)
    connection.request("GET", "/help/slow")
    time.sleep(0.5)
    begun = time.monotonic()
    service.process.send_signal(signal.SIGTERM)
    assert service.process.wait(timeout=20) == 0
    assert time.monotonic() - begun < 15
    connection.close()


def test_told_twice_it_stops_at_once(serve: Serve) -> None:
    service = serve(60.0)
    connection = http.client.HTTPConnection("127.0.0.1", service.port, timeout=30)
    connection.request("GET", "/help/slow")
    time.sleep(0.5)
    service.process.send_signal(signal.SIGTERM)
    time.sleep(0.3)
    assert service.process.poll() is None
    workers = service.children()
    service.process.send_signal(signal.SIGTERM)
    assert service.process.wait(timeout=5) == 1
    assert are_gone(workers)
    connection.close()


def test_a_hundred_slow_connections_stop_nobody(serve: Serve) -> None:
    service = serve(CANT_SECONDS_TO_SEND="3")
    head = b"POST /plans HTTP/1.1\r\nHost: localhost\r\nContent-Length: 90000\r\n\r\n"
    dripping = []
    for number in range(130):
        opened = socket.create_connection(("127.0.0.1", service.port), timeout=10)
        opened.sendall(b"GET / HTTP/1.1\r\nX-" if number % 2 else head)  # half a header, or half a body
        dripping.append(opened)
    until = time.monotonic() + 15
    slowest, cut = 0.0, 0
    while cut < len(dripping) and time.monotonic() < until:
        begun = time.monotonic()
        assert service.get("/")[0] == 200
        slowest = max(slowest, time.monotonic() - begun)
        cut = 0
        for opened in dripping:
            try:
                opened.sendall(b"x")
                opened.setblocking(False)
                cut += opened.recv(100) == b""
            except BlockingIOError:
                pass
            except OSError:
                cut += 1
            finally:
                if opened.fileno() >= 0:
                    opened.settimeout(10)
        time.sleep(0.3)
    for opened in dripping:
        opened.close()
    assert cut == len(dripping)
    assert slowest < 5


def test_one_address_does_not_take_all_connections(serve: Serve) -> None:
    service = serve(CANT_CONNECTIONS="40")
    with contextlib.ExitStack() as closing:
        opened = [
            closing.enter_context(socket.create_connection(("127.0.0.1", service.port), timeout=10))
            for _ in range(25)
        ]
        time.sleep(0.5)
        cut = 0
        for one in opened:
            one.setblocking(False)
            with contextlib.suppress(BlockingIOError):
                cut += one.recv(1) == b""
        assert cut == 5
    time.sleep(0.5)  # until it has seen that they are closed
    assert service.get("/healthz")[0] == 200


def test_slow_readers_stop_nobody(serve: Serve) -> None:
    service = serve()
    opener = urllib.request.build_opener(urllib.request.HTTPCookieProcessor())
    page = opener.open(service.base, timeout=60).read().decode()
    found = TOKEN.search(page)
    assert found is not None
    data = f"token={found.group(1)}".encode()
    plan = opener.open(f"{service.base}/plans/sample", data, timeout=60).geturl().removesuffix("/cants")
    cookies = next(h for h in opener.handlers if isinstance(h, urllib.request.HTTPCookieProcessor)).cookiejar
    cookie = "; ".join(f"{one.name}={one.value}" for one in cookies)
    path = plan.removeprefix(service.base)
    asking = f"GET {path}/plan.json HTTP/1.1\r\nHost: localhost\r\nCookie: {cookie}\r\n\r\n".encode()
    with contextlib.ExitStack() as closing:
        for _ in range(80):  # more than there are threads
            opened = closing.enter_context(socket.socket())
            opened.setsockopt(socket.SOL_SOCKET, socket.SO_RCVBUF, 1024)
            opened.connect(("127.0.0.1", service.port))
            opened.sendall(asking)
        assert service.get("/healthz") == (200, "alive\n")
        until = time.monotonic() + 60
        while (code := service.get("/help/terms")[0]) == 503 and time.monotonic() < until:
            time.sleep(0.5)  # the eighty are still being computed
        assert code == 200


def are_gone(processes: list[int]) -> bool:
    until = time.monotonic() + 15
    while time.monotonic() < until:
        if not any(Path(f"/proc/{number}").exists() for number in processes):
            return True
        time.sleep(0.1)
    return False


def raw(port: int, request: bytes) -> bytes:
    with socket.create_connection(("127.0.0.1", port), timeout=30) as opened:
        opened.sendall(request)
        answer = b""
        while part := opened.recv(65536):
            answer += part
        return answer


def test_what_is_too_large_is_refused_by_its_header(serve: Serve) -> None:
    service = serve(CANT_UPLOAD_MB="1", CANT_HEADER_KB="8")
    head = b"POST /plans HTTP/1.1\r\nHost: localhost\r\nContent-Length: 9000000\r\n\r\n"
    assert raw(service.port, head).startswith(b"HTTP/1.1 413")
    long = b"GET / HTTP/1.1\r\nHost: localhost\r\nX-Long: " + b"x" * 9000 + b"\r\n\r\n"
    assert raw(service.port, long).split(b" ", 2)[1] == b"431"
    chunked = b"POST /plans HTTP/1.1\r\nHost: localhost\r\nTransfer-Encoding: chunked\r\n\r\n"
    assert raw(service.port, chunked + (b"80000\r\n" + b"x" * 0x80000 + b"\r\n") * 9).startswith(
        b"HTTP/1.1 413"
    )
    whole = head + b"x" * 9_000_000  # a browser that sends all of it before it reads
    refused = raw(service.port, whole)
    assert refused.startswith(b"HTTP/1.1 413")
    assert b"as csv" in refused
    assert service.get("/healthz")[0] == 200


def test_answers_name_no_server(serve: Serve) -> None:
    service = serve()
    answer = raw(service.port, b"GET /help/ HTTP/1.1\r\nHost: localhost\r\nConnection: close\r\n\r\n")
    head = answer.split(b"\r\n\r\n")[0].lower()
    assert b"\r\nserver:" not in head
    assert b"waitress" not in head


def test_the_access_log_goes_where_it_is_told(serve: Serve, tmp_path: Path) -> None:
    file = tmp_path / "access.log"
    service = serve(CANT_ACCESS_LOG=str(file))
    service.get("/help/terms?x=secret")
    until = time.monotonic() + 10
    while not file.read_text() and time.monotonic() < until:
        time.sleep(0.02)  # written when the answer has gone
    assert "GET /help/terms 200" in file.read_text()
    assert "secret" not in file.read_text()
    assert not any("/help/terms" in line for line in service.said)
    assert os.stat(file).st_mode & 0o077 == 0
