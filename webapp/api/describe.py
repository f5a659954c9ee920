"""The OpenAPI description, made from the register of operations and their models."""

from __future__ import annotations

from typing import Any

from flask import Response, current_app, has_app_context, jsonify
from pydantic import BaseModel
from pydantic.json_schema import models_json_schema

from cant.version import __version__
from cant.writing.cautions import CAUTIONS
from webapp.api.models import ErrorAnswer, KnownQuery, WorkAnswer
from webapp.api.operations import OPERATIONS, Operation, api
from webapp.security import SESSION_COOKIE

COMPONENTS = "#/components/schemas/{model}"
BINARY = {"type": "string", "format": "binary"}
VARIABLES: dict[str, dict[str, Any]] = {
    "address": {"type": "string", "pattern": "^[A-Za-z0-9_-]{32}$"},
    "number": {"type": "integer", "minimum": 1, "maximum": 10_000_000},
    "option": {"type": "integer", "minimum": 1, "maximum": 100},
    "share": {"type": "integer", "minimum": 1, "maximum": 2_147_483_647},
    "change": {"type": "string", "pattern": "^[A-Za-z0-9_-]{12}$"},
    "work": {"type": "string", "pattern": "^[A-Za-z0-9_-]{20}$"},
    "name": {"type": "string", "minLength": 1, "maxLength": 80, "pattern": "^[a-z0-9-]+$"},
}
ERRORS = {
    "400": "The request is not well formed.",
    "401": "No key and no cookie was sent, or, where people sign in, none that is valid.",
    "403": "The key is not valid, or the request comes from another site.",
    "404": "There is no such plan for the caller.",
    "409": "The work for it was cancelled or failed, or somebody has decided the same since what is known.",
    "413": "The request is too large.",
    "415": "The body has the wrong media type.",
    "422": "What was sent cannot be used; the message says why and what would be right.",
    "429": "Too much was asked in a short time; Retry-After says in how many seconds to try again.",
    "503": "The service is busy and nothing was stored; Retry-After says in how many seconds to try again.",
    "507": "There is no room for what was sent; the message says what to delete. Nothing was stored.",
}


@api.get("/openapi.json")
def description() -> Response:
    """Give the description of the JSON interface."""
    return jsonify(describe())


def describe() -> dict[str, Any]:
    """Give the OpenAPI 3.1 description as a dict."""
    taken = {model for o in OPERATIONS for model in (o.body, o.query) if model is not None}
    given = {o.answer for o in OPERATIONS if isinstance(o.answer, type)} | {ErrorAnswer}
    _, schemas = models_json_schema(
        [(m, "validation") for m in sorted(taken, key=lambda m: m.__name__)]
        + [(m, "serialization") for m in sorted(given, key=lambda m: m.__name__)],
        ref_template=COMPONENTS,
    )
    paths: dict[str, dict[str, Any]] = {}
    for what in OPERATIONS:
        paths.setdefault(f"/api/v1{what.path}", {})[what.method.lower()] = _operation(what, schemas["$defs"])
    return {
        "openapi": "3.1.0",
        "info": {
            "title": "Cant",
            "version": __version__,
            "description": f"Plans the cant of railway curves, metric always. {CAUTIONS[0]}",
        },
        "paths": paths,
        "components": {
            "schemas": schemas["$defs"],
            "securitySchemes": {
                "key": {"type": "http", "scheme": "bearer"},
                "cookie": {"type": "apiKey", "in": "cookie", "name": _cookie_name()},
            },
        },
    }


def _cookie_name() -> str:
    return str(current_app.config["SESSION_COOKIE_NAME"]) if has_app_context() else SESSION_COOKIE


def _operation(what: Operation, schemas: dict[str, Any]) -> dict[str, Any]:
    made: dict[str, Any] = {
        "operationId": what.name,
        "summary": what.summary,
        "responses": {str(what.code): _success(what), **_not_yet(what), **_errors(what)},
    }
    parameters = [
        {"name": name, "in": "path", "required": True, "schema": schema}
        for name, schema in VARIABLES.items()
        if f"{{{name}}}" in what.path
    ]
    if what.query is not None:
        parameters += [
            {"name": name, "in": "query", "required": False, "schema": schema}
            for name, schema in schemas[what.query.__name__]["properties"].items()
        ]
    if parameters:
        made["parameters"] = parameters
    if what.body is not None:
        made["requestBody"] = {
            "required": True,
            "content": {"application/json": {"schema": _reference(what.body)}},
        }
    if what.upload:
        made["requestBody"] = _content("multipart/form-data", _files())
    if not what.open:
        made["security"] = [{"key": []}, {"cookie": []}]
    return made


def _content(media: str, schema: dict[str, Any]) -> dict[str, Any]:
    return {"required": True, "content": {media: {"schema": schema}}}


def _success(what: Operation) -> dict[str, Any]:
    if what.answer is None:
        return {"description": "Done."}
    if isinstance(what.answer, str):
        return {"description": "The file.", "content": {what.answer: {"schema": BINARY}}}
    return {"description": "Done.", "content": {"application/json": {"schema": _reference(what.answer)}}}


def _not_yet(what: Operation) -> dict[str, Any]:
    if not what.later:
        return {}
    headers = {
        "Location": {"schema": {"type": "string"}, "description": "Where the work can be looked at."},
        "Retry-After": {"schema": {"type": "integer"}, "description": "Seconds."},
    }
    words = {
        "202": "Not yet: it is made in the background. Ask the same again later.",
        "409": ERRORS["409"],
    }
    models: dict[str, type[BaseModel]] = {"202": WorkAnswer, "409": ErrorAnswer}
    answers = {
        code: {"description": text, "content": {"application/json": {"schema": _reference(models[code])}}}
        for code, text in words.items()
    }
    return {**answers, "202": {**answers["202"], "headers": headers}}


def _errors(what: Operation) -> dict[str, Any]:
    content = {"application/json": {"schema": _reference(ErrorAnswer)}}
    codes = ["400", "401", "404", "422", "429", "503"]
    codes += ["507"] if what.upload else []
    codes += ["409"] if what.query is KnownQuery else []
    codes += ["403", "413", "415"] if what.changes else (["403"] if not what.open else [])
    return {code: {"description": ERRORS[code], "content": content} for code in sorted(codes)}


def _files() -> dict[str, Any]:
    words = {
        "file": "The curve list: xlsx, xlsm, xls, ods or csv.",
        "traffic": "A traffic table that replaces the sheet.",
        "limits": "A limits table that replaces the sheet.",
        "settings": "A settings table that replaces the sheet.",
    }
    return {
        "type": "object",
        "required": ["file"],
        "properties": {name: {**BINARY, "description": text} for name, text in words.items()},
    }


def _reference(model: type[BaseModel]) -> dict[str, str]:
    return {"$ref": COMPONENTS.format(model=model.__name__)}
