"""Numbers as people type them: decimal commas, thousands dots, fractions, signs, units behind the figure.

Stands apart because which mark is the decimal one is a question to a whole sheet, while the notation is one
of a single text.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from functools import lru_cache

from cant.units import Unit, find_unit

_SPACES = re.compile(r"(?<=\d)[\s\u00a0\u2007\u202f'’](?=\d{3}(?:\D|$))")
_PLAIN = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
_VULGAR = {
    "¼": "1/4", "½": "1/2", "¾": "3/4", "⅛": "1/8", "⅜": "3/8", "⅝": "5/8", "⅞": "7/8",
    "⅓": "1/3", "⅔": "2/3", "⅙": "1/6", "⅚": "5/6", "⅕": "1/5", "⅖": "2/5", "⅗": "3/5", "⅘": "4/5",
}  # fmt: skip
_VULGAR_SIGN = re.compile("[" + "".join(_VULGAR) + "]")
_FRACTION = re.compile(
    r"(?P<sign>[+-]?)\s*(?:(?P<whole>\d+)\s*[\s\-+&]\s*)?(?P<top>\d{1,2})\s*[/⁄]\s*(?P<bottom>\d{1,2})"
)
_COMMA_DECIMAL = re.compile(r"\d,(?:\d{1,2}|\d{4,})(?!\d)|\d\.\d{3},\d")
_POINT_DECIMAL = re.compile(r"\d\.(?:\d{1,2}|\d{4,})(?!\d)|\d,\d{3}\.\d")
_QUANTITY = re.compile(
    r"^(?:(?P<label>[^\W\d_]{1,8})\s*[=:.]\s*|[RVhu]\s+|(?P<about>~|ca\.?|c\.|approx\.?|about)\s*)?"
    r"(?P<number>[+-]?\s*[\d.,].*?)\s*(?P<unit>[^\W\d_%‰°][^\d]*|\([^\d)]*\)|[\"″'′%‰°])?$"
)


@lru_cache(maxsize=65536)
def parse_number(text: str, decimal: str = "") -> float | None:
    """Read one number, or None where the text is none.

    Parameters
    ----------
    text : str
        Such as ``1.200``, ``1 200,5``, ``-20``, ``3 1/2``, ``1½``.
    decimal : str
        ``","`` or ``"."`` where the sheet has shown which mark is the decimal one; "" where it has not: then
        a single mark before exactly three digits is a decimal point and a decimal comma is a thousands comma.
    """
    word = " ".join(text.replace("−", "-").replace("–", "-").split())
    word = _VULGAR_SIGN.sub(lambda m: " " + _VULGAR[m.group()], word).strip()
    if fraction := _FRACTION.fullmatch(word):
        return _fraction(fraction)
    word = _SPACES.sub("", word)
    if word[:1] in "+-":
        word = word[:1] + word[1:].lstrip()
    if not word or not any(c.isdigit() for c in word):
        return None
    word = _with_point(word, decimal)
    return float(word) if _PLAIN.fullmatch(word) else None


def _fraction(match: re.Match[str]) -> float | None:
    bottom = int(match["bottom"])
    if bottom not in (2, 3, 4, 5, 6, 8, 10, 12, 16, 32, 64) or int(match["top"]) >= bottom:
        return None
    value = int(match["whole"] or 0) + int(match["top"]) / bottom
    return -value if match["sign"] == "-" else value


def _with_point(word: str, decimal: str) -> str:
    points, commas = word.count("."), word.count(",")
    if points and commas:
        last = max(word.rfind("."), word.rfind(","))
        other = "," if word[last] == "." else "."
        return word.replace(other, "").replace(word[last], ".")
    if points > 1 or commas > 1:
        mark = "." if points else ","
        return word.replace(mark, "") if re.fullmatch(rf"[+-]?\d{{1,3}}(?:\{mark}\d{{3}})+", word) else word
    if commas:
        thousands = bool(re.fullmatch(r"[+-]?[1-9]\d{0,2},\d{3}", word)) and decimal != ","
        return word.replace(",", "" if thousands else ".")
    if points and decimal == "," and re.fullmatch(r"[+-]?[1-9]\d{0,2}\.\d{3}", word):
        return word.replace(".", "")
    return word


def decimal_mark(texts: Iterable[str]) -> str:
    """Tell from the texts of a sheet which mark is the decimal one, "" where none shows it."""
    commas = points = 0
    for text in texts:
        commas += bool(_COMMA_DECIMAL.search(text))
        points += bool(_POINT_DECIMAL.search(text))
    if commas > points:
        return ","
    return "." if points else ""


@lru_cache(maxsize=65536)
def parse_quantity(text: str, decimal: str = "") -> tuple[float, Unit | None, str] | None:
    """Read a number with what stands around it: ``R=650``, ``650 m``, ``3 1/2"``, ``ca. 100``.

    Returns
    -------
    tuple of float, Unit or None, str, or None
        Value, unit behind it, and words behind it that are no unit (``""`` where none); None where the text
        is not one number.
    """
    number = parse_number(text, decimal)
    if number is not None:
        return number, None, ""
    plain = _VULGAR_SIGN.sub(lambda m: " " + _VULGAR[m.group()], text.replace("−", "-"))
    match = _QUANTITY.match(" ".join(plain.split()))
    if match is None:
        return None
    value = parse_number(match["number"], decimal)
    if value is None:
        return None
    tail = (match["unit"] or "").strip()
    found = find_unit(tail) if tail else None
    return value, found, "" if found else tail
