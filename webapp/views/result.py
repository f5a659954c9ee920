"""The cants of a plan: counts that filter, the table, the line drawn, the findings, the page for print."""

from __future__ import annotations

from typing import Any

from flask import Blueprint, render_template, request
from flask.typing import ResponseReturnValue

from webapp import line_view
from webapp.computing import Computed
from webapp.context import computed_of, current_measures, stored, unconfirmed
from webapp.findings_view import page_of_findings
from webapp.listing import PAGE_SIZES, SORTS, Wanted

pages = Blueprint("result", __name__, url_prefix="/plans/<address>")
PRINT_ROWS = 500


def _wanted() -> Wanted:
    return Wanted.of(request.args, request.args.getlist("status"))


@pages.get("/cants")
def show(address: str) -> ResponseReturnValue:
    """Show the table of curves."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    wanted = _wanted()
    page = computed.listing.page(wanted)
    return render_template(
        "cants.html",
        **_shared(computed),
        wanted=wanted,
        page=page,
        records=computed.rows(page.indices, current_measures().system),
        sorts=SORTS,
        sizes=PAGE_SIZES,
    )


@pages.get("/line")
def line(address: str) -> ResponseReturnValue:
    """Show the line drawn along the chainage, so many curves a page."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    shown = line_view.page_of_line(computed, plan.address, request.args, current_measures())
    return render_template("line.html", **_shared(computed), drawn=shown, zooms=line_view.ZOOMS)


@pages.get("/findings")
def findings(address: str) -> ResponseReturnValue:
    """Show everything a good engineer would notice."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    severity, kind = request.args.get("severity", ""), request.args.get("kind", "")
    page = page_of_findings(computed, current_measures().system, severity, kind, _wanted().page)
    return render_template(
        "findings.html",
        **_shared(computed),
        page=page,
        severity=severity,
        kind=kind,
        names=computed.planned.plan.curves.curve,
    )


@pages.get("/print")
def print_page(address: str) -> ResponseReturnValue:
    """Show a schedule fit to print: what is asked for, with cautions, limits and room to sign."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    wanted = _wanted()
    found = computed.listing.select(wanted)
    pages_in_all = max(-(-len(found) // PRINT_ROWS), 1)
    number = min(wanted.page, pages_in_all)
    rows = [int(i) for i in found[(number - 1) * PRINT_ROWS : number * PRINT_ROWS]]
    return render_template(
        "print.html",
        **_shared(computed),
        wanted=wanted,
        records=computed.rows(rows, current_measures().system),
        total=len(found),
        number=number,
        pages=pages_in_all,
    )


def _shared(computed: Computed) -> dict[str, Any]:
    """Give what every page of a result shows above its own."""
    result = computed.planned.plan
    return {
        "computed": computed,
        "counts": computed.listing.counts(),
        "assessed": len(result.assessed),
        "rejected": len(computed.planned.reading.rejected),
        "limits": result.limits,
        "settings": result.settings,
        "plan_findings": computed.shown_in(current_measures().system).explanation.plan_findings,
    }
