"""Does one piece of work: from a plan's file and the decisions it carries to the result as bytes."""

from __future__ import annotations

import logging
import secrets
import zlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

from cant import service
from cant.errors import CantError
from cant.explaining import explain
from cant.model.reading import Reading
from cant.model.signatures import Signatures
from cant.service import PlannedLine, Progress
from webapp.computing import Computed
from webapp.keeping.access import NotThereError
from webapp.keeping.database import Database
from webapp.keeping.results import Results
from webapp.keeping.work import FAILED, REFUSED, Piece
from webapp.keeping.work_claims import Claims
from webapp.working.orders import DOCUMENT, PLAN, READING, WORDS, WORKBOOK, Order, program
from webapp.working.sealing import LEVEL, Seal, pack, unpack

LOG = logging.getLogger("webapp.working")
SYSTEM = "system"
SIGNED = "signatures"
OTHER_VERSION = (
    "This was asked for by another version of the program than does the work. Start it again once the whole "
    "service has been upgraded."
)
TOLD_EVERY = 64
RECORDS_FROM, RECORDS_TO = 0.1, 0.7


@dataclass(frozen=True)
class Watched(PlannedLine):
    """A planned line that tells how far its records have been made."""

    tell: Progress

    def records(self) -> Iterator[dict[str, Any]]:
        """Give the records, and tell of them."""
        total = max(len(self.plan.assessed), 1)
        for number, record in enumerate(super().records()):
            if number % TOLD_EVERY == 0:
                done = RECORDS_FROM + (RECORDS_TO - RECORDS_FROM) * number / total
                self.tell(done, f"curve {number + 1} of {total}")
            yield record
        self.tell(RECORDS_TO, "putting it together")


class Doing:
    """Does pieces of work.

    Parameters
    ----------
    database : Database
    seal : Seal
    """

    def __init__(self, database: Database, seal: Seal) -> None:
        program()  # as it was loaded, not as it may lie on the disk later
        self._claims, self._results, self._seal = Claims(database), Results(database), seal
        self._makers: dict[str, Callable[[Order, Piece, Progress], bytes]] = {
            READING: lambda order, piece, tell: pack(self._reading(order, piece, tell)),
            PLAN: lambda order, piece, tell: pack_plan(self._planned(order, piece, tell)),
            WORKBOOK: self._workbook,
            DOCUMENT: self._document,
        }

    def do(self, piece: Piece, tell: Progress) -> None:
        """Do a piece and settle it; MemoryError passes through.

        Parameters
        ----------
        piece : Piece
            One that was claimed.
        tell : callable
            Called with the share done (0 to 1) and what is being done.
        """
        try:
            tell(0.0, WORDS[piece.kind])
            order = Order.of(piece.kind, piece.content)
            if order.key != piece.key:
                self._claims.end(piece, FAILED, OTHER_VERSION)
                return
            data = self._makers[piece.kind](order, piece, tell)
        except MemoryError:
            raise
        except CantError as error:
            self._claims.end(piece, REFUSED, str(error))
        except Exception:
            reference = secrets.token_hex(4)
            LOG.exception("Work of kind %s failed, reference %s", piece.kind, reference)
            message = (
                "The service met something that it was not made for. "
                f"Who runs it finds the details in its log under the reference {reference}."
            )
            self._claims.end(piece, FAILED, message)
        else:
            self._claims.finish(piece, self._seal.close(piece.key, data))

    def _reading(self, order: Order, piece: Piece, tell: Progress) -> Reading:
        found = self._known(order.needs(READING), piece)
        if found is None:
            tell(0.05, WORDS[READING])
            found = order.basis.read(self._file(piece))
            if piece.kind != READING:
                self._keep(order.needs(READING), piece, pack(found))
        reading: Reading = found
        return reading

    def _planned(self, order: Order, piece: Piece, tell: Progress) -> PlannedLine:
        found = self._known(order.needs(PLAN), piece)
        if found is not None:
            return planned_of(found)
        reading = self._reading(order, piece, tell)
        planned = order.basis.plan(reading, lambda share, doing: tell(0.4 + 0.6 * share, doing))
        if piece.kind != PLAN:
            self._keep(order.needs(PLAN), piece, pack_plan(planned))
        return planned

    def _watched(self, order: Order, piece: Piece, tell: Progress, system: str = "") -> Watched:
        planned = self._planned(order, piece, lambda share, doing: tell(RECORDS_FROM * share, doing))
        shown = Computed(planned).shown_in(system) if system else planned
        return Watched(shown.reading, shown.plan, shown.explanation, tell)

    def _workbook(self, order: Order, piece: Piece, tell: Progress) -> bytes:
        watched = self._watched(order, piece, tell, order.told(SYSTEM))
        signed = order.told(SIGNED)
        return service.annotated_workbook(
            watched,
            self._file(piece),
            order.basis.file_name,
            signatures=Signatures.from_text(signed) if signed else None,
        ).data

    def _document(self, order: Order, piece: Piece, tell: Progress) -> bytes:
        """Give the JSON of a plan, packed as it is made: it may be far larger than what else is kept."""
        packing = zlib.compressobj(LEVEL)
        parts = [packing.compress(chunk) for chunk in self._watched(order, piece, tell).json_chunks()]
        return b"".join([*parts, packing.flush()])

    def _known(self, order: Order, piece: Piece) -> Any:
        sealed = self._results.of_plan(piece.plan_id, order.key)
        data = None if sealed is None else self._seal.open(order.key, sealed)
        return None if data is None else unpack(data)

    def _keep(self, order: Order, piece: Piece, data: bytes) -> None:
        self._results.keep(piece.plan_id, order.kind, order.key, self._seal.close(order.key, data))

    def _file(self, piece: Piece) -> bytes:
        data = self._claims.file(piece)
        if data is None:
            message = "the plan has been deleted"
            raise NotThereError(message)
        return data


def pack_plan(planned: PlannedLine) -> bytes:
    """Give a plan as bytes: its words are made anew by who asks for them."""
    return pack((planned.reading, planned.plan))


def planned_of(found: Any) -> PlannedLine:
    """Give the plan that :func:`pack_plan` packed, unpacked."""
    reading, plan = found
    return PlannedLine(reading, plan, explain(plan))
