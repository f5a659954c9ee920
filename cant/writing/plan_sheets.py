"""The sheets of our own that follow the user's: summary, plan, figures, transitions, findings, inputs.

Filled record by record in one pass; each table is a list of columns from :mod:`cant.writing.columns` and
:mod:`cant.writing.figure_columns`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from typing import TYPE_CHECKING, Any

from cant.limit_sets import as_table, headers
from cant.model.plan import STATUSES
from cant.version import __version__
from cant.writing.book.calculation import Calculation
from cant.writing.book.selection import Selection, chosen_curves
from cant.writing.columns import DECISION, GEOMETRY, PLACE, WORDS, Cell, Column, Record, class_columns
from cant.writing.document import cautions_of
from cant.writing.figure_columns import END, FIGURES
from cant.writing.sheets import Heading, NewSheets, TableSheet

if TYPE_CHECKING:
    from cant.writing.planned import PlannedLine

STATUS_WORDS: dict[str, str] = {
    "not assessed": "the limits or the data have a gap there",
    "not compliant": "its fixed or site-bound cant keeps no limit that no lower speed can mend",
    "restrict": "some class may not run at its planned speed",
    "exceptional": "an exceptional value is needed, which takes approval",
    "kept": "today's cant is the one to have",
    "change": "another cant than today's is proposed, within normal limits",
}
"""What each status means, for people."""

FULL_FIGURES = 5000
"""Up to this many curves the sheets of figures show all; of longer lists, those that need a decision."""

CALCULATION_SHEETS = ("Calculation", "Calculation by class", "Calculation of ends")

_DECIDED = ("kept", "change")


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
    """

    def __init__(self, book: NewSheets, planned: PlannedLine, name: Callable[[str], str]) -> None:
        self._planned = planned
        self._display = planned.display
        self._plan_columns = [
            *PLACE,
            *GEOMETRY,
            *DECISION,
            *class_columns(planned.plan.traffic.class_names),
            *WORDS,
        ]
        self._name = name
        self._book = book
        self._all = len(planned.plan.assessed) <= FULL_FIGURES
        self._summary()
        self._plan = self._table("Plan", self._plan_columns)
        self._figures = self._table("Figures", [*PLACE, *FIGURES])
        self._ends = self._table("Transitions", [*PLACE, *END])
        self._findings = self._plain("Findings", ["Line", "Track", "Curve", "Severity", "Finding", "Clause"])
        self._chosen = Selection(planned.plan, chosen_curves(planned.plan))
        self._index = iter(planned.plan.assessed.tolist())
        calculated = [book.table(name(wanted)) for wanted in CALCULATION_SHEETS]
        names = [name(wanted) for wanted in ("Inputs", "Limits used", "Traffic used")]
        self._calculation = Calculation(
            self._chosen,
            (calculated[0], calculated[1], calculated[2]),
            (names[0], names[1], names[2]),
        )

    def add(self, record: Record) -> None:
        """Write what the sheets hold of one curve."""
        place = self._chosen.place.get(next(self._index))
        if place is not None:
            self._chosen.take(place, record)
        self._plan.row([column.cell(record, self._display) for column in self._plan_columns])
        names = [record["line"], record["track"], record["curve"]]
        self._write_findings(names, record["findings"])
        if self._all or record["status"] not in _DECIDED:
            self._add_figures(record)

    def _add_figures(self, record: Record) -> None:
        """Write a row for each class, proposed and today, and for each end."""
        place = [column.cell(record, self._display) for column in PLACE]
        ends = record["transitions"]
        for entry in record["classes"]:
            self._figure_row(place, {**entry, "cant": "proposed", **_over_ends(ends, entry["class"])})
        for entry in record["today"]["classes"]:
            self._figure_row(place, {**entry, "cant": "today"})
        for side, end in ends.items():
            shown = {**end, "side": side}
            self._ends.row([*place, *(column.cell(shown, self._display) for column in END)])

    def finish(self) -> None:
        """Write the sheets that need no curves."""
        plan = self._planned.plan
        self._write_findings(
            [None, None, None], [finding.as_json() for finding in self._planned.explanation.plan_findings]
        )
        self._rejected()
        self._calculation.write(self._book)
        self._how_read()

    def _figure_row(self, place: list[Cell], figures: Record) -> None:
        self._figures.row([*place, *(column.cell(figures, self._display) for column in FIGURES)])

    def _summary(self) -> None:
        """Write the first of our sheets: what was planned with what, counts, cautions."""
        planned, plan = self._planned, self._planned.plan
        sheet = self._book.table(self._name("Plan summary"))
        sheet.widths(28, 14, 70)
        sheet.line("Plan of cant", bold=True)
        edited = ", edited" if plan.limits.edited else ""
        verified = "" if plan.limits.verified else " (UNVERIFIED)"
        for name, value in (
            ("Curve file", planned.reading.file),
            ("SHA-256 of it", planned.reading.sha256),
            ("Limits", f"{plan.limits.title or plan.limits.name}{verified}"),
            ("Edition", f"{plan.limits.edition}{edited}"),
            ("Method", plan.settings.method),
            ("Tiers", ", ".join(plan.settings.tiers)),
            ("Program", f"cant {__version__}"),
        ):
            if value:
                sheet.line(name, value)
        sheet.line()
        sheet.line("Status", "Curves", "Meaning", bold=True)
        counts = plan.counts()
        for status in STATUSES:
            sheet.line(status, counts.get(status, 0), STATUS_WORDS[status])
        sheet.line(
            "rejected", float(plan.curves.rejected.sum()), "rows that cannot be read: see 'Not assessed'"
        )
        if not self._all:
            text = (
                f"The list has more than {FULL_FIGURES} curves: the sheets 'Figures' and 'Transitions' hold "
                "those that need a decision; the JSON holds all."
            )
            sheet.paragraph(text, 3)
        sheet.line()
        sheet.line("Cautions", bold=True)
        for caution in cautions_of(plan.limits):
            sheet.paragraph(caution, 3)
        sheet.line()
        for role in ("Prepared", "Checked", "Approved"):
            sheet.line(f"{role} by / date", "", "")

    def _rejected(self) -> None:
        sheet = self._plain("Not assessed", ["Sheet", "Row", "Column", "Value", "Problem"])
        for row in self._planned.reading.rejected:
            sheet.row([row.sheet, row.row, row.column, row.value, row.problem])

    def _settings(self) -> None:
        settings = self._planned.plan.settings
        sheet = self._plain("Settings used", ["Setting", "Value"])
        for name, value in settings.model_dump().items():
            sheet.row([name, _cell(value)])
        sheet.row(["equilibrium constant used [mm m/(km/h)2]", settings.constant])
        sheet.row(["rail spacing used [mm]", settings.spacing_mm])

    def _how_read(self) -> None:
        reading = self._planned.reading
        names = ["Sheet", "Column", "Understood as", "Unit", "Unit from", "Confidence", "Note"]
        sheet = self._plain("How it was read", names)
        for c in reading.columns:
            meaning = c.meaning or "left alone"
            sheet.row([c.sheet, c.heading, meaning, c.unit, c.unit_from, c.confidence, c.note])
        for q in reading.questions:
            choices = "; ".join(q.choices)
            sheet.row([q.sheet, q.column, "ASKED", "", "", "asked", f"{q.question} Choices: {choices}"])
        for note in reading.notes:
            sheet.row(["", "", "", "", "", "", note])

    def _write_findings(self, names: Sequence[Cell], findings: Iterable[dict[str, Any]]) -> None:
        for finding in findings:
            self._findings.row([*names, finding["severity"], finding["text"], finding["clause"]])

    def _table(self, name: str, columns: Sequence[Column]) -> TableSheet:
        sheet = self._book.table(self._name(name))
        display = self._display
        heads = [Heading(c.title(display), c.width, c.number_format(display)) for c in columns]
        sheet.header(heads, keep=len(PLACE))
        return sheet

    def _plain(self, name: str, titles: Sequence[str]) -> TableSheet:
        sheet = self._book.table(self._name(name))
        wide = {"Finding": 90.0, "Problem": 90.0, "Note": 70.0, "Setting": 40.0, "Clause": 24.0}
        sheet.header([Heading(title, wide.get(title, 16.0)) for title in titles])
        return sheet

    def _dicts(self, name: str, titles: Sequence[str], rows: Iterable[dict[str, Any]]) -> None:
        sheet = self._plain(name, titles)
        for row in rows:
            sheet.row([_cell(row[title]) for title in titles])


def _over_ends(ends: Record, name: str) -> dict[str, Record]:
    """Give what a class has over each end of a curve."""
    return {side: entry for side, end in ends.items() for entry in end["classes"] if entry["class"] == name}


def _cell(value: Any) -> Cell:
    """Turn a value of a model into a cell: yes and no in words, lists with commas, blanks blank."""
    if value is None or (isinstance(value, str | float | int) and not isinstance(value, bool)):
        return value
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, tuple | list):
        return ", ".join(str(part) for part in value)
    return str(value)
