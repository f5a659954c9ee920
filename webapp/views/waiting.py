"""The pages of long work: how far it is, how it ended; and the answer where a result is not yet there."""

from __future__ import annotations

from flask import Blueprint, Flask, Response, g, jsonify, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from webapp import going_on
from webapp.context import running, stored
from webapp.errors import answer, wants_json
from webapp.going_on import GoingOn
from webapp.keeping.work import CANCELLED, DONE, FAILED, Piece
from webapp.security import owner
from webapp.working.asking import NotYetError
from webapp.working.orders import DOCUMENT, GIVES, PLAN, READING, WORDS, WORKBOOK

pages = Blueprint("waiting", __name__, url_prefix="/plans/<address>/pieces/<work>")
RETRY_S = 2
PLACES = {
    READING: "reading.show",
    PLAN: "result.show",
    WORKBOOK: "downloads.workbook",
    DOCUMENT: "downloads.document",
}
"""Where the result of each kind of work is looked at."""
TAKEN_AWAY = (WORKBOOK, DOCUMENT)
CANCELLED_WORDS = "The work was cancelled; it can be started again"


def add_not_yet(app: Flask) -> None:
    """Register the answer to what is not there yet."""
    app.register_error_handler(NotYetError, _not_yet)


@pages.get("")
def show(address: str, work: str) -> ResponseReturnValue:
    """Show how far a piece of work is, or how it ended."""
    stored(address)
    piece = running().background.queue.piece(owner(), address, work)
    if request.args.get("then"):
        return _page(piece, going_on.of_form(address), address)
    return _page(piece, GoingOn(url_for(PLACES[piece.kind], address=address)), address)


@pages.post("/stop")
def stop(address: str, work: str) -> ResponseReturnValue:
    """Cancel it."""
    stored(address)
    piece = running().background.queue.cancel(owner(), address, work)
    return _page(piece, going_on.of_form(address), address)


@pages.post("/again")
def again(address: str, work: str) -> ResponseReturnValue:
    """Start it again."""
    stored(address)
    piece = running().background.queue.again(owner(), address, work)
    going = going_on.of_form(address)
    return _page(piece, going, address) if going.is_form else redirect(going.path, 303)


def _not_yet(error: NotYetError) -> ResponseReturnValue:
    """Answer with how far the work is."""
    piece, address = error.piece, error.plan.address
    if wants_json():
        return _as_json(piece, address)
    if "plan" not in g:
        g.plan = error.plan
    going = going_on.of_request()
    if piece.kind in TAKEN_AWAY and piece.is_open:
        # A page that loads a file stays as it is: this one tells that the file is ready.
        return redirect(url_for("waiting.show", address=address, work=piece.address, then=going.path))
    return _page(piece, going, address)


def _as_json(piece: Piece, address: str) -> Response:
    if not piece.is_open:
        again_at = f"/api/v1/plans/{address}/pieces/{piece.address}"
        how = f"send POST to {again_at} to start it again"
        reason = "the work was cancelled" if piece.state == CANCELLED else piece.message
        return answer(409, f"{reason}; {how}" if piece.state == CANCELLED else f"{reason} Or {how}.")
    # The model lies with the interface, which knows the pages; only its words are needed here.
    from webapp.api.models import WorkAnswer

    queue = running().background.queue
    made = jsonify(WorkAnswer.of(piece, address, queue.before(piece)).model_dump(mode="json"))
    made.status_code = 202
    made.headers["Location"] = f"/api/v1/plans/{address}/pieces/{piece.address}"
    made.headers["Retry-After"] = str(RETRY_S)
    return made


def _page(piece: Piece, going: GoingOn, address: str) -> Response:
    queue = running().background.queue
    shown = render_template(
        "waiting.html",
        address=address,
        piece=piece,
        kind_words=WORDS[piece.kind],
        gives=GIVES[piece.kind],
        may_cancel=g.plan.may_edit or piece.asked_by == owner(),
        going=going,
        refresh=_refresh(piece, going, address),
        before=queue.before(piece),
        nobody=queue.nobody_works(piece),
        taken_away=piece.kind in TAKEN_AWAY,
        retry_s=RETRY_S,
        done=piece.state == DONE,
    )
    made = Response(shown, 202 if piece.is_open else 409 if piece.state in (CANCELLED, FAILED) else 200)
    if piece.is_open:
        made.headers["Retry-After"] = str(RETRY_S)
    return made


def _refresh(piece: Piece, going: GoingOn, address: str) -> str:
    """Give the address that is opened in a moment where there is no script, "" where a form goes on."""
    if going.is_form or not piece.is_open:
        return ""
    if piece.kind in TAKEN_AWAY:
        return url_for("waiting.show", address=address, work=piece.address, then=going.path)
    return going.path
