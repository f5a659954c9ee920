"""Text that stays text: in a cell's XML, in csv, and in the notation for characters XML forbids."""

from __future__ import annotations

import re

_ESCAPED = re.compile(r"_x([0-9A-Fa-f]{4})_")
_LITERAL_ESCAPE = re.compile(r"_(?=x[0-9A-Fa-f]{4}_)")
_FORBIDDEN = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_NUMBER = re.compile(r"[+-]?(\d+([.,]\d*)?|[.,]\d+)([eE][+-]?\d+)?%?\Z")
MAX_CELL_TEXT = 32_767
"""Characters that a spreadsheet cell holds."""


def from_cell_text(text: str) -> str:
    """Resolve the ``_xHHHH_`` notation of a cell's text."""
    if "_x" not in text:
        return text
    return _ESCAPED.sub(lambda match: chr(int(match.group(1), 16)), text)


def to_cell_text(text: str) -> str:
    """Put a text into the notation of a cell, cut to what a cell holds.

    Characters that XML forbids become ``_xHHHH_``, and what only looks like that notation is protected.
    """
    if len(text) > MAX_CELL_TEXT:
        text = text[:MAX_CELL_TEXT]
    if "_x" in text:
        text = _LITERAL_ESCAPE.sub("_x005F_", text)
    if text.isascii() and text.isprintable():
        return text
    return _FORBIDDEN.sub(lambda match: f"_x{ord(match.group()):04X}_", text)


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
    risky = text.lstrip(" ").startswith(("=", "+", "-", "@", "\t", "\r", "\n"))
    if risky and not _NUMBER.match(text.strip()):
        return "'" + text
    return text
