"""The service for tests: on SQLite and on PostgreSQL, with browsers that keep their cookies."""

from __future__ import annotations

import os
import shutil
import subprocess
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import psycopg
import pytest
from flask import Flask
from people_tools import made
from playwright.sync_api import Browser as Chromium
from playwright.sync_api import BrowserContext, sync_playwright
from screen_tools import ARGUMENTS, SCREENS, Visit, Visitor
from web_tools import CURVES, Browser, served

from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION
from webapp.people.settings import SignIn


@pytest.fixture(scope="session")
def postgresql() -> Iterator[str]:
    """Run a PostgreSQL server of our own, as an unprivileged user, for the time of the tests."""
    programs = Path(shutil.which("initdb") or max(Path("/usr/lib/postgresql").glob("*/bin/initdb"))).parent
    place = Path(tempfile.mkdtemp(prefix="cant-pg-", dir="/tmp"))  # a short path: a socket's name is limited
    as_user: dict[str, Any] = {"cwd": place}
    if os.geteuid() == 0:
        shutil.chown(place, "nobody")
        as_user["user"] = "nobody"
    data, log = place / "data", place / "log"
    quiet = {"stdout": subprocess.DEVNULL, "stderr": subprocess.DEVNULL, "check": True}
    subprocess.run(
        [programs / "initdb", "-D", data, "-U", "cant", "-A", "trust", "-E", "UTF8", "--locale=C", "-N"],
        **quiet,
        **as_user,
    )
    options = f"-c listen_addresses='' -c unix_socket_directories={place} -c fsync=off"
    subprocess.run(
        [programs / "pg_ctl", "-D", data, "-l", log, "-w", "-o", options, "start"], **quiet, **as_user
    )
    try:
        yield str(place)
    finally:
        subprocess.run([programs / "pg_ctl", "-D", data, "-m", "immediate", "stop"], **quiet, **as_user)
        shutil.rmtree(place, ignore_errors=True)


@pytest.fixture(params=["sqlite", pytest.param("postgresql", marks=pytest.mark.postgresql)])
def database_url(request: pytest.FixtureRequest, tmp_path: Path) -> str:
    """Give the URL of an empty database, on each of the two kinds."""
    if request.param == "sqlite":
        return f"sqlite:///{tmp_path / 'plans.sqlite3'}"
    place = request.getfixturevalue("postgresql")
    name = f"t{abs(hash(str(tmp_path)))}"
    with psycopg.connect(f"host={place} user=cant dbname=postgres", autocommit=True) as connection:
        connection.execute(f'CREATE DATABASE "{name}"')
    return f"postgresql://cant@/{name}?host={place}"


@pytest.fixture
def start(tmp_path: Path) -> Iterator[Callable[..., Flask]]:
    """Give a function that starts the service; the same arguments start it on the same data again."""
    started: list[Flask] = []

    def start_service(database_url: str = "", **config: Any) -> Flask:
        given = Config(tmp_path / "data", database_url, **config)
        app = create_app({"CANT": given, "PROPAGATE_EXCEPTIONS": False})
        started.append(app)
        return app

    yield start_service
    for app in started:
        app.extensions[EXTENSION].database.close()


@pytest.fixture
def app(start: Callable[..., Flask]) -> Flask:
    """Give the service on SQLite."""
    return start()


@pytest.fixture
def office(start: Callable[..., Flask], database_url: str) -> Flask:
    """Give a service where people sign in, on either database; Anna Holt has an account."""
    app = start(database_url, sign_in=SignIn(accounts=True))
    made(app, "anna", full_name="Anna Holt")
    return app


@pytest.fixture
def house(start: Callable[..., Flask]) -> Flask:
    """Give a service where people sign in, on SQLite alone; Anna Holt has an account."""
    app = start(sign_in=SignIn(accounts=True))
    made(app, "anna", full_name="Anna Holt")
    return app


@pytest.fixture
def browser(app: Flask) -> Browser:
    """Give a browser of that service."""
    return Browser(app)


@pytest.fixture
def other_browser(app: Flask) -> Browser:
    """Give another browser of the same service."""
    return Browser(app)


@pytest.fixture
def bare_list(tmp_path: Path) -> Path:
    """Give a curve list without trains and limits."""
    file = tmp_path / "aldmere.csv"
    file.write_text(CURVES, encoding="utf-8")
    return file


@pytest.fixture(scope="session")
def chromium() -> Iterator[Chromium]:
    """Give a real browser."""
    with sync_playwright() as playwright:
        started = playwright.chromium.launch(executable_path="/usr/bin/chromium", args=ARGUMENTS)
        yield started
        started.close()


@pytest.fixture
def address(start: Callable[..., Flask]) -> Iterator[str]:
    """Run the service in this process, on a port of its own."""
    with served(start()) as address:
        yield address


@pytest.fixture
def visit(chromium: Chromium, address: str) -> Iterator[Visit]:
    """Give a function that lets a person arrive at a screen."""
    opened: list[BrowserContext] = []

    def arrive(screen: str = "desktop", **options: Any) -> Visitor:
        context = chromium.new_context(viewport=SCREENS[screen], accept_downloads=True, **options)
        context.set_default_timeout(20_000)
        opened.append(context)
        return Visitor(context, address)

    yield arrive
    for context in opened:
        context.close()
