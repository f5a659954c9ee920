"""One cell as a worksheet's XML writes it; text is always written as text.

Made in two steps, what it holds and then where it stands and how it looks, so that cells can wait in little
memory until that is known.
"""

from __future__ import annotations

from cant.files.additions import OutValue
from cant.files.grid import CellError
from cant.files.markup import escape, unescape
from cant.files.text import from_cell_text, to_cell_text

NUMBER, TEXT, KEPT_TEXT, TRUTH, ERROR, BLANK = "ntkbe-"
"""What a cell holds, the first letter of :func:`held`: kept text is one whose blanks count."""


def held(value: OutValue) -> str:
    """Give what a cell holds in one text: a letter for its kind, and the content as XML has it.

    Parameters
    ----------
    value : float, str, bool or None
        Value; a :class:`cant.files.grid.CellError` is held as an error, what is no number as #N/A.
    """
    if value is None:
        return BLANK
    if isinstance(value, CellError):
        return ERROR + escape(value)
    if isinstance(value, str):
        keep = value != value.strip() or "\n" in value or "  " in value
        return (KEPT_TEXT if keep else TEXT) + escape(to_cell_text(value))
    if isinstance(value, bool):
        return f"{TRUTH}{int(value)}"
    text = number_text(value)
    return ERROR + "#N/A" if text is None else NUMBER + text


def value_held(content: str) -> OutValue:
    """Give the value of what :func:`held` made."""
    kind, text = content[:1], content[1:]
    if kind == BLANK:
        return None
    if kind == NUMBER:
        return float(text)
    if kind == TRUTH:
        return text == "1"
    return CellError(unescape(text)) if kind == ERROR else from_cell_text(unescape(text))


def held_cell(prefix: str, name: str, style: str, content: str, formula: str | None = None) -> str:
    """Give the XML of a cell by what it holds; the other parameters are those of :func:`cell_xml`."""
    p, kind, text = prefix, content[0], content[1:]
    head = f'<{p}c r="{name}"{style}'
    inner = "" if formula is None else f"<{p}f>{escape(to_cell_text(formula))}</{p}f>"
    if kind == NUMBER:
        return f"{head}>{inner}<{p}v>{text}</{p}v></{p}c>"
    if kind in (TEXT, KEPT_TEXT):
        if inner:
            return f'{head} t="str">{inner}<{p}v>{text}</{p}v></{p}c>'
        keep = ' xml:space="preserve"' if kind == KEPT_TEXT else ""
        return f'{head} t="inlineStr"><{p}is><{p}t{keep}>{text}</{p}t></{p}is></{p}c>'
    if kind == BLANK:
        return f"{head}>{inner}</{p}c>" if inner else f"{head}/>"
    return f'{head} t="{kind}">{inner}<{p}v>{text}</{p}v></{p}c>'


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
    return held_cell(prefix, name, style, held(value), formula)


def number_text(value: float) -> str | None:
    """Give a number as a cell stores it, None where it is no number or infinite."""
    text = repr(float(value))
    if text.endswith(".0"):
        return text[:-2]
    return None if "n" in text else text  # nan, inf
