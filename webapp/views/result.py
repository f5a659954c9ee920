"""The cants of a plan: counts that filter, the table, the line drawn, the findings, the page for print."""

from __future__ import annotations

from typing import Any

from flask import Blueprint, render_template, request
from flask.typing import ResponseReturnValue

from cant.model.plan import Finding
from webapp import line_view
from webapp.computing import Computed
from webapp.context import computed_of, current_measures, stored, unconfirmed
from webapp.listing import PAGE_SIZES, SORTS, Wanted

pages = Blueprint("result", __name__, url_prefix="/plans/<address>")
PRINT_ROWS = 500
FINDINGS_PAGE = 100


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
        records=computed.records(page.indices, current_measures().system),
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
    return render_template("line.html", **_shared(computed), drawn=shown)


@pages.get("/findings")
def findings(address: str) -> ResponseReturnValue:
    """Show everything a good engineer would notice."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    found = computed.findings(current_measures().system)
    severity = request.args.get("severity", "")
    code = request.args.get("kind", "")
    chosen = [f for f in found if (not severity or f.severity == severity) and (not code or f.code == code)]
    pages_in_all = max(-(-len(chosen) // FINDINGS_PAGE), 1)
    number = min(Wanted.of(request.args, []).page, pages_in_all)
    return render_template(
        "findings.html",
        **_shared(computed),
        found=chosen[(number - 1) * FINDINGS_PAGE : number * FINDINGS_PAGE],
        total=len(chosen),
        number=number,
        pages=pages_in_all,
        kinds=_counted(found, "code"),
        severities=_counted(found, "severity"),
        severity=severity,
        kind=code,
        names=computed.planned.plan.curves.curve,
    )


def _counted(found: list[Finding], attribute: str) -> dict[str, int]:
    counts: dict[str, int] = {}
    for finding in found:
        key = str(getattr(finding, attribute))
        counts[key] = counts.get(key, 0) + 1
    return dict(sorted(counts.items()))


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
        records=computed.records(rows, current_measures().system),
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
