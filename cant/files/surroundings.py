"""What around the added columns behaves otherwise than one might expect, in sentences for a person."""

from __future__ import annotations

from collections.abc import Iterator

from cant.files.book import Book
from cant.files.markup import Element, text_of
from cant.files.package import Package
from cant.files.sheets import SheetRead


def notes_on(package: Package, book: Book, read: SheetRead, columns: list[int]) -> Iterator[str]:
    """Give the notes for one sheet.

    Parameters
    ----------
    package : Package
        The user's workbook.
    book : Book
        Its workbook part.
    read : SheetRead
        The sheet.
    columns : list of int
        The added columns from 0.
    """
    if not columns:
        return
    name = read.entry.name
    rest = read.xml.rest
    if any(one.last_column == columns[0] - 2 for one in read.tables):
        yield (
            f"Sheet '{name}': a table ends left of the added columns; one column stays empty between, and "
            "sorting or filtering the table by its own buttons does not move the added cells."
        )
    elif rest.child("autoFilter") is not None:
        yield (
            f"Sheet '{name}': the filter does not reach the added columns; extend it before sorting by it, "
            "or the added cells no longer stand beside their rows."
        )
    protection = rest.child("sheetProtection")
    if protection is not None and protection.flag("sheet"):
        yield f"Sheet '{name}' is protected; the added cells are protected like those beside them."
    if _has_print_area(book, name):
        yield f"Sheet '{name}': the print area is as it was and does not reach the added columns."
    if _is_overlaid(package, read, columns):
        yield f"Sheet '{name}': a chart or picture lies over the added columns; move it to see them."


def _has_print_area(book: Book, sheet: str) -> bool:
    found = False
    for name, _, element in book.names():
        scope = element.get("localSheetId")
        if name == "_xlnm.Print_Area" and scope.isdecimal() and int(scope) < len(book.sheets):
            found = found or book.sheets[int(scope)].name == sheet
    return found


def _is_overlaid(package: Package, read: SheetRead, columns: list[int]) -> bool:
    """Tell whether a drawing is anchored so that it covers an added column."""
    part = package.related(read.entry.part or "", "drawing")
    if part is None:
        return False
    data = package.xml(part)
    for anchor in package.tree(part).children:
        start, end = anchor.child("from"), anchor.child("to")
        first = _column(data, start)
        last = _column(data, end) if end is not None else first
        if first is not None and last is not None and first <= columns[-1] and last >= columns[0]:
            return True
    return False


def _column(data: bytes, corner: Element | None) -> int | None:
    holder = corner.child("col") if corner is not None else None
    text = text_of(data, holder).strip() if holder is not None else ""
    return int(text) if text.isdecimal() and len(text) < 7 else None
