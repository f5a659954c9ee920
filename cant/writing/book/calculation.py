"""The live calculation: three sheets of formulas over the sheets of inputs, made together.

Apart from each of them because their cells refer to one another: all columns are laid out first and written
when every letter and row is known.
"""

from __future__ import annotations

import numpy as np

from cant.writing.book.class_calculation import ClassCalculation
from cant.writing.book.curve_calculation import CurveCalculation
from cant.writing.book.end_calculation import EndCalculation
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import FIRST_ROW, Basis
from cant.writing.book.inputs import Inputs
from cant.writing.book.ledger import Ledger
from cant.writing.book.limits_sheet import LimitsSheet
from cant.writing.book.selection import Selection, rule_of_choice
from cant.writing.book.traffic_sheet import TrafficSheet
from cant.writing.sheets import NewSheets, TableSheet

_HOW = (
    "Formulas with their values stored: change a cell on a pale ground here or on the sheets {inputs}, "
    "{limits} and "
    "{traffic}, and everything that depends on it follows, the row of the limits that governs too. "
    "Grey cells are fixed by the program. {rule}"
)


class Calculation:
    """The sheets in the making.

    Parameters
    ----------
    chosen : Selection
        Curves to calculate; their figures may be filled in until :meth:`write`.
    sheets : tuple of three TableSheet
        For curves, classes and ends.
    names : tuple of three str
        Names of the sheets of inputs, limits and traffic.
    """

    def __init__(
        self,
        chosen: Selection,
        sheets: tuple[TableSheet, TableSheet, TableSheet],
        names: tuple[str, str, str],
    ) -> None:
        plan = chosen.plan
        self._chosen = chosen
        self._sheets = sheets
        self._names = names
        self._situations = sorted({plan.curves.situations[i] for i in chosen.curves.tolist()}, key=sorted)
        self.inputs = Inputs(plan.settings, names[0])
        self.limits = LimitsSheet(plan.limits, self._situations, self.inputs, names[1])
        self.traffic = TrafficSheet(plan.traffic, self.inputs, names[2])

    def write(self, book: NewSheets) -> None:
        """Write the three sheets, and then the inputs that they refer to."""
        chosen = self._chosen
        basis = Basis(self.inputs, self.limits, self.traffic, chosen)
        rows = EndRows.of(chosen)
        counts = (len(chosen), len(chosen.pos), len(rows))
        curves, classes, ends = (
            Ledger(sheet, FIRST_ROW, count) for sheet, count in zip(self._sheets, counts, strict=True)
        )
        number = {words: place for place, words in enumerate(self._situations, start=1)}
        situations = chosen.plan.curves.situations
        numbers = np.array([number[situations[i]] for i in chosen.curves.tolist()], dtype=np.float64)
        of_curves = CurveCalculation(basis, curves, numbers)
        of_curves.make_inputs()
        of_classes = ClassCalculation(basis, classes)
        of_classes.set_curve_sheet(curves, numbers)
        of_classes.make()
        of_ends = EndCalculation(basis, ends, rows, curves, classes)
        of_ends.make()
        of_classes.speeds.join_ends(ends, rows, of_ends.failing, of_ends.broken)
        of_curves.make_results(classes, ends, rows)
        text = _HOW.format(
            inputs=f"'{self._names[0]}'",
            limits=f"'{self._names[1]}'",
            traffic=f"'{self._names[2]}'",
            rule=rule_of_choice(chosen.plan, len(chosen)),
        )
        for ledger, keep in ((curves, 3), (classes, 4), (ends, 6)):
            ledger.sheet.paragraph(text, 10, 105)
            ledger.write(keep)
        self.inputs.write(book)
        self.limits.write(book)
        self.traffic.write(book)
