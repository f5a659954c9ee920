"""What an end of a curve bounds and needs at planned speeds: columns of "Calculation of ends"."""

from __future__ import annotations

import numpy as np

from cant.quantities.catalogue import CATALOGUE
from cant.quantities.lengths import length_for_gradient, length_for_rate
from cant.units import KMH_PER_MS
from cant.writing.book.end_limits import CANT_RATE, DEFICIENCY_RATE, GRADIENT, EndLimits, Texts
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray
from cant.writing.book.ledger import BoolArray, token


class EndLengths:
    """Builds the columns.

    Parameters
    ----------
    basis : Basis
    build : Builder
    rows : EndRows
    limits : EndLimits
    changes : tuple of ndarray
        Change of cant over each row, and change of deficiency at the planned speed [mm].
    """

    def __init__(
        self,
        basis: Basis,
        build: Builder,
        rows: EndRows,
        limits: EndLimits,
        changes: tuple[FloatArray, FloatArray],
    ) -> None:
        self._basis, self._build, self._rows, self._limits = basis, build, rows, limits
        self._chosen = basis.chosen
        self._planned = limits.planned_kmh
        self._cant_change, self._planned_change = changes

    def make(self) -> None:
        """Add the bounds to a straight, and the lengths needed."""
        gradient = self._limits.add(GRADIENT, "g limp", "Vp", True)
        cant_rate = self._limits.add(CANT_RATE, "rD limp", "Vp", True)
        deficiency_rate = self._limits.add(DEFICIENCY_RATE, "rI limp", "Vp", True)
        self._bounds(gradient, cant_rate, deficiency_rate)
        self._needed()

    def _bounds(self, gradient: FloatArray, cant_rate: FloatArray, deficiency_rate: FloatArray) -> None:
        rows, basis, build = self._rows, self._basis, self._build
        alone, planned = ~rows.shared, self._planned
        k, speed = token("k"), basis.ref("Vp", "speed exact")
        ramp, length = basis.ref("Lr", "length"), basis.ref("L", "length")
        inputs = basis.inputs
        with np.errstate(divide="ignore", invalid="ignore"):
            by_gradient = gradient * rows.ramp_m / rows.factor
            by_rate = KMH_PER_MS * cant_rate * rows.ramp_m / (rows.factor * planned)
            room = KMH_PER_MS * deficiency_rate * rows.length_m / (rows.factor * planned)
        balance = self._chosen.balance(planned, rows.entry)
        ramped, long = rows.ramp_m > 0, rows.length_m > 0
        text = inputs.shown(
            CATALOGUE["most_cant_for_gradient"].text(
                grad_lim=inputs.canonical(token("g limp"), "gradient"), L=ramp, k=k
            ),
            "cant exact",
        )
        usable = f"AND(N({token('Lr')})>0,ISNUMBER({token('g limp')}))"
        build.computed(
            "up g",
            "Most cant by the gradient",
            "D_high",
            _where(alone & ramped & np.isfinite(gradient), by_gradient),
            "cant exact",
            [(f'IF({usable},{text},"")', alone)],
            "to a straight",
        )
        for key, limit, span, where, values, heading in (
            ("rD limp", cant_rate, ("Lr", ramp), ramped, by_rate, "Most cant by its rate of change"),
            (
                "rI limp",
                deficiency_rate,
                ("L", length),
                long,
                balance - room,
                "Least cant by rate of deficiency",
            ),
        ):
            text = inputs.shown(
                CATALOGUE["most_change_for_rate"].text(
                    r_lim=inputs.canonical(token(key), "rate"), L=span[1], k=k, V=speed
                ),
                "cant exact",
            )
            usable = f"AND(N({token(span[0])})>0,ISNUMBER({token(key)}),{token('Vp')}>0)"
            if key == "rI limp":
                text = f"{self._limits.balance('1', 'Vp')}-{text}"
            build.computed(
                "up r" if key == "rD limp" else "low r",
                heading,
                "D_high" if key == "rD limp" else "D_low",
                _where(alone & where & np.isfinite(limit) & (planned > 0), values),
                "cant exact",
                [(f'IF({usable},{text},"")', alone)],
                "to a straight",
            )

    def _needed(self) -> None:
        """Add the lengths that the normal limits need at planned speeds."""
        rows, basis, build = self._rows, self._basis, self._build
        # Where a checker may switch the tier of a curve, the cell of its limit is not the normal one.
        normal = np.full(len(rows), not self._chosen.plan.settings.allows_exceptional)
        inputs = basis.inputs
        for key, heading, quantity, change, words in (
            ("needed g", "Ramp needed by the gradient", GRADIENT, "dD", "gradient"),
            ("needed r", "Ramp needed by the rate of cant", CANT_RATE, "dD", "rate"),
            ("needed I", "Transition needed by the rate of deficiency", DEFICIENCY_RATE, "dIp", "rate"),
        ):
            limit = self._limits.asked(quantity, self._planned, False).value
            size = self._cant_change if change == "dD" else self._planned_change
            reference = inputs.canonical(token(change), "cant exact")
            if words == "gradient":
                values = np.asarray(length_for_gradient(size, limit, rows.factor))
            else:
                values = np.asarray(length_for_rate(size, self._planned, limit, rows.factor))
            cell = {"needed g": "g limp", "needed r": "rD limp", "needed I": "rI limp"}[key]
            texts: Texts = []
            for limit_text, limit_kind_where in self._needed_limits(quantity, cell, normal):
                used = inputs.canonical(limit_text, words)
                if words == "gradient":
                    text = CATALOGUE["length_for_gradient"].text(k=token("k"), dD=reference, grad_lim=used)
                else:
                    text = CATALOGUE["length_for_rate"].text(
                        k=token("k"), dD=reference, r_lim=used, V=basis.ref("Vp", "speed exact")
                    )
                texts.append((f'IFERROR({inputs.shown(text, "length")},"")', limit_kind_where))
            known = np.isfinite(limit) & np.isfinite(values)
            build.computed(
                key, heading, "L", _where(known, values), "length", texts, "normal limits, planned speed"
            )

    def _needed_limits(self, quantity: str, cell: str, normal: BoolArray) -> Texts:
        """Give the normal limit as a cell where it stands in one, else as its own lookup."""
        texts: Texts = [(token(cell), normal)]
        for text, where in self._limits.texts(quantity, "Vp", False):
            here = ~normal if where is None else ~normal & where
            texts.append((f"({text})", here))
        return texts


def _where(condition: BoolArray, values: FloatArray) -> FloatArray:
    return np.where(condition, values, np.nan)
