"""Bare numbers that may be miles and chains, miles and yards, or decimal miles: what their decimals allow."""

from __future__ import annotations

import numpy as np

from cant.model.curves import FloatArray
from cant.reading.evidence import Evidence
from cant.reading.headings import MILES_CHAINS, MILES_YARDS
from cant.reading.sheet_column import Column

MILES = "mi"


def like_miles_and_yards(every: FloatArray) -> bool:
    """Whether numbers look like miles.yards: four decimals, and all below .1760."""
    parts = np.round(every - np.floor(every + 1e-9), 6)
    hundredths, myriads = np.round(parts * 100, 4), np.round(parts * 10000, 2)
    two_digits = bool(np.all(np.abs(hundredths - np.round(hundredths)) < 1e-3))
    four_digits = bool(np.all(np.abs(myriads - np.round(myriads)) < 1e-1))
    return four_digits and not two_digits and bool(np.all(parts < 0.1760)) and float(np.max(every)) < 1000


def mile_notations(first: Column, every: FloatArray, evidence: Evidence) -> list[str]:
    """Give the readings that miles without notation leave open, the likeliest first."""
    parts = np.round(every - np.floor(every + 1e-9), 6)
    hundredths, myriads = np.round(parts * 100, 4), np.round(parts * 10000, 2)
    two_digits = bool(np.all(np.abs(hundredths - np.round(hundredths)) < 1e-3))
    four_digits = bool(np.all(np.abs(myriads - np.round(myriads)) < 1e-1)) and not two_digits
    spelled = "mile" in first.heading.text.casefold() and "mileage" not in first.heading.text.casefold()
    if spelled and two_digits:
        return [MILES]
    if spelled:
        return [MILES_YARDS, MILES] if four_digits and bool(np.all(parts < 0.1760)) else [MILES]
    milepost = "mp" in first.heading.text.casefold().split() or "milepost" in first.heading.text.casefold()
    if four_digits and len(every) >= 4 and bool(np.all(parts < 0.1760)):
        return [MILES_YARDS] if len(every) >= 6 else [MILES_YARDS, MILES]
    if two_digits and bool(np.all(parts < 0.80)) and not milepost:
        if "ch" in evidence.imperial or len(every) >= 30:
            return [MILES_CHAINS]
        return [MILES_CHAINS, MILES]
    return [MILES]
