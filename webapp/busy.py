"""What the service says when it can take no more just now, or has no room left; nothing is stored then."""

from __future__ import annotations

from cant.errors import CantError

BUSY = "The service is busy just now; nothing has been stored. Try once more in a moment."


class BusyError(Exception):
    """No turn was free in time: the request may be made again.

    Parameters
    ----------
    retry_s : int
        Seconds after which another try makes sense.
    message : str
        What the person is told.
    """

    def __init__(self, retry_s: int, message: str = BUSY) -> None:
        super().__init__(message)
        self.retry_s = retry_s


class TooManyError(BusyError):
    """Too much was asked in too short a time, from one address or by one person."""


class FullError(CantError):
    """There is no room for what was sent: of its owner, of the whole store, or on the disk."""
