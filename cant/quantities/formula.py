"""What one formula of the catalogue is: its array function, its spreadsheet text, and the words beside both.

Apart from the catalogue so that the list of formulas stays a list.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from string import Formatter

from cant.quantities.arrays import ArrayLike, FloatArray

_SIMPLE = re.compile(
    r"('[^']+'!|\w+!)?\$?[A-Z]{1,3}\$?\d+(:\$?[A-Z]{1,3}\$?\d+)?|\d+(\.\d+)?|[A-Za-z_][\w.]*(\[[^\[\]]+\])?"
)


@dataclass(frozen=True, slots=True)
class Symbol:
    """A quantity that a formula takes: its unit and what it is."""

    unit: str
    words: str


@dataclass(frozen=True, slots=True)
class Formula:
    """One formula, said three times: as code, as spreadsheet text, in words.

    Attributes
    ----------
    key : str
        Name in code, unique.
    symbol, unit, words : str
        Of the result.
    source : str
        Document and clause, or what it follows from.
    template : str
        Spreadsheet text without the equals sign, arguments in braces; functions of Excel 2010 only.
    function : callable
        The array function.
    parameters : mapping of str to str
        Symbol in the template to parameter of the function.
    """

    key: str
    symbol: str
    unit: str
    words: str
    source: str
    template: str
    function: Callable[..., FloatArray]
    parameters: Mapping[str, str]

    @property
    def arguments(self) -> list[str]:
        """Symbols that the template takes, each once, in the order of their first use."""
        found = (name for _, name, _, _ in Formatter().parse(self.template) if name)
        return list(dict.fromkeys(found))

    def text(self, **cells: str | float) -> str:
        """Write the formula over cells, without the equals sign.

        Parameters
        ----------
        **cells : str or float
            By symbol: a reference, a name, a number, or an expression, which is put in brackets.

        Returns
        -------
        str
            Text that can stand after an equals sign or within another formula's argument.

        Raises
        ------
        KeyError
            Where a symbol of the template is missing, or one is given that it does not have.
        """
        if set(cells) != set(self.arguments):
            message = f"{self.key} takes {', '.join(self.arguments)}, not {', '.join(cells)}"
            raise KeyError(message)
        return self.template.format_map({symbol: _bracketed(cell) for symbol, cell in cells.items()})

    def evaluate(self, **values: ArrayLike) -> FloatArray:
        """Compute the formula from values by symbol."""
        return self.function(**{self.parameters[symbol]: value for symbol, value in values.items()})


def _bracketed(cell: str | float) -> str:
    """Put an expression in brackets, so that it can stand anywhere; leave references and numbers alone."""
    text = cell if isinstance(cell, str) else repr(float(cell))
    return text if _SIMPLE.fullmatch(text) else f"({text})"


STANDARD = "definition of the trade"
"""Source of what has no single source."""

CONSTANT = {"C": "constant"}
SPACING = {"e": "rail_spacing_mm", "g": "gravity_ms2"}
CURVE = {"V": "speed_kmh", "R": "radius_m"}
PEAK = {"k": "peak_factor"}


def entry(
    key: str,
    result: tuple[str, str, str],
    template: str,
    function: Callable[..., FloatArray],
    parameters: dict[str, str],
    source: str = STANDARD,
) -> Formula:
    """Make a formula in the order in which one reads it.

    Parameters
    ----------
    key : str
        Name in code [-].
    result : tuple of str
        Symbol, unit and words of the result [-].
    template, function, parameters, source
        As for :class:`Formula` [-].

    Returns
    -------
    Formula
        The entry, one (no array shape).

    References
    ----------
    .. [1] Each entry names its own source.
    """
    symbol, unit, words = result
    return Formula(key, symbol, unit, words, source, template, function, parameters)
