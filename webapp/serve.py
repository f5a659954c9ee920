"""Runs the service: a production WSGI server on the loopback address unless told otherwise."""

from __future__ import annotations

import contextlib
import ctypes
import ipaddress
import logging
import os
import signal
import sys
import time
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

from cant.errors import FileError
from webapp.app import create_app
from webapp.config import Config
from webapp.context import EXTENSION, Running
from webapp.guarding.access_log import log_to
from webapp.guarding.cleaning import Cleaner
from webapp.guarding.listening import Server, make_server
from webapp.working.keeper import Keeper

LOOPBACK_HOSTS = ("localhost", "127.0.0.1", "[::1]", "::1")
STOPPED_AT_ONCE = 1
FILES_BESIDE = 200
"""Files that are open beside the connections: database, logs, uploads."""
M_ARENA_MAX = -8
ARENAS = 2


def run(host: str = "127.0.0.1", port: int = 8000) -> None:
    """Serve until told to stop, by SIGINT or SIGTERM; a second one stops at once.

    Parameters
    ----------
    host : str
        Address to listen at.
    port : int
        Port; 0 takes any that is free.

    Raises
    ------
    CantError
        The address is taken, or the database cannot be used.
    """
    _prepare_logs()
    config = Config.from_environment()
    _prepare_process(config)
    local = is_loopback(host)
    if local and not config.trusted_hosts:
        config = replace(config, trusted_hosts=LOOPBACK_HOSTS)
    app = create_app(config)
    parts: Running = app.extensions[EXTENSION]
    try:
        server = make_server(app, host, port, config)
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        message = f"cannot listen at {host} port {port}: {reason}; give another with --host or --port"
        raise FileError(message) from error
    log_to(config.access_log)
    cleaner, keeper = Cleaner(parts.clean), Keeper(config.work.workers, parts.stopping)
    with _stopped_by_signals(server, parts):
        cleaner.start()
        keeper.start()
        _announce(host, server.port, config, local=local)
        try:
            server.run(config.bounds.seconds_to_stop)
        finally:
            keeper.stop()
            cleaner.stop()
            parts.database.close()


def is_loopback(host: str) -> bool:
    """Tell whether an address can be reached from this machine alone."""
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False


@contextlib.contextmanager
def _stopped_by_signals(server: Server, parts: Running) -> Iterator[None]:
    """Let the first signal stop the server in good order, and a second one at once."""

    def told(_number: int, _frame: Any) -> None:
        if parts.stopping.is_set():
            os._exit(STOPPED_AT_ONCE)
        parts.stopping.set()
        server.stop()

    before = {number: signal.signal(number, told) for number in (signal.SIGINT, signal.SIGTERM)}
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


def _prepare_logs() -> None:
    logging.basicConfig(
        level=logging.INFO, format="%(asctime)s.%(msecs)03dZ %(levelname)s %(name)s %(message)s"
    )
    for handler in logging.getLogger().handlers:
        if handler.formatter is not None:
            handler.formatter.converter = time.gmtime
            handler.formatter.datefmt = "%Y-%m-%dT%H:%M:%S"
    for name, level in (
        ("alembic", logging.WARNING),
        ("waitress", logging.WARNING),
        ("waitress.queue", logging.ERROR),
    ):
        logging.getLogger(name).setLevel(level)


def _prepare_process(config: Config) -> None:
    """Let what is written be the owner's alone, connections have their files, and threads share memory."""
    os.umask(0o077)
    with contextlib.suppress(ImportError, OSError, ValueError):  # not on every system
        import resource

        now, most = resource.getrlimit(resource.RLIMIT_NOFILE)
        wanted = max(config.bounds.connections + FILES_BESIDE, now)
        if wanted > now != resource.RLIM_INFINITY:
            highest = wanted if most == resource.RLIM_INFINITY else min(wanted, most)
            resource.setrlimit(resource.RLIMIT_NOFILE, (highest, most))
    with contextlib.suppress(OSError, AttributeError):  # only with the GNU C library
        ctypes.CDLL(None).mallopt(M_ARENA_MAX, ARENAS)


def _who_may(config: Config) -> str:
    """Say who may use the service, and what is amiss with that."""
    if config.sign_in.header:
        return f"People sign in at the proxy, which names them in the header {config.sign_in.header}."
    if not config.sign_in.accounts:
        return "Who reaches it can use it; each browser sees its own plans only."
    warning = (
        "" if config.https else " WARNING: passwords are safe by https alone; set CANT_HTTPS=yes behind it."
    )
    return f"People sign in with accounts; 'cant accounts add NAME' makes one.{warning}"


def _announce(host: str, port: int, config: Config, *, local: bool) -> None:
    address = f"[{host}]" if ":" in host else host
    lines = [
        f"Cant is ready: open http://{address}:{port}/ in a browser. Ctrl+C stops it.",
        f"Plans are kept in {config.database_words} for {config.keep_days} days after their last change.",
        "Only this machine can reach it."
        if local
        else "WARNING: other machines can reach it, unencrypted unless a proxy stands in front.",
        _who_may(config),
    ]
    print("\n".join(lines), file=sys.stderr, flush=True)
