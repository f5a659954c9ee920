"""One line of progress on standard error for a person who waits; nothing where nobody watches."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager

_EVERY_S = 0.1


@contextmanager
def progress_line() -> Iterator[Callable[[float, str], None]]:
    """Give a function that shows the share done (0 to 1) and what is being done.

    Only a terminal is written to; the line is wiped in the end, so that messages stand alone.
    """
    stream = sys.stderr
    if not stream.isatty():
        yield lambda share, what: None
        return
    last = 0.0

    def show(share: float, what: str) -> None:
        nonlocal last
        now = time.monotonic()
        if now - last >= _EVERY_S:
            last = now
            stream.write(f"\r{100 * share:3.0f} %  {what:<30.30}")
            stream.flush()

    try:
        yield show
    finally:
        stream.write("\r" + " " * 40 + "\r")
        stream.flush()
