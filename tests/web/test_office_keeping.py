"""What the database keeps and what it lets go: room, expiry that deletes, backup, migration."""

from __future__ import annotations

import io
import os
import sqlite3
import subprocess
import sys
import threading
from collections.abc import Callable
from datetime import UTC, datetime, timedelta
from pathlib import Path
from types import SimpleNamespace

import psycopg
import pytest
from alembic import command
from alembic.config import Config as AlembicConfig
from flask import Flask
from sqlalchemy import create_engine, select, text, update
from web_tools import TRAINS, Browser

from cant.errors import FileError, InputError
from webapp.busy import FullError
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.guarding.bounds import Bounds
from webapp.guarding.cleaning import Cleaner
from webapp.keeping import backup
from webapp.keeping.database import MIGRATIONS, Database
from webapp.keeping.records import FileRow, PlanRow
from webapp.keeping.store import Store

Start = Callable[..., Flask]
MARK = "Zyxwvut-marker-of-this-test"
ROWS = f"Curve,Radius (m),Speed (km/h)\n{MARK},500,80\n".encode()
FAR = [f"F{n},{500 + n},80\n" for n in range(4000)]


def bring(browser: Browser, rows: bytes = ROWS, name: str = "a.csv") -> str:
    answer = browser.post("/plans", {"file": (io.BytesIO(rows), name)})
    assert answer.status_code == 303, answer.text
    return answer.headers["Location"].removesuffix("/list")


def bytes_of(folder: Path) -> bytes:
    return b"".join(path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file())


def in_tables(database_url: str, wanted: str) -> bool:
    """Tell whether a text stands in any row of any table."""
    engine = create_engine(database_url.replace("postgresql:", "postgresql+psycopg:"))
    try:
        with engine.connect() as connection:
            for table in ("plans", "files", "decisions", "kept_limits", "results", "work", "shares"):
                for row in connection.execute(text(f"SELECT * FROM {table}")):  # noqa: S608
                    if any(wanted.encode() in (v if isinstance(v, bytes) else str(v).encode()) for v in row):
                        return True
    finally:
        engine.dispose()
    return False


@pytest.mark.parametrize("how", ["deleted by its owner", "expired"])
def test_what_is_deleted_is_in_no_file_any_more(
    start: Start, database_url: str, tmp_path: Path, how: str
) -> None:
    app = start(database_url)
    browser = Browser(app)
    plan = bring(browser)
    browser.post(f"{plan}/trains", {**TRAINS, "0-name": MARK})
    running = app.extensions[EXTENSION]
    embedded = database_url.startswith("sqlite")
    assert in_tables(database_url, MARK)
    if embedded:
        assert MARK.encode() in bytes_of(tmp_path)
    if how == "expired":
        with running.database.sessions.begin() as session:
            session.execute(update(PlanRow).values(expires=datetime.now(UTC) - timedelta(seconds=1)))
        assert running.store.remove_expired() == 1
    else:
        assert browser.post(f"{plan}/delete").status_code == 303
    assert not in_tables(database_url, MARK)
    if embedded:
        assert MARK.encode() not in bytes_of(tmp_path)
        with running.database.engine.connect() as connection:
            assert connection.execute(text("PRAGMA secure_delete")).scalar() == 1


def test_what_a_reader_keeps_from_being_cleared_away_is_cleared_later(start: Start, tmp_path: Path) -> None:
    app = start()
    browser, running = Browser(app), app.extensions[EXTENSION]
    plan = bring(browser)
    reader = running.database.engine.connect()
    reader.execute(text("SELECT count(*) FROM plans"))
    assert browser.post(f"{plan}/delete").status_code == 303
    assert running.database.must_clear
    assert MARK.encode() in bytes_of(tmp_path / "data")
    reader.close()
    running.clean()  # the hour is not over, but this waits
    assert not running.database.must_clear
    assert MARK.encode() not in bytes_of(tmp_path / "data")


def test_cleaning_needs_no_requests() -> None:
    called = threading.Event()
    cleaner = Cleaner(called.set, every_s=0.01)
    cleaner.start()
    assert called.wait(10)
    cleaner.stop()


def test_files_are_the_owners_alone(start: Start, tmp_path: Path) -> None:
    (tmp_path / "data").parent.mkdir(exist_ok=True)
    before = os.umask(0)
    try:
        browser = Browser(start())
        bring(browser)
        folder = tmp_path / "data"
        assert folder.stat().st_mode & 0o777 == 0o700
        kept = {path.name: path.stat().st_mode & 0o777 for path in folder.iterdir()}
    finally:
        os.umask(before)
    assert {"plans.sqlite3", "plans.sqlite3-wal", "signing-key"} <= set(kept)
    assert set(kept.values()) == {0o600}


