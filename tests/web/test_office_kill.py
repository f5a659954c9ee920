"""The service killed without warning: after each restart every plan is whole or offered again.

The real command in its own process group, killed at random moments of upload, planning and decision; and its
worker, which never outlives it, puts back what it cannot finish, and stops what was cancelled.
"""

from __future__ import annotations

import hashlib
import json
import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import closing
from pathlib import Path

import pytest
from flask import Flask
from kill_tools import Client, Known, Service, at_work, curve_list
from sqlalchemy import func, select
from web_tools import Browser
from work_tools import EVERYTHING, parts_of, work_off, worked

from webapp.keeping.database import Database
from webapp.keeping.records import FileRow, PlanRow, ResultRow, WorkRow
from webapp.keeping.work import CANCELLED, DONE, FAILED, UNDER_WAY, WAITING

KILLS = 20
SEED = 20
LONGEST_S = {"upload": 0.1, "planning": 1.5, "decision": 0.1}
"""A kill comes at a random moment up to so long after the beginning of an activity."""
LONG_KB = "2"


@pytest.fixture
def environment(database_url: str, tmp_path: Path) -> dict[str, str]:
    given = {"CANT_DATA": str(tmp_path / "data"), "CANT_LONG_FILE_KB": LONG_KB, "CANT_WORKERS": "1"}
    return {**given, "CANT_DATABASE": database_url}


def check_file(database_url: str) -> None:
    """Let SQLite itself look through its file as the kill left it."""
    if not database_url.startswith("sqlite"):
        return
    with closing(sqlite3.connect(database_url.removeprefix("sqlite:///"))) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
        assert connection.execute("PRAGMA foreign_key_check").fetchall() == []


def check_plan(client: Client, address: str, known: Known) -> None:
    """Let a plan be there whole: its reading or that it waits, and every decision that was confirmed."""
    code, found = client.call("GET", f"/plans/{address}")
    if known.deleted and code == 404:
        return
    assert code == 200, found
    assert json.loads(found)["sha256"] == hashlib.sha256(known.data).hexdigest()
    code, found = client.call("GET", f"/plans/{address}/history")
    assert code == 200, found
    reasons = [step["reason"] for step in json.loads(found)["steps"]]
    assert [r for r in reasons if r in known.decided] == known.decided
    code, found = client.call("GET", f"/plans/{address}/curves")
    assert code in (200, 202), found


def check_all(client: Client, port: int) -> None:
    """Let everything that was confirmed be there, and nothing be there by half."""
    client.port = port
    for address, known in client.plans.items():
        check_plan(client, address, known)
    if client.key is None:
        return
    code, found = client.call("GET", "/plans")
    assert code == 200
    sent = {hashlib.sha256(data).hexdigest() for data in client.sent}
    for plan in json.loads(found)["plans"]:
        assert plan["sha256"] in sent, "a plan that nobody sent"


def check_rows(database_url: str) -> None:
    """Let every plan have its file, byte for byte, and no work have failed."""
    database = Database(database_url.replace("postgresql:", "postgresql+psycopg:"))
    with database.sessions() as session:
        for digest, size, data in session.execute(
            select(PlanRow.file_digest, PlanRow.file_size, FileRow.data).join_from(
                PlanRow, FileRow, isouter=True
            )
        ):
            assert data is not None
            assert (hashlib.sha256(data).hexdigest(), len(data)) == (digest, size)
        assert session.scalar(select(func.count()).select_from(FileRow)) == session.scalar(
            select(func.count()).select_from(PlanRow)
        )
        states = set(session.scalars(select(WorkRow.state)))
        assert FAILED not in states, session.scalars(select(WorkRow.message)).all()
    database.close()


