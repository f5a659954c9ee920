"""Chainages in all their notations, each turned into a number and the unit that the notation itself fixes.

The location text goes to the output untouched; what is made here only orders curves and measures gaps.
"""

from __future__ import annotations

import re
from typing import TypeVar

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.cells import Taken
from cant.reading.numbers import parse_number
from cant.units import CHAIN_M, MILE_KM, YARD_M, find_unit

Amount = TypeVar("Amount", float, FloatArray)

STATION = "station"
"""Unit of a station of 100 (``1234+56``) whose unit, foot or metre, the column must settle."""

_NUM = r"\d+(?:[.,]\d+)?"
_PREFIX = re.compile(
    r"^(?:km|pk|p\.k\.|k|dk|ch(?:ainage)?|mp|milepost|m\.p\.|sta(?:tion)?|stat|st|progr?|bahn-?km|strecken-?km|at)"
    r"\s*[.:=]?\s*(?=[\d-])",
    re.IGNORECASE,
)
_COMMON = re.compile(r"(\d{1,4})\+(\d{3}(?:\.\d+)?)")
_KM_M = re.compile(r"(?P<sign>-?)(?P<km>\d{1,4})\s*[+/]\s*(?P<m>\d{3}(?:[.,]\d+)?)\s*m?")
_K_M = re.compile(r"(?P<sign>-?)(?P<km>\d{1,4})\s*k(?:m)?\s*(?P<m>\d{1,3}(?:[.,]\d+)?)\s*m", re.IGNORECASE)
_HM_M = re.compile(r"(?P<sign>-?)(?P<km>\d{1,4}[.,]\d)\s*\+\s*(?P<m>\d{1,3}(?:[.,]\d+)?)\s*m?")
_STATION = re.compile(r"(?P<sign>-?)(?P<hundreds>\d{1,5})\s*\+\s*(?P<rest>\d{2}(?:[.,]\d+)?)")
_MILES_CHAINS = re.compile(
    rf"(?P<mi>\d+)\s*(?:mi?|miles?|m\.)\s*\.?\s*(?P<ch>{_NUM})\s*(?:ch|chs|chains?|c)\.?", re.IGNORECASE
)
_MILES_YARDS = re.compile(
    rf"(?P<mi>\d+)\s*(?:mi?|miles?|m\.)\s*\.?\s*(?P<yd>{_NUM})\s*(?:yds?|yards?|y)\.?", re.IGNORECASE
)
_PICKET = re.compile(r"(?P<km>\d+)\s*km\s*(?:pk|пк)\s*(?P<p>\d+)\s*\+\s*(?P<m>\d+)", re.IGNORECASE)
_MAST = re.compile(r"\d{1,4}\s*/\s*\d{1,2}(?:\s*-\s*\d{1,2})?")


def take_location(text: str, decimal: str = "") -> Taken:
    """Read a chainage; a bare number is left to the unit of the column.

    Parameters
    ----------
    text : str
        ``12+345``, ``km 12.345``, ``PK 12/345``, ``45,3+20``, ``12k345m``, ``12m 34ch``, ``1234+56.78``.
    decimal : str
        Decimal mark of the sheet.
    """
    if (common := _COMMON.fullmatch(text)) is not None:
        return Taken(int(common[1]) + float(common[2]) / 1000, unit="km")
    word = _PREFIX.sub("", text.replace("−", "-")).strip().strip("~").strip()
    if (taken := _metric(word) or _imperial(word)) is not None:
        return taken
    if match := _STATION.fullmatch(word):
        value = float(match["hundreds"]) * 100 + _float(match["rest"])
        return Taken(-value if match["sign"] else value, unit=STATION)
    if _MAST.fullmatch(word):
        return Taken(
            problem=f"'{text}' names a kilometre and a mast, no distance; a chainage such as 12+345 is one"
        )
    number, unit = _bare(word, decimal)
    if number is None:
        return Taken(problem=f"'{text}' is no chainage; one such as 12.345 or 12+345 belongs there")
    return Taken(number, unit=unit)


def _float(text: str) -> float:
    return float(text.replace(",", "."))


def _metric(word: str) -> Taken | None:
    for pattern in (_KM_M, _K_M, _HM_M):
        if match := pattern.fullmatch(word):
            value = _float(match["km"]) + _float(match["m"]) / 1000
            return Taken(-value if match["sign"] else value, unit="km")
    if match := _PICKET.fullmatch(word):
        return Taken(_float(match["km"]) + (100 * _float(match["p"]) + _float(match["m"])) / 1000, unit="km")
    return None


def _imperial(word: str) -> Taken | None:
    if match := _MILES_CHAINS.fullmatch(word):
        return Taken(miles_chains(float(match["mi"]), _float(match["ch"])), unit="km")
    if match := _MILES_YARDS.fullmatch(word):
        return Taken(miles_yards(float(match["mi"]), _float(match["yd"])), unit="km")
    return None


def _bare(word: str, decimal: str) -> tuple[float | None, str]:
    value = parse_number(word, decimal or ("," if "," in word and "." not in word else ""))
    if value is not None:
        return value, ""
    match = re.fullmatch(r"(?P<number>-?[\d.,\s]+?)\s*(?P<unit>[A-Za-z]{1,6})\.?", word)
    unit = find_unit(match["unit"]) if match else None
    if match is None or unit is None or unit.dimension != "length":
        return None, ""
    return parse_number(match["number"], decimal), unit.symbol


def miles_chains(miles: Amount, chains: Amount) -> Amount:
    """Give miles and chains in kilometres (80 chains to the mile)."""
    return miles * MILE_KM + chains * CHAIN_M / 1000


def miles_yards(miles: Amount, yards: Amount) -> Amount:
    """Give miles and yards in kilometres (1760 yards to the mile)."""
    return miles * MILE_KM + yards * YARD_M / 1000


def split_decimals(values: FloatArray, digits: int) -> tuple[FloatArray, FloatArray]:
    """Split ``12.34`` into 12 and 34 (two digits), ``12.0748`` into 12 and 748 (four digits)."""
    whole = np.floor(values + 1e-9)
    return whole, np.round((values - whole) * 10**digits, 6)
