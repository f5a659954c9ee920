"""The empty workbook of ``cant template``: canonical headings, notes, drop-downs, marked example rows.

Made from the columns dictionary, so that it can never ask for what the reader does not know.
"""

from __future__ import annotations

import io
from collections.abc import Sequence

from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Font, PatternFill
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from cant.model.curves import SHAPES
from cant.model.limits import QUANTITIES
from cant.model.settings import METHODS
from cant.reading.columns import ColumnInfo, columns_of
from cant.reading.records import EXAMPLE_MARK
from cant.units import UNITS

ROWS = 2000
"""Rows that the drop-downs cover."""

EXAMPLES: dict[str, dict[str, str | float]] = {
    "curves": {
        "Line": EXAMPLE_MARK,
        "Track": "Down",
        "Curve": "C1",
        "Start": 12.345,
        "End": 12.605,
        "Radius": 650,
        "Hand": "L",
        "Length": 260,
        "Transition in": 60,
        "Transition out": 60,
        "Shape": "linear",
        "Cant": 95,
        "Speed": 100,
        "Situation": "platform",
    },
    "traffic": {
        "Class": f"Freight ({EXAMPLE_MARK})",
        "Category": "freight",
        "Speed": 80,
        "Trains per day": 12,
        "Mass": 1600,
        "Roll coefficient": 0.2,
        "Centre of gravity": 1.8,
        "Regular": "yes",
    },
    "limits": {
        "Quantity": "cant",
        "Normal": 150,
        "Exceptional": 160,
        "Unit": "mm",
        "Category": "",
        "Clause": "your standard, clause",
        "Note": EXAMPLE_MARK,
    },
    "turnouts": {
        "Turnout": f"T1 ({EXAMPLE_MARK})",
        "Track": "Down",
        "Curve": "C1",
        "Radius on the straight": 500,
        "Hand": "R",
        "Branch speed": 60,
        "Category": "freight",
    },
}

_SETTINGS: tuple[tuple[str, str], ...] = (
    ("Rail spacing", "mm between the two wheel-rail contact points, 1500 for 1435 mm gauge when blank"),
    ("Equilibrium constant", "a printed constant (mm, km/h, m), or such as 0.0007 in/(mph^2 deg)"),
    ("Method", f"one of {', '.join(METHODS)}; the first when blank"),
    ("Tiers", "normal when blank; or normal, exceptional"),
    ("Keep within", "mm; today's cant stays where it lies no further than this from the best"),
    ("Maintenance allowance", "mm, taken off a ceiling on cant"),
    (
        "Fraction of fastest",
        "method fraction: share of the fastest class's equilibrium cant, 0.65 when blank",
    ),
    ("Underbalance", "method underbalance: mm under the equilibrium cant of the class with most tonnes"),
    ("Today within", "method today: mm; today's cant is the target where it is this close to that of rms"),
    ("Units", "metric or us: in which units the plan is shown"),
)

_HEAD = PatternFill("solid", fgColor="FFE3E8EE")
_REQUIRED = PatternFill("solid", fgColor="FFF6D9B8")
_PALE = Font(italic=True, color="FF7A7A7A")


def template_workbook() -> bytes:
    """Give an empty workbook to fill in, with sheets Curves, Traffic, Limits, Turnouts and Settings.

    Returns
    -------
    bytes
        An xlsx file.
    """
    book = Workbook()
    first = book.active
    if first is not None:
        book.remove(first)
    for table in ("curves", "traffic", "limits", "turnouts"):
        _table_sheet(book.create_sheet(table.capitalize()), table)
    _settings_sheet(book.create_sheet("Settings"))
    _notes_sheet(book.create_sheet("How to fill in"))
    stream = io.BytesIO()
    book.save(stream)
    return stream.getvalue()


def heading(info: ColumnInfo) -> str:
    """Give a column's heading with its unit in brackets."""
    return f"{info.name} ({info.unit})" if info.unit else info.name


