"""How texts are compared: case, accents, dots and the many ways of writing "number" do not matter.

Stands apart because headings, words in cells and names of classes must all be folded in the same way.
"""

from __future__ import annotations

import re
import unicodedata
from datetime import date, datetime, time
from functools import lru_cache

from cant.files.grid import CellError, TypedNumber, Uncalculated, Value

_LETTERS = str.maketrans(
    {
        "ł": "l",
        "ø": "o",
        "đ": "d",
        "ß": "ss",
        "æ": "ae",
        "œ": "oe",
        "ı": "i",
        "’": "'",
        "‘": "'",
        "–": "-",
        "—": "-",
        "−": "-",
        "\u2010": "-",
        "\u2011": "-",
    }
)
_NUMBER_SIGN = re.compile(
    r"#|№|\bn\s?[.]?\s?[º°]|\bno\b\.?|\bnum\b\.?|\bnr\b\.?|(?<=\s)č\.|^č\.|(?<=\s)n\.(?=\s|$)|^n\."
)
_PK = re.compile(r"\b[pP]\.\s?[kK]\b\.?")
_SUPERSCRIPT = re.compile("[¹²³⁴⁵⁶⁷⁸⁹⁰*†‡]")
_WORD = re.compile(r"[^\W_]+", re.UNICODE)

BLANKS = frozenset(
    {"", "-", "--", "---", ".", "..", "...", "n/a", "na", "n.a.", "?", "/", "*", "k.a.", "s/d", "nan"}
)
"""Texts that say that nothing is known."""


@lru_cache(maxsize=65536)
def fold(text: str) -> str:
    """Give the words of a text, lower case, without accents and punctuation, one blank between them."""
    text = _SUPERSCRIPT.sub("", text)
    text = _PK.sub("pk", text)
    lowered = _NUMBER_SIGN.sub(" nr ", text.casefold().translate(_LETTERS))
    plain = "".join(c for c in unicodedata.normalize("NFKD", lowered) if not unicodedata.combining(c))
    return " ".join(_WORD.findall(plain))


def squeeze(text: str) -> str:
    """Give a text with every run of blanks (no-break spaces and line ends too) as one blank."""
    return " ".join(text.split())


def shown(value: Value) -> str:
    """Give a cell's content as a person would type it, "" for a blank."""
    if type(value) is str:
        return value
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, TypedNumber):
        return value.typed
    if isinstance(value, (int, float)):
        return f"{value:.12g}" if abs(value) < 1e12 else repr(value)
    if isinstance(value, datetime):
        return value.isoformat(sep=" ") if value.time() != time(0) else value.date().isoformat()
    if isinstance(value, (date, time)):
        return value.isoformat()
    return str(value)


def is_text(value: Value) -> bool:
    """Whether a cell holds words that a person typed (no error value, no formula without a value)."""
    return isinstance(value, str) and not isinstance(value, (CellError, Uncalculated))


def is_blank(value: Value) -> bool:
    """Whether a cell says nothing: empty, or one of the usual dashes."""
    if value is None:
        return True
    if not isinstance(value, str) or (len(value) > 5 and not value.isspace() and value[0].isalnum()):
        return False
    return squeeze(value).casefold() in BLANKS
