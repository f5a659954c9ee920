"""The user's workbook with the plan in it: columns beside his rows, sheets of ours behind his own.

Decides what is written where; how it gets into the file without loss is the business of :mod:`cant.files`.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from cant.errors import column_letter
from cant.files.additions import AddedColumn, CellMark, ConditionalFill, OutCell, SheetAddition
from cant.files.annotate import annotate, can_annotate, free_sheet_name
from cant.files.grid import Workbook
from cant.files.open import open_workbook
from cant.files.rewrite import rows_as_new_workbook, sheet_name_in_new_workbook
from cant.model.display import Display
from cant.model.reading import Reading, RejectedRow, SheetReading
from cant.writing.book.status import FILLS, NOT_ASSESSED
from cant.writing.columns import DECISION, NEEDED, WORDS, Column, Record, class_columns
from cant.writing.own_units import units_of_sheet
from cant.writing.plan_sheets import PlanSheets, footer_of, holds_all
from cant.writing.sheets import A4, LETTER, MAX_TEXT, NewSheets

if TYPE_CHECKING:
    from cant.writing.planned import PlannedLine

_KEPT = 100_000
OUTSIDE = "F2B8B0"
"""Ground of a proposed cant outside the curve's own bounds."""


@dataclass(frozen=True)
class AnnotatedFile:
    """A workbook with the plan in it.

    Attributes
    ----------
    data : bytes
        The file.
    notes : list of str
        What a person should know: what could not be added, or that it is a new workbook and why.
    suffix : str
        What its name has to end in: ``.xlsx``, or ``.xlsm`` where it holds macros.
    """

    data: bytes
    notes: list[str] = field(default_factory=list)
    suffix: str = ".xlsx"


class AddedColumns:
    """The cells of the added columns of every curve sheet, gathered record by record.

    Where two curves stand side by side in one row, the second gets columns of its own.
    """

    def __init__(self, columns: list[Column], display: Callable[[str], Display]) -> None:
        self._columns = columns
        self._display = display
        self._cells: dict[str, list[list[dict[int, OutCell]]]] = {}
        self._taken: dict[tuple[str, int], int] = {}
        self._made: dict[tuple[float | str, str | None], OutCell] = {}

    def add(self, record: Record) -> None:
        """Take the cells of one curve."""
        cells = self._place(record["sheet"], record["row"])
        display = self._display(record["sheet"])
        for column, into in zip(self._columns, cells, strict=True):
            value = column.cell(record, display)
            if value is None:
                continue
            if isinstance(value, str):
                value = value[:MAX_TEXT]
            fill = FILLS.get(str(value)) if column.heading == "Status" else None
            into[record["row"]] = self._cell(value, fill)

    def _cell(self, value: float | str, fill: str | None) -> OutCell:
        """Give a cell; of equal ones there is one object, for a register holds millions."""
        found = self._made.get((value, fill))
        if found is None:
            found = OutCell(value, fill=fill)
            if len(self._made) < _KEPT:
                self._made[value, fill] = found
        return found

    def add_rejected(self, row: RejectedRow) -> None:
        """Take the cells of a row that was refused: its status, and why."""
        if self._taken.get((row.sheet, row.row)):
            return
        cells = self._place(row.sheet, row.row)
        for column, into in zip(self._columns, cells, strict=True):
            if column.heading == "Status":
                into[row.row] = OutCell(NOT_ASSESSED, fill=FILLS[NOT_ASSESSED])
            elif column.heading == "Reason":
                into[row.row] = OutCell(row.problem[:MAX_TEXT])

    def of(self, sheet: str, letters: Callable[[int], list[str]]) -> list[AddedColumn]:
        """Give the columns that a sheet gains, in order.

        Parameters
        ----------
        sheet : str
        letters : callable
            Gives the letters of a number of added columns.
        """
        added: list[AddedColumn] = []
        display = self._display(sheet)
        groups = self._cells.get(sheet, [[{} for _ in self._columns]])
        every = letters(len(groups) * len(self._columns))
        for number, group in enumerate(groups):
            suffix = f" [{number + 1}]" if number else ""
            own = every[number * len(self._columns) :]
            added += [
                AddedColumn(
                    heading=column.title(display) + suffix,
                    cells=cells,
                    width=column.width,
                    number_format=column.number_format(display),
                    heading_note=column.help or None,
                    conditional=self._conditions(column, cells, own),
                )
                for column, cells in zip(self._columns, group, strict=True)
            ]
        return added

    def _conditions(
        self, column: Column, cells: dict[int, OutCell], letters: list[str]
    ) -> list[ConditionalFill]:
        """Let a proposed cant that somebody edits show where it leaves the curve's own bounds."""
        if column.heading != "Proposed cant" or not cells:
            return []
        at = {one.heading: letters[i] for i, one in enumerate(self._columns)}
        row = min(cells)
        cant, low, high = (f"${at[name]}{row}" for name in ("Proposed cant", "Lower bound", "Upper bound"))
        below = f"AND(ISNUMBER({low}),{cant}<{low}-0.001)"
        above = f"AND(ISNUMBER({high}),{cant}>{high}+0.001)"
        return [ConditionalFill(f"AND(ISNUMBER({cant}),OR({below},{above}))", OUTSIDE)]

    def _place(self, sheet: str, row: int) -> list[dict[int, OutCell]]:
        number = self._taken.get((sheet, row), 0)
        self._taken[sheet, row] = number + 1
        groups = self._cells.setdefault(sheet, [])
        while len(groups) <= number:
            groups.append([{} for _ in self._columns])
        return groups[number]


