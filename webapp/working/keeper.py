"""Keeps a worker running beside the service: started with it, begun anew where it ends, stopped with it."""

from __future__ import annotations

import logging
import os
import subprocess
import sys
import threading

LOG = logging.getLogger("webapp.working")
FIRST_WAIT_S = 1.0
LONGEST_WAIT_S = 60.0
STOP_S = 10.0


class Keeper:
    """Keeps a worker process; its configuration is the environment's, as the service's is.

    Parameters
    ----------
    workers : int
        Pieces that it does at the same time; for 0 there is no worker here.
    stopping : threading.Event, optional
        Set when the service has been told to stop: a worker that ends then is not begun anew.
    """

    def __init__(self, workers: int, stopping: threading.Event | None = None) -> None:
        self._wanted = workers > 0
        self._stopping = stopping or threading.Event()
        self._lock = threading.Lock()
        self._process: subprocess.Popen[bytes] | None = None
        self._thread = threading.Thread(target=self._keep, name="keeper", daemon=True)

    def start(self) -> None:
        """Begin."""
        if self._wanted:
            self._begin()
            self._thread.start()

    def stop(self) -> None:
        """Let the worker put its work back and end."""
        self._stopping.set()
        with self._lock:
            process = self._process
        if process is None:
            return
        process.terminate()
        try:
            process.wait(timeout=STOP_S)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()

    def _begin(self) -> None:
        command = [sys.executable, "-m", "webapp.working", "--parent", str(os.getpid())]
        with self._lock:
            if not self._stopping.is_set():
                self._process = subprocess.Popen(command, stdin=subprocess.DEVNULL)  # noqa: S603 - our own

    def _keep(self) -> None:
        wait = FIRST_WAIT_S
        while not self._stopping.is_set():
            process = self._process
            if process is None:
                return
            code = process.wait()
            if self._stopping.wait(wait):
                return
            LOG.error("The worker ended with %s; another one is started", code)
            wait = min(2 * wait, LONGEST_WAIT_S)
            self._begin()