def test_killed_at_any_moment_nothing_confirmed_is_lost(
    environment: dict[str, str], database_url: str, tmp_path: Path
) -> None:
    rng = random.Random(SEED)
    client = Client(rng)
    moments = [list(LONGEST_S)[i % len(LONGEST_S)] for i in range(KILLS)]
    rng.shuffle(moments)
    service = Service(environment, tmp_path)
    try:
        for moment in moments:
            service.begin()
            check_all(client, service.port)
            following = Service(environment, tmp_path)
            try:
                with at_work(client, service.port):
                    assert client.began[moment].wait(60), f"no {moment} began"
                    time.sleep(rng.uniform(0, LONGEST_S[moment]))
                    service.kill_group()
            finally:
                service.kill_group()
                service = following
            check_file(database_url)
        service.begin()
        check_all(client, service.port)
        for address in [a for a, known in client.plans.items() if not known.deleted]:
            assert client.plan(address) == 200, "what was under way is taken up again"
        check_rows(database_url)
    finally:
        service.kill_group()
    assert len(client.plans) > 3
    assert any(known.decided for known in client.plans.values())


def children_of(process: int) -> list[int]:
    """Give the processes that a process has begun and that live."""
    threads = Path(f"/proc/{process}/task").glob("*/children")
    return [int(word) for path in threads for word in path.read_text().split()]


