"""Signing off a plan: who prepared, checked and approved it."""

from __future__ import annotations

from flask import Blueprint
from flask.typing import ResponseReturnValue

from webapp.context import stored

pages = Blueprint("signing", __name__, url_prefix="/plans/<address>")


@pages.get("/sign-off")
def show(address: str) -> ResponseReturnValue:
    """Show who has signed the plan."""
    return stored(address).name
