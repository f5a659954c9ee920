"""The user's workbook with the plan in it: columns beside his rows, sheets of ours behind his own.

Decides what is written where; how it gets into the file without loss is the business of :mod:`cant.files`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import partial
from typing import TYPE_CHECKING

from cant.files.additions import AddedColumn, CellMark, ConditionalFill, OutCell, SheetAddition
from cant.files.annotate import Annotation, can_annotate
from cant.files.open import open_workbook
from cant.files.packed_rows import PackedRows
from cant.files.rewrite import rows_as_new_workbook, sheet_name_in_new_workbook
from cant.model.display import Display
from cant.model.reading import Reading, RejectedRow, SheetReading
from cant.model.signatures import Signatures
from cant.writing.book.status import FILLS, NOT_ASSESSED
from cant.writing.columns import DECISION, NEEDED, WORDS, Cell, Column, Record, class_columns, row_maker
from cant.writing.looks import A4, LETTER, MAX_TEXT
from cant.writing.own_units import units_of_sheet
from cant.writing.plan_sheets import PlanSheets, footer_of, holds_all
from cant.writing.sheets import NewSheets

if TYPE_CHECKING:
    from cant.writing.planned import PlannedLine

OUTSIDE = "F2B8B0"
"""Ground of a proposed cant outside the curve's own bounds."""


@dataclass(frozen=True)
class AnnotatedFile:
    """A workbook with the plan in it.

    Attributes
    ----------
    pieces : list of bytes
        The file, in pieces.
    notes : list of str
        What a person should know: what could not be added, or that it is a new workbook and why.
    suffix : str
        What its name has to end in: ``.xlsx``, or ``.xlsm`` where it holds macros.
    """

    pieces: list[bytes | memoryview]
    notes: list[str] = field(default_factory=list)
    suffix: str = ".xlsx"

    @property
    def data(self) -> bytes:
        """The file as a whole."""
        return b"".join(self.pieces)


