"""One connection: how long its request has been arriving, and a refusal that arrives although more was sent.

What is too large is refused by its header. A browser that is still sending reads the refusal only where the
connection is not closed under it: what it sends is taken and dropped for some seconds.
"""

from __future__ import annotations

import socket
import time
from datetime import UTC, datetime
from typing import Any

from waitress.channel import HTTPChannel
from waitress.task import ErrorTask

from webapp.guarding.access_log import LOG

MINUTE_BYTES = 10_000_000
"""A request may take a minute more for each of these."""
LINGER_S = 10.0
WORDS = {
    400: "This is not a request that can be understood.",
    413: "The request is too large. Send the sheet with the curve list alone, or as csv.",
    431: "The head of the request is too large. Delete the cookies of this site, and try once more.",
    500: "The service met something that it was not made for.",
    501: "The request is encoded in a way that is not understood here.",
}


class Refusal(ErrorTask):
    """The answer to a request that does not get as far as the application: plain words, and a line logged."""

    def execute(self) -> None:
        """Send it."""
        asked: Any = self.request
        error = asked.error
        body = f"{WORDS.get(error.code, WORDS[400])}\n".encode()
        self.status = f"{error.code} {error.reason}"
        self.response_headers = [
            ("Content-Type", "text/plain; charset=utf-8"),
            ("X-Content-Type-Options", "nosniff"),
            ("Content-Security-Policy", "default-src 'none'"),
            ("Cache-Control", "no-store"),
        ]
        self.set_close_on_finish()
        self.content_length = len(body)
        self.write(body)
        moment = datetime.now(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")
        LOG.info("%s %s OTHER - %d %d 0ms -", moment, self.channel.addr[0], error.code, len(body))


class Channel(HTTPChannel):
    """A connection of the server."""

    error_task_class = Refusal
    begun = 0.0
    refused = False
    lingers_until = 0.0

    def received(self, data: bytes) -> bool:
        """Take bytes of a request."""
        before = self.request
        taken = bool(super().received(data))
        if self.request is not None and self.request is not before:
            self.begun = time.time()
        return taken

    def service(self) -> None:
        """Answer a request; once the server stops it is the last one of its connection."""
        self.refused = self.requests[0].error is not None
        super().service()
        if getattr(self.server, "stopping", False):
            self.close_when_flushed = True

    def readable(self) -> bool:
        """Tell whether bytes are wanted."""
        return bool(self.lingers_until) or bool(super().readable())

    def writable(self) -> bool:
        """Tell whether bytes are to be sent, or the connection to be closed."""
        return not self.lingers_until and bool(super().writable())

    def handle_read(self) -> None:
        """Take bytes, or drop what is sent after a refusal."""
        if not self.lingers_until:
            super().handle_read()
        elif self.socket is not None:
            try:
                self.recv(self.adj.recv_bytes)  # closes where nothing comes any more
            except OSError:
                self.handle_close()

    def handle_close(self) -> None:
        """Close; after a refusal our side alone, until the other has read it."""
        if self.refused and not self.lingers_until and self.connected and self.socket is not None:
            self.lingers_until = time.time() + LINGER_S
            try:
                self.socket.shutdown(socket.SHUT_WR)
            except OSError:
                super().handle_close()
            return
        super().handle_close()

    def close_where_late(self, now: float, seconds: float) -> None:
        """Close where its request should have arrived by now, or a refusal have been read."""
        if self.lingers_until:
            if now > self.lingers_until:
                self.handle_close()
        elif self.request is not None and not self.requests:
            more = 60.0 * self.request.body_bytes_received / MINUTE_BYTES
            if now - self.begun > seconds + more:
                self.will_close = True

    @property
    def is_working(self) -> bool:
        """Whether a request is arriving or being worked on, or an answer under way."""
        return bool(self.requests or self.request is not None or self.total_outbufs_len)
