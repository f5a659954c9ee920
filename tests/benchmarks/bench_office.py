"""What one user's long plan does to the pages of others; run by hand.

``python tests/benchmarks/bench_office.py [ROWS]`` starts the real service, lets one browser bring and plan a
register of 20,000 rows (or as told), and lets another look at the pages of a short plan: alone, while the
register is read and planned, while its workbook is made, and while its JSON is written. It prints for each
the median, the 95th of 100 and the longest time of a page, and how long the long work took.
"""

from __future__ import annotations

import os
import re
import subprocess
import sys
import tempfile
import threading
import time
import urllib.error
import urllib.parse
import urllib.request
from collections.abc import Callable
from http.cookiejar import CookieJar
from pathlib import Path

import numpy as np
from bench_web import TRAINS, register

READY = re.compile(r"open (http://\S+)/ in a browser")
PAGES = ("cants", "curves/3", "findings", "line", "limits", "list")
ALONE_S = 10.0


class Browser:
    """A browser with cookies that follows redirects."""

    def __init__(self, base: str) -> None:
        self.base = base
        self.opener = urllib.request.build_opener(urllib.request.HTTPCookieProcessor(CookieJar()))
        found = re.search(rb'name="token" value="([^"]+)"', self.ask("/")[1])
        self.token = found.group(1).decode() if found else ""
        self.at = ""

    def ask(self, path: str, data: bytes | None = None, kind: str = "") -> tuple[int, bytes]:
        """Ask for a page, or send a form."""
        request = urllib.request.Request(self.base + path, data, {"Content-Type": kind} if kind else {})  # noqa: S310
        try:
            with self.opener.open(request, timeout=600) as answer:
                self.at = answer.geturl().removeprefix(self.base)
                return answer.status, answer.read()
        except urllib.error.HTTPError as error:
            return error.code, error.read()

    def post(self, path: str, **form: str) -> int:
        """Send a form until what it needs is done."""
        data = urllib.parse.urlencode({"token": self.token, **form}).encode()
        return self.until(lambda: self.ask(path, data)[0])

    def until(self, ask: Callable[[], int]) -> int:
        """Ask until the answer is not that the work is under way."""
        while (code := ask()) == 202:
            time.sleep(0.5)
        return code

    def bring(self, data: bytes) -> str:
        """Bring a list; give the path of its plan."""
        line = "limit-of-the-parts"
        head = f'--{line}\r\nContent-Disposition: form-data; name="'
        body = f'{head}token"\r\n\r\n{self.token}\r\n{head}file"; filename="register.csv"\r\n\r\n'.encode()
        self.ask(
            "/plans", body + data + f"\r\n--{line}--\r\n".encode(), f"multipart/form-data; boundary={line}"
        )
        return self.at.removesuffix("/list")


def look(browser: Browser, plan: str, until: Callable[[], bool]) -> list[float]:
    """Look at the pages of a plan until something is so; give the milliseconds of each."""
    times = []
    while not until():
        for page in PAGES:
            begin = time.perf_counter()
            code, _ = browser.ask(f"{plan}/{page}")
            times.append(1000 * (time.perf_counter() - begin))
            assert code == 200, code
            time.sleep(0.05)
    return times


def tell(what: str, times: list[float], seconds: float) -> None:
    """Print what was measured."""
    middle, slow = np.percentile(times, [50, 95])
    print(f"{what:28s} {seconds:7.1f} s  {len(times):5d} pages", end="")
    print(f"  median {middle:6.0f} ms, 95 of 100 in {slow:6.0f} ms, longest {max(times):6.0f} ms", flush=True)


def beside(what: str, short: tuple[Browser, str], work: Callable[[], object]) -> None:
    """Look at a short plan while something long is done, and print how long its pages took."""
    begin = time.perf_counter()
    thread = threading.Thread(target=work)
    thread.start()
    times = look(*short, lambda: not thread.is_alive())
    tell(what, times, time.perf_counter() - begin)


def main(rows: int) -> None:
    """Run the benchmark."""
    with tempfile.TemporaryDirectory() as folder:
        command = [sys.executable, "-m", "cant", "serve", "--port", "0"]
        given = {**os.environ, "CANT_DATA": folder, "CANT_ACCESS_LOG": str(Path(folder) / "access")}
        with subprocess.Popen(command, env=given, stderr=subprocess.PIPE, text=True) as service:
            assert service.stderr is not None
            base = next(found.group(1) for line in service.stderr if (found := READY.search(line)))
            threading.Thread(target=service.stderr.read, daemon=True).start()
            try:
                measure(base, rows)
            finally:
                service.terminate()


def measure(base: str, rows: int) -> None:
    """Measure a running service."""
    short, long = Browser(base), Browser(base)
    short.post("/plans/sample")
    mine = (short, short.at.removesuffix("/cants"))
    end = time.perf_counter() + ALONE_S
    tell("alone", look(*mine, lambda: time.perf_counter() > end), ALONE_S)
    plan = ""

    def bring() -> None:
        nonlocal plan
        plan = long.bring(register(rows))
        long.until(lambda: long.ask(f"{plan}/list")[0])
        long.post(f"{plan}/trains", **TRAINS)
        long.post(f"{plan}/limits/choose", source="set:typical")
        long.post(f"{plan}/confirm")
        long.until(lambda: long.ask(f"{plan}/cants")[0])

    beside(f"reading and planning {rows}", mine, bring)
    beside("its pages looked at", mine, lambda: [long.ask(f"{plan}/{page}") for page in PAGES])
    beside("its workbook", mine, lambda: long.until(lambda: long.ask(f"{plan}/workbook")[0]))
    beside("its JSON", mine, lambda: long.until(lambda: long.ask(f"{plan}/plan.json")[0]))
    beside("its JSON taken away", mine, lambda: long.ask(f"{plan}/plan.json"))


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 20_000)
