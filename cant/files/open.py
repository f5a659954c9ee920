"""One door for every file that comes in: what it is by content, whether it is safe, and what it holds."""

from __future__ import annotations

from cant.errors import FileError, Place
from cant.files.archive import Archive
from cant.files.delimited import read_delimited
from cant.files.grid import Workbook
from cant.files.kinds import Kind, recognise
from cant.files.ods import read_ods
from cant.files.package import Package
from cant.files.xls import read_xls
from cant.files.xlsx import read_xlsx

MAX_FILE_BYTES = 200_000_000


def open_workbook(data: bytes, file: str) -> Workbook:
    """Recognise, guard and read a workbook or separated text.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        Its name as the user gave it, for messages alone: the kind is found by content.

    Returns
    -------
    Workbook
        Sheets with values. Columns and sheets that an earlier annotation added are left out, and
        ``notes`` says so.

    Raises
    ------
    FileError
        Not a table, password-protected, damaged, or refused for safety: one clear sentence.
    """
    place = Place(file)
    if len(data) > MAX_FILE_BYTES:
        message = f"is refused for safety: it is larger than {MAX_FILE_BYTES // 1_000_000} MB"
        raise FileError(message, place)
    try:
        return _read(data, file)
    except MemoryError:
        message = "is too large for the memory there is; keep the curve list in a file of its own"
        raise FileError(message, place) from None


def _read(data: bytes, file: str) -> Workbook:
    kind = recognise(data, file)
    if kind is Kind.PACKAGE:
        return read_xlsx(Package(data, file), file)
    if kind is Kind.TEXT:
        return read_delimited(data, file)
    if kind is Kind.ODS:
        return read_ods(Archive(data, file), file)
    return read_xls(data, file)
