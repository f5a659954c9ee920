"""What the service asks for: a result where it is there, else an error that says how far the work is."""

from __future__ import annotations

import zlib
from collections.abc import Iterator
from datetime import date

from cant.errors import CantError
from cant.model.reading import Reading
from cant.model.signatures import Signatures
from cant.service import PlannedLine
from webapp.basis import Basis
from webapp.keeping.results import Results
from webapp.keeping.store import StoredPlan
from webapp.keeping.work import REFUSED, Piece, WorkQueue
from webapp.working.doing import SIGNED, SYSTEM, planned_of
from webapp.working.orders import DOCUMENT, PLAN, READING, WORKBOOK, Order, program
from webapp.working.sealing import Seal, unpack

DAY = "day"
CHUNK_BYTES = 1_000_000


class NotYetError(Exception):
    """A result that is not there: its work waits, is under way, was cancelled, or failed.

    Parameters
    ----------
    plan : StoredPlan
    piece : Piece
    """

    def __init__(self, plan: StoredPlan, piece: Piece) -> None:
        super().__init__(f"{piece.kind}: {piece.state}")
        self.plan, self.piece = plan, piece


class Background:
    """Asks for results.

    Parameters
    ----------
    queue : WorkQueue
    results : Results
    seal : Seal
    """

    def __init__(self, queue: WorkQueue, results: Results, seal: Seal) -> None:
        program()  # as it was loaded, not as it may lie on the disk later
        self.queue = queue
        self._results, self._seal = results, seal

    def reading(self, plan: StoredPlan, who: str) -> Reading:
        """Give how a list is read."""
        found: Reading = unpack(self._result(plan, who, _order(READING, plan)))
        return found

    def planned(self, plan: StoredPlan, who: str) -> PlannedLine:
        """Give a plan."""
        return planned_of(unpack(self._result(plan, who, _order(PLAN, plan))))

    def workbook(
        self, plan: StoredPlan, who: str, system: str, signatures: Signatures | None = None
    ) -> bytes:
        """Give the workbook of a plan, in a system of units; it bears the day on which it is made."""
        signed = () if signatures is None else ((SIGNED, signatures.as_text()),)
        more = ((DAY, date.today().isoformat()), *signed, (SYSTEM, system))
        return self._result(plan, who, _order(WORKBOOK, plan, more))

    def document(self, plan: StoredPlan, who: str) -> Iterator[bytes]:
        """Give the JSON of a plan in pieces."""
        return _unpacked(self._result(plan, who, _order(DOCUMENT, plan)))

    def _result(self, plan: StoredPlan, who: str, order: Order) -> bytes:
        """Give the bytes of a result.

        Raises
        ------
        NotYetError
            It is not there.
        CantError
            What is asked for cannot be made of this list and these decisions.
        """
        sealed = self._results.of(who, plan.address, order.key)
        if sealed is not None:
            data = self._seal.open(order.key, sealed)
            if data is not None:
                return data
            self._results.forget(order.key)
        piece = self.queue.ask(who, plan.address, order.kind, order.key, order.content)
        if piece.state == REFUSED:
            raise CantError(piece.message)
        raise NotYetError(plan, piece)


def _order(kind: str, plan: StoredPlan, more: tuple[tuple[str, str], ...] = ()) -> Order:
    return Order(kind, Basis(plan.file_name, plan.file_digest, plan.decided), more)


def _unpacked(data: bytes) -> Iterator[bytes]:
    unpacking = zlib.decompressobj()
    rest = data
    while rest and not unpacking.eof:
        yield unpacking.decompress(rest, CHUNK_BYTES)
        rest = unpacking.unconsumed_tail
    yield unpacking.flush()
