"""The process that does one piece of work: bounded in memory, and never alone.

Forked from a worker that has loaded the program already.
"""

from __future__ import annotations

import contextlib
import os
import resource
import signal
import sys
import threading
import time
from multiprocessing.connection import Connection

from webapp.keeping.database import Database
from webapp.keeping.work import Piece
from webapp.working.doing import Doing

OUT_OF_MEMORY = 71
ALONE = 72
SPARE_BYTES = 32_000_000
LOOK_S = 0.5
TOLD_EVERY_S = 0.3


def run_piece(
    database: Database, doing: Doing, piece: Piece, pipe: Connection, limit_bytes: int, parent: int
) -> None:
    """Do a piece, tell of it, and end.

    Parameters
    ----------
    database : Database
        Without open connections.
    doing : Doing
    piece : Piece
    pipe : Connection
        Takes (share, what is being done).
    limit_bytes : int
        Memory that may be taken.
    parent : int
        The worker, without which nothing is done.
    """
    signal.signal(signal.SIGTERM, signal.SIG_DFL)
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with, args=(parent,), daemon=True).start()
    _bound(limit_bytes)
    told = 0.0

    def tell(share: float, what: str) -> None:
        nonlocal told
        now = time.monotonic()
        if now - told >= TOLD_EVERY_S:
            told = now
            with contextlib.suppress(OSError):  # the worker is gone, and so is this process in a moment
                pipe.send((share, what))

    try:
        doing.do(piece, tell)
    except MemoryError:
        os._exit(OUT_OF_MEMORY)
    except Exception:
        if _is_full():  # a thread that cannot start, a library that cannot be loaded: also want of memory
            os._exit(OUT_OF_MEMORY)
        raise
    finally:
        database.close()
    sys.exit(0)


def _is_full() -> bool:
    """Tell whether the memory that this process may take is used up."""
    try:
        bytearray(SPARE_BYTES)
    except MemoryError:
        return True
    return False


def _end_with(parent: int) -> None:
    while os.getppid() == parent:
        time.sleep(LOOK_S)
    os._exit(ALONE)


def _bound(limit_bytes: int) -> None:
    """Bound the memory of this process; where a system does not know such a bound there is none."""
    _, hard = resource.getrlimit(resource.RLIMIT_AS)
    most = limit_bytes if hard == resource.RLIM_INFINITY else min(limit_bytes, hard)
    with contextlib.suppress(ValueError, OSError):
        resource.setrlimit(resource.RLIMIT_AS, (most, hard))
