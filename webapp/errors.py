"""What a person or a program is told when something goes wrong: a page, or JSON, in the same words.

Never a stack trace: what was not foreseen goes to the log, and the answer carries its reference.
"""

from __future__ import annotations

import logging
import secrets

from flask import Flask, Response, jsonify, render_template, request
from flask.typing import ResponseReturnValue
from sqlalchemy.exc import DBAPIError
from sqlalchemy.exc import TimeoutError as PoolTimeoutError
from werkzeug.exceptions import HTTPException, RequestEntityTooLarge, SecurityError

from cant.errors import CantError
from webapp.busy import BusyError, FullError, TooManyError
from webapp.context import running
from webapp.guarding.access_log import route
from webapp.guarding.texts import is_own_path
from webapp.keeping.access import NotAllowedError, NotThereError
from webapp.keeping.database import is_full, is_passing
from webapp.meanwhile import MeanwhileError
from webapp.security import RefusedError

API_PREFIX = "/api/"
LOG = logging.getLogger("webapp")
TITLES = {
    400: "This cannot be used as it is",
    401: "Sign in first",
    403: "Refused",
    404: "Nothing here",
    405: "Not possible here",
    409: "Somebody was quicker",
    413: "Too large",
    422: "This cannot be used as it is",
    429: "Too much at once",
    500: "Something went wrong here",
    503: "Busy just now",
    507: "Full",
}
AGAIN = (429, 503)
"""What passes by itself: the page offers to be asked for again."""
DATABASE_RETRY_S = 10


def add_error_answers(app: Flask) -> None:
    """Register the answers to every kind of error."""
    app.register_error_handler(NotThereError, _not_there)
    app.register_error_handler(NotAllowedError, _not_allowed)
    app.register_error_handler(MeanwhileError, _meanwhile)
    app.register_error_handler(FullError, _full)
    app.register_error_handler(BusyError, _busy)
    app.register_error_handler(DBAPIError, _database)
    app.register_error_handler(PoolTimeoutError, _database)
    app.register_error_handler(CantError, _cannot)
    app.register_error_handler(RefusedError, _refused)
    app.register_error_handler(RequestEntityTooLarge, _too_large)
    app.register_error_handler(SecurityError, _unknown_host)
    app.register_error_handler(HTTPException, _http)
    app.register_error_handler(Exception, _unforeseen)


def wants_json() -> bool:
    """Tell whether the answer should be JSON: on the JSON interface, or where JSON is preferred."""
    if request.path.startswith(API_PREFIX):
        return True
    accepted = request.accept_mimetypes
    return accepted.best_match(["text/html", "application/json"]) == "application/json"


def answer(code: int, message: str) -> Response:
    """Give an error as JSON or as a page."""
    if wants_json():
        made = jsonify({"error": {"status": code, "message": message}})
    else:
        title = TITLES.get(code, "This did not work")
        here = request.full_path.rstrip("?")
        again = code in AGAIN and request.method == "GET" and is_own_path(here)
        shown = render_template(
            "error.html", title=title, message=message, code=code, again=here if again else ""
        )
        made = Response(shown)
    made.status_code = code
    return made


def _not_there(error: NotThereError) -> ResponseReturnValue:
    return answer(404, _sentence(str(error)))


def _not_allowed(error: NotAllowedError) -> ResponseReturnValue:
    return answer(403, _sentence(str(error)))


def _meanwhile(error: MeanwhileError) -> ResponseReturnValue:
    return answer(409, _sentence(str(error)))


def _full(error: FullError) -> ResponseReturnValue:
    LOG.warning("Full: refused to store, route %s", route())
    return answer(507, _sentence(str(error)))


def _busy(error: BusyError) -> ResponseReturnValue:
    too_many = isinstance(error, TooManyError)
    if too_many:
        LOG.warning("Too much was asked from one address or by one person, route %s", route())
    made = answer(429 if too_many else 503, _sentence(str(error)))
    made.headers["Retry-After"] = str(error.retry_s)
    return made


def _database(error: DBAPIError | PoolTimeoutError) -> ResponseReturnValue:
    """Answer where the database is full, gone or held by others; anything else of it was not foreseen."""
    if isinstance(error, DBAPIError) and is_full(error):
        LOG.error("The database has no room left, route %s: %s", route(), type(error.orig))
        message = "the database of this service has no room left; nothing has been stored. Tell who runs it"
        return answer(507, _sentence(message))
    if isinstance(error, PoolTimeoutError) or is_passing(error):
        LOG.error("The database does not answer, route %s: %s", route(), type(error))
        return _busy(BusyError(DATABASE_RETRY_S))
    return _unforeseen(error)


def _cannot(error: CantError) -> ResponseReturnValue:
    return answer(422, _sentence(str(error)))


def _refused(error: RefusedError) -> ResponseReturnValue:
    LOG.warning("Refused, route %s: %s", route(), error)
    return answer(403, _sentence(str(error)))


def _too_large(_error: RequestEntityTooLarge) -> ResponseReturnValue:
    largest = running().config.upload_mb
    message = f"A request may have {largest} MB at most. Send the sheet with the curve list alone, or as csv."
    return answer(413, message)


def _unknown_host(_error: SecurityError) -> ResponseReturnValue:
    """Answer in plain text: a page has links, and links need a host that is trusted."""
    return Response("This service does not answer to that host name.\n", 400, mimetype="text/plain")


def _http(error: HTTPException) -> ResponseReturnValue:
    code = error.code or 500
    if code < 400:
        return error.get_response()
    message = error.description or error.name
    if code == 404:
        message = "There is no page at this address."
    made = answer(code, message)
    if code == 405 and getattr(error, "valid_methods", None):
        made.headers["Allow"] = ", ".join(sorted(error.valid_methods))  # type: ignore[attr-defined]
    return made


def _unforeseen(error: Exception) -> ResponseReturnValue:
    reference = secrets.token_hex(4)
    LOG.error("Request %s %s failed, reference %s", request.method, route(), reference, exc_info=error)
    message = (
        f"The service met something that it was not made for. "
        f"Who runs it finds the details in its log under the reference {reference}."
    )
    return answer(500, message)


def _sentence(text: str) -> str:
    """Give a message as a sentence."""
    shown = text[:1].upper() + text[1:]
    return shown if shown.endswith((".", "?", "!")) else f"{shown}."
