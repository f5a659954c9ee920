"""The help pages, made from the same data as the code: terms, formulas, columns, limit sets, cautions."""

from __future__ import annotations

from flask import Blueprint, render_template
from flask.typing import ResponseReturnValue

from cant import limit_sets, service
from cant.model.limits import QUANTITIES
from cant.model.settings import METHODS
from cant.quantities.catalogue import CATALOGUE, SYMBOLS
from cant.reading.columns import TABLES, columns_of
from webapp import limits_form
from webapp.context import current_measures
from webapp.keeping.access import NotThereError

pages = Blueprint("help", __name__, url_prefix="/help")


@pages.get("/")
def contents() -> ResponseReturnValue:
    """Show what the program does, how to go through it, and its cautions."""
    return render_template("help/contents.html")


@pages.get("/terms")
def terms() -> ResponseReturnValue:
    """Show the terms and the limited quantities."""
    return render_template(
        "help/terms.html",
        quantities=QUANTITIES,
        methods=METHODS,
        symbols=SYMBOLS,
        formulas=CATALOGUE.values(),
    )


@pages.get("/formulas")
def formulas() -> ResponseReturnValue:
    """Show every formula with its source."""
    return render_template("help/formulas.html", formulas=CATALOGUE.values(), symbols=SYMBOLS)


@pages.get("/columns")
def columns() -> ResponseReturnValue:
    """Show the columns that are understood, by table, with the headings they go by."""
    return render_template("help/columns.html", tables={table: columns_of(table) for table in TABLES})


@pages.get("/limits")
def sets() -> ResponseReturnValue:
    """Show the limit sets that come with the program."""
    return render_template("help/limit_sets.html", sets=[limit_sets.load(n) for n in limit_sets.names()])


@pages.get("/limits/<name>")
def limit_set(name: str) -> ResponseReturnValue:
    """Show one limit set."""
    found = service.limits_named(name)
    if found is None:
        message = f"there is no limit set named '{name}'"
        raise NotThereError(message)
    rows = limits_form.shown_rows(found, current_measures())
    return render_template("help/limit_set.html", limits=found, rows=rows)
