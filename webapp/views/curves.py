"""The page of one curve: everything the plan knows of it, and its canted section."""

from __future__ import annotations

from collections.abc import Mapping

from flask import Blueprint, render_template
from flask.typing import ResponseReturnValue

from cant.explaining import CurveKey
from webapp import curve_view, line_view
from webapp.context import computed_of, current_measures, stored, unconfirmed
from webapp.store import NotThereError, StoredPlan

pages = Blueprint("curves", __name__, url_prefix="/plans/<address>")


@pages.get("/curves/<int:number>")
def show(address: str, number: int) -> ResponseReturnValue:
    """Show a curve by its number in the list, counted from 1."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    index = number - 1
    if not computed.listing.has(index):
        message = f"this plan has no curve number {number} that could be assessed"
        raise NotThereError(message)
    return page_of_curve(plan, index)


def page_of_curve(
    plan: StoredPlan,
    index: int,
    problems: Mapping[str, str] | None = None,
    sent: Mapping[str, str] | None = None,
) -> str:
    """Give the page of a curve, with what was sent and what of it cannot be used."""
    computed = computed_of(plan)
    number = index + 1
    record = computed.record(index, current_measures().system)
    key = CurveKey.of(computed.planned.plan.curves, index)
    before, after = computed.listing.neighbours(index)
    return render_template(
        "curve.html",
        record=record,
        number=number,
        before=before,
        after=after,
        names=computed.planned.plan.curves.curve,
        section=curve_view.section(computed, record, current_measures()),
        today_section=curve_view.section(computed, record, current_measures(), today=True),
        heights_assumed=curve_view.heights_assumed(computed, record),
        nearby=line_view.around(computed, plan.address, index, current_measures()),
        classes=curve_view.class_rows(record),
        bounds=curve_view.bound_rows(record, current_measures()),
        mix=curve_view.mix_facts(record, current_measures()),
        further=curve_view.further(record),
        further_classes=curve_view.further_classes(record),
        passed=curve_view.limit_rows(record.get("limits_passed") or [], current_measures()),
        breaks=curve_view.limit_rows(record["today"]["breaks"], current_measures()),
        transitions=curve_view.transition_rows(record),
        track=computed.listing.track_of(index),
        limits=computed.planned.plan.limits,
        settings=computed.planned.plan.settings,
        taken=[one for one in plan.decided.changes if one.on == key],
        problems=problems or {},
        sent=sent or {},
    )
