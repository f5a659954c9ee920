"""The sheet of inputs: settings as used and the constants that follow, in cells that formulas refer to."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

from cant.model.display import Display
from cant.model.settings import Settings
from cant.quantities.catalogue import CATALOGUE
from cant.units import GRAVITY_MS2
from cant.writing.book.ledger import FIXED, FORMULA, INPUT, quoted
from cant.writing.columns import Cell
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets

_Origin: TypeAlias = tuple[str, str, str | None]
_CONVERTED = ("cant", "speed", "radius", "length", "gradient", "rate", "mass", "height")


@dataclass(frozen=True)
class _Entry:
    key: str
    label: str
    value: Cell
    unit: str
    symbol: str
    source: str
    kind: str = FIXED
    formula: str | None = None


class Inputs:
    """The cells of the sheet "Inputs", and how a number shown becomes the unit of the formulas.

    Parameters
    ----------
    settings : Settings
        As used by the plan.
    sheet : str
        Name of the sheet.
    """

    def __init__(self, settings: Settings, sheet: str) -> None:
        self.display = Display(settings.units)
        self.settings = settings
        self.name = sheet
        self._rows: dict[str, int] = {}
        self._entries = self._made()
        for row, entry in enumerate(self._entries, start=FIRST_ROW):
            self._rows[entry.key] = row

    def cell(self, key: str) -> str:
        """Give the address of an input: ``constant``, ``spacing``, ``gravity``, ``allowance``."""
        return f"{quoted(self.name)}!$B${self._rows[key]}"

    def canonical(self, reference: str, kind: str) -> str:
        """Give a shown number as the formulas take it: itself in metric units, else divided by its factor."""
        if self.display[kind].factor == 1.0:
            return reference
        return f"{reference}/{self.cell('per ' + _family(kind))}"

    def shown(self, formula: str, kind: str) -> str:
        """Give the result of a formula as it is shown."""
        factor = self.display[kind].factor
        if factor == 1.0:
            return formula
        if kind == "share":
            return f"({formula})*100"
        return f"({formula})*{self.cell('per ' + _family(kind))}"

    def write(self, book: NewSheets) -> None:
        """Write the sheet."""
        sheet = book.table(self.name)
        titles = ("Input", "Value", "Unit", "Symbol", "Where from")
        sheet.paragraph(
            "Settings as used and the constants that follow from them. Cells on a pale ground are inputs: "
            "the "
            "sheets of calculation refer to them.",
            5,
            130,
        )
        sheet.header([Heading(t, w) for t, w in zip(titles, (44.0, 18.0, 22.0, 9.0, 60.0), strict=True)])
        for entry in self._entries:
            row = sheet.next_row
            style = book.looks.styled("General" if isinstance(entry.value, float) else None, entry.kind)
            for column, text in ((0, entry.label), (2, entry.unit), (3, entry.symbol), (4, entry.source)):
                sheet.raw.write_string(row - 1, column, text, book.looks.word)
            if entry.formula is not None:
                sheet.raw.write_formula(row - 1, 1, "=" + entry.formula, style, entry.value)
            elif isinstance(entry.value, str):
                sheet.raw.write_string(row - 1, 1, entry.value, style)
            elif entry.value is not None:
                sheet.raw.write_number(row - 1, 1, entry.value, style)
            sheet.skip()

    def _made(self) -> list[_Entry]:
        s = self.settings
        name = quoted(self.name)
        rows = [
            _Entry("gravity", "Gravity", GRAVITY_MS2, "m/s2", "g", "fixed in this program", INPUT),
            *self._constants(name),
            _Entry(
                "allowance",
                "Maintenance allowance, taken off a ceiling on cant",
                s.maintenance_allowance_mm or 0.0,
                "mm",
                "",
                "Settings" if s.maintenance_allowance_mm is not None else "not stated: 0",
                INPUT,
            ),
            *(
                _Entry(
                    key,
                    f"Height of {title} above the rails",
                    height,
                    "m",
                    "h",
                    "assumed: put in the height of the place",
                    INPUT,
                )
                for key, (title, height) in HEIGHTS.items()
            ),
            _Entry("method", "Method of the target cant", s.method, "", "", "Settings; planned with it"),
            _Entry(
                "tiers", "Tiers of limits allowed", ", ".join(s.tiers), "", "", "Settings; planned with it"
            ),
            _Entry(
                "keep", "Keep today's cant within", s.keep_within_mm, "mm", "", "Settings; planned with it"
            ),
            _Entry("fraction", "Method fraction: share", s.fraction_of_fastest, "-", "", "Settings"),
            _Entry("underbalance", "Method underbalance: margin", s.underbalance_mm, "mm", "", "Settings"),
            _Entry("today", "Method today: within", s.today_within_mm, "mm", "", "Settings"),
            _Entry("units", "Units of these sheets", s.units, "", "", "Settings"),
        ]
        return [*rows, *self._factors()]

    def _constants(self, name: str) -> list[_Entry]:
        s = self.settings
        gravity = f"{name}!$B${FIRST_ROW}"
        spacing, constant = (f"{name}!$B${FIRST_ROW + offset}" for offset in (1, 2))
        if s.equilibrium_constant is not None:
            formula = CATALOGUE["rail_spacing_from_constant"].text(g=gravity, C=constant)
            first: _Origin = ("from the printed constant: 12.96 g C", FORMULA, formula)
            second: _Origin = ("as printed or set", INPUT, None)
        else:
            source = (
                "Settings or limit set" if s.rail_spacing_mm is not None else "1500 where nothing is stated"
            )
            first = (source, INPUT, None)
            second = (
                "from the rail spacing: e / (12.96 g)",
                FORMULA,
                CATALOGUE["constant_from_rail_spacing"].text(g=gravity, e=spacing),
            )
        return [
            _Entry("spacing", "Rail spacing", s.spacing_mm, "mm", "e", *first),
            _Entry("constant", "Equilibrium constant", s.constant, "mm m/(km/h)2", "C", *second),
        ]

    def _factors(self) -> list[_Entry]:
        metric = Display("metric")
        return [
            _Entry(
                "per " + kind,
                f"{self.display[kind].unit} in one {metric[kind].unit}, {kind}",
                self.display[kind].factor,
                f"{self.display[kind].unit} per {metric[kind].unit}",
                "",
                "definition of the units",
            )
            for kind in _CONVERTED
            if self.display[kind].factor != 1.0
        ]


HEIGHTS: dict[str, tuple[str, float]] = {
    "platform": ("the platform edge", 0.915),
    "wire": ("the contact wire", 5.0),
}
"""Heights above the rails [m] at which the shift is shown where nobody says another: common practice."""

FIRST_ROW = 3
"""Row of the first input, below the explanation and the header."""


def _family(kind: str) -> str:
    """Give the kind whose factor is the same: ``cant exact`` is shown like ``cant``."""
    return kind.removesuffix(" exact")
