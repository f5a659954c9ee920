"""How the file was read, with every doubt and answer, and the rows that could not be assessed."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from cant.writing.columns import Cell
from cant.writing.looks import Heading
from cant.writing.planned import PlannedLine
from cant.writing.sheets import NewSheets

_READ = (
    ("Sheet", 16.0),
    ("Column", 24.0),
    ("Understood as", 24.0),
    ("Unit", 10.0),
    ("Unit from", 14.0),
    ("Certainty", 12.0),
    ("Values as they stand", 40.0),
    ("Note", 60.0),
)
_REJECTED = (("Sheet", 16.0), ("Row", 8.0), ("Column", 20.0), ("Value", 20.0), ("Problem", 90.0))


def write_how_read(book: NewSheets, name: str, planned: PlannedLine) -> None:
    """Write what each column was understood as, what was asked, and what else was noted.

    Parameters
    ----------
    book : NewSheets
    name : str
    planned : PlannedLine
    """
    reading = planned.reading
    sheet = book.table(name)
    sheet.paragraph(
        f"File {reading.name or '(no file)'}"
        + (f", SHA-256 {reading.sha256}" if reading.sha256 else "")
        + ". 'certain' rests on the heading or its unit, 'likely' on the values, 'answer' on what was "
        "answered.",
        8,
        180,
    )
    sheet.header([Heading(title, width) for title, width in _READ])
    for sheet_read in reading.sheets:
        data = f"data rows {sheet_read.first_row} to {sheet_read.last_row}"
        rows = f"header to row {sheet_read.header_row}, {data}"
        sheet.row([sheet_read.sheet, "(whole sheet)", f"table: {sheet_read.role}", "", "", "", "", rows])
    for c in reading.columns:
        meaning = c.meaning or "left alone"
        samples = "; ".join(c.samples)
        sheet.row([c.sheet, c.heading, meaning, c.unit, c.unit_from, c.confidence, samples, c.note])
    for q in reading.questions:
        choices = "; ".join(q.choices)
        rows = f" Rows {_listed(q.rows)}." if q.rows else ""
        text = f"{q.question} Choices: {choices}.{rows}"
        sheet.row([q.sheet, q.column, "ASKED, not answered", "", "", "asked", "", text])
    for note in reading.notes:
        sheet.row(["", "", "", "", "", "", "", note])


def write_rejected(book: NewSheets, name: str, planned: PlannedLine) -> None:
    """Write every row without an assessment: those refused, and those where limits or data have a gap.

    Parameters
    ----------
    book : NewSheets
    name : str
    planned : PlannedLine
    """
    sheet = book.table(name)
    sheet.header([Heading(title, width) for title, width in _REJECTED])
    count = 0
    for row in planned.reading.rejected:
        sheet.row([row.sheet, float(row.row), row.column, row.value, row.problem])
        count += 1
    plan = planned.plan
    for i in np.flatnonzero(~plan.outcome.planned & ~plan.curves.rejected).tolist():
        reason = planned.explanation.reason(i)
        where: list[Cell] = [plan.curves.sheet[i], float(plan.curves.row[i]), "", plan.curves.curve[i]]
        sheet.row([*where, reason])
        count += 1
    if not count:
        sheet.line("Every row was assessed.")


def _listed(rows: Iterable[int]) -> str:
    numbers = list(rows)
    shown = ", ".join(str(number) for number in numbers[:20])
    return shown + (f" and {len(numbers) - 20} more" if len(numbers) > 20 else "")
