"""The workbook part: its sheets in order, its settings, and the marks that an earlier annotation left.

What was added bears a hidden defined name for each column, and for each sheet. Spreadsheet programs move such
names along when columns are inserted or sheets renamed, and keep them when the file is saved; so the
additions are still found later, and nothing else is taken for one.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from cant.errors import FileError
from cant.files.grid import CellRange
from cant.files.markup import Element, elements, text_of
from cant.files.package import MAX_SHEETS, STRICT, Package
from cant.files.sheet_xml import parse_range

COLUMN_MARK = "_cant_column_"
SHEET_MARK = "_cant_sheet_"
TOUCHED_MARK = "_cant_touched_"
MARKS = (COLUMN_MARK, SHEET_MARK, TOUCHED_MARK)
MAX_NAME = 255
"""Longest name of a sheet that is read; spreadsheet programs allow 31 characters."""

_AREA = re.compile(r"(?:'((?:[^']|'')+)'|([^'!,()]+))!([$A-Za-z0-9:]+)")


@dataclass(frozen=True, slots=True)
class SheetEntry:
    """One sheet of the workbook part.

    Attributes
    ----------
    name : str
        Its name.
    part : str or None
        Its part, None where it is missing.
    is_worksheet : bool
        False for chart and dialog sheets.
    visible : bool
        False where it is hidden.
    element : Element
        Where it stands in the workbook part.
    """

    name: str
    part: str | None
    is_worksheet: bool
    visible: bool
    element: Element


@dataclass(frozen=True, slots=True)
class Area:
    """A rectangle on a sheet."""

    sheet: str
    cells: CellRange


class Book:
    """The workbook part of a package.

    Attributes
    ----------
    part : str
        Its name.
    data : bytes
        Its XML.
    root : Element
        The same as elements.
    sheets : list of SheetEntry
        In order.
    """

    def __init__(self, package: Package) -> None:
        self.package = package
        self.part = package.workbook_part
        self.data = package.plain_xml(self.part)
        self.root = elements(self.data, self.part, package.place)
        self.relations = package.relationships(self.part)
        self.sheets = list(self._sheets())

    def _sheets(self) -> Iterator[SheetEntry]:
        holder = self.root.child("sheets")
        listed = list(holder.all("sheet")) if holder else []
        if len(listed) > MAX_SHEETS:
            message = f"is refused for safety: it has {len(listed)} sheets; at most {MAX_SHEETS} are read"
            raise FileError(message, self.package.place)
        parts: set[str] = set()
        for one in listed:
            relation = self.relations.get(relation_id(one))
            part = self.package.name_of(relation.target) if relation and not relation.external else None
            kind = relation.type if relation else "worksheet"
            if part is not None and part in parts:
                self.package.damaged(f"two of its sheets are one and the same part, {part}")
            parts.add(part or "")
            if len(one.get("name")) > MAX_NAME:
                self.package.damaged(f"a sheet has a name of {len(one.get('name'))} characters")
            yield SheetEntry(
                one.get("name"), part, kind == "worksheet", one.get("state", "visible") == "visible", one
            )

    @property
    def is_strict(self) -> bool:
        """Whether it is written in the strict variant of the standard."""
        return any(value.startswith(STRICT) for value in self.root.attributes.values())

    @property
    def epoch_1904(self) -> bool:
        """Whether its dates count from 1904."""
        settings = self.root.child("workbookPr")
        return settings is not None and settings.flag("date1904")

    def names(self) -> Iterator[tuple[str, str, Element]]:
        """Give the defined names: name, what it refers to, and where it stands."""
        holder = self.root.child("definedNames")
        for one in holder.all("definedName") if holder else ():
            yield one.get("name"), text_of(self.data, one), one

    def added_columns(self) -> dict[str, list[CellRange]]:
        """Give the cells that an earlier annotation added, by the name of their sheet in lower case."""
        found: dict[str, list[CellRange]] = {}
        marked = [(name, refers) for name, refers, _ in self.names() if name.startswith(COLUMN_MARK)]
        for _, refers in sorted(marked):
            for area in areas(refers):
                found.setdefault(area.sheet.casefold(), []).append(area.cells)
        return found

    def added_sheets(self) -> set[str]:
        """Give the names, in lower case, of the sheets that an earlier annotation added."""
        return self._marked(SHEET_MARK)

    def touched_sheets(self) -> set[str]:
        """Give the names, in lower case, of the user's sheets that an earlier annotation touched."""
        return self._marked(TOUCHED_MARK, COLUMN_MARK)

    def _marked(self, *marks: str) -> set[str]:
        return {
            area.sheet.casefold()
            for name, refers, _ in self.names()
            if name.startswith(marks)
            for area in areas(refers)
        }


def areas(refers: str) -> list[Area]:
    """Give the rectangles that a defined name refers to; broken references are left out."""
    found = []
    for quoted, bare, cells in _AREA.findall(refers):
        one = parse_range(cells)
        if one is not None:
            found.append(Area(quoted.replace("''", "'") or bare.strip(), one))
    return found


def relation_id(element: Element) -> str:
    """Give the relationship that an element names (``r:id`` under any prefix)."""
    for key, value in element.attributes.items():
        if key.endswith(":id"):
            return value
    return ""
