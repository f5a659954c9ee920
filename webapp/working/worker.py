"""A worker: takes pieces from the queue, gives each to a process of its own, watches it and tells of it.

The loop has one thread and computes nothing, so that it can always stop what it watches. A piece is stopped
when it was cancelled, when its plan was deleted, and when it takes too long; when the worker itself is told
to stop, it puts its pieces back. Where it dies without a word, its processes notice and end, and somebody
else takes the pieces up.
"""

from __future__ import annotations

import logging
import multiprocessing
import multiprocessing.connection
import os
import signal
import time
from dataclasses import dataclass
from multiprocessing.connection import Connection
from types import FrameType

from sqlalchemy.exc import SQLAlchemyError

from webapp.config import Config
from webapp.keeping.database import Database
from webapp.keeping.work import FAILED, Piece
from webapp.keeping.work_claims import Claims
from webapp.working.child import OUT_OF_MEMORY, run_piece
from webapp.working.doing import Doing
from webapp.working.orders import KINDS, QUICK
from webapp.working.sealing import Seal

LOG = logging.getLogger("webapp.working")
POLL_S = 0.25
BEAT_S = 1.0
LOST_EVERY_S = 5.0
AFTER_ERROR_S = 2.0
NICE = 10
_FORK = multiprocessing.get_context("fork")


@dataclass
class Child:
    """A process that does a piece."""

    process: multiprocessing.process.BaseProcess
    pipe: Connection
    piece: Piece
    begun: float
    told: float = 0.0
    share: float = 0.0
    doing: str = ""


class Worker:
    """Works until it is told to stop.

    Parameters
    ----------
    config : Config
    database : Database
    parent : int, optional
        Process that started it, and with which it ends.
    """

    def __init__(self, config: Config, database: Database, parent: int | None = None) -> None:
        self._config, self._database, self._parent = config, database, parent
        self._claims = Claims(database)
        self._doing = Doing(database, Seal(config.key()))
        self._children: list[Child] = []
        self._looked_for_lost = 0.0
        self._stopping = False

    def run(self) -> None:
        """Work."""
        for number in (signal.SIGTERM, signal.SIGINT):
            signal.signal(number, self._stop)
        os.nice(NICE)
        while not self._stopping and not self._is_alone():
            try:
                self._take_up()
                self._wait()
                for child in list(self._children):
                    self._look_after(child)
            except SQLAlchemyError as error:
                LOG.warning("The database does not answer the worker; it tries again: %s", type(error))
                time.sleep(AFTER_ERROR_S)
        self._put_all_back()

    def _stop(self, _number: int, _frame: FrameType | None) -> None:
        self._stopping = True

    def _is_alone(self) -> bool:
        return self._parent is not None and os.getppid() != self._parent

    def _take_up(self) -> None:
        """Take up pieces as far as there is room: so many of any kind, and one more that is soon done."""
        now = time.monotonic()
        if now - self._looked_for_lost >= LOST_EVERY_S:
            self._looked_for_lost = now
            self._claims.find_lost()
        while (room := max(self._config.work.workers, 1) + 1 - len(self._children)) > 0:
            piece = self._claims.take(KINDS if room > 1 else QUICK)
            if piece is None:
                return
            self._begin(piece)

    def _begin(self, piece: Piece) -> None:
        reader, writer = _FORK.Pipe(duplex=False)
        self._database.close()  # a connection does not survive in two processes
        limit = self._config.work.work_mb * 1_000_000
        process = _FORK.Process(
            target=run_piece,
            args=(self._database, self._doing, piece, writer, limit, os.getpid()),
            daemon=True,
        )
        process.start()
        writer.close()
        self._children.append(Child(process, reader, piece, time.monotonic()))

    def _wait(self) -> None:
        """Wait until something happens, or for a moment."""
        ends = [child.process.sentinel for child in self._children]
        multiprocessing.connection.wait(ends, timeout=POLL_S) if ends else time.sleep(POLL_S)

    def _look_after(self, child: Child) -> None:
        if not child.process.is_alive():
            self._bury(child)
            return
        try:
            while child.pipe.poll():
                share, child.doing = child.pipe.recv()
                child.share = max(child.share, share)
        except EOFError:
            return  # about to end
        now = time.monotonic()
        minutes = self._config.work.work_minutes
        if now - child.begun > 60 * minutes:
            self._end(child)
            message = (
                f"The work took longer than the {minutes} minutes that this service allows. Divide the list, "
                "or ask who runs the service to allow more."
            )
            self._claims.end(child.piece, FAILED, message)
        elif now - child.told > BEAT_S:
            child.told = now
            if not self._claims.tell(child.piece, child.share, child.doing):
                self._end(child)

    def _bury(self, child: Child) -> None:
        """Settle what a process left that ended by itself."""
        code = child.process.exitcode
        self._end(child)
        if code == OUT_OF_MEMORY:
            message = (
                f"The work needs more memory than the {self._config.work.work_mb} MB that this service "
                "allows. Divide the list, or ask who runs the service to allow more."
            )
            self._claims.end(child.piece, FAILED, message)
        elif code != 0:
            LOG.error("A process ended with %s during work of kind %s", code, child.piece.kind)
            self._claims.give_back(child.piece, counts=True)

    def _end(self, child: Child) -> None:
        self._children.remove(child)
        if child.process.is_alive():
            child.process.kill()
        child.process.join()
        child.pipe.close()

    def _put_all_back(self) -> None:
        for child in list(self._children):
            self._end(child)
            try:
                self._claims.give_back(child.piece, counts=False)
            except SQLAlchemyError as error:
                LOG.warning("Work could not be put back; it is taken up later: %s", type(error))


def do_waiting(config: Config, database: Database) -> int:
    """Do all that waits, one after the other in this process; give the number of pieces."""
    claims, doing = Claims(database), Doing(database, Seal(config.key()))
    done = 0
    while (piece := claims.take(KINDS)) is not None:
        _do_here(claims, doing, piece)
        done += 1
    return done


def _do_here(claims: Claims, doing: Doing, piece: Piece) -> None:
    def tell(share: float, what: str) -> None:
        claims.tell(piece, share, what)

    doing.do(piece, tell)
