"""Operations on long work: how far it is, cancel it, start it again."""

from __future__ import annotations

from webapp.api.models import WorkAnswer, WorkList
from webapp.api.operations import operation
from webapp.context import running
from webapp.keeping.work import Piece
from webapp.security import owner


@operation("GET", "/plans/{address}/pieces", answer=WorkList)
def list_work(address: str) -> WorkList:
    """List the long work of a plan that is known, the latest first."""
    found = running().background.queue.of_plan(owner(), address)
    return WorkList(work=[_answer(address, piece) for piece in found])


@operation("GET", "/plans/{address}/pieces/{work}", answer=WorkAnswer)
def get_work(address: str, work: str) -> WorkAnswer:
    """Tell how far a piece of work is."""
    return _answer(address, running().background.queue.piece(owner(), address, work))


@operation("DELETE", "/plans/{address}/pieces/{work}", answer=WorkAnswer)
def cancel_work(address: str, work: str) -> WorkAnswer:
    """Cancel a piece of work that is waiting or under way."""
    return _answer(address, running().background.queue.cancel(owner(), address, work))


@operation("POST", "/plans/{address}/pieces/{work}", answer=WorkAnswer)
def begin_work_again(address: str, work: str) -> WorkAnswer:
    """Start a piece of work again that was cancelled or failed."""
    return _answer(address, running().background.queue.again(owner(), address, work))


def _answer(address: str, piece: Piece) -> WorkAnswer:
    return WorkAnswer.of(piece, address, running().background.queue.before(piece))