class AddedColumns:
    """The cells of the added columns of every curve sheet, gathered record by record.

    Where two curves stand side by side in one row, the second gets columns of its own.
    """

    def __init__(self, columns: list[Column], display: Callable[[str], Display]) -> None:
        self._columns = columns
        self._display = display
        self._groups: dict[str, list[PackedRows]] = {}
        self._rows: dict[Display, Callable[[Record], list[Cell]]] = {}

    def add(self, record: Record) -> None:
        """Take the cells of one curve."""
        display = self._display(record["sheet"])
        made = self._rows.get(display)
        if made is None:
            made = self._rows[display] = row_maker(self._columns, display)
        self._put(record["sheet"], record["row"], made(record))

    def add_rejected(self, row: RejectedRow) -> None:
        """Take the cells of a row that was refused: its status, and why."""
        if any(row.row in group for group in self._groups.get(row.sheet, ())):
            return
        shown = {"Status": NOT_ASSESSED, "Reason": row.problem}
        self._put(row.sheet, row.row, [shown.get(column.heading) for column in self._columns])

    def _put(self, sheet: str, row: int, values: list[Cell]) -> None:
        groups = self._groups.setdefault(sheet, [])
        group = next((one for one in groups if row not in one), None)
        if group is None:
            group = PackedRows(len(self._columns))
            groups.append(group)
        group.put(row, [value[:MAX_TEXT] if isinstance(value, str) else value for value in values])

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
        groups = self._groups.get(sheet, [PackedRows(len(self._columns))])
        every = letters(len(groups) * len(self._columns))
        for number, group in enumerate(groups):
            suffix = f" [{number + 1}]" if number else ""
            own = every[number * len(self._columns) :]
            cells_of = [
                group.column(place, FILLS if column.heading == "Status" else None)
                for place, column in enumerate(self._columns)
            ]
            added += [
                AddedColumn(
                    heading=column.title(display) + suffix,
                    cells=cells,
                    width=column.width,
                    number_format=column.number_format(display),
                    heading_note=column.help or None,
                    conditional=self._conditions(column, cells, own),
                )
                for column, cells in zip(self._columns, cells_of, strict=True)
            ]
        return added

    def _conditions(
        self, column: Column, cells: Mapping[int, OutCell], letters: list[str]
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


class PlanWorkbook:
    """A workbook with a plan in the making; use as a context, add every record, then finish.

    Parameters
    ----------
    planned : PlannedLine
        The plan.
    data, file
        The curve file as it was read, and its name.
    signatures : Signatures, optional
        Who has signed the plan.
    """

    def __init__(
        self, planned: PlannedLine, data: bytes, file: str, signatures: Signatures | None = None
    ) -> None:
        self._reading = planned.reading
        base, self._names, self._notes = _base(data, file)
        self._annotation = Annotation(base, file)
        display = planned.display
        words = WORDS if holds_all(len(planned.plan.assessed)) else WORDS[:2]
        columns = [*DECISION, *class_columns(planned.plan.traffic.class_names), *NEEDED, *words]
        units = {
            entry.sheet: units_of_sheet(display, planned.reading.columns, entry.sheet)
            for entry in _curve_sheets(planned.reading)
        }
        self._added = AddedColumns(columns, lambda sheet: units.get(sheet, display))
        self._book = NewSheets(footer_of(planned), LETTER if display.units == "us" else A4)
        free_name = self._annotation.free_name
        try:
            self._sheets = PlanSheets(self._book, planned, free_name, signatures=signatures)
        except BaseException:
            self._book.discard()
            raise

    def __enter__(self) -> PlanWorkbook:
        return self

    def __exit__(self, *error: object) -> None:
        self._book.discard()

    def add(self, record: Record) -> None:
        """Write what the workbook holds of one curve; the records come in the order of the plan."""
        self._added.add(record)
        self._sheets.add(record)

    def finish(self) -> AnnotatedFile:
        """Give the user's workbook with columns and sheets added, once.

        Where it cannot be annotated in place, it is a new workbook with the same rows, and a note says so.
        """
        self._sheets.finish()
        del self._sheets
        for row in self._reading.rejected:
            self._added.add_rejected(row)
        additions = _additions(self._reading, self._added, self._annotation, self._names)
        result = self._annotation.run(additions, self._book.parts())
        suffix = ".xlsm" if self._annotation.has_macros else ".xlsx"
        return AnnotatedFile(result.pieces, [*self._notes, *result.notes], suffix)


def annotate_plan(
    planned: PlannedLine, data: bytes, file: str, signatures: Signatures | None = None
) -> AnnotatedFile:
    """Write a plan into the workbook that it came from; see :class:`PlanWorkbook`."""
    with PlanWorkbook(planned, data, file, signatures) as workbook:
        for record in planned.records():
            workbook.add(record)
        return workbook.finish()


def _additions(
    reading: Reading, added: AddedColumns, annotation: Annotation, names: Callable[[str], str]
) -> list[SheetAddition]:
    """Give what each curve sheet gains."""
    marks = _marks(reading)
    additions = []
    for entry in _curve_sheets(reading):
        sheet = names(entry.sheet)
        columns = added.of(entry.sheet, partial(annotation.letters, sheet))
        additions.append(SheetAddition(sheet, entry.header_row, columns, marks.get(entry.sheet, [])))
    return additions


def _base(data: bytes, file: str) -> tuple[bytes, Callable[[str], str], list[str]]:
    """Give the workbook to annotate, the name that each sheet bears in it, and what to say about it."""
    reason = can_annotate(data)
    if reason is None:
        return data, lambda name: name, []
    workbook = open_workbook(data, file)
    names = {
        sheet.name: sheet_name_in_new_workbook(workbook, index) for index, sheet in enumerate(workbook.sheets)
    }
    note = f"{workbook.file}: the plan is in a new workbook with the same rows, because {reason}"
    return rows_as_new_workbook(workbook), names.__getitem__, [note]


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
