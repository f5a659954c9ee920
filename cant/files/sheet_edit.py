"""A worksheet part with additions: its rows spliced, and around them the few entries that go with that.

Column widths, the stated extent, conditional formats and the link to the legacy drawing are edited by
position; no other byte changes.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence

from cant.errors import FileError
from cant.files.additions import AddedColumn, CellMark
from cant.files.edit import OFFICE_RELATIONS, Change, before, changed, into, start_tag
from cant.files.grid import CellRange
from cant.files.markup import Element, escape, text_of
from cant.files.row_splice import PlacedColumn, RowSplice, stretches
from cant.files.sheet_xml import parse_range, reference
from cant.files.sheets import SheetRead
from cant.files.style_edit import StyleEdit

OWN_CONDITION = 'N("cant")=0'
"""Always true; it marks the conditional formats that an annotation added."""

DEFAULT_WIDTH = 11.0
_ORDER = [
    "sheetPr", "dimension", "sheetViews", "sheetFormatPr", "cols", "sheetData", "sheetCalcPr",
    "sheetProtection", "protectedRanges", "scenarios", "autoFilter", "sortState", "dataConsolidate",
    "customSheetViews", "mergeCells", "phoneticPr", "conditionalFormatting", "dataValidations",
    "hyperlinks", "printOptions", "pageMargins", "pageSetup", "headerFooter", "rowBreaks", "colBreaks",
    "customProperties", "cellWatches", "ignoredErrors", "smartTags", "drawing", "legacyDrawing",
    "legacyDrawingHF", "picture", "oleObjects", "controls", "webPublishItems", "tableParts", "extLst",
]  # fmt: skip
_COL_ATTRIBUTE = re.compile(
    r"""\s(min|max|hidden|width|customWidth|collapsed|bestFit)\s*=\s*("[^"]*"|'[^']*')"""
)


