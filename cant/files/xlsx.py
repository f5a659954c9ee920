"""An xlsx or xlsm file as a workbook of plain values."""

from __future__ import annotations

from cant.errors import FileError
from cant.files.book import Book
from cant.files.grid import Sheet, Workbook
from cant.files.package import Package
from cant.files.sheets import BookReader, as_sheet

_BINARY = "sheet.binary"


def read_xlsx(package: Package, file: str) -> Workbook:
    """Read all worksheets of a package.

    Parameters
    ----------
    package : Package
        The package.
    file : str
        The file's name as the user gave it.

    Raises
    ------
    FileError
        It is no spreadsheet, or see :class:`cant.files.sheets.BookReader`.
    """
    kind = package.content_type(package.workbook_part)
    if _BINARY in kind:
        message = "is a binary workbook (.xlsb); save it as .xlsx in a spreadsheet program and try again"
        raise FileError(message, package.place)
    book = Book(package)
    reader = BookReader(package, book)
    added = book.added_sheets()
    notes: list[str] = []
    sheets: list[Sheet] = []
    for entry in book.sheets:
        if entry.name.casefold() in added:
            continue
        if not entry.is_worksheet:
            notes.append(f"Sheet '{entry.name}' holds no cells (a chart or dialog) and is left out.")
            continue
        sheets.append(as_sheet(reader.read(entry)))
    if added or reader.added:
        notes.append("Columns and sheets that an earlier annotation added are left out.")
    if package.related("", "origin"):
        notes.append("The file bears a digital signature, which holds for the file as it is and no other.")
    if not sheets:
        message = "holds no sheet with cells; add a sheet with the curve list"
        raise FileError(message, package.place)
    return Workbook(file, "xlsm" if "macroEnabled" in kind else "xlsx", sheets, notes)
