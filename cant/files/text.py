"""Text that stays text: in XML, in csv, and in the notation spreadsheets use for forbidden characters."""

from __future__ import annotations


def csv_cell(text: str) -> str:
    """Give a text for a csv cell that no spreadsheet takes for a formula.

    Parameters
    ----------
    text : str
        As the user typed it.

    Returns
    -------
    str
        With an apostrophe before it where it begins with = + - @, tab or carriage return and is no number.
    """
    raise NotImplementedError