@pytest.mark.parametrize(
    ("bounds", "words"),
    [
        ({"plans_per_person": 2}, "2 plans already"),
        ({"mb_per_person": 1}, "1 MB together"),
        ({"mb_in_all": 1}, "service is full"),
    ],
)
def test_what_has_no_room_is_refused_whole(
    start: Start, database_url: str, bounds: dict[str, int], words: str
) -> None:
    app = start(database_url, bounds=Bounds(**bounds))
    browser = Browser(app)
    rows = ROWS if "plans_per_person" in bounds else ROWS + b"," * 450_000
    for _ in range(2):
        bring(browser, rows)
    answer = browser.post("/plans", {"file": (io.BytesIO(rows), "a.csv")})
    assert answer.status_code == 507
    assert words in answer.text
    assert "delete" in answer.text
    api = browser.client.post("/api/v1/plans", data={"file": (io.BytesIO(rows), "a.csv")})
    assert api.status_code == 507
    assert api.json is not None
    assert words in api.json["error"]["message"]
    with app.extensions[EXTENSION].database.sessions() as session:
        assert len(session.scalars(select(PlanRow)).all()) == 2
        assert len(session.scalars(select(FileRow.plan_id)).all()) == 2
    if "mb_in_all" not in bounds:
        assert Browser(app).post("/plans", {"file": (io.BytesIO(ROWS), "a.csv")}).status_code == 303
    plan = browser.get("/api/v1/plans").json["plans"][0]["address"]
    browser.post(f"/plans/{plan}/delete")
    bring(browser, rows)