def _table_sheet(sheet: Worksheet, table: str) -> None:
    columns = columns_of(table)
    for at, info in enumerate(columns, start=1):
        cell = sheet.cell(row=1, column=at, value=heading(info))
        cell.font = Font(bold=True)
        cell.fill = _REQUIRED if info.required else _HEAD
        cell.alignment = Alignment(wrap_text=True, vertical="top")
        needed = " Needed in each row." if info.required else ""
        cell.comment = Comment(info.help + needed, "cant", height=110, width=260)
        example = sheet.cell(row=2, column=at, value=EXAMPLES[table].get(info.name) or None)
        example.font = _PALE
        sheet.column_dimensions[get_column_letter(at)].width = max(11.0, len(heading(info)) * 0.75 + 4)
        if choices := _choices(table, info):
            _drop_down(sheet, at, choices, strict=info.name not in ("Situation", "Category"))
    if table == "curves":
        _speed_of_class(sheet, len(columns) + 1)
    sheet.freeze_panes = "A2"
    sheet.row_dimensions[1].height = 32


def _speed_of_class(sheet: Worksheet, at: int) -> None:
    cell = sheet.cell(row=1, column=at)
    cell.comment = Comment(
        "For any class of the traffic table a column 'Speed NAME' may follow here: its speed on the curve, "
        "none where it does not run.",
        "cant",
        height=110,
        width=260,
    )


def _choices(table: str, info: ColumnInfo) -> Sequence[str]:
    if info.kind == "yes_no":
        return ("yes", "no")
    if info.kind == "hand":
        return ("L", "R")
    if info.kind == "shape":
        return tuple(SHAPES)
    return {
        ("limits", "Quantity"): tuple(QUANTITIES),
        ("limits", "Kind"): ("design", "ceiling"),
        ("limits", "Unit"): tuple(u for u in _limit_units() if "," not in u),
        ("traffic", "Category"): ("passenger", "freight"),
        ("limits", "Category"): ("passenger", "freight"),
    }.get((table, info.name), ())


def _limit_units() -> list[str]:
    dimensions = {d for info in QUANTITIES.values() for d in info.dimensions} - {"length"}
    return ["mm", "in", *(u.symbol for u in UNITS.values() if u.dimension in dimensions)]


def _drop_down(sheet: Worksheet, at: int, choices: Sequence[str], strict: bool) -> None:
    listed = ",".join(choices)
    rule = DataValidation(type="list", formula1=f'"{listed}"', allow_blank=True)
    rule.showErrorMessage = strict
    rule.error = "Choose one of the list, or leave it blank."
    letter = get_column_letter(at)
    rule.add(f"{letter}2:{letter}{ROWS}")
    sheet.add_data_validation(rule)


def _settings_sheet(sheet: Worksheet) -> None:
    for at, text in enumerate(("Setting", "Value", "Note"), start=1):
        cell = sheet.cell(row=1, column=at, value=text)
        cell.font, cell.fill = Font(bold=True), _HEAD
    for row, (name, note) in enumerate(_SETTINGS, start=2):
        sheet.cell(row=row, column=1, value=name)
        sheet.cell(row=row, column=3, value=note).font = _PALE
    for letter, width in (("A", 24), ("B", 24), ("C", 80)):
        sheet.column_dimensions[letter].width = width
    for row, choices in ((4, METHODS), (8, ("metric", "us"))):
        rule = DataValidation(type="list", formula1='"' + ",".join(choices) + '"', allow_blank=True)
        rule.add(f"B{row}")
        sheet.add_data_validation(rule)
    sheet.freeze_panes = "A2"


_HOW = (
    "One row a curve on sheet Curves; several curve sheets are fine. Start, End and Length are those of the "
    "circular arc.",
    "A unit in brackets behind a heading holds for the column: change (m) to (ft), (mm) to (in), (km/h) to "
    "(mph).",
    "A blank transition means not known; 0 means none. Leave cells blank where nothing is known.",
    "Columns of your own may stand anywhere: they come back untouched.",
    f"Rows that carry the words '{EXAMPLE_MARK}' are ignored; write over them or delete them.",
    "The limits are those of your railway's own standard. A plan serves a competent, licensed engineer, who "
    "checks and approves it; the standard and local codes rule.",
)


def _notes_sheet(sheet: Worksheet) -> None:
    for row, text in enumerate(_HOW, start=1):
        sheet.cell(row=row, column=1, value=text).alignment = Alignment(wrap_text=True, vertical="top")
    sheet.column_dimensions["A"].width = 110
