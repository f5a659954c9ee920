"""One operation of the JSON interface: its address, what it takes and gives, and how a call is checked.

A view is registered together with its pydantic models, and the OpenAPI description is made from the same
register, so that neither can promise what the other does not keep.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import wraps
from typing import Any, TypeVar, get_origin

from flask import Blueprint, Response, jsonify, request
from flask.typing import ResponseReturnValue
from pydantic import BaseModel, ValidationError
from werkzeug.exceptions import Unauthorized, UnsupportedMediaType

from cant.errors import InputError
from webapp.guarding.texts import strict_json
from webapp.security import check_same_site, is_known

api = Blueprint("api", __name__, url_prefix="/api/v1")
LONGEST_PLACE = 200
View = TypeVar("View", bound=Callable[..., Any])


@dataclass(frozen=True)
class Operation:
    """What is promised of one operation.

    Attributes
    ----------
    name, method, path, summary : str
        The path has its variables in braces.
    code : int
        Status of success.
    answer : type of BaseModel or str or None
        Model of the JSON answer, or a media type; None for an empty one.
    body, query : type of BaseModel or None
        Models of the JSON body and of the parameters.
    upload : bool
        The body is a form with files.
    open : bool
        Asks for no plan's owner.
    later : bool
        What is asked for may be made in the background: the answer is then 202, and tells how far it is.
    """

    name: str
    method: str
    path: str
    summary: str
    code: int = 200
    answer: type[BaseModel] | str | None = None
    body: type[BaseModel] | None = None
    query: type[BaseModel] | None = None
    upload: bool = False
    open: bool = False
    later: bool = False

    @property
    def changes(self) -> bool:
        """Whether a call may change something."""
        return self.method != "GET"


OPERATIONS: list[Operation] = []


def operation(method: str, path: str, **promised: Any) -> Callable[[View], View]:
    """Register a view as an operation; it gets ``body`` and ``query`` as models where they are promised."""

    def register(view: View) -> View:
        summary = (view.__doc__ or "").strip().splitlines()[0]
        what = Operation(view.__name__, method, path, summary, **promised)
        OPERATIONS.append(what)
        rule = (
            path.replace("{number}", "{int:number}")
            .replace("{option}", "{int:option}")
            .replace("{share}", "{int:share}")
            .replace("{", "<")
            .replace("}", ">")
        )

        @wraps(view)
        def call(**variables: Any) -> ResponseReturnValue:
            return _call(what, view, variables)

        api.add_url_rule(rule, endpoint=view.__name__, view_func=call, methods=[method])
        return view

    return register


def _call(what: Operation, view: Callable[..., Any], variables: dict[str, Any]) -> ResponseReturnValue:
    if not what.open and not is_known():
        message = "send the key that came with the plan as 'Authorization: Bearer KEY'"
        raise Unauthorized(message)
    if what.changes:
        check_same_site()
    if what.query is not None:
        variables["query"] = _checked(what.query, _parameters(what.query))
    if what.body is not None:
        variables["body"] = _checked(what.body, _json_body())
    return _answer(what, view(**variables))


def _answer(what: Operation, made: Any) -> Response:
    if isinstance(made, Response):
        return made
    if what.answer is None:
        return Response(status=204)
    found = made.model_dump(mode="json") if isinstance(made, BaseModel) else made
    answer = jsonify(found)
    answer.status_code = what.code
    return answer


def _parameters(model: type[BaseModel]) -> dict[str, Any]:
    """Give the parameters of the address; a list for those that may be repeated."""
    found: dict[str, Any] = {}
    for name, values in request.args.lists():
        field = model.model_fields.get(name)
        repeated = field is not None and get_origin(field.annotation) is list
        if not repeated and len(values) > 1:
            message = f"the parameter {name} may be given once"
            raise InputError(message)
        found[name] = values if repeated else values[0]
    return found


def _json_body() -> Any:
    if not request.is_json:
        message = "send JSON, with 'Content-Type: application/json'"
        raise UnsupportedMediaType(message)
    return strict_json(request.get_data())


def _checked(model: type[BaseModel], given: Any) -> Any:
    try:
        return model.model_validate(given)
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        where = ascii(".".join(str(part) for part in first["loc"]))[1:-1][:LONGEST_PLACE]
        said = str(first["msg"])
        message = f"{where}: {said}" if where else said
        raise InputError(message) from error
