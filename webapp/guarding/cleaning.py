"""Deletes what has expired while nobody asks for anything: a thread beside the server."""

from __future__ import annotations

import logging
import threading
from collections.abc import Callable

from sqlalchemy.exc import SQLAlchemyError

LOG = logging.getLogger("webapp")
EVERY_S = 5.0


class Cleaner:
    """Calls a function every few seconds until it is stopped; it knows itself when there is something to do.

    Parameters
    ----------
    clean : callable
    every_s : float
    """

    def __init__(self, clean: Callable[[], None], every_s: float = EVERY_S) -> None:
        self._clean, self._every_s = clean, every_s
        self._stop = threading.Event()
        self._thread = threading.Thread(target=self._run, name="cleaner", daemon=True)

    def start(self) -> None:
        """Begin."""
        self._thread.start()

    def stop(self) -> None:
        """End; what is being cleaned is finished first."""
        self._stop.set()
        self._thread.join(timeout=10)

    def _run(self) -> None:
        while not self._stop.wait(self._every_s):
            try:
                self._clean()
            except SQLAlchemyError as error:
                LOG.warning("What has expired could not be deleted; tried again: %s", type(error))
