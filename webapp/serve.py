"""Runs the service: a production WSGI server on the loopback address unless told otherwise."""

from __future__ import annotations

import ipaddress
import logging
import socket
import sys

from waitress.server import create_server

from cant.errors import FileError
from webapp.app import create_app
from webapp.config import Config

THREADS = 8
LOOPBACK_HOSTS = ("localhost", "127.0.0.1", "[::1]", "::1")


def run(host: str = "127.0.0.1", port: int = 8000) -> None:
    """Serve until interrupted.

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
    logging.basicConfig(level=logging.INFO, format="%(asctime)s %(levelname)s %(message)s")
    logging.getLogger("alembic").setLevel(logging.WARNING)
    config = Config.from_environment()
    local = is_loopback(host)
    if local and not config.trusted_hosts:
        config = Config(**{**vars(config), "trusted_hosts": LOOPBACK_HOSTS})
    app = create_app(config)
    try:
        server = create_server(app, host=host, port=port, threads=THREADS, ident="cant")
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        message = f"cannot listen at {host} port {port}: {reason}; give another with --host or --port"
        raise FileError(message) from error
    _announce(host, _port_of(server, port), config, local=local)
    try:
        server.run()
    except KeyboardInterrupt:
        pass
    finally:
        server.close()


def is_loopback(host: str) -> bool:
    """Tell whether an address can be reached from this machine alone."""
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False


def _port_of(server: object, port: int) -> int:
    listening = getattr(server, "socket", None)
    return int(listening.getsockname()[1]) if isinstance(listening, socket.socket) else port


def _announce(host: str, port: int, config: Config, *, local: bool) -> None:
    address = f"[{host}]" if ":" in host else host
    lines = [
        f"Cant is ready: open http://{address}:{port}/ in a browser. Ctrl+C stops it.",
        f"Plans are kept in {config.database_words} for {config.keep_days} days after their last change.",
        "Only this machine can reach it."
        if local
        else "WARNING: other machines can reach it, unencrypted unless a proxy stands in front; who reaches "
        "it can use it. Each browser sees its own plans only.",
    ]
    print("\n".join(lines), file=sys.stderr, flush=True)
