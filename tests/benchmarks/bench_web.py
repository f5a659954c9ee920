"""Time the pages of a long register, as a browser asks for them; run by hand.

``python tests/benchmarks/bench_web.py [ROWS]`` makes a register of 20,000 rows (or as told), brings it, plans
it, and prints how long each page takes the second time: a page must cost what it shows, not what the plan is.
"""

from __future__ import annotations

import io
import re
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from flask import Flask
from werkzeug.test import TestResponse

from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.working.worker import do_waiting

HEADER = "Line,Track,Curve,Start (km),End (km),Radius (m),Hand,Transition in,Transition out,Cant,Speed"
COMMON = {"trains_per_day": "20", "mass_t": "900", "regular": "yes"}
CLASSES = (
    {"name": "Express", "category": "passenger", "speed_kmh": "160", **COMMON},
    {"name": "Goods", "category": "freight", "speed_kmh": "80", **COMMON},
)
TRAINS = {
    "rows": "2",
    "units": "metric",
    **{f"{n}-{key}": value for n, row in enumerate(CLASSES) for key, value in row.items()},
}
PAGES = (
    "cants",
    "cants?sort=change&order=falling",
    "cants?search=c12",
    "cants?size=250",
    "line?page=20",
    "findings",
    "curves/777",
    "print",
    "curves/777/at?cant=60",
    "curves/777/held?cant=60",
    "history",
    "compare?from=2&to=3",
)
LIVE_ASKED = 200


def register(rows: int) -> bytes:
    """Make a register of some rows, 2000 curves a line."""
    rng = np.random.default_rng(3)
    lines = [HEADER]
    for i in range(rows):
        start = (i % 2000) * 1.2 + rng.uniform(0, 0.3)
        radius, length = rng.choice([400, 500, 600, 800, 1000, 1500, 2000]), rng.uniform(0.15, 0.5)
        ramps, hand = rng.choice([60, 80, 100], 2), rng.choice(["L", "R"])
        lines.append(
            f"L{i // 2000},1,C{i},{start:.3f},{start + length:.3f},{radius},{hand},{ramps[0]},{ramps[1]},"
            f"{rng.choice([50, 60, 80, 100])},{rng.choice([80, 100, 120])}"
        )
    return "\n".join(lines).encode()


def timed(app: Flask, name: str, ask: Callable[[], TestResponse]) -> TestResponse:
    """Print how long an answer takes, and before it how long the work that it needs in the background."""
    begin = time.perf_counter()
    while (answer := ask()).status_code == 202:
        parts = app.extensions[EXTENSION]
        do_waiting(parts.config, parts.database)
        print(f"{name + ', in the background':36s} {1000 * (time.perf_counter() - begin):9.0f} ms")
        begin = time.perf_counter()
    print(f"{name:36s} {1000 * (time.perf_counter() - begin):9.0f} ms  {answer.status_code}")
    return answer


def main(rows: int) -> None:
    """Run the benchmark."""
    with tempfile.TemporaryDirectory() as folder:
        app = create_app({"CANT": Config(Path(folder))})
        client = app.test_client()
        found = re.search(r'name="token" value="([^"]+)"', client.get("/").text)
        token = {"token": found.group(1) if found else ""}
        file = (io.BytesIO(register(rows)), "register.csv")
        plan = timed(app, "bring", lambda: client.post("/plans", data={**token, "file": file})).headers[
            "Location"
        ]
        plan = plan.removesuffix("/list")
        timed(app, "list", lambda: client.get(f"{plan}/list"))
        timed(app, "trains", lambda: client.post(f"{plan}/trains", data={**token, **TRAINS}))
        timed(
            app,
            "limits",
            lambda: client.post(f"{plan}/limits/choose", data={**token, "source": "set:typical"}),
        )
        timed(app, "plan", lambda: client.post(f"{plan}/confirm", data=token))
        compared = {**token, "source": "set:typical", "compare": "1"}
        timed(app, "compare", lambda: client.post(f"{plan}/limits/choose", data=compared))
        for page in PAGES:
            timed(app, f"{page} (first)", lambda page=page: client.get(f"{plan}/{page}"))
            timed(app, page, lambda page=page: client.get(f"{plan}/{page}"))
        times = []
        for i in range(LIVE_ASKED):
            begin = time.perf_counter()
            client.get(f"{plan}/curves/{700 + i // 20}/at?cant={5 * (i % 20)}")
            times.append(1000 * (time.perf_counter() - begin))
        slow = np.percentile(times, 95)
        print(f"the slider moved: median {np.median(times):.1f} ms, 95 of 100 in {slow:.1f} ms")
        app.extensions[EXTENSION].database.close()


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 20_000)
