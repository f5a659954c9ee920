"""How a request goes on once the work it waits for is done: the same address again, or the same form."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass

from flask import g, request, url_for

PREFIX = "go-"
PAGE_OF_PLAN = re.compile(r"/plans/[A-Za-z0-9_-]{32}/\S+\Z", re.ASCII)
NOT_CARRIED = ("token", "password")


@dataclass(frozen=True)
class GoingOn:
    """How it goes on.

    Attributes
    ----------
    path : str
        Address on this site.
    fields : tuple of (str, str)
        Fields of the form that is sent there.
    is_form : bool
        Whether a form is sent; else a page is opened.
    """

    path: str
    fields: tuple[tuple[str, str], ...] = ()
    is_form: bool = False


def carry_on(path: str, fields: Mapping[str, str]) -> None:
    """Let this request go on with another form than its own, such as one without a file."""
    g.going_on = GoingOn(path, tuple(fields.items()), True)


def of_request() -> GoingOn:
    """Tell how the request at hand goes on."""
    if request.method in ("GET", "HEAD"):
        return GoingOn(request.full_path.rstrip("?"))
    carried: GoingOn | None = g.get("going_on")
    if carried is not None:
        return carried
    fields = tuple((k, v) for k, v in request.form.items(multi=True) if k not in NOT_CARRIED)
    return GoingOn(request.path, fields, True)


def of_form(address: str) -> GoingOn:
    """Tell how it goes on by the fields of a waiting page that was sent back; to a page of a plan alone."""
    path = request.values.get("then", "")
    if not PAGE_OF_PLAN.match(path) or ".." in path or "\\" in path:
        return GoingOn(url_for("start.resume", address=address))
    fields = tuple(
        (name.removeprefix(PREFIX), value)
        for name, value in request.form.items(multi=True)
        if name.startswith(PREFIX)
    )
    return GoingOn(path, fields, request.form.get("how") == "form")
