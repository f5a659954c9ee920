"""What the three sheets of calculation share: columns from the formula catalogue, in the units shown."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from cant.quantities.catalogue import CATALOGUE
from cant.writing.book.inputs import Inputs
from cant.writing.book.ledger import FIXED, FORMULA, INPUT, BoolArray, Ledger, LedgerColumn, token
from cant.writing.book.limits_sheet import LimitsSheet
from cant.writing.book.selection import Selection, number_or
from cant.writing.book.traffic_sheet import TrafficSheet
from cant.writing.columns import Cell

FloatArray = npt.NDArray[np.float64]
AnyFloats = npt.NDArray[np.floating[Any]]
FIRST_ROW = 5
"""First row of data of a sheet of calculation: below the explanation and three rows of header."""


@dataclass(frozen=True)
class Basis:
    """What formulas refer to.

    Attributes
    ----------
    inputs, limits, traffic : Inputs, LimitsSheet, TrafficSheet
        Sheets of inputs.
    chosen : Selection
        Curves with their figures.
    """

    inputs: Inputs
    limits: LimitsSheet
    traffic: TrafficSheet
    chosen: Selection

    def ref(self, name: str, kind: str) -> str:
        """Give a column as the formulas of the catalogue take it."""
        return self.inputs.canonical(token(name), kind)

    @property
    def C(self) -> str:  # the symbol of the trade
        """Cell of the equilibrium constant."""
        return self.inputs.cell("constant")

    @property
    def e(self) -> str:
        """Cell of the rail spacing."""
        return self.inputs.cell("spacing")

    @property
    def g(self) -> str:
        """Cell of gravity."""
        return self.inputs.cell("gravity")


class Builder:
    """Adds columns to one ledger.

    Parameters
    ----------
    basis : Basis
    ledger : Ledger
    """

    def __init__(self, basis: Basis, ledger: Ledger) -> None:
        self.basis = basis
        self.ledger = ledger

    def words(self, key: str, heading: str, values: Sequence[Cell], width: float = 10.0) -> None:
        """Add a column of fixed texts."""
        self.ledger.add(LedgerColumn(key, heading, "", "", list(values), None, FIXED, None, width))

    def number(
        self,
        key: str,
        heading: str,
        symbol: str,
        values: AnyFloats,
        kind: str,
        source: str = "curve list",
        cell: str = INPUT,
    ) -> None:
        """Add a column of numbers that nothing computes: an input, or fixed by the program."""
        shown = self.basis.inputs.display[kind]
        self.ledger.add(
            LedgerColumn(
                key,
                heading,
                _symbol(symbol, shown.unit),
                source,
                np.asarray(values, dtype=np.float64) * shown.factor,
                "General" if cell == INPUT else shown.number_format,
                cell,
                None,
                11.5,
            )
        )

    def refer(self, key: str, heading: str, symbol: str, values: AnyFloats, kind: str) -> None:
        """Add a column that repeats a cell of another sheet, named ``from KEY`` in the ledger."""
        shown = self.basis.inputs.display[kind]
        column = LedgerColumn(
            key,
            heading,
            _symbol(symbol, shown.unit),
            "from its sheet",
            np.asarray(values, dtype=np.float64) * shown.factor,
            "General",
            FORMULA,
            [(token(f"from {key}"), None)],
            11.5,
        )
        self.ledger.add(column)

    def computed(
        self,
        key: str,
        heading: str,
        symbol: str,
        values: Sequence[Cell] | FloatArray,
        kind: str,
        formulas: str | list[tuple[str, BoolArray | None]],
        source: str,
        width: float = 11.5,
    ) -> None:
        """Add a column of formulas; values are canonical where they are an array, as shown where a list."""
        unit, number_format, factor = "", None, 1.0
        if kind:
            shown = self.basis.inputs.display[kind]
            unit, number_format, factor = shown.unit, shown.number_format, shown.factor
        stored = values * factor if isinstance(values, np.ndarray) else list(values)
        texts: list[tuple[str, BoolArray | None]]
        texts = [(formulas, None)] if isinstance(formulas, str) else formulas
        self.ledger.add(
            LedgerColumn(
                key, heading, _symbol(symbol, unit), source, stored, number_format, FORMULA, texts, width
            )
        )

    def catalogued(
        self,
        key: str,
        name: str,
        values: AnyFloats,
        kind: str,
        where: str = "",
        heading: str = "",
        **cells: str,
    ) -> None:
        """Add a column of one formula of the catalogue.

        Parameters
        ----------
        key : str
        name : str
            Key in the catalogue.
        values : ndarray
            Canonical.
        kind : str
            Kind of number of the result.
        where : str
            Condition under which the formula holds, else the cell is blank; "" always.
        heading : str
            Instead of the catalogue's words.
        **cells : str
            References by symbol, canonical.
        """
        entry = CATALOGUE[name]
        text = self.basis.inputs.shown(entry.text(**cells), kind)
        if where:
            text = f'IF({where},{text},"")'
        words = heading or entry.words[0].upper() + entry.words[1:]
        self.computed(key, words, entry.symbol, np.asarray(values), kind, text, entry.source)

    def shown(self, values: AnyFloats, kind: str, word: str = "none") -> list[Cell]:
        """Give values as shown, a word where there is none."""
        return number_or(np.asarray(values, dtype=np.float64) * self.basis.inputs.display[kind].factor, word)


def share(value: FloatArray, limit: FloatArray) -> FloatArray:
    """Give value / limit where there is a limit over 0, else nan."""
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(np.isfinite(limit) & (limit > 0), value / limit, np.nan)


def share_text(value: str, limit: str) -> str:
    """Give the formula of :func:`share`, of cells in the same unit."""
    divided = CATALOGUE["utilisation"].text(value=value, limit=limit)
    return f'IF(N({limit})>0,IF(ISNUMBER({value}),{divided},""),"")'


def _symbol(symbol: str, unit: str) -> str:
    if symbol and unit:
        return f"{symbol} ({unit})"
    return symbol or (f"({unit})" if unit else "")
