"""The user's workbook edited in place: what is not annotated stays byte-identical.

Libraries that load a workbook and save it again lose what they do not know: charts' details, shapes, slicers,
stored formula values. Here the sheet's own XML gains cells and everything else is copied.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NoReturn

from cant.errors import FileError, Place, column_letter
from cant.files.additions import (
    AddedColumn,
    Annotated,
    CellMark,
    ConditionalFill,
    OutCell,
    SheetAddition,
)
from cant.files.book import Book, SheetEntry
from cant.files.book_edit import BookEdit
from cant.files.edit import OFFICE_RELATIONS, PackageEdit
from cant.files.graft import Graft, free_name, renamed_sheets
from cant.files.kinds import Kind, recognise
from cant.files.loose_parts import LooseParts
from cant.files.notes_edit import NotesEdit
from cant.files.package import Package
from cant.files.packed_rows import PackedColumn
from cant.files.row_splice import PlacedColumn
from cant.files.sheet_edit import SheetEdit
from cant.files.sheet_xml import MAX_COLUMN
from cant.files.sheets import BookReader, SheetRead, as_sheet
from cant.files.style_edit import EMPTY_STYLES, StyleEdit
from cant.files.surroundings import notes_on

__all__ = [
    "AddedColumn",
    "Annotated",
    "Annotation",
    "CellMark",
    "ConditionalFill",
    "OutCell",
    "SheetAddition",
    "annotate",
    "can_annotate",
]

_STYLES_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"
_REASONS = {
    Kind.TEXT: "separated text holds values only",
    Kind.XLS: "an .xls file cannot be edited in place without loss",
    Kind.ODS: "an .ods file cannot be edited in place without loss",
}


def can_annotate(data: bytes) -> str | None:
    """Say why a file cannot be annotated in place, or None where it can.

    Parameters
    ----------
    data : bytes
        The whole file.

    Returns
    -------
    str or None
        The reason as a clause that follows "because": ``it bears a digital signature, ...``. Then make a new
        workbook with :func:`cant.files.rewrite.rows_as_new_workbook` and annotate that.

    Raises
    ------
    FileError
        It is no table at all, or is refused.
    """
    kind = recognise(data, "")
    if kind is not Kind.PACKAGE:
        return _REASONS[kind]
    return _reason_against(Package(data))


def _reason_against(package: Package) -> str | None:
    names = [name.casefold() for name in package.archive.members]
    if package.related("", "origin") or any(name.startswith("_xmlsignatures/") for name in names):
        return "it bears a digital signature, which any change would break"
    if any(name.startswith("xl/revisions/") for name in names):
        return "it is a shared workbook with a list of its changes, which an edit would contradict"
    if Book(package).is_strict:
        return "it is written in the strict variant of Office Open XML"
    return None


def annotate(
    original: bytes,
    additions: Sequence[SheetAddition],
    new_sheets: bytes | LooseParts | None = None,
    file: str = "",
) -> Annotated:
    """Add columns, fills, notes and whole sheets to a workbook; see :class:`Annotation`."""
    return Annotation(original, file).run(additions, new_sheets)


class Annotation:
    """One annotation of one workbook: columns, fills, notes and whole sheets, everything else left as it is.

    An earlier annotation is taken out first, so that a second run replaces it; its columns are used again.

    Parameters
    ----------
    original : bytes
        The user's workbook, xlsx or xlsm.
    file : str
        Its name as the user gave it, for messages.

    Raises
    ------
    FileError
        The file cannot be read, or cannot be annotated (:func:`can_annotate`).
    """

    def __init__(self, original: bytes, file: str = "") -> None:
        kind = recognise(original, file)
        package = Package(original, file) if kind is Kind.PACKAGE else None
        reason = _REASONS[kind] if package is None else _reason_against(package)
        if package is None or reason is not None:
            message = f"cannot be annotated in place because {reason}; write its rows to a new workbook"
            raise FileError(message, Place(file))
        self.package = package
        self.edit = PackageEdit(package)
        self.old_book = Book(package)
        self.book = BookEdit(self.edit, self.old_book)
        self._reader: BookReader | None = None
        self._read: dict[str, SheetRead] = {}
        self.styles_part = package.related(self.old_book.part, "styles")
        data = package.plain_xml(self.styles_part) if self.styles_part else EMPTY_STYLES
        self.styles = StyleEdit(data, self.styles_part or "", package.place)
        self.notes: list[str] = []
        self.renamed: dict[str, str] = {}
        self.marked_columns = 0

    @property
    def has_macros(self) -> bool:
        """Whether the workbook's name has to end in ``.xlsm``."""
        return "macroEnabled" in self.package.content_type(self.old_book.part)

    def free_name(self, wanted: str) -> str:
        """Give a name for a new sheet that no sheet of the user's has: ``wanted``, else with (2), (3) ..."""
        return free_name(wanted, self.book.sheet_names)

    def letters(self, sheet: str, count: int) -> list[str]:
        """Give the letters of the columns that a number of added columns of a sheet take.

        Raises
        ------
        FileError
            There is no such sheet, or it cannot be read.
        """
        for entry in self.book.kept:
            if entry.is_worksheet and entry.name.casefold() == sheet.casefold():
                read = self._read[entry.name] = self._sheet_read(entry)
                return [column_letter(column) for column in as_sheet(read).added_columns(count)]
        self._no_sheet(sheet)

    def run(
        self, additions: Sequence[SheetAddition], new_sheets: bytes | LooseParts | None = None
    ) -> Annotated:
        """Make the annotated workbook, once.

        Parameters
        ----------
        additions : sequence of SheetAddition
            What his own sheets gain, one entry a sheet.
        new_sheets : bytes, LooseParts or None
            A complete xlsx made by XlsxWriter, or its parts, whose sheets are put behind his own. Its
            formulas may refer to his sheets by name, and those of added columns to its sheets.

        Returns
        -------
        Annotated
            The workbook, and notes.

        Raises
        ------
        FileError
            A sheet cannot be read, or there is no such sheet.
        """
        self.book.remove_earlier_sheets()
        if new_sheets is not None:
            graft = Graft(Package(new_sheets), self.edit, self.book, self.styles)
            self.notes += graft.run()
            self.renamed = graft.renamed
            self._note_locked_structure()
        for number, (entry, addition) in enumerate(self._wanted(additions), start=1):
            if addition is not None:
                self.book.mark_touched(number, entry.name)
            self._sheet(entry, addition or SheetAddition(entry.name, 1, []))
        if self.book.recalculate or self.book.gone or self.old_book.added_columns():
            self.book.drop_calculation_chain()
        self._write_styles()
        self.book.write()
        return Annotated(self.edit.build(), self.notes)

    def _wanted(self, additions: Sequence[SheetAddition]) -> list[tuple[SheetEntry, SheetAddition | None]]:
        """Pair the additions with their sheets; sheets touched earlier come along to be cleaned."""
        by_name: dict[str, SheetAddition] = {}
        entries = {one.name.casefold(): one for one in self.book.kept if one.is_worksheet}
        for addition in additions:
            name = addition.sheet.casefold()
            if name in by_name:
                message = f"has two additions for sheet '{addition.sheet}'; give one"
                raise FileError(message, self.package.place)
            if name not in entries:
                self._no_sheet(addition.sheet)
            by_name[name] = addition
        touched = self.old_book.touched_sheets()
        return [
            (entry, by_name.get(name))
            for name, entry in entries.items()
            if name in by_name or name in touched
        ]

    def _no_sheet(self, name: str) -> NoReturn:
        there = ", ".join(one.name for one in self.book.kept if one.is_worksheet) or "none"
        message = f"has no sheet '{name}' to annotate; it has {there}"
        raise FileError(message, self.package.place)

    def _sheet_read(self, entry: SheetEntry) -> SheetRead:
        """Read a sheet, its values left out, where that is not done already."""
        if self._reader is None:
            self._reader = BookReader(self.package, self.old_book)
        return self._read.pop(entry.name, None) or self._reader.read(entry, keep=False)

    def _sheet(self, entry: SheetEntry, addition: SheetAddition) -> None:
        read = self._sheet_read(entry)
        placed = self._placed(read, addition)
        sheet = SheetEdit(read, placed, addition.header_row, self.styles)
        self.notes += [f"Sheet '{entry.name}': {note}" for note in sheet.widths()]
        sheet.extent()
        sheet.conditional_formats(addition.marks)
        sheet.legacy_drawing(self._add_notes(entry, addition, sheet))
        positions = sorted(one.column for one in placed)
        self.notes += notes_on(self.package, self.old_book, read, positions)
        for _, areas in sorted(sheet.rows.areas(), key=lambda one: placed_order(placed, one[0])):
            self.marked_columns += 1
            self.book.mark_column(self.marked_columns, entry.name, areas)
        self.edit.replace(read.xml.name, sheet.chunks())
        self.book.recalculate = self.book.recalculate or sheet.rows.has_formulas

    def _placed(self, read: SheetRead, addition: SheetAddition) -> list[PlacedColumn]:
        positions = as_sheet(read).added_columns(len(addition.columns))
        if positions and max(positions) >= MAX_COLUMN:
            message = f"has no room for {len(positions)} more columns; the last column is used"
            raise FileError(message, read.xml.place)
        names = self.renamed
        columns = [_with_renamed(one, names) for one in addition.columns]
        return [PlacedColumn(column, one) for column, one in zip(positions, columns, strict=True)]

    def _add_notes(self, entry: SheetEntry, addition: SheetAddition, sheet: SheetEdit) -> str | None:
        edit = NotesEdit(self.edit, entry.part or "")
        edit.remove_own()
        wanted = {(one.row, one.column): one.note for one in addition.marks if one.note}
        wanted |= sheet.rows.notes()
        taken = edit.taken() & wanted.keys()
        if taken:
            self.notes.append(
                f"Sheet '{entry.name}': {len(taken)} cell(s) have a note already, which stays as it is; "
                "what would have been noted there is in the findings."
            )
        return edit.add({cell: text for cell, text in wanted.items() if cell not in taken})

    def _note_locked_structure(self) -> None:
        protection = self.old_book.root.child("workbookProtection")
        if protection is not None and protection.flag("lockStructure"):
            self.notes.append("The order of the sheets is protected; the new sheets stand behind all others.")

    def _write_styles(self) -> None:
        new = self.styles.result()
        if self.styles_part is not None:
            if new != self.styles.data:
                self.edit.replace(self.styles_part, new)
            return
        part = "xl/styles.xml"
        if self.edit.has(part):
            part = self.edit.free_part("xl/styles", ".xml")
        self.edit.add(part, new, _STYLES_TYPE)
        self.edit.relate(self.old_book.part, f"{OFFICE_RELATIONS}/styles", part)


def placed_order(placed: Sequence[PlacedColumn], column: int) -> int:
    """Give the place in the caller's order of the added column that stands at ``column``."""
    return next(number for number, one in enumerate(placed) if one.column == column)


def _with_renamed(column: AddedColumn, names: dict[str, str]) -> AddedColumn:
    """Let a column's formulas follow new sheets that had to be renamed."""
    if all(old == new for old, new in names.items()) or isinstance(column.cells, PackedColumn):
        return column
    cells = {
        row: OutCell(
            cell.value,
            None if cell.formula is None else renamed_sheets(cell.formula, names),
            cell.number_format,
            cell.fill,
            cell.note,
        )
        for row, cell in column.cells.items()
    }
    return AddedColumn(
        column.heading,
        cells,
        column.width,
        column.number_format,
        column.heading_note,
        column.heading_fill,
        column.conditional,
    )
