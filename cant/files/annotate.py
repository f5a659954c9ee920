"""The user's workbook edited in place: what is not annotated stays byte-identical."""

from __future__ import annotations

from collections.abc import Sequence

from cant.files.additions import (
    AddedColumn,
    Annotated,
    CellMark,
    ConditionalFill,
    OutCell,
    SheetAddition,
)
from cant.files.grid import Workbook

__all__ = [
    "AddedColumn",
    "Annotated",
    "CellMark",
    "ConditionalFill",
    "OutCell",
    "SheetAddition",
    "annotate",
    "can_annotate",
]


def can_annotate(data: bytes) -> str | None:
    """Say why a file cannot be annotated in place, or None where it can.

    Parameters
    ----------
    data : bytes
        The whole file.

    Returns
    -------
    str or None
        The reason as a clause that follows "because": ``an .xls file has no room for ...``. Then make a new
        workbook with :func:`cant.files.rewrite.rows_as_new_workbook` and annotate that.
    """
    raise NotImplementedError


def annotate(
    original: bytes, additions: Sequence[SheetAddition], new_sheets: bytes | None = None, file: str = ""
) -> Annotated:
    """Add columns, fills, notes and whole sheets to a workbook, leaving everything else as it is.

    An earlier annotation is taken out first, so that a second run replaces it.

    Parameters
    ----------
    original : bytes
        The user's workbook, xlsx or xlsm.
    additions : sequence of SheetAddition
        What his own sheets gain.
    new_sheets : bytes or None
        A complete xlsx made by XlsxWriter, whose sheets are put behind his own. Its formulas may refer to
        his sheets by name.
    file : str
        Its name as the user gave it, for messages.

    Returns
    -------
    Annotated
        The workbook, and notes.

    Raises
    ------
    FileError
        The file cannot be read, cannot be annotated (:func:`can_annotate`), or has no such sheet.
    """
    raise NotImplementedError


def free_sheet_name(workbook: Workbook, wanted: str) -> str:
    """Give a name for a new sheet that no sheet of the user's has: ``wanted``, else with (2), (3) ...

    Parameters
    ----------
    workbook : Workbook
        The user's workbook as read (an earlier annotation's sheets do not count).
    wanted : str
        The name wished for.
    """
    raise NotImplementedError
