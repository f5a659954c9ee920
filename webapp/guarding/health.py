"""Two addresses for who watches over the service: whether the process lives, and whether it can take work.

They need no cookie and give none, are not counted, and say nothing but that.
"""

from __future__ import annotations

import threading
import time

from flask import Blueprint, Response, current_app
from flask.typing import ResponseReturnValue
from sqlalchemy.exc import SQLAlchemyError

from cant.errors import CantError
from webapp.context import running

pages = Blueprint("health", __name__)
KEPT_S = 1.0
EXTENSION = "cant-readiness"


class Readiness:
    """Whether the service can take work, asked of the database once a second at most."""

    def __init__(self) -> None:
        self._lock = threading.Lock()
        self._asked = -KEPT_S
        self._lacking = ""

    def lacking(self) -> str:
        """Give what is lacking, "" where nothing is."""
        if running().stopping.is_set():
            return "stopping"
        with self._lock:
            if time.monotonic() - self._asked >= KEPT_S:
                self._lacking = _lacking()
                self._asked = time.monotonic()
            return self._lacking


def _lacking() -> str:
    store = running().store
    if not running().database.answers():
        return "the database does not answer"
    try:
        store.room.check_disk()
        if not running().database.takes_changes():
            return "the database takes no changes"
        if running().background.queue.is_left_alone():
            return "nobody does the work that waits"
    except CantError:
        return "the disk is full"
    except (SQLAlchemyError, OSError):
        return "the database takes no changes"
    return ""


@pages.get("/healthz")
def alive() -> ResponseReturnValue:
    """Tell that the process answers."""
    return Response("alive\n", mimetype="text/plain")


@pages.get("/readyz")
def ready() -> ResponseReturnValue:
    """Tell whether work can be taken: the database takes changes, and nobody stops the service."""
    readiness: Readiness = current_app.extensions.setdefault(EXTENSION, Readiness())
    lacking = readiness.lacking()
    words = f"not ready: {lacking}\n" if lacking else "ready\n"
    return Response(words, 503 if lacking else 200, mimetype="text/plain")
