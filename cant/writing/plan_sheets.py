"""The sheets of our own that follow the user's: which there are, in which order, and who writes each.

Filled record by record in one pass, so that a register never stands in memory; each sheet is a module of
:mod:`cant.writing.book`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from datetime import date
from typing import TYPE_CHECKING, Any

from cant.model.signatures import Signatures
from cant.writing.book.calculation import Calculation
from cant.writing.book.exceptions import Exceptions, SpeedChanges
from cant.writing.book.lifting import LiftingSchedule
from cant.writing.book.pictures import Pictures
from cant.writing.book.ramp_values import RampValues
from cant.writing.book.reading_sheets import write_how_read, write_rejected
from cant.writing.book.selection import Selection, chosen_curves, rule_of_choice
from cant.writing.book.status import STATUS_WORDS
from cant.writing.book.summary import Summary
from cant.writing.book.terms import write_terms
from cant.writing.columns import (
    DECISION,
    NEEDED,
    PLACE,
    WORDS,
    Cell,
    Column,
    Record,
    class_columns,
    geometry_columns,
    row_maker,
)
from cant.writing.figure_columns import END, FIGURES
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets, TableSheet

if TYPE_CHECKING:
    from cant.writing.planned import PlannedLine

__all__ = ["FULL_FIGURES", "STATUS_WORDS", "PlanSheets", "footer_of"]

FULL_FIGURES = 2000
"""Up to this many curves the sheets of figures show all; of longer lists, those that need a decision and are
calculated."""

FULL_PLAN = 10_000
"""Up to this many curves the sheets "Plan" and "Findings" show all, and added columns hold the findings."""

_DECIDED = ("kept", "change")
_FINDING = (
    ("Line", 16.0),
    ("Track", 7.0),
    ("Curve", 9.0),
    ("Severity", 10.0),
    ("Finding", 100.0),
    ("Clause", 20.0),
)


def footer_of(planned: PlannedLine) -> str:
    """Give the footer of every page: input file and digest, sheet, page."""
    file = planned.reading.name[-60:].replace("&", "&&")
    digest = planned.reading.sha256[:16]
    left = file + (f"  sha256 {digest}" if digest else "")
    return f"&L&8{left}&C&8&A&R&8Page &P of &N"


def holds_all(curves: int) -> bool:
    """Tell whether a list is short enough for every curve to stand on the sheets "Plan" and "Findings"."""
    return curves <= FULL_PLAN


class PlanSheets:
    """Our sheets in the making.

    Parameters
    ----------
    book : NewSheets
        The workbook that they are written to.
    planned : PlannedLine
        The plan.
    name : callable
        Gives a sheet name that the user's workbook does not have yet.
    day : date, optional
        Date of the issue; today when not told.
    signatures : Signatures, optional
        Who has signed the plan.
    """

    def __init__(
        self,
        book: NewSheets,
        planned: PlannedLine,
        name: Callable[[str], str],
        day: date | None = None,
        signatures: Signatures | None = None,
    ) -> None:
        plan, self._display = planned.plan, planned.display
        self._planned, self._book, self._name = planned, book, name
        self._index = iter(plan.assessed.tolist())
        self._all = len(plan.assessed) <= FULL_FIGURES
        self._shown = 0
        self._whole = holds_all(len(plan.assessed))
        self._chosen = Selection(plan, chosen_curves(plan))
        self._summary = Summary(book, name("Plan summary"), planned, day, signatures)
        self._pictures = Pictures(
            book, (name("Line in pictures"), name("Picture data")), self._display, plan.traffic.class_names
        )
        self._exceptions = Exceptions(book, name("Exceptions"), self._display, self._whole)
        self._speeds = SpeedChanges(book, name("Speed changes"), self._display)
        lifting = book.table(name("Lifting schedule"))
        rule = "" if self._all else "Ramps of: " + rule_of_choice(plan, len(self._chosen))
        self._ramps = RampValues(book, name("Ramp values"), self._display, plan, rule)
        classes = class_columns(plan.traffic.class_names)
        columns = [*PLACE, *geometry_columns(self._display), *DECISION, *classes, *NEEDED, *WORDS]
        self._plan_row, self._place_row, self._figure_cells, self._end_row = (
            row_maker(one, self._display) for one in (columns, PLACE, FIGURES, END)
        )
        self._plan = self._table("Plan", columns)
        self._figures = self._table("Figures", [*PLACE, *FIGURES])
        self._ends = self._table("Transitions", [*PLACE, *END])
        self._findings = self._plain("Findings", _FINDING)
        self._calculation = self._calculated()
        self._lifting = LiftingSchedule(lifting, self._calculation.inputs)

    def _calculated(self) -> Calculation:
        first, second, third = (
            self._book.table(self._name(wanted))
            for wanted in ("Calculation", "Calculation by class", "Calculation of ends")
        )
        inputs, limits, traffic = (self._name(wanted) for wanted in ("Inputs", "Limits used", "Traffic used"))
        return Calculation(self._chosen, (first, second, third), (inputs, limits, traffic))

    def add(self, record: Record) -> None:
        """Write what the sheets hold of one curve; the records come in the order of the plan."""
        place = self._chosen.place.get(next(self._index))
        if place is not None:
            self._chosen.take(place, record)
        for part in (self._summary, self._pictures, self._exceptions, self._speeds, self._lifting):
            part.add(record)
        needs_decision = record["status"] not in _DECIDED
        if self._whole or (needs_decision and self._shown < FULL_PLAN):
            self._shown += 1
            self._plan.row(self._plan_row(record))
            self._write_findings([record["line"], record["track"], record["curve"]], record["findings"])
        if self._all or (needs_decision and place is not None):
            self._add_figures(record)

    def _add_figures(self, record: Record) -> None:
        """Write a row for each class, proposed and today, and for each end."""
        place = self._place_row(record)
        ends = record["transitions"]
        for entry in record["classes"]:
            self._figure_row(place, {**entry, "cant": "proposed", **_over_ends(ends, entry["class"])})
        for entry in record["today"]["classes"]:
            self._figure_row(place, {**entry, "cant": "today"})
        for side, end in ends.items():
            shown = {**end, "side": side}
            self._ends.row([*place, *self._end_row(shown)])

    def finish(self) -> None:
        """Write what needs all curves, and the sheets that need none."""
        nowhere: list[Cell] = [None, None, None]
        self._write_findings(nowhere, [f.as_json() for f in self._planned.explanation.plan_findings])
        self._exceptions.finish()
        self._speeds.finish()
        self._lifting.write()
        curves = self._planned.plan.assessed.tolist() if self._all else self._chosen.curves.tolist()
        self._ramps.write(curves)
        self._calculation.write(self._book)
        write_how_read(self._book, self._name("How it was read"), self._planned)
        write_rejected(self._book, self._name("Not assessed"), self._planned)
        write_terms(self._book, self._name("Terms and formulas"))
        self._pictures.write()
        self._summary.write(self._chosen)

    def _figure_row(self, place: list[Cell], figures: Record) -> None:
        self._figures.row([*place, *self._figure_cells(figures)])

    def _write_findings(self, names: Sequence[Cell], findings: Iterable[dict[str, Any]]) -> None:
        for finding in findings:
            self._findings.row([*names, finding["severity"], finding["text"], finding["clause"]])

    def _table(self, name: str, columns: Sequence[Column]) -> TableSheet:
        sheet = self._book.table(self._name(name))
        if not (self._whole if name == "Plan" else self._all):
            most = FULL_PLAN if name == "Plan" else FULL_FIGURES
            which = "the first of them" if name == "Plan" else "those that the sheets of calculation hold"
            text = (
                f"The list has more than {most} curves: this sheet holds of those that need a decision (not "
                f"compliant, speed restricted, exceptional, not assessed) {which}, at most {most}. The added "
                "columns of the curve list and the JSON hold all."
            )
            if name == "Plan":
                text += (
                    " Findings on single curves stand in the JSON alone; the exceptions give the reason once "
                    "a curve."
                )
            sheet.paragraph(text, 10, 110)
        display = self._display
        heads = [Heading(c.title(display), c.width, c.number_format(display)) for c in columns]
        sheet.header(heads, keep=len(PLACE))
        return sheet

    def _plain(self, name: str, heads: Sequence[tuple[str, float]]) -> TableSheet:
        sheet = self._book.table(self._name(name))
        sheet.header([Heading(title, width) for title, width in heads], keep=3)
        return sheet


def _over_ends(ends: Record, name: str) -> dict[str, Record]:
    """Give what a class has over each end of a curve."""
    return {side: entry for side, end in ends.items() for entry in end["classes"] if entry["class"] == name}
