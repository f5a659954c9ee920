"""What is taken away: the annotated workbook, the JSON of the plan, the file as it came."""

from __future__ import annotations

from pathlib import PurePath
from urllib.parse import quote

from flask import Blueprint, Response, render_template
from flask.typing import ResponseReturnValue

from cant.files.annotate import can_annotate
from webapp.context import (
    computed_of,
    current_measures,
    document_of,
    file_of,
    stored,
    unconfirmed,
    workbook_of,
)
from webapp.tables import file_name

pages = Blueprint("downloads", __name__, url_prefix="/plans/<address>")
XLSX = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"
MACROS = "application/vnd.ms-excel.sheet.macroEnabled.12"


def attachment(name: str) -> str:
    """Give the header under which a file is saved; a plain name for old programs, the full one for others."""
    path = PurePath(name)
    return f"attachment; filename=\"{file_name(path.stem, path.suffix)}\"; filename*=UTF-8''{quote(name)}"


@pages.get("/files")
def show(address: str) -> ResponseReturnValue:
    """Show what can be taken away."""
    plan = stored(address)
    if not plan.decided.confirmed:
        return render_template("files.html", ready=False)
    computed = computed_of(plan)
    return render_template(
        "files.html",
        ready=True,
        limits=computed.planned.plan.limits,
        why_new=can_annotate(file_of(plan)),
    )


@pages.get("/workbook")
def workbook(address: str) -> ResponseReturnValue:
    """Give the user's workbook with the plan in it."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    data = workbook_of(plan, computed, current_measures().system)
    path = PurePath(plan.file_name)
    ending = ".xlsm" if path.suffix.lower() == ".xlsm" else ".xlsx"
    answer = Response(data, mimetype=MACROS if ending == ".xlsm" else XLSX)
    answer.headers["Content-Disposition"] = attachment(f"{path.stem}-cants{ending}")
    return answer


@pages.get("/plan.json")
def document(address: str) -> ResponseReturnValue:
    """Give the JSON of the plan, metric always, in pieces as it is made."""
    plan = stored(address)
    if away := unconfirmed(plan):
        return away
    computed = computed_of(plan)
    answer = Response(document_of(plan, computed), mimetype="application/json")
    answer.headers["Content-Disposition"] = attachment(f"{PurePath(plan.file_name).stem}-cants.json")
    return answer


@pages.get("/original")
def original(address: str) -> ResponseReturnValue:
    """Give the file back as it came."""
    plan = stored(address)
    answer = Response(file_of(plan), mimetype="application/octet-stream")
    answer.headers["Content-Disposition"] = attachment(plan.file_name)
    return answer
