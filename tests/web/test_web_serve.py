"""The service as a process: nothing need be configured, it says where it is, a restart forgets nothing."""

from __future__ import annotations

import re
import signal
import subprocess
import sys
import urllib.error
import urllib.parse
import urllib.request
from collections.abc import Callable, Iterator
from http.cookiejar import CookieJar
from pathlib import Path

import pytest
from flask import Flask
from web_tools import Browser

from cant.errors import InputError
from webapp.config import Config
from webapp.serve import is_loopback

READY = re.compile(r"open (http://\S+/) in a browser")
Serve = Callable[..., tuple[str, "subprocess.Popen[str]", list[str]]]


@pytest.fixture
def serve(tmp_path: Path) -> Iterator[Serve]:
    """Give a function that runs ``cant serve`` on the same data and gives its address, process and words."""
    running: list[subprocess.Popen[str]] = []

    def start(*options: str) -> tuple[str, subprocess.Popen[str], list[str]]:
        command = [sys.executable, "-m", "cant", "serve", "--port", "0", *options]
        environment = {"CANT_DATA": str(tmp_path / "data"), "PATH": "/usr/bin:/bin"}
        process = subprocess.Popen(command, env=environment, stderr=subprocess.PIPE, text=True, cwd=tmp_path)
        running.append(process)
        assert process.stderr is not None
        said: list[str] = []
        for line in process.stderr:
            said.append(line)
            if found := READY.search(line):
                said += [process.stderr.readline(), process.stderr.readline()]
                return found.group(1), process, said
        message = f"the service did not start: {''.join(said)}"
        raise AssertionError(message)

    yield start
    for process in running:
        process.kill()
        process.wait()
        if process.stderr is not None:
            process.stderr.close()


def open_page(opener: urllib.request.OpenerDirector, address: str, **form: str) -> tuple[str, str]:
    data = urllib.parse.urlencode(form).encode() if form else None
    with opener.open(address, data, timeout=60) as answer:
        return answer.geturl(), answer.read().decode()


def test_restart_loses_nothing_confirmed(serve: Serve) -> None:
    opener = urllib.request.build_opener(urllib.request.HTTPCookieProcessor(CookieJar()))
    base, process, _ = serve()
    _, page = open_page(opener, base)
    found = re.search(r'name="token" value="([^"]+)"', page)
    assert found is not None
    plan, before = open_page(opener, f"{base}plans/sample", token=found.group(1))
    path = plan.removeprefix(base)
    process.send_signal(signal.SIGKILL)
    process.wait()
    base, process, _ = serve()
    _, after = open_page(opener, base + path)

    def cants(text: str) -> list[str]:
        return re.findall(r'data-label="Proposed[^>]+>([^<]+)<', text)

    assert cants(before)
    assert cants(after) == cants(before)
    assert path.split("/")[1] in open_page(opener, base)[1]
    process.send_signal(signal.SIGINT)
    assert process.wait(timeout=20) == 0


def test_says_where_it_listens_and_where_plans_are_kept(serve: Serve, tmp_path: Path) -> None:
    base, _, said = serve()
    assert base.startswith("http://127.0.0.1:")
    assert str(tmp_path / "data" / "plans.sqlite3") in "".join(said)
    assert "Only this machine" in "".join(said)
    assert (tmp_path / "data" / "signing-key").stat().st_mode & 0o077 == 0


def test_warns_where_others_can_reach_it(serve: Serve) -> None:
    _, _, said = serve("--host", "0.0.0.0")  # noqa: S104 - that is what is tested
    assert "WARNING" in "".join(said)


def test_answers_to_its_own_names_alone_on_loopback(serve: Serve) -> None:
    base, _, _ = serve()
    request = urllib.request.Request(base, headers={"Host": "elsewhere.example"})  # noqa: S310
    with pytest.raises(urllib.error.HTTPError) as caught:
        urllib.request.urlopen(request, timeout=30)  # noqa: S310 - our own address
    assert caught.value.code == 400
    caught.value.close()


def test_taken_port_is_one_line_and_exit_status_2(serve: Serve, tmp_path: Path) -> None:
    base, _, _ = serve()
    port = base.rstrip("/").rsplit(":", 1)[1]
    command = [sys.executable, "-m", "cant", "serve", "--port", port]
    environment = {"CANT_DATA": str(tmp_path / "data"), "PATH": "/usr/bin:/bin"}
    done = subprocess.run(command, env=environment, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 2
    assert len(done.stderr.splitlines()) == 1
    assert port in done.stderr


def test_health_addresses(start: Callable[..., Flask]) -> None:
    browser = Browser(start())
    assert browser.get("/healthz").text == "alive\n"
    assert browser.get("/readyz").text == "ready\n"


@pytest.mark.parametrize(
    ("host", "loopback"),
    [
        ("127.0.0.1", True),
        ("127.3.2.1", True),
        ("::1", True),
        ("localhost", True),
        ("0.0.0.0", False),  # noqa: S104
        ("x", False),
    ],
)
def test_loopback_is_told_from_others(host: str, loopback: bool) -> None:
    assert is_loopback(host) is loopback


def test_configuration_from_the_environment(tmp_path: Path) -> None:
    config = Config.from_environment(
        {"CANT_DATA": str(tmp_path), "CANT_KEEP_DAYS": "7", "CANT_HTTPS": "yes", "CANT_HOSTS": "a.example, b"}
    )
    assert (config.keep_days, config.https, config.trusted_hosts) == (7, True, ("a.example", "b"))
    assert config.database == f"sqlite:///{tmp_path / 'plans.sqlite3'}"
    assert config.key() == config.key()
    given = Config(tmp_path, "postgresql://anna:secret@db/plans")
    assert given.database == "postgresql+psycopg://anna:secret@db/plans"
    assert "secret" not in given.database_words
    with pytest.raises(InputError, match="CANT_KEEP_DAYS"):
        Config.from_environment({"CANT_KEEP_DAYS": "soon"})
    with pytest.raises(InputError, match="URL"):
        _ = Config(tmp_path, "not a url").database


def test_every_variable_is_in_the_readme(root: Path) -> None:
    read: set[str] = set()

    class Recorder(dict[str, str]):
        def get(self, key: str, default: str | None = None) -> str | None:
            read.add(key)
            return default

    Config.from_environment(Recorder())
    text = (root / "README.md").read_text(encoding="utf-8")
    assert read == set(re.findall(r"`(CANT_[A-Z_]+)` \|", text))
