"""Texts that come in: what no database holds and no program should have to think of is refused."""

from __future__ import annotations

import json
from typing import Any
from urllib.parse import urlsplit

from flask import request
from werkzeug.exceptions import BadRequest, NotFound

NULL = "\x00"
NOT_JSON = "the body is not JSON"


def refuse_null() -> None:
    """Refuse a request with a null character in its address, its query or its form."""
    if any(isinstance(value, str) and NULL in value for value in (request.view_args or {}).values()):
        raise NotFound
    given = [*request.args.items(multi=True), *request.form.items(multi=True)]
    if any(NULL in f"{name}{value}" for name, value in given):  # a part of a form may have no name
        message = "a text holds a null character, which no text has"
        raise BadRequest(message)


def strict_json(data: bytes) -> Any:
    """Read JSON as its standard has it: UTF-8, each name of an object once, numbers that are numbers.

    Raises
    ------
    BadRequest
        It is something else, nested without end, or holds a letter that no text has.
    """
    try:
        found = json.loads(data.decode("utf-8"), object_pairs_hook=_once, parse_constant=_no_number)
        again = json.dumps(found, ensure_ascii=False)
        again.encode("utf-8")
    except (ValueError, RecursionError) as error:  # a letter that is none is a ValueError too
        raise BadRequest(NOT_JSON) from error
    if "\\u0000" in again:
        message = "the body holds a null character, which no text has"
        raise BadRequest(message)
    return found


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        raise ValueError(NOT_JSON)
    return found


def _no_number(name: str) -> Any:
    raise ValueError(name)


def is_own_path(path: str) -> bool:
    """Tell whether an address leads to a page of this service, however a browser may read it."""
    if not path.startswith("/") or path.startswith("//") or "\\" in path:
        return False
    if any(letter <= " " or letter == "\x7f" for letter in path):  # browsers take some of them away
        return False
    parts = urlsplit(path)
    return not parts.scheme and not parts.netloc
