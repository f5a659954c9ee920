"""One line a request for who runs the service: never what was asked for by whom, only that somebody asked.

Time, address, method, the route with its variables unfilled, status, bytes, milliseconds, and a short keyed
hash of the person, by which requests of one person are seen to be one's. No address of a plan, no query, no
secret, no name of a file; every part is of a form that holds no blank and no line break.
"""

from __future__ import annotations

import hashlib
import hmac
import ipaddress
import logging
import os
import time
from collections.abc import Iterable, Iterator
from datetime import UTC, datetime
from logging.handlers import WatchedFileHandler
from pathlib import Path
from typing import TYPE_CHECKING, Any

from flask import Flask, g, request

if TYPE_CHECKING:
    from _typeshed.wsgi import StartResponse, WSGIApplication, WSGIEnvironment

LOG = logging.getLogger("webapp.access")
ROUTE, PERSON = "cant.route", "cant.person"
METHODS = frozenset({"GET", "HEAD", "POST", "PUT", "DELETE", "OPTIONS", "PATCH"})
HASH_LENGTH = 12


class AccessLog:
    """Writes a line when an answer has been sent, or given up.

    Parameters
    ----------
    application : WSGI application
    """

    def __init__(self, application: WSGIApplication) -> None:
        self._application = application

    def __call__(self, environ: WSGIEnvironment, start_response: StartResponse) -> Iterable[bytes]:
        """Answer a request."""
        begun = time.perf_counter()
        status: list[str] = []

        def starting(line: str, headers: list[tuple[str, str]], *more: Any) -> Any:
            status[:] = [line[:3]]
            return start_response(line, headers, *more)

        answer = self._application(environ, starting)
        return _Counted(answer, lambda size: _write(environ, status, size, begun))


class _Counted:
    """An answer that counts its bytes, and tells them when it is closed."""

    def __init__(self, answer: Iterable[bytes], tell: Any) -> None:
        self._answer, self._tell, self._size = answer, tell, 0

    def __iter__(self) -> Iterator[bytes]:
        for piece in self._answer:
            self._size += len(piece)
            yield piece

    def close(self) -> None:
        """Close the answer; the server calls it whatever happened."""
        try:
            close = getattr(self._answer, "close", None)
            if close is not None:
                close()
        finally:
            self._tell(self._size)


def _write(environ: WSGIEnvironment, status: list[str], size: int, begun: float) -> None:
    moment = datetime.now(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")
    method = environ.get("REQUEST_METHOD", "")
    LOG.info(
        "%s %s %s %s %s %d %.0fms %s",
        moment,
        _address(environ.get("REMOTE_ADDR", "")),
        method if method in METHODS else "OTHER",
        environ.get(ROUTE, "-"),
        status[0] if status and status[0].isdigit() else "-",
        size,
        1000 * (time.perf_counter() - begun),
        environ.get(PERSON, "-"),
    )


def _address(text: str) -> str:
    try:
        return str(ipaddress.ip_address(text))
    except ValueError:
        return "-"


def add_access_log(app: Flask) -> None:
    """Let every request be known to the log; where that is written is settled by :func:`log_to`."""

    @app.teardown_request
    def remember(_error: BaseException | None) -> None:
        request.environ[ROUTE] = route()
        request.environ[PERSON] = person_hash(app, str(g.get("counted_as", "")))


def route() -> str:
    """Give the route of the request with its variables unfilled, ``-`` where there is none."""
    return request.url_rule.rule if request.url_rule is not None else "-"


def person_hash(app: Flask, person: str) -> str:
    """Give a short hash of a person, keyed so that nobody can find him by trying; ``-`` for nobody."""
    if not person:
        return "-"
    return hmac.new(str(app.secret_key).encode(), person.encode(), hashlib.sha256).hexdigest()[:HASH_LENGTH]


def log_to(file: str) -> None:
    """Write the access log to a file, which may be moved away under it; to standard error where it is ""."""
    handler: logging.Handler
    if file:
        path = Path(file)
        path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
        os.close(os.open(path, os.O_WRONLY | os.O_CREAT | os.O_APPEND, 0o600))
        handler = WatchedFileHandler(path, encoding="utf-8")
    else:
        handler = logging.StreamHandler()
    handler.setFormatter(logging.Formatter("%(message)s"))
    for old in LOG.handlers[:]:
        LOG.removeHandler(old)
        old.close()
    LOG.addHandler(handler)
    LOG.setLevel(logging.INFO)
    LOG.propagate = False
