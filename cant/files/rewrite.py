"""A new workbook with the rows of a file that cannot be annotated in place."""

from __future__ import annotations

from cant.files.grid import Workbook


def rows_as_new_workbook(workbook: Workbook) -> bytes:
    """Write the values of a workbook into a new xlsx, each cell where it was and typed as it was read.

    Parameters
    ----------
    workbook : Workbook
        As read; a csv file's one sheet is named after the file.

    Returns
    -------
    bytes
        An xlsx that :func:`cant.files.annotate.annotate` takes.
    """
    raise NotImplementedError


def sheet_name_in_new_workbook(workbook: Workbook, index: int) -> str:
    """Give the name that sheet ``index`` bears there: its own, or for a csv file one from its name."""
    raise NotImplementedError