def test_bounds_hold_when_two_come_at_once(start: Start, database_url: str) -> None:
    store: Store = start(database_url, bounds=Bounds(plans_per_person=3)).extensions[EXTENSION].store
    refused: list[FullError] = []

    def add() -> None:
        try:
            store.add("anna", "a.csv", b"x")
        except FullError as error:
            refused.append(error)

    threads = [threading.Thread(target=add) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(store.plans("anna")) == 3
    assert len(refused) == 5


def test_the_bound_of_all_holds_when_several_come_at_once(start: Start, database_url: str) -> None:
    store: Store = start(database_url, bounds=Bounds(mb_in_all=1)).extensions[EXTENSION].store
    together = threading.Barrier(8)
    refused: list[FullError] = []

    def add(owner: str) -> None:
        together.wait()
        try:
            store.add(owner, "a.csv", b"x" * 400_000)
        except FullError as error:
            refused.append(error)

    owners = [f"owner {n}" for n in range(8)]
    threads = [threading.Thread(target=add, args=(owner,)) for owner in owners]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sum(len(store.plans(owner)) for owner in owners) == 2
    assert len(refused) == 6


def test_decisions_and_kept_limits_have_no_room_without_end(start: Start, database_url: str) -> None:
    app = start(database_url, bounds=Bounds(mb_decided_per_person=1))
    browser = Browser(app)
    rows = [{"quantity": "cant", "normal": 150, "unit": "mm", "note": "n" * 300} for _ in range(1000)]
    plan = browser.client.post("/api/v1/plans", data={"file": (io.BytesIO(ROWS), "a.csv")}).json["address"]
    codes = [
        browser.client.put(
            f"/api/v1/plans/{plan}/limits", json={"name": f"own {n}", "rows": rows}
        ).status_code
        for n in range(3)
    ]
    assert codes == [200, 507, 507]
    assert browser.client.get(f"/api/v1/plans/{plan}").json["steps"] == 2
    kept = app.extensions[EXTENSION].kept_limits
    with browser.client.session_transaction() as session:
        owner = session["owner"]
    limits = app.extensions[EXTENSION].store.plan(owner, plan).decided.limits
    with pytest.raises(FullError, match="kept limits"):
        kept.keep(owner, "mine", limits)
    kept.keep("somebody else", "mine", limits)
    with pytest.raises(FullError):
        kept.keep("somebody else", "mine too", limits)
    kept.keep("somebody else", "mine", limits)
    assert [one.name for one in kept.of("somebody else")] == ["mine"]
    browser.post(f"/plans/{plan}/delete")
    kept.keep(owner, "mine", limits)


def test_a_full_disk_refuses_a_decision(start: Start, monkeypatch: pytest.MonkeyPatch) -> None:
    browser = Browser(start())
    plan = bring(browser)
    monkeypatch.setattr(
        "webapp.keeping.room.shutil.disk_usage", lambda _folder: SimpleNamespace(free=200_000_000)
    )
    path = plan.replace("/plans/", "/api/v1/plans/")
    assert browser.client.put(f"{path}/settings", json={"method": "balanced"}).status_code == 507
    assert browser.client.get(path).json["decided"] == []


def test_decisions_at_the_same_moment_all_hold(start: Start, database_url: str) -> None:
    store: Store = start(database_url).extensions[EXTENSION].store
    plan = store.add("anna", "a.csv", b"x")
    problems: list[BaseException] = []

    def decide(number: int) -> None:
        try:
            store.decide("anna", plan.address, {"answers": f'{{"a": {number}}}'})
        except BaseException as error:
            problems.append(error)

    threads = [threading.Thread(target=decide, args=(number,)) for number in range(12)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert problems == []
    assert len(store.plan("anna", plan.address).history) == 12


def test_a_full_disk_refuses_an_upload_and_stores_nothing(
    start: Start, monkeypatch: pytest.MonkeyPatch
) -> None:
    app = start()
    browser = Browser(app)
    monkeypatch.setattr(
        "webapp.keeping.room.shutil.disk_usage", lambda _folder: SimpleNamespace(free=200_000_000)
    )
    answer = browser.post("/plans", {"file": (io.BytesIO(ROWS), "a.csv")})
    assert answer.status_code == 507
    assert "no room left on the disk" in answer.text
    assert browser.get("/api/v1/plans").json["plans"] == []


def test_a_database_that_is_held_is_busy_and_one_that_is_full_says_so(
    start: Start, monkeypatch: pytest.MonkeyPatch
) -> None:
    from sqlalchemy.exc import OperationalError

    app = start()
    browser = Browser(app)
    store = app.extensions[EXTENSION].store
    for words, code in (("database is locked", 503), ("database or disk is full", 507), ("other", 500)):

        def fails(*_given: object, words: str = words) -> None:
            statement = "INSERT"
            raise OperationalError(statement, {}, sqlite3.OperationalError(words))

        monkeypatch.setattr(store, "add", fails)
        answer = browser.post("/plans", {"file": (io.BytesIO(ROWS), "a.csv")})
        assert answer.status_code == code
        assert words not in answer.text
        assert ("Retry-After" in answer.headers) is (code == 503)


def test_backup_while_others_write_is_whole_and_can_be_used(start: Start, tmp_path: Path) -> None:
    app = start()
    store: Store = app.extensions[EXTENSION].store
    known: dict[str, bytes] = {}
    stop = threading.Event()

    def write() -> None:
        number = 0
        while not stop.is_set():
            number += 1
            data = f"{number};".encode() * 20_000
            known[store.add("anna", f"{number}.csv", data, {"confirmed": "true"}).address] = data

    writer = threading.Thread(target=write)
    writer.start()
    try:
        while len(known) < 5:
            pass
        first = set(known)
        copies = [tmp_path / f"copy-{n}.sqlite3" for n in range(3)]
        for copy in copies:
            backup.back_up(tmp_path / "data" / "plans.sqlite3", copy)
    finally:
        stop.set()
        writer.join()
    for copy in copies:
        assert copy.stat().st_mode & 0o777 == 0o600
        restored = start(f"sqlite:///{copy}").extensions[EXTENSION].store
        plans = restored.plans("anna")
        assert first <= {plan.address for plan in plans} <= set(known)
        for plan in plans:
            assert restored.file("anna", plan.address) == known[plan.address]
            assert plan.decided.confirmed
    assert sorted(path.name for path in tmp_path.glob(".copy*")) == []


def test_the_backup_command(start: Start, tmp_path: Path) -> None:
    browser = Browser(start())
    plan = bring(browser)
    environment = {"CANT_DATA": str(tmp_path / "data"), "PATH": "/usr/bin:/bin"}
    copy = tmp_path / "copy.sqlite3"

    def run(*options: str, **more: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "cant", "backup", str(copy), *options],
            env={**environment, **more},
            capture_output=True,
            text=True,
            check=False,
        )

    done = run()
    assert done.returncode == 0, done.stderr
    assert "1 plans, checked" in done.stdout
    assert "signing-key" in done.stdout
    before = copy.read_bytes()
    again = run()
    assert again.returncode == 2
    assert "--replace" in again.stderr
    assert copy.read_bytes() == before
    assert run("--replace").returncode == 0
    server = run("--replace", CANT_DATABASE="postgresql://anna:secret@db/plans")
    assert server.returncode == 2
    assert "pg_dump" in server.stderr
    assert "secret" not in server.stderr
    assert plan.split("/")[2].encode() in copy.read_bytes()


def test_backup_refuses_what_it_cannot_do(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="no database here"):
        backup.back_up(tmp_path / "none.sqlite3", tmp_path / "copy")
    damaged = tmp_path / "damaged.sqlite3"
    damaged.write_bytes(b"SQLite format 3\x00" + b"x" * 5000)
    with pytest.raises(FileError, match="could not be copied"):
        backup.back_up(damaged, tmp_path / "copy")
    with pytest.raises(FileError, match="folder"):
        backup.back_up(damaged, tmp_path, replace=True)
    with pytest.raises(FileError, match="already"):
        backup.back_up(damaged, damaged, replace=True)
    assert not (tmp_path / "copy").exists()
    with pytest.raises(InputError, match="pg_dump"):
        backup.embedded_file(Config(tmp_path, "postgresql://db/plans"))


def test_processes_that_start_together_on_a_new_file_all_come_up(tmp_path: Path) -> None:
    code = (
        "import sys; from pathlib import Path\n"
        "from webapp.app import create_app; from webapp.config import Config\n"
        "app = create_app(Config(Path(sys.argv[1])))\n"
        "print(app.secret_key)"
    )
    processes = [
        subprocess.Popen(
            [sys.executable, "-c", code, str(tmp_path / "data")],
            stdout=subprocess.PIPE,
            stderr=subprocess.PIPE,
            text=True,
        )
        for _ in range(3)
    ]
    said = [process.communicate(timeout=120) for process in processes]
    assert [process.returncode for process in processes] == [0, 0, 0], said
    assert len({out for out, _ in said}) == 1


def test_threads_that_start_together_on_a_new_database_all_come_up(database_url: str) -> None:
    url = database_url.replace("postgresql:", "postgresql+psycopg:")
    made: list[Database] = []
    threads = [threading.Thread(target=lambda: made.append(Database(url))) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(made) == 4
    for database in made:
        database.close()


@pytest.mark.parametrize("revision", ["0001", "0002"])
def test_an_older_database_is_brought_up_to_date_and_keeps_all(
    start: Start, database_url: str, revision: str
) -> None:
    url = database_url.replace("postgresql:", "postgresql+psycopg:")
    engine = create_engine(url)
    config = AlembicConfig()
    config.set_main_option("script_location", str(MIGRATIONS))
    config.set_main_option("path_separator", "os")
    now, later = datetime.now(UTC), datetime.now(UTC) + timedelta(days=9)
    with engine.connect() as connection:
        config.attributes["connection"] = connection
        command.upgrade(config, revision)
        values = {"now": now, "later": later, "data": ROWS, "size": len(ROWS)}
        connection.execute(
            text(
                "INSERT INTO plans (id, address, owner, name, file_name, file_digest, file_size,"
                " created, changed, expires)"
                " VALUES (1, 'old-address', 'anna', 'Old', 'old.csv', 'd', :size, :now, :now, :later)"
            ),
            values,
        )
        connection.execute(text("INSERT INTO files (plan_id, data) VALUES (1, :data)"), values)
        who = ("who, ", "'A. Brenn', ") if revision == "0002" else ("", "")
        connection.execute(
            text(
                f"INSERT INTO decisions (plan_id, number, kind, content, reason, {who[0]}made)"  # noqa: S608
                f" VALUES (1, 0, 'confirmed', 'true', 'as agreed', {who[1]}:now)"
            ),
            values,
        )
        connection.commit()
    engine.dispose()
    store: Store = start(database_url).extensions[EXTENSION].store
    (plan,) = store.plans("anna")
    assert (plan.address, plan.name, plan.decided.confirmed) == ("old-address", "Old", True)
    assert abs(plan.expires - later) < timedelta(seconds=1)
    assert [(d.reason, d.who) for d in plan.history] == [
        ("as agreed", "A. Brenn" if revision == "0002" else "")
    ]
    assert store.file("anna", "old-address") == ROWS
    assert store.rename("anna", "old-address", "New").name == "New"


def test_a_newer_database_is_told_in_one_line(start: Start, database_url: str) -> None:
    database = start(database_url).extensions[EXTENSION].database
    with database.sessions.begin() as session:
        session.execute(text("UPDATE alembic_version SET version_num = '9999'"))
    with pytest.raises(FileError, match="newer version"):
        Database(database.engine.url.render_as_string(hide_password=False))


@pytest.mark.postgresql
def test_a_server_that_goes_away_is_busy_and_then_there_again(
    start: Start, postgresql: str, tmp_path: Path
) -> None:
    name = f"gone{abs(hash(str(tmp_path)))}"
    with psycopg.connect(f"host={postgresql} user=cant dbname=postgres", autocommit=True) as connection:
        connection.execute(f'CREATE DATABASE "{name}"')
        app = start(f"postgresql://cant@/{name}?host={postgresql}")
        browser = Browser(app)
        assert browser.get("/").status_code == 200
        connection.execute(f'ALTER DATABASE "{name}" WITH ALLOW_CONNECTIONS false')
        end = "SELECT pg_terminate_backend(pid) FROM pg_stat_activity WHERE datname = %s"
        connection.execute(end, (name,))
        assert browser.get("/readyz").status_code == 503
        answer = browser.get("/")
        assert answer.status_code == 503
        assert "Retry-After" in answer.headers
        connection.execute(f'ALTER DATABASE "{name}" WITH ALLOW_CONNECTIONS true')
        assert browser.get("/").status_code == 200
