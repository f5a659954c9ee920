"""What the sheet "Calculation of ends" asks of the limits: of each row, of both curves where it is shared.

Apart from the columns because values and formulas must ask alike, whichever column they are for.
"""

from __future__ import annotations

import numpy as np

from cant.planning.limit_table import LimitAt
from cant.quantities.catalogue import CATALOGUE
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray
from cant.writing.book.ledger import BoolArray, token
from cant.writing.book.limit_lookup import Asking, kind_of

GRADIENT, CANT_RATE = "cant gradient", "rate of change of cant"
DEFICIENCY_RATE, ABRUPT = "rate of change of cant deficiency", "abrupt change of cant deficiency"

Texts = list[tuple[str, BoolArray | None]]
"""Formulas, each with the rows in which it stands."""


class EndLimits:
    """Asks the limits of the rows.

    Parameters
    ----------
    basis : Basis
    build : Builder
    rows : EndRows

    Attributes
    ----------
    other_entry : ndarray of int
        Entry of the same class on the other curve of a shared transition, else on the same curve.
    run_kmh, planned_kmh : ndarray
        Of each row; over a shared transition the lower of the two curves'.
    """

    def __init__(self, basis: Basis, build: Builder, rows: EndRows) -> None:
        self._basis, self._build, self._rows, self._chosen = basis, build, rows, basis.chosen
        self.other_entry = np.where(rows.shared, rows.other, rows.entry)
        chosen, entry, other = basis.chosen, rows.entry, self.other_entry
        self.run_kmh = np.minimum(chosen.run_kmh[entry], chosen.run_kmh[other])
        self.planned_kmh = np.minimum(chosen.planned_kmh[entry], chosen.planned_kmh[other])

    def balance(self, side: str, speed: str) -> str:
        """Give the formula of the equilibrium cant of one of the two curves at the speed of a column."""
        basis = self._basis
        text = CATALOGUE["equilibrium_cant"].text(
            C=basis.C, V=basis.ref(speed, "speed exact"), R=basis.ref(f"R {side}", "radius")
        )
        return basis.inputs.shown(text, "cant exact")

    def asked(self, quantity: str, speed: FloatArray, tier: bool) -> LimitAt:
        """Ask the limit of each row: over a shared transition the stricter of the two curves'."""
        chosen = self._chosen
        one, two = (
            chosen.tier_limit(quantity, speed, at) if tier else chosen.limit(quantity, speed, False, at)
            for at in (self._rows.entry, self.other_entry)
        )
        first = one.value <= two.value
        return LimitAt(
            np.where(first, one.value, two.value),
            np.where(first, one.tolerance, two.tolerance),
            np.where(first, one.row, two.row),
            one.gap,
        )

    def _asking(self, side: str, speed: str, tier: bool) -> Asking:
        return Asking(
            token(speed),
            token(f"R {side}"),
            token(f"category {side}"),
            token(f"situation {side}"),
            token(f"tier {side}") if tier else "1",
        )

    def texts(self, quantity: str, speed: str, tier: bool) -> Texts:
        """Give the formulas of the limit of each row, at the speed of a column."""
        limits, shared = self._basis.limits, self._rows.shared
        one, two = (limits.value(quantity, self._asking(side, speed, tier)) for side in "12")
        if not limits.has(quantity):
            return [('"none"', None)]
        both = f'IF(COUNT({one},{two})=0,"none",MIN({one},{two}))'
        return [(one, ~shared), (both, shared)]

    def add(self, quantity: str, key: str, speed: str, tier: bool) -> FloatArray:
        """Add a column of limits, and give them [canonical]."""
        values = self.asked(quantity, self.planned_kmh if speed == "Vp" else self.run_kmh, tier).value
        words = "at planned speed, in the tier of the curve" if tier else "normal, at run speed"
        self._build.computed(
            key,
            f"Limit of {quantity}, {words}",
            "lim",
            self._build.shown(values, kind_of(quantity)),
            kind_of(quantity),
            self.texts(quantity, speed, tier),
            "Limits used: strictest row that holds",
        )
        return values
