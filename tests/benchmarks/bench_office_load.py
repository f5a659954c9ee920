"""Load the real service with an office at work, and hold it against what is asked of it; run by hand.

``python tests/benchmarks/bench_office_load.py [--clients 32] [--seconds 60] [--database URL]`` starts
``cant serve`` on an empty database, and lets so many clients work at the same time from one address: each
brings a small list of its own, gives trains and limits, looks at pages, decides and takes the workbook away,
over and over. At least 90 of 100 uploads must be taken, every other answer be a clean "busy", nothing fail,
and the memory of the process after the load be within 10 % of what it is after a warm-up of the same kind.
"""

from __future__ import annotations

import argparse
import http.client
import os
import random
import re
import signal
import subprocess
import sys
import tempfile
import threading
import time
import urllib.parse
from collections import Counter, defaultdict
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

READY = re.compile(r"open http://127\.0\.0\.1:(\d+)/ in a browser")
TOKEN = re.compile(r'name="token" value="([^"]+)"')
HEADER = "Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in,Transition out,Cant,Speed"
COMMON = {"trains_per_day": "20", "mass_t": "900", "regular": "yes"}
CLASSES = (
    {"name": "Express", "category": "passenger", "speed_kmh": "140", **COMMON},
    {"name": "Goods", "category": "freight", "speed_kmh": "80", **COMMON},
)
TRAINS = {
    "rows": "2",
    "units": "metric",
    **{f"{n}-{key}": value for n, row in enumerate(CLASSES) for key, value in row.items()},
}
LOOKED_AT = ("cants", "curves/1", "line", "findings", "files", "print")
BUSY_TRIES = 4
PAGE = 4096
LEAST_UPLOADS = 0.9
MEMORY_WITHIN = 0.1


@dataclass
class Seen:
    """What the clients saw."""

    codes: Counter[str] = field(default_factory=Counter)
    times: dict[str, list[float]] = field(default_factory=lambda: defaultdict(list))
    wrong: list[str] = field(default_factory=list)
    uploads: int = 0
    taken: int = 0
    lock: threading.Lock = field(default_factory=threading.Lock)


class Client:
    """A browser of its own, with its cookies, that waits as long as it is told to."""

    def __init__(self, port: int, seen: Seen, number: int) -> None:
        self._port, self._seen = port, seen
        self._random = random.Random(number)
        self._cookies: dict[str, str] = {}
        self._token = ""
        self._connection = http.client.HTTPConnection("127.0.0.1", port, timeout=120)
        self._number = number
        self._plans = 0

    def ask(
        self, name: str, method: str, path: str, body: bytes = b"", kind: str = ""
    ) -> tuple[int, str, str]:
        """Ask once; give code, location and text."""
        headers = {"Cookie": "; ".join(f"{k}={v}" for k, v in self._cookies.items())}
        if kind:
            headers["Content-Type"] = kind
        begun = time.perf_counter()
        try:
            self._connection.request(method, path, body or None, headers)
            answer = self._connection.getresponse()
            data = answer.read()
        except (OSError, http.client.HTTPException) as error:
            self._connection.close()
            self._note(name, "failed", begun, f"{name}: {error!r}")
            return 0, "", ""
        for cookie in answer.headers.get_all("Set-Cookie") or []:
            key, _, value = cookie.partition(";")[0].partition("=")
            self._cookies[key] = value
        text = data.decode("utf-8", "replace") if "html" in answer.headers.get("Content-Type", "") else ""
        if found := TOKEN.search(text):
            self._token = found.group(1)
        wrong = ""
        if answer.status == 503 and not answer.headers.get("Retry-After"):
            wrong = f"{name}: busy without a time"
        elif answer.status not in (200, 303, 503):
            wrong = f"{name}: {answer.status} {text[-300:]}"
        self._note(name, str(answer.status), begun, wrong)
        return answer.status, answer.headers.get("Location", ""), text

    def _note(self, name: str, code: str, begun: float, wrong: str) -> None:
        with self._seen.lock:
            self._seen.codes[code] += 1
            self._seen.times[name].append(time.perf_counter() - begun)
            if wrong:
                self._seen.wrong.append(wrong)

    def patiently(
        self, name: str, method: str, path: str, body: bytes = b"", kind: str = ""
    ) -> tuple[int, str]:
        """Ask, and again a moment later where the service is busy."""
        for _ in range(BUSY_TRIES):
            code, location, _ = self.ask(name, method, path, body, kind)
            if code != 503:
                return code, location
            time.sleep(1 + self._random.random())
        return code, location

    def form(self, name: str, path: str, **fields: str) -> int:
        """Send a form."""
        body = urllib.parse.urlencode({"token": self._token, **fields}).encode()
        return self.patiently(name, "POST", path, body, "application/x-www-form-urlencoded")[0]

    def upload(self) -> str:
        """Bring a small list of its own; give the path of its plan, "" where the service was busy."""
        rows = [HEADER]
        for i in range(self._random.randint(5, 30)):
            start, length = 1.4 * i + self._random.random() / 3, 0.2 + self._random.random() / 4
            radius, cant = self._random.choice((400, 600, 900, 1500)), self._random.choice((50, 80, 100))
            hand = self._random.choice("LR")
            rows.append(
                f"L{self._number},1,C{i},{start:.3f},{start + length:.3f},{radius},{hand},80,80,{cant},100"
            )
        if not self._token:
            self.ask("start", "GET", "/")
        edge = "xxxxx-edge-xxxxx"
        body = (
            f'--{edge}\r\nContent-Disposition: form-data; name="token"\r\n\r\n{self._token}\r\n'
            f'--{edge}\r\nContent-Disposition: form-data; name="file"; filename="list.csv"\r\n\r\n'
            + "\n".join(rows)
            + f"\r\n--{edge}--\r\n"
        ).encode()
        code, location, _ = self.ask(
            "upload", "POST", "/plans", body, f"multipart/form-data; boundary={edge}"
        )
        with self._seen.lock:
            self._seen.uploads += 1
            self._seen.taken += code == 303
        return location.removesuffix("/list") if code == 303 else ""

    def work(self) -> None:
        """Go the whole way once."""
        plan = self.upload()
        if not plan:
            time.sleep(1)
            return
        self.patiently("list", "GET", f"{plan}/list")
        if self.form("trains", f"{plan}/trains", **TRAINS) != 303:
            return
        if self.form("limits", f"{plan}/limits/choose", source="set:typical") != 303:
            return
        if self.form("plan", f"{plan}/confirm") != 303:
            return
        for page in self._random.sample(LOOKED_AT, 4):
            self.patiently(page.split("/")[0], "GET", f"{plan}/{page}")
            time.sleep(self._random.random() / 2)
        self.form(
            "hold", f"{plan}/curves/1/hold", cant="50", units="metric", because="as measured", who="A. B."
        )
        self.patiently("cants", "GET", f"{plan}/cants")
        self.patiently("workbook", "GET", f"{plan}/workbook")
        self._plans += 1
        if self._plans % 2 == 0:
            self.form("delete", f"{plan}/delete")


