"""Turns to compute: so many requests at a time; the others wait in their order, or are told to come back.

A page that only looks something up needs no turn, so that it answers while others compute.
"""

from __future__ import annotations

import threading
from collections import Counter, deque
from collections.abc import Iterable, Iterator
from typing import TypeVar

from flask import Flask, Response, g, request

from webapp.busy import BusyError

RETRY_S = 5
MOST_WAITING = 48
MOST_WAITING_PERSON = 12
NEEDS_NONE = frozenset(
    {
        "static",
        "start.home",
        "start.units",
        "start.resume",
        "start.rename",
        "start.keep",
        "start.delete",
        "health.alive",
        "health.ready",
        "help.contents",
        "waiting.show",
        "api.list_plans",
        "api.get_plan",
        "api.delete_plan",
        "api.list_work",
        "api.get_work",
    }
)
"""Endpoints that only look something up; all others take a turn."""
Chunk = TypeVar("Chunk")


class Turns:
    """Gives out turns, first come first served.

    Parameters
    ----------
    at_once : int
        Turns held at the same time.
    wait_s : float
        How long one waits for a turn.
    most_waiting, most_waiting_person : int
        How many may wait at the same time, of all and of one person.
    """

    def __init__(
        self,
        at_once: int,
        wait_s: float,
        most_waiting: int = MOST_WAITING,
        most_waiting_person: int = MOST_WAITING_PERSON,
    ) -> None:
        self.wait_s = wait_s
        self._most, self._most_person = most_waiting, most_waiting_person
        self._free = at_once
        self._queue: deque[threading.Event] = deque()
        self._waiting: Counter[str] = Counter()
        self._lock = threading.Lock()

    def take(self, who: str = "", *, however_long: bool = False) -> None:
        """Take a turn; BusyError where none is free in time, or too many wait already."""
        with self._lock:
            if self._free:
                self._free -= 1
                return
            if not however_long:
                self._refuse_where_full(who)
                self._waiting[who] += 1
            called = threading.Event()
            self._queue.append(called)
        in_time = called.wait(None if however_long else self.wait_s)
        with self._lock:
            if not however_long:
                self._waiting[who] -= 1
                self._waiting += Counter()  # forgets who waits no more
            if not in_time and not called.is_set():
                self._queue.remove(called)
                raise BusyError(RETRY_S)

    def _refuse_where_full(self, who: str) -> None:
        by_person = self._waiting[who] if who else 0
        if self._waiting.total() >= self._most or by_person >= self._most_person:
            raise BusyError(RETRY_S)

    def give_back(self) -> None:
        """Give a turn to who waits longest."""
        with self._lock:
            if self._queue:
                self._queue.popleft().set()
            else:
                self._free += 1

    def piece_by_piece(self, pieces: Iterable[Chunk]) -> Iterator[Chunk]:
        """Give pieces, each made in a turn of its own: between two of them others have theirs."""
        making = iter(pieces)
        while True:
            self.take(however_long=True)
            try:
                piece = next(making, None)
            finally:
                self.give_back()
            if piece is None:
                return
            yield piece


def add_turns(app: Flask, turns: Turns) -> None:
    """Let every request that computes take a turn, and give it back with its answer."""

    @app.before_request
    def take() -> None:
        if request.endpoint is not None and request.endpoint not in NEEDS_NONE:
            turns.take(g.get("counted_as", ""))
            g.has_turn = True

    @app.after_request
    def in_pieces(response: Response) -> Response:
        if g.get("has_turn") and response.is_streamed and not response.direct_passthrough:
            response.response = turns.piece_by_piece(response.iter_encoded())
        return response

    @app.teardown_request
    def give_back(_error: BaseException | None) -> None:
        if g.pop("has_turn", False):
            turns.give_back()
