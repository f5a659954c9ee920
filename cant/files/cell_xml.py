"""One cell as a worksheet's XML writes it; text is always written as text."""

from __future__ import annotations

from cant.files.additions import OutValue
from cant.files.grid import CellError
from cant.files.markup import escape
from cant.files.text import to_cell_text


def cell_xml(prefix: str, name: str, style: str, value: OutValue, formula: str | None = None) -> str:
    """Give the XML of a cell.

    Parameters
    ----------
    prefix : str
        Prefix of the spreadsheet's elements with its colon, or "".
    name : str
        Reference such as ``B7``.
    style : str
        Attribute `` s="3"`` with a blank before it, or "".
    value : float, str, bool or None
        Value; a :class:`cant.files.grid.CellError` is written as an error, what is no number as #N/A.
    formula : str or None
        Formula without its equals sign.
    """
    p = prefix
    head = f'<{p}c r="{name}"{style}'
    inner = "" if formula is None else f"<{p}f>{escape(to_cell_text(formula))}</{p}f>"
    if value is None:
        return f"{head}>{inner}</{p}c>" if inner else f"{head}/>"
    if isinstance(value, CellError):
        return f'{head} t="e">{inner}<{p}v>{escape(value)}</{p}v></{p}c>'
    if isinstance(value, str):
        return _text_cell(p, head, inner, value)
    if isinstance(value, bool):
        return f'{head} t="b">{inner}<{p}v>{int(value)}</{p}v></{p}c>'
    text = number_text(value)
    if text is None:
        return f'{head} t="e">{inner}<{p}v>#N/A</{p}v></{p}c>'
    return f"{head}>{inner}<{p}v>{text}</{p}v></{p}c>"


def _text_cell(p: str, head: str, formula: str, value: str) -> str:
    text = escape(to_cell_text(value))
    if formula:
        return f'{head} t="str">{formula}<{p}v>{text}</{p}v></{p}c>'
    keep = ' xml:space="preserve"' if value != value.strip() or "\n" in value or "  " in value else ""
    return f'{head} t="inlineStr"><{p}is><{p}t{keep}>{text}</{p}t></{p}is></{p}c>'


def number_text(value: float) -> str | None:
    """Give a number as a cell stores it, None where it is no number or infinite."""
    text = repr(float(value))
    if text.endswith(".0"):
        return text[:-2]
    return None if "n" in text else text  # nan, inf