class SheetEdit:
    """One worksheet under edit.

    Parameters
    ----------
    read : SheetRead
        The sheet as read.
    columns : sequence of PlacedColumn
        Columns to add.
    header_row : int
        Row of their headings, from 1.
    styles : StyleEdit
        The workbook's styles.
    """

    def __init__(
        self, read: SheetRead, columns: Sequence[PlacedColumn], header_row: int, styles: StyleEdit
    ) -> None:
        self.read = read
        self.root = read.xml.rest
        self.data = read.xml.rest_data
        self.columns = columns
        self.styles = styles
        self.rows = RowSplice(read, columns, header_row, styles)
        self.header_row = header_row
        self._changes: list[Change] = []
        holder = self.root.child("sheetData")
        if holder is None or self.root.name != "worksheet":
            message = "is damaged: it has no place for cells; open it and save it anew"
            raise FileError(message, read.xml.place)
        self.holder: Element = holder

    def widths(self) -> list[str]:
        """Set the widths of the added columns and show them where the user hid what lay there; say so."""
        wanted = {one.column + 1: one.content.width for one in self.columns}
        holder = self.root.child("cols")
        old = list(holder.all("col")) if holder else []
        entries: list[tuple[int, str]] = []
        unhidden = False
        for one in old:
            first, last = _number(one.get("min")), _number(one.get("max"))
            text = self.data[one.start : one.end].decode("utf-8")
            hidden = one.flag("hidden")
            inside = [n for n in sorted(wanted) if first <= n <= last and (hidden or wanted[n] is not None)]
            if not inside:
                entries.append((first, text))
                continue
            unhidden = unhidden or hidden
            entries += self._split(text, first, last, {number: wanted.pop(number) for number in inside})
        p = self.root.prefix
        for number, width in wanted.items():
            if width is not None and not any(_covers(one, number) for one in old):
                tag = f'<{p}col min="{number}" max="{number}" width="{width:g}" customWidth="1"/>'
                entries.append((number, tag))
        self._write_cols(holder, [text for _, text in sorted(entries)], len(old))
        return ["Columns that were hidden there are shown again."] if unhidden else []

    def _split(
        self, text: str, first: int, last: int, inside: Mapping[int, float | None]
    ) -> Iterator[tuple[int, str]]:
        """Cut an entry for many columns so that some get entries of their own."""
        at = first
        for number, width in inside.items():
            if at < number:
                yield at, _col(text, {"min": str(at), "max": str(number - 1)}, keep=True)
            shown = {"min": str(number), "max": str(number), "width": f"{width or DEFAULT_WIDTH:g}"}
            yield number, _col(text, shown | {"customWidth": "1"}, keep=False)
            at = number + 1
        if at <= last:
            yield at, _col(text, {"min": str(at), "max": str(last)}, keep=True)

    def _write_cols(self, holder: Element | None, entries: list[str], before_count: int) -> None:
        inner = "".join(entries).encode("utf-8")
        p = self.root.prefix
        whole = f"<{p}cols>".encode() + inner + f"</{p}cols>".encode()
        if holder is None and entries:
            self._changes.append((self.holder.start, self.holder.start, whole))
        elif holder is not None and inner != self.data[holder.inner : holder.inner_end]:
            self._changes.append((holder.start, holder.end, whole))

    def extent(self) -> None:
        """Let the stated extent cover the added cells."""
        stated = self.root.child("dimension")
        old = parse_range(stated.get("ref")) if stated else None
        if stated is None or old is None or not self.columns or not self.rows.rows:
            return
        new = CellRange(
            min(old.first_row, self.rows.rows[0]),
            min(old.first_column, min(one.column for one in self.columns)),
            max(old.last_row, self.rows.rows[-1]),
            max(old.last_column, max(one.column for one in self.columns)),
        )
        if new != old:
            self._changes.append(start_tag(self.data, stated, ref=reference(new)))

    def conditional_formats(self, marks: Iterable[CellMark]) -> None:
        """Take out the conditional formats of an earlier annotation and add those wanted now."""
        self._remove_own_formats()
        p = self.root.prefix
        theirs = [one for one in self.root.walk() if one.name == "cfRule" and not self._is_own(one)]
        rank = 1 + max((_number(one.get("priority")) for one in theirs), default=0)
        new: list[str] = []
        for cells, formula, style in [*self._column_formats(), *self._mark_formats(marks)]:
            new.append(
                f'<{p}conditionalFormatting sqref="{cells}"><{p}cfRule type="expression" dxfId="{style}" '
                f'priority="{rank + len(new)}"><{p}formula>{escape(formula)}</{p}formula></{p}cfRule>'
                f"</{p}conditionalFormatting>"
            )
        if new:
            at = before(self.root, _ORDER, "conditionalFormatting", "oleObjects")
            self._changes.append((at, at, "".join(new).encode("utf-8")))

    def _remove_own_formats(self) -> None:
        for one in self.root.all("conditionalFormatting"):
            rules = list(one.all("cfRule"))
            own = [rule for rule in rules if self._is_own(rule)]
            gone = [one] if own and len(own) == len(rules) else own
            self._changes += [(each.start, each.end, b"") for each in gone]

    def _is_own(self, rule: Element) -> bool:
        return any(OWN_CONDITION in text_of(self.data, one).replace(" ", "") for one in rule.all("formula"))

    def _column_formats(self) -> Iterator[tuple[str, str, int]]:
        for placed in self.columns:
            rows = self._data_rows(placed.content) if placed.content.conditional else []
            if not rows:
                continue
            cells = reference(CellRange(rows[0], placed.column, rows[-1], placed.column))
            for one in placed.content.conditional:
                style = self.styles.conditional_style(one.fill, one.font)
                yield cells, f"AND({one.formula},{OWN_CONDITION})", style

    def _data_rows(self, content: AddedColumn) -> list[int]:
        return sorted(row for row in content.cells if row != self.header_row)

    def _mark_formats(self, marks: Iterable[CellMark]) -> Iterator[tuple[str, str, int]]:
        by_fill: dict[str, dict[int, list[int]]] = {}
        for one in marks:
            if one.fill is not None:
                by_fill.setdefault(one.fill, {}).setdefault(one.column, []).append(one.row)
        for fill, columns in by_fill.items():
            areas = [
                reference(area)
                for column, rows in sorted(columns.items())
                for area in stretches(sorted(set(rows)), column, most=1_000_000)
            ]
            yield " ".join(areas), OWN_CONDITION, self.styles.conditional_style(fill, None)

    def legacy_drawing(self, identifier: str | None) -> None:
        """Name the legacy drawing that shows the notes."""
        if identifier is None or self.root.child("legacyDrawing") is not None:
            return
        at = before(self.root, _ORDER, "legacyDrawing", "oleObjects")
        tag = (
            f'<{self.root.prefix}legacyDrawing xmlns:r="{OFFICE_RELATIONS}" r:id="{identifier}"/>'
        ).encode()
        self._changes.append((at, at, tag))

    def chunks(self) -> Iterator[bytes]:
        """Give the new part in pieces."""
        seam = self.read.xml.rows_start
        head = [one for one in self._changes if one[0] < seam]
        tail = [(start - seam, end - seam, new) for start, end, new in self._changes if start >= seam]
        if self.holder.is_empty_tag:
            opened = into(self.data, self.holder, b"")[2].partition(b"></")[0] + b">"
            yield changed(self.data[:seam], [*head, (self.holder.start, self.holder.end, opened)])
            yield from self.rows.chunks()
            yield f"</{self.holder.tag}>".encode()
        else:
            yield changed(self.data[:seam], head)
            yield from self.rows.chunks()
        yield changed(self.data[seam:], tail)


def _number(text: str) -> int:
    return int(text) if text.isdecimal() and len(text) < 10 else 0


def _covers(one: Element, number: int) -> bool:
    return _number(one.get("min")) <= number <= _number(one.get("max"))


def _col(text: str, attributes: dict[str, str], *, keep: bool) -> str:
    """Give a ``col`` entry with attributes replaced; its hidden state and width go unless ``keep``."""

    def left(match: re.Match[str]) -> str:
        return match.group() if keep and match.group(1) not in attributes else ""

    bare = _COL_ATTRIBUTE.sub(left, text)
    cut = re.search(r"\s*/?>", bare)
    at = cut.start() if cut else len(bare)
    return bare[:at] + "".join(f' {name}="{value}"' for name, value in attributes.items()) + bare[at:]