def lives(process: int) -> bool:
    """Tell whether a process lives; one that nobody has fetched yet does not."""
    try:
        return Path(f"/proc/{process}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


def until(condition: Callable[[], bool], what: str, seconds: float = 300) -> None:
    """Wait until something is so."""
    end = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < end, f"never: {what}"
        time.sleep(0.05)


class Bench:
    """A long list whose workbook is asked for, and the process that makes it."""

    def __init__(self, app: Flask, folder: Path, environment: dict[str, str], curves: int = 1_000) -> None:
        self.app, self.browser = app, Browser(app)
        self.environment = {**environment, "CANT_LONG_FILE_KB": "0", "CANT_LONG_CURVES": "1"}
        file = folder / "long.csv"
        file.write_bytes(curve_list(curves, random.Random(1)))
        self.path = self.browser.upload(file)
        traffic = {"0-name": "Fast", "0-category": "passenger", "0-speed_kmh": "120", "0-regular": "yes"}
        self._post("trains", {"rows": "1", "units": "metric", **traffic})
        self._post("limits/choose", {"source": "set:typical"})
        self._post("confirm", {})

    def _post(self, page: str, form: dict[str, str]) -> None:
        assert worked(self.app, lambda: self.browser.post(f"{self.path}/{page}", form)).status_code == 303

    def ask(self) -> str:
        """Ask for the workbook; give the address of its work."""
        answer = self.browser.get(f"{self.path}/workbook")
        assert answer.status_code == 302, answer.text
        return str(answer.headers["Location"]).split("?")[0]

    def row(self) -> WorkRow:
        """Give the row of the workbook's work."""
        with parts_of(self.app).database.sessions() as session:
            return session.scalars(select(WorkRow).where(WorkRow.kind == "workbook")).one()

    def is_under_way(self) -> bool:
        """Tell whether some of it is done."""
        row = self.row()
        return row.state == UNDER_WAY and row.share > 0


@pytest.fixture
def bench(
    start: Callable[..., Flask], environment: dict[str, str], database_url: str, tmp_path: Path
) -> Bench:
    return Bench(start(database_url, work=EVERYTHING), tmp_path, environment)


@pytest.fixture
def begin() -> Iterator[Callable[..., subprocess.Popen[bytes]]]:
    """Give a function that starts a process."""
    begun: list[subprocess.Popen[bytes]] = []

    def start_process(module: str, environment: dict[str, str], *words: str) -> subprocess.Popen[bytes]:
        command = [sys.executable, "-m", module, *words]
        given = {"PATH": "/usr/bin:/bin", **environment}
        begun.append(subprocess.Popen(command, env=given, stderr=subprocess.DEVNULL))
        return begun[-1]

    yield start_process
    for process in begun:
        process.kill()
        process.wait()


def test_the_worker_stops_what_is_cancelled_and_puts_back_what_it_leaves(
    bench: Bench, begin: Callable[..., subprocess.Popen[bytes]]
) -> None:
    work = bench.ask()
    worker = begin("webapp.working", bench.environment)
    until(bench.is_under_way, "under way")
    (child,) = children_of(worker.pid)
    assert os.getpriority(os.PRIO_PROCESS, child) > 0, "what is long gives way to who waits"
    bench.browser.get(work)
    assert bench.browser.post(f"{work}/stop").status_code == 409
    until(lambda: not lives(child), "the process of what was cancelled ends")
    assert bench.row().state == CANCELLED
    assert bench.browser.post(f"{work}/again").status_code == 303
    until(bench.is_under_way, "under way again")
    (child,) = children_of(worker.pid)
    os.kill(child, signal.SIGKILL)
    until(lambda: bench.row().attempts == 2 and bench.is_under_way(), "a process that died is followed")
    (child,) = children_of(worker.pid)
    worker.send_signal(signal.SIGTERM)
    assert worker.wait(timeout=20) == 0
    assert not lives(child)
    row = bench.row()
    assert (row.state, row.attempts, row.worker) == (WAITING, 1, "")
    begin("webapp.working", bench.environment)
    until(lambda: bench.row().state == DONE, "done in the end")
    assert bench.browser.get(f"{bench.path}/workbook").status_code == 200


def test_a_plan_deleted_while_its_work_is_under_way_ends_it(
    bench: Bench, begin: Callable[..., subprocess.Popen[bytes]]
) -> None:
    bench.ask()
    worker = begin("webapp.working", bench.environment)
    until(bench.is_under_way, "under way")
    (child,) = children_of(worker.pid)
    bench.browser.get("/")
    assert bench.browser.post(f"{bench.path}/delete").status_code == 303
    until(lambda: not lives(child), "its process ends")
    with parts_of(bench.app).database.sessions() as session:
        assert session.scalars(select(ResultRow.id)).all() == []
        assert session.scalars(select(WorkRow.id)).all() == []
    assert worker.poll() is None


def test_no_worker_outlives_the_service(bench: Bench, begin: Callable[..., subprocess.Popen[bytes]]) -> None:
    bench.ask()
    service = begin("cant", bench.environment, "serve", "--port", "0")
    until(bench.is_under_way, "under way")
    (worker,) = children_of(service.pid)
    (child,) = children_of(worker)
    service.kill()
    service.wait()
    until(lambda: not lives(worker) and not lives(child), "worker and its process end", 20)
    until(lambda: bench.row().state == WAITING, "what was under way is put back", 20)
    assert work_off(bench.app) == 1


def test_a_worker_that_dies_is_replaced(
    start: Callable[..., Flask],
    environment: dict[str, str],
    database_url: str,
    tmp_path: Path,
    begin: Callable[..., subprocess.Popen[bytes]],
) -> None:
    bench = Bench(start(database_url, work=EVERYTHING), tmp_path, environment, curves=20)
    service = begin("cant", bench.environment, "serve", "--port", "0")
    until(lambda: bool(children_of(service.pid)), "a worker")
    (worker,) = children_of(service.pid)
    os.kill(worker, signal.SIGKILL)
    until(lambda: children_of(service.pid) not in ([], [worker]), "another worker")
    bench.ask()
    until(lambda: bench.row().state == DONE, "it works")
    service.send_signal(signal.SIGTERM)
    assert service.wait(timeout=60) == 0


def test_work_is_bounded_in_memory_and_time(
    bench: Bench, begin: Callable[..., subprocess.Popen[bytes]]
) -> None:
    work = bench.ask()
    worker = begin("webapp.working", {**bench.environment, "CANT_WORK_MB": "300"})
    until(lambda: bench.row().state == FAILED, "too large")
    assert "300 MB" in bench.row().message
    assert worker.poll() is None
    assert "300 MB" in bench.browser.get(work).text
