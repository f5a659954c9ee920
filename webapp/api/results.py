"""Operations on results: the plan, its curves, its workbook."""

from __future__ import annotations

from typing import Any

from flask import Response

from cant.model.plan import PlanDocument
from webapp.api.models import CurvesAnswer, CurvesQuery, NumberedCurve
from webapp.api.operations import operation
from webapp.context import computed_of, document_of, stored, workbook_of
from webapp.keeping.access import NotThereError
from webapp.listing import Wanted

XLSX = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"


@operation("GET", "/plans/{address}/result", answer=PlanDocument, later=True)
def get_result(address: str) -> Response:
    """Give the whole plan, metric always."""
    plan = stored(address)
    return Response(document_of(plan, computed_of(plan)), mimetype="application/json")


@operation("GET", "/plans/{address}/curves", answer=CurvesAnswer, query=CurvesQuery, later=True)
def get_curves(address: str, query: CurvesQuery) -> dict[str, Any]:
    """Give a page of curves, filtered and sorted."""
    computed = computed_of(stored(address))
    wanted = Wanted(
        statuses=frozenset(query.status),
        search=query.search.strip(),
        track=query.track,
        sort=query.sort,
        falling=query.order == "falling",
        page=query.page,
        size=int(query.size),
    )
    page = computed.listing.page(wanted)
    return {
        "total": page.total,
        "page": page.number,
        "pages": page.pages,
        "counts": computed.listing.counts(),
        "curves": [
            {"number": i + 1, **record}
            for i, record in computed.records(page.indices, computed.planned.plan.settings.units)
        ],
    }


@operation("GET", "/plans/{address}/curves/{number}", answer=NumberedCurve, later=True)
def get_curve(address: str, number: int) -> dict[str, Any]:
    """Give everything the plan knows of one curve."""
    computed = computed_of(stored(address))
    if not computed.listing.has(number - 1):
        message = f"this plan has no curve number {number} that could be read"
        raise NotThereError(message)
    return {"number": number, **computed.record(number - 1, computed.planned.plan.settings.units)}


@operation("GET", "/plans/{address}/workbook", answer=XLSX, later=True)
def get_workbook(address: str) -> Response:
    """Give the workbook with the plan written into it."""
    plan = stored(address)
    computed = computed_of(plan)
    data = workbook_of(plan, computed, computed.planned.plan.settings.units)
    return Response(data, mimetype=XLSX)