def load(port: int, clients: int, seconds: float) -> Seen:
    """Let clients work for some time."""
    seen = Seen()
    until = time.monotonic() + seconds

    def one(number: int) -> None:
        client = Client(port, seen, number)
        while time.monotonic() < until:
            client.work()

    threads = [threading.Thread(target=one, args=(number,)) for number in range(clients)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    return seen


def memory_mb(process: int) -> float:
    """Give the resident memory of a process [MB]."""
    return int(Path(f"/proc/{process}/statm").read_text().split()[1]) * PAGE / 1e6


def told(seen: Seen, seconds: float) -> bool:
    """Print what was seen; tell whether it is as it should be."""
    share = seen.taken / max(seen.uploads, 1)
    asked = sum(seen.codes.values())
    print(f"{asked} requests, {asked / seconds:.1f} a second, by code: {dict(sorted(seen.codes.items()))}")
    print(f"uploads taken: {seen.taken} of {seen.uploads}, {100 * share:.1f} %")
    print(f"busy: {100 * seen.codes['503'] / max(asked, 1):.1f} % of all requests")
    print(f"errors: {len(seen.wrong)} {seen.wrong[:5]}")
    for name, times in sorted(seen.times.items()):
        middle, late, latest = np.percentile(times, [50, 95, 100])
        print(
            f"  {name:10s} {len(times):5d} times, median {middle:6.2f} s, "
            f"95 of 100 in {late:6.2f} s, all in {latest:6.2f} s"
        )
    return share >= LEAST_UPLOADS and not seen.wrong


def main() -> int:
    """Run the benchmark; 0 where all holds."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--clients", type=int, default=32)
    parser.add_argument("--seconds", type=float, default=60.0)
    parser.add_argument("--warm", type=float, default=40.0)
    parser.add_argument("--database", default="")
    given = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        environment = {**os.environ, "CANT_DATA": folder, "CANT_ACCESS_LOG": f"{folder}/access.log"}
        if given.database:
            environment["CANT_DATABASE"] = given.database
        process = subprocess.Popen(
            [sys.executable, "-m", "cant", "serve", "--port", "0"],
            env=environment,
            stderr=subprocess.PIPE,
            text=True,
        )
        assert process.stderr is not None
        port = 0
        for line in process.stderr:
            print(line, end="")
            if found := READY.search(line):
                port = int(found.group(1))
                break
        threading.Thread(target=lambda: [print(line, end="") for line in process.stderr], daemon=True).start()
        try:
            print(f"warming up for {given.warm:.0f} s")
            told(load(port, given.clients, given.warm), given.warm)
            before = memory_mb(process.pid)
            print(f"memory after warm-up: {before:.0f} MB")
            print(f"{given.clients} clients for {given.seconds:.0f} s")
            good = told(load(port, given.clients, given.seconds), given.seconds)
            after = memory_mb(process.pid)
            growth = after / before - 1
            print(f"memory at the end: {after:.0f} MB, {100 * growth:+.1f} %")
            good = good and growth <= MEMORY_WITHIN
        finally:
            process.send_signal(signal.SIGTERM)
            code = process.wait(timeout=60)
        print(f"stopped with {code}; {'all holds' if good and code == 0 else 'NOT as it should be'}")
        return 0 if good and code == 0 else 1


if __name__ == "__main__":
    sys.exit(main())
