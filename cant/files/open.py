"""One door for every file that comes in: what it is by content, whether it is safe, and what it holds."""

from __future__ import annotations

from cant.files.grid import Workbook


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
    raise NotImplementedError
