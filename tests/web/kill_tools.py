"""A service that is killed, and a client that never stops: what was confirmed to him is written down."""

from __future__ import annotations

import contextlib
import http.client
import json
import os
import random
import re
import secrets
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

READY = re.compile(r"open http://127\.0\.0\.1:(\d+)/ in a browser")
HEAD = "Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in (m),Transition out (m),Cant,Speed"
TRAFFIC = b"Class,Category,Speed,Trains per day,Mass\nFast,passenger,120,20,400\nGoods,freight,80,30,1500\n"
LIMITS = b"Quantity,Normal,Unit\ncant,160,mm\ncant deficiency,100,mm\ncant excess,90,mm\n"


def curve_list(curves: int, rng: random.Random) -> bytes:
    """Make a list of some curves, another one every time."""
    lines = [HEAD]
    for i in range(curves):
        radius, cant = rng.choice([500, 600, 800, 1200]), rng.choice([40, 60, 80])
        lines.append(
            f"L,1,C{i},{i * 1.5:.3f},{i * 1.5 + 0.4:.3f},{radius},L,80,80,{cant},{rng.choice([80, 100])}"
        )
    return "\n".join(lines).encode()


PROGRAM = """
import sys
import webapp.serve
from cant.cli import main
sys.stdin.readline()
sys.argv = ["cant", "serve", "--port", "0"]
sys.exit(main())
"""
"""``cant serve``, loaded beforehand: it touches nothing until it is told to."""


class Service:
    """``cant serve`` in a process group of its own."""

    def __init__(self, environment: dict[str, str], folder: Path) -> None:
        self.process = subprocess.Popen(
            [sys.executable, "-c", PROGRAM],
            env={"PATH": "/usr/bin:/bin", **environment},
            cwd=folder,
            stdin=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
            start_new_session=True,
        )
        self.said: list[str] = []
        self._ready = threading.Event()
        self.port = 0
        self._reader = threading.Thread(target=self._read, daemon=True)
        self._reader.start()

    def begin(self) -> None:
        """Let it serve, and wait until it does."""
        assert self.process.stdin is not None
        self.process.stdin.write("\n")
        self.process.stdin.flush()
        assert self._ready.wait(90), "".join(self.said)
        assert self.port, "".join(self.said)

    def _read(self) -> None:
        assert self.process.stderr is not None
        for line in self.process.stderr:
            self.said.append(line)
            if found := READY.search(line):
                self.port = int(found.group(1))
                self._ready.set()
        self._ready.set()

    def kill_group(self) -> None:
        """Kill service, worker and what it does, all at once."""
        with contextlib.suppress(ProcessLookupError):
            os.killpg(self.process.pid, signal.SIGKILL)
        self.process.wait()
        self._reader.join(timeout=10)
        for pipe in (self.process.stdin, self.process.stderr):
            assert pipe is not None
            pipe.close()


class GoneError(Exception):
    """The service has been killed under a request."""


@dataclass
class Known:
    """What was confirmed of a plan."""

    data: bytes
    decided: list[str] = field(default_factory=list)
    deleted: bool = False


@dataclass
class Client:
    """A program that brings lists, plans them and decides; ``doing`` tells which of it is under way."""

    rng: random.Random
    port: int = 0
    key: str | None = None
    doing: str = ""
    plans: dict[str, Known] = field(default_factory=dict)
    sent: list[bytes] = field(default_factory=list)
    began: dict[str, threading.Event] = field(default_factory=dict)

    def call(self, method: str, path: str, body: bytes | None = None, kind: str = "") -> tuple[int, bytes]:
        """Ask the JSON interface; GoneError where no whole answer comes."""
        headers = {"Content-Type": kind} if kind else {}
        if self.key:
            headers["Authorization"] = f"Bearer {self.key}"
        connection = http.client.HTTPConnection("127.0.0.1", self.port, timeout=60)
        try:
            connection.request(method, f"/api/v1{path}", body, headers)
            answer = connection.getresponse()
            return answer.status, answer.read()
        except (OSError, http.client.HTTPException) as error:
            raise GoneError from error
        finally:
            connection.close()

    def send(self, method: str, path: str, body: Any) -> tuple[int, Any]:
        """Send JSON, and give the answer's."""
        code, found = self.call(method, path, json.dumps(body).encode(), "application/json")
        return code, json.loads(found)

    def _begin(self, what: str) -> None:
        self.doing = what
        if what in self.began:
            self.began[what].set()

    def bring(self, data: bytes) -> str:
        """Bring a list; give the address of the plan."""
        self._begin("upload")
        boundary = secrets.token_hex(12)
        parts = b""
        for name, file, content in (
            ("file", "list.csv", data),
            ("traffic", "traffic.csv", TRAFFIC),
            ("limits", "limits.csv", LIMITS),
        ):
            parts += f'--{boundary}\r\nContent-Disposition: form-data; name="{name}"; '.encode()
            parts += f'filename="{file}"\r\nContent-Type: text/csv\r\n\r\n'.encode() + content + b"\r\n"
        self.sent.append(data)
        kind = f"multipart/form-data; boundary={boundary}"
        code, found = self.call("POST", "/plans", parts + f"--{boundary}--\r\n".encode(), kind)
        assert code == 201, found
        made = json.loads(found)
        self.key = made.get("key") or self.key
        self.plans[made["address"]] = Known(data)
        return str(made["address"])

    def plan(self, address: str, seconds: float = 60) -> int:
        """Ask for the curves of a plan until they are there; give the last status."""
        self._begin("planning")
        until = time.monotonic() + seconds
        while True:
            code, _ = self.call("GET", f"/plans/{address}/curves")
            if code != 202 or time.monotonic() > until:
                return code
            time.sleep(0.1)

    def decide(self, address: str) -> None:
        """Hold a cant, as often as the service says that the plan is not there yet."""
        self._begin("decision")
        because = f"reason {secrets.token_hex(8)}"
        body = {"cant_mm": float(self.rng.choice([50, 55, 65, 70])), "because": because}
        code, found = self.send("PUT", f"/plans/{address}/curves/{self.rng.randint(1, 3)}/cant", body)
        assert code in (200, 202), found
        if code == 200:
            self.plans[address].decided.append(because)

    def delete(self, address: str) -> None:
        """Delete a plan."""
        self._begin("deletion")
        self.plans[address].deleted = True  # from now on either is right until it is confirmed
        code, found = self.call("DELETE", f"/plans/{address}")
        assert code == 204, found

    def work(self) -> None:
        """Bring, plan, decide and delete until the service is gone."""
        with contextlib.suppress(GoneError):
            for turn in range(1_000):
                address = self.bring(curve_list(self.rng.choice([3, 5, 400]), self.rng))
                if self.plan(address) == 200:
                    for _ in range(3):
                        self.decide(address)
                        self.plan(address)
                if turn % 4 == 3:
                    self.delete(address)


@contextlib.contextmanager
def at_work(client: Client, port: int) -> Iterator[threading.Thread]:
    """Let a client work in the background until the service is gone."""
    client.port = port
    client.began = {what: threading.Event() for what in ("upload", "planning", "decision")}
    thread = threading.Thread(target=client.work)
    thread.start()
    yield thread
    thread.join(timeout=90)
    assert not thread.is_alive()
