"""The start page: bring a list, try the sample line, come back to a plan; and the life of a plan."""

from __future__ import annotations

from importlib.resources import files

from flask import Blueprint, Response, flash, redirect, render_template, request, url_for
from flask.typing import ResponseReturnValue

from cant import service
from cant.errors import CantError
from webapp.access import of_my_own
from webapp.context import choose_units, running, stored
from webapp.decisions import as_text
from webapp.guarding.texts import is_own_path
from webapp.keeping.shares import Shares
from webapp.measures import SYSTEMS
from webapp.security import owner
from webapp.uploads import needed
from webapp.working.orders import WORDS

pages = Blueprint("start", __name__)
SAMPLE = "dunmarrow_keldrith.xlsx"
XLSX = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"


def _start_page(problem: str = "", code: int = 200) -> ResponseReturnValue:
    plans = running().store.plans(owner())
    shown = render_template(
        "start.html",
        plans=plans,
        shared=Shares(running().database).shared_with(owner()),
        work=running().background.queue.open_of([plan.address for plan in plans]),
        work_words=WORDS,
        problem=problem,
        upload_mb=running().config.upload_mb,
    )
    return Response(shown, code)


@pages.get("/")
def home() -> ResponseReturnValue:
    """Show the start page."""
    return _start_page()


@pages.post("/plans")
def upload() -> ResponseReturnValue:
    """Make a plan from a file; one that cannot be read is not kept, a long one is kept and then read."""
    try:
        data, name = needed("file", "a workbook or a csv file with a curve list")
        at_once = not running().computations.is_long(len(data))
        reading = service.read_curves(data, name) if at_once else None
    except CantError as error:
        return _start_page(str(error), 422)
    plan = running().store.add(owner(), name, data)
    if reading is not None:
        running().computations.keep_reading(plan, reading)
    return redirect(url_for("reading.show", address=plan.address), 303)


@pages.post("/plans/sample")
def sample() -> ResponseReturnValue:
    """Make a plan from the sample line and show its cants at once."""
    data = files("webapp").joinpath("sample", SAMPLE).read_bytes()
    plan = running().store.add(owner(), SAMPLE, data, {"confirmed": as_text(True)})
    return redirect(url_for("result.show", address=plan.address), 303)


@pages.get("/template.xlsx")
def template() -> ResponseReturnValue:
    """Give an empty workbook to fill in."""
    made = Response(service.template(), mimetype=XLSX)
    made.headers["Content-Disposition"] = 'attachment; filename="cant-template.xlsx"'
    return made


@pages.get("/plans/<address>")
def resume(address: str) -> ResponseReturnValue:
    """Lead to where the work on a plan stands."""
    plan = stored(address)
    endpoint = "result.show" if plan.decided.confirmed else "reading.show"
    return redirect(url_for(endpoint, address=address))


@pages.post("/plans/<address>/name")
def rename(address: str) -> ResponseReturnValue:
    """Call a plan otherwise."""
    of_my_own(address)
    running().store.rename(owner(), address, request.form.get("name", ""))
    flash("The plan has its new name.")
    return redirect(url_for("start.home"), 303)


@pages.post("/plans/<address>/keep")
def keep(address: str) -> ResponseReturnValue:
    """Keep a plan longer."""
    plan = running().store.keep_longer(owner(), address)
    flash(f"{plan.name} is kept until {plan.expires:%Y-%m-%d}.")
    return redirect(url_for("start.home"), 303)


@pages.route("/plans/<address>/delete", methods=["GET", "POST"])
def delete(address: str) -> ResponseReturnValue:
    """Ask, then delete a plan with its file."""
    plan = of_my_own(address)
    if request.method == "GET":
        return render_template("delete.html", asked=plan)
    running().store.remove(owner(), address)
    flash(f"{plan.name} has been deleted, its file with it.")
    return redirect(url_for("start.home"), 303)


@pages.post("/units")
def units() -> ResponseReturnValue:
    """Choose the units of all pages, and go back to the page."""
    asked = request.form.get("units", "")
    back = request.form.get("back", "")
    path = back if is_own_path(back) else url_for("start.home")
    made = redirect(path, 303)
    if asked in SYSTEMS:
        choose_units(asked)
    return made