def annotate_plan(planned: PlannedLine, data: bytes, file: str) -> AnnotatedFile:
    """Write a plan into the workbook that it came from.

    Parameters
    ----------
    planned : PlannedLine
        The plan.
    data, file
        The curve file as it was read, and its name.

    Returns
    -------
    AnnotatedFile
        The user's workbook with columns and sheets added; where it cannot be annotated in place, a new
        workbook with the same rows, and a note that says so.
    """
    workbook = open_workbook(data, file)
    base, names, notes = _base(workbook, data)
    display = planned.display
    words = WORDS if holds_all(len(planned.plan.assessed)) else WORDS[:2]
    columns = [*DECISION, *class_columns(planned.plan.traffic.class_names), *NEEDED, *words]
    units = {
        entry.sheet: units_of_sheet(display, planned.reading.columns, entry.sheet)
        for entry in _curve_sheets(planned.reading)
    }
    added = AddedColumns(columns, lambda sheet: units.get(sheet, display))
    with NewSheets(footer_of(planned), LETTER if display.units == "us" else A4) as book:
        sheets = PlanSheets(book, planned, _name_giver(workbook))
        for record in planned.records():
            added.add(record)
            sheets.add(record)
        sheets.finish()
    for row in planned.reading.rejected:
        added.add_rejected(row)
    marks = _marks(planned.reading)
    target = workbook if base is data else open_workbook(base, file)
    additions = [
        SheetAddition(
            names(entry.sheet),
            entry.header_row,
            added.of(entry.sheet, _letters(target, names(entry.sheet))),
            marks.get(entry.sheet, []),
        )
        for entry in _curve_sheets(planned.reading)
    ]
    result = annotate(base, additions, book.data, file)
    suffix = ".xlsm" if workbook.kind == "xlsm" and base is data else ".xlsx"
    return AnnotatedFile(result.data, [*notes, *result.notes], suffix)


def _base(workbook: Workbook, data: bytes) -> tuple[bytes, Callable[[str], str], list[str]]:
    """Give the workbook to annotate, the name that each sheet bears in it, and what to say about it."""
    reason = can_annotate(data)
    if reason is None:
        return data, lambda name: name, []
    place = {sheet.name: index for index, sheet in enumerate(workbook.sheets)}
    note = f"{workbook.file}: the plan is in a new workbook with the same rows, because {reason}"
    return (
        rows_as_new_workbook(workbook),
        lambda name: sheet_name_in_new_workbook(workbook, place[name]),
        [note],
    )


def _name_giver(workbook: Workbook) -> Callable[[str], str]:
    return lambda wanted: free_sheet_name(workbook, wanted)


def _letters(workbook: Workbook, sheet: str) -> Callable[[int], list[str]]:
    found = next(one for one in workbook.sheets if one.name == sheet)
    return lambda count: [column_letter(index) for index in found.added_columns(count)]


def _curve_sheets(reading: Reading) -> list[SheetReading]:
    """Give the curve sheets, each once, with the header of its first table."""
    found: dict[str, SheetReading] = {}
    for entry in reading.sheets:
        if entry.role == "curves":
            found.setdefault(entry.sheet, entry)
    return list(found.values())


def _marks(reading: Reading) -> dict[str, list[CellMark]]:
    """Give the marks on the user's own cells: one where a value made its row unusable."""
    columns: dict[tuple[str, str], int] = {}
    for column_read in reading.columns:  # of two headings alike the first one counts
        columns.setdefault((column_read.sheet, column_read.heading), column_read.index)
    texts: dict[tuple[str, int, int], list[str]] = {}
    for row in reading.rejected:
        at = columns.get((row.sheet, row.column))
        if at is not None:
            texts.setdefault((row.sheet, row.row, at), []).append(row.problem)
    marks: dict[str, list[CellMark]] = {}
    for (sheet, line, column), problems in texts.items():
        note = "\n".join(problems)[:MAX_TEXT]
        marks.setdefault(sheet, []).append(CellMark(line, column, FILLS[NOT_ASSESSED], note))
    return marks
