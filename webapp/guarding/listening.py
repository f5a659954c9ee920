"""The server that listens: slow and stalled clients cost it nothing, and it stops in good order.

Requests are received, and answers sent, by one loop that waits for nobody; a thread works on a request only
when it is there whole, and is free again when its answer is made. What takes too long to arrive is cut off.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

from waitress import wasyncore
from waitress.adjustments import Adjustments
from waitress.server import TcpWSGIServer
from waitress.task import ThreadedTaskDispatcher

from webapp.config import Config
from webapp.guarding.channel import Channel
from webapp.guarding.proxies import is_among
from webapp.guarding.turns import MOST_WAITING

if TYPE_CHECKING:
    from _typeshed.wsgi import WSGIApplication

LIGHT_THREADS = 8
"""Threads for what needs no turn: it answers even while as many wait as may."""
IDLE_S = 75
SHARE_OF_ONE = 2
"""One address may have the connections of all divided by this."""
CLEANUP_S = 5
HELD_BYTES = 1_000_000_000
"""An answer is held for a slow client, on disk, up to this size: no thread waits for him."""
BEYOND_UPLOAD_BYTES = 1_000_000
"""Room for what stands around a file in a request; what is larger is refused by its header."""


class Listener(TcpWSGIServer):
    """Listens at one address."""

    channel_class = Channel
    stopping = False
    seconds_to_send = 60.0
    most_of_one = 500
    proxies: tuple[str, ...] = ()

    def handle_accept(self) -> None:
        """Take a connection, unless its address has too many; a proxy may have all."""
        before = set(self._open())
        super().handle_accept()
        for number in set(self._open()) - before:
            address = self._open()[number].addr[0]
            theirs = sum(one.addr[0] == address for one in self._open().values())
            if theirs > self.most_of_one and not is_among(address, self.proxies):
                self._open()[number].will_close = True

    def _open(self) -> dict[int, Channel]:
        found: Any = self.active_channels
        return dict(found)

    def maintenance(self, now: float) -> None:
        """Close what has been idle for long, and what takes too long to arrive."""
        super().maintenance(int(now))
        for channel in self._open().values():
            channel.close_where_late(now, self.seconds_to_send)

    def stop_listening(self) -> None:
        """Accept no more connections; those that are open stay."""
        self.stopping = True
        self.accepting = False
        self.del_channel()
        if self.socket is not None:
            self.socket.close()


@dataclass
class Server:
    """A server at one port of every address of a host.

    Attributes
    ----------
    listeners : list of Listener
    threads : ThreadedTaskDispatcher
    sockets : dict
        Everything that the loop watches.
    port : int
        Port in use.
    """

    listeners: list[Listener]
    threads: ThreadedTaskDispatcher
    sockets: dict[int, Any] = field(default_factory=dict)
    port: int = 0
    _told: bool = False

    def run(self, seconds_to_stop: float) -> None:
        """Serve until told to stop, then finish what is under way within some seconds."""
        while not self._told:
            self._once(1.0)
        for listener in self.listeners:
            listener.stop_listening()
        until = time.monotonic() + seconds_to_stop
        while self._is_working() and time.monotonic() < until:
            self._once(0.1)
        self.close()

    def stop(self) -> None:
        """Tell it to stop; may be called by a signal, or by another thread."""
        self._told = True
        for listener in self.listeners:
            listener.stopping = True
            listener.pull_trigger()

    def close(self) -> None:
        """Close everything."""
        self.threads.shutdown(timeout=1)
        wasyncore.close_all(self.sockets)

    def _once(self, seconds: float) -> None:
        wasyncore.loop(timeout=seconds, use_poll=True, map=self.sockets, count=1)

    def _is_working(self) -> bool:
        return any(isinstance(one, Channel) and one.is_working for one in list(self.sockets.values()))


def _of(address: Any) -> tuple[int, int, int | None, Any]:
    family, kind, protocol, name = address
    return family, kind, protocol, name


def make_server(application: WSGIApplication, host: str, port: int, config: Config) -> Server:
    """Make a server that listens at a host and port; OSError or ValueError where it cannot."""
    bounds = config.bounds
    settings = Adjustments(
        host=host,
        port=port,
        threads=bounds.turns + MOST_WAITING + LIGHT_THREADS,
        ident=None,
        connection_limit=bounds.connections,
        channel_timeout=IDLE_S,
        cleanup_interval=CLEANUP_S,
        max_request_header_size=bounds.header_kb * 1_000,
        max_request_body_size=config.upload_mb * 1_000_000 + BEYOND_UPLOAD_BYTES,
        outbuf_high_watermark=HELD_BYTES,
        asyncore_use_poll=True,
        backlog=1024,
    )
    threads = ThreadedTaskDispatcher()
    server = Server([], threads)
    try:
        for address in settings.listen:
            listener = Listener(
                application, map=server.sockets, dispatcher=threads, adj=settings, sockinfo=_of(address)
            )
            listener.seconds_to_send = bounds.seconds_to_send
            listener.most_of_one = max(bounds.connections // SHARE_OF_ONE, 1)
            listener.proxies = config.proxies
            server.listeners.append(listener)
    except OSError:
        wasyncore.close_all(server.sockets)
        raise
    threads.set_thread_count(settings.threads)
    server.port = int(server.listeners[0].getsockname()[1])
    return server
