"""The summary on one printed page: what was planned with what, what matters most, and who signs.

Made from what is known before any record, and from the few curves that matter most.
"""

from __future__ import annotations

from datetime import date

import numpy as np

from cant.model.plan import STATUSES
from cant.model.signatures import STEPS, Signatures
from cant.version import __version__
from cant.writing.book.selection import Selection
from cant.writing.book.status import FILLS, STATUS_WORDS
from cant.writing.columns import Record
from cant.writing.document import cautions_of
from cant.writing.planned import PlannedLine
from cant.writing.sheets import NewSheets, TableSheet

_WIDTHS = (24.0, 13.0, 26.0, 13.0, 26.0, 26.0)
_WIDE = sum(_WIDTHS)
_SHOWN = 7
_GRAVE = ("not compliant", "restrict", "exceptional")
_CUT = 420


class Summary:
    """The first of our sheets.

    Parameters
    ----------
    book : NewSheets
    name : str
    planned : PlannedLine
    day : date or None
        Date of the issue; today when not told.
    signatures : Signatures or None
        Who has signed; room to sign by hand for the others.
    """

    def __init__(
        self,
        book: NewSheets,
        name: str,
        planned: PlannedLine,
        day: date | None = None,
        signatures: Signatures | None = None,
    ) -> None:
        self._book = book
        self._planned = planned
        self._plan = planned.plan
        self._day = day or date.today()
        self._signed = signatures
        self._sheet: TableSheet = book.table(name)
        self._sheet.widths(*_WIDTHS)
        self._gravest: dict[str, list[str]] = {status: [] for status in _GRAVE}
        self._lost = 0.0
        self._changed = {"up": 0, "down": 0}
        self._unknown_ends = 0
        self._unknown_today = 0

    def add(self, record: Record) -> None:
        """Take a curve."""
        status = record["status"]
        if status in self._gravest and len(self._gravest[status]) < _SHOWN:
            place = " ".join(word for word in (record["line"], record["track"], record["curve"]) if word)
            self._gravest[status].append(f"{place}: {record['reason']}")
        old, new = record["existing_cant_mm"], record["recommended_cant_mm"]
        self._unknown_today += old is None
        if old is not None and new is not None and abs(new - old) > 1e-6:
            self._changed["up" if new > old else "down"] += 1
        self._lost += record["running_time_lost_s"] or 0.0
        self._unknown_ends += sum(end["kind"] == "not known" for end in record["transitions"].values())

    def write(self, chosen: Selection) -> None:
        """Write the page."""
        self._head()
        self._counts()
        self._matters()
        self._not_checked(chosen)
        self._cautions()
        self._signatures()
        raw = self._sheet.raw
        raw.fit_to_pages(1, 1)
        raw.set_portrait()
        raw.print_area(0, 0, self._sheet.next_row - 2, len(_WIDTHS) - 1)

    def _text(self, text: str) -> None:
        self._sheet.paragraph(text, len(_WIDTHS), _WIDE * 1.08)

    def _heading(self, text: str) -> None:
        self._sheet.skip()
        self._sheet.line(text, bold=True)

    def _head(self) -> None:
        planned, plan, sheet = self._planned, self._plan, self._sheet
        sheet.raw.write_string(0, 0, "Plan of cant", self._book.looks.title)
        sheet.raw.set_row(0, 22)
        sheet.skip()
        limits, settings = plan.limits, plan.settings
        marks = ("" if limits.verified else " - UNVERIFIED") + (" - EDITED" if limits.edited else "")
        constant = f"C = {settings.constant:.6g} mm m/(km/h)2, e = {settings.spacing_mm:.6g} mm"
        for label, value in (
            ("Curve file", planned.reading.name or "(tables given to the library)"),
            ("SHA-256 of it", planned.reading.sha256),
            ("Limits", f"{limits.title or limits.name}{marks}"),
            ("Edition, document", ", ".join(word for word in (limits.edition, limits.document) if word)),
            ("Completeness", limits.completeness),
            ("Method and tiers", f"{settings.method}; {', '.join(settings.tiers)}; {constant}"),
            ("Program", f"cant {__version__}"),
            ("Issue and date", f"issue ____   {self._day.isoformat()}"),
        ):
            if value:
                self._row(label, value)

    def _row(self, label: str, value: str) -> None:
        row = self._sheet.next_row - 1
        self._sheet.raw.write_string(row, 0, label, self._book.looks.bold)
        lines = max(1, -(-len(value) // int(_WIDE - _WIDTHS[0] - 4)))
        self._sheet.raw.set_row(row, 15.0 * lines)
        self._sheet.raw.merge_range(row, 1, row, len(_WIDTHS) - 1, value, self._book.looks.wrapped)
        self._sheet.skip()

    def _counts(self) -> None:
        self._sheet.skip()
        counts = self._plan.counts()
        rejected = int(np.count_nonzero(self._plan.curves.rejected))
        self._sheet.line("Status", "Curves", "Meaning", bold=True)
        for status in STATUSES:
            fill = FILLS.get(status)
            row = self._sheet.next_row - 1
            look = {"valign": "top", **({"bg_color": f"#{fill}"} if fill else {})}
            self._sheet.raw.write_string(row, 0, status, self._book.workbook.add_format(look))
            self._sheet.raw.write_number(row, 1, counts.get(status, 0), self._book.looks.plain)
            self._sheet.raw.write_string(row, 2, STATUS_WORDS[status], self._book.looks.word)
            self._sheet.skip()
        row = self._sheet.next_row - 1
        self._sheet.raw.write_string(
            row, 2, "rows that cannot be read: see 'Not assessed'", self._book.looks.word
        )
        self._sheet.line("rejected", float(rejected))

    def _matters(self) -> None:
        self._heading("What matters most")
        lines = [text for status in _GRAVE for text in self._gravest[status]][:_SHOWN]
        counts = self._plan.counts()
        total = sum(counts.get(status, 0) for status in _GRAVE)
        for text in lines:
            self._text("- " + (text if len(text) <= _CUT else text[:_CUT].rsplit(" ", 1)[0] + " ..."))
        if total > len(lines):
            self._text(f"- and {total - len(lines)} more: see the exceptions and the speed changes.")
        up, down = self._changed["up"], self._changed["down"]
        self._text(
            f"- Cant goes up on {up} and comes down on {down} curves (see the lifting schedule). "
            f"Running time lost against the planned speeds: {self._lost:.0f} s a day over all trains, "
            "over the "
            "curves alone."
        )
        for finding in self._planned.explanation.plan_findings[:5]:
            text = finding.text
            self._text("- " + (text if len(text) <= _CUT else text[:_CUT].rsplit(" ", 1)[0] + " ..."))

    def _not_checked(self, chosen: Selection) -> None:
        self._heading("What was not checked")
        counts = self._plan.counts()
        rejected = int(np.count_nonzero(self._plan.curves.rejected))
        missing = counts.get("not assessed", 0) + rejected
        parts = []
        if missing:
            parts.append(f"{missing} rows were not assessed: see 'Not assessed'.")
        if self._unknown_ends:
            parts.append(
                f"{self._unknown_ends} transitions are not known: their rates and gradients are unchecked."
            )
        if self._unknown_today:
            parts.append(f"Today's cant is not known on {self._unknown_today} curves.")
        every = int(self._plan.outcome.planned.sum())
        if len(chosen) < every:
            parts.append(
                f"The sheets of calculation hold {len(chosen)} of {every} curves, the gravest first."
            )
        parts.append(
            "Signalling and braking distance, level crossings, structures, overhead line, track quality and "
            "vehicle approval are not examined."
        )
        self._text(" ".join(parts))

    def _cautions(self) -> None:
        self._heading("Cautions")
        for caution in cautions_of(self._plan.limits):
            self._text(caution)

    def _signatures(self) -> None:
        self._sheet.skip()
        self._signature_row("", "Name", "Signature", "Date")
        for step in STEPS:
            signed = self._signed.of(step) if self._signed else None
            if signed is None:
                self._signature_row(step.capitalize(), "", "", "")
            else:
                self._signature_row(step.capitalize(), signed.name, _SIGNED, signed.day.isoformat())
        if self._signed and self._signed.signed:
            self._text(
                "The signatures named here were given in the service over the curve file, every decision and "
                f"the version of the program together, SHA-256 {self._signed.digest}. They say nothing of "
                "what is changed in this workbook afterwards."
            )

    def _signature_row(self, step: str, name: str, signature: str, day: str) -> None:
        raw, box = self._sheet.raw, self._book.looks.box
        row = self._sheet.next_row - 1
        raw.set_row(row, 16 if not step else 26)
        raw.write_string(row, 0, step, box)
        for first, text in ((1, name), (3, signature)):
            raw.merge_range(row, first, row, first + 1, "", box)
            if text:  # merging would take a text for whatever it looks like
                raw.write_string(row, first, text, box)
        raw.write_string(row, 5, day, box)
        self._sheet.skip()


_SIGNED = "signed in the service"
