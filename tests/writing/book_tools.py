"""Our sheets made of a plan, and what LibreOffice makes of them: helpers of the tests of the workbook."""

from __future__ import annotations

import io
import subprocess
from collections.abc import Iterable, Mapping
from datetime import date
from pathlib import Path
from typing import Any
from zipfile import ZipFile

from openpyxl import load_workbook
from openpyxl.workbook import Workbook

from cant.writing.plan_sheets import PlanSheets, footer_of
from cant.writing.planned import PlannedLine
from cant.writing.sheets import NewSheets

CALCULATIONS = ("Calculation", "Calculation by class", "Calculation of ends")
TOLERANCE = 1e-9
DAY = date(2031, 5, 4)
PROFILE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load">
<prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop></item></oor:items>
"""


def sheets_data(planned: PlannedLine) -> bytes:
    """Make our sheets as a workbook of their own."""
    with NewSheets(footer_of(planned)) as book:
        sheets = PlanSheets(book, planned, lambda wanted: wanted, DAY)
        for record in planned.records():
            sheets.add(record)
        sheets.finish()
        return put_together(book)


def put_together(book: NewSheets) -> bytes:
    """Zip the parts of our sheets as they are."""
    stream = io.BytesIO()
    parts = book.parts()
    with ZipFile(stream, "w") as archive:
        for name in parts.members:
            archive.writestr(name, parts.read(name))
    return stream.getvalue()


def values_of(data: bytes) -> Workbook:
    """Give a workbook with the values stored in it."""
    return load_workbook(io.BytesIO(data), data_only=True)


def formulas_of(data: bytes) -> Workbook:
    """Give a workbook with its formulas."""
    return load_workbook(io.BytesIO(data))


def headings(sheet: Any, row: int) -> dict[str, int]:
    """Give the columns of a sheet by heading, from 1."""
    return {str(cell.value): cell.column for cell in sheet[row] if cell.value is not None}


def recalculated(books: Mapping[str, Workbook], folder: Path) -> dict[str, Workbook]:
    """Let LibreOffice compute workbooks anew; openpyxl saves formulas without values, so none can survive.

    Parameters
    ----------
    books : mapping of str to Workbook
        With formulas.
    folder : Path
        Where files may be put.
    """
    profile, out = folder / "profile", folder / "out"
    (profile / "user").mkdir(parents=True, exist_ok=True)
    (profile / "user" / "registrymodifications.xcu").write_text(PROFILE, encoding="utf-8")
    for name, book in books.items():
        book.save(folder / f"{name}.xlsx")
    files = [str(folder / f"{name}.xlsx") for name in books]
    command = ["soffice", f"-env:UserInstallation={profile.as_uri()}", "--headless", "--convert-to", "xlsx"]
    subprocess.run([*command, "--outdir", str(out), *files], check=True, capture_output=True, timeout=300)
    return {name: load_workbook(out / f"{name}.xlsx", data_only=True) for name in books}


def alike(one: Any, other: Any) -> bool:
    """Tell whether two cells hold the same to the tolerance; a blank and an empty text are the same."""
    one, other = ("" if value is None else value for value in (one, other))
    if isinstance(one, int | float) and isinstance(other, int | float):
        return abs(one - other) <= TOLERANCE * max(1.0, abs(one))
    return bool(one == other)


def differences(
    formulas: Workbook, stored: Workbook, computed: Workbook, names: Iterable[str] | None = None
) -> tuple[int, list[str]]:
    """Compare every formula cell: how many there are, and those whose values differ."""
    count, wrong = 0, []
    for name in names or formulas.sheetnames:
        for row in formulas[name].iter_rows():
            for cell in row:
                if cell.data_type != "f":
                    continue
                count += 1
                one, other = stored[name][cell.coordinate].value, computed[name][cell.coordinate].value
                if not alike(one, other):
                    head = formulas[name].cell(2, cell.column).value
                    wrong.append(f"{name}!{cell.coordinate} {head}: stored {one!r}, computed {other!r}")
    return count, wrong
