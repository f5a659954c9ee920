"""The workbook part under edit: sheets and defined names that come and go, and the order to recalculate."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from cant.files.book import COLUMN_MARK, MARKS, SHEET_MARK, TOUCHED_MARK, Book, relation_id
from cant.files.edit import (
    OFFICE_RELATIONS,
    Change,
    PackageEdit,
    all_targets,
    before,
    changed,
    into,
    start_tag,
)
from cant.files.grid import CellRange
from cant.files.markup import Element, escape, escape_attribute
from cant.files.sheet_xml import reference

_ORDER = [
    "fileVersion", "fileSharing", "workbookPr", "workbookProtection", "bookViews", "sheets", "functionGroups",
    "externalReferences", "definedNames", "calcPr", "oleSize", "customWorkbookViews", "pivotCaches",
    "smartTagPr", "smartTagTypes", "webPublishing", "fileRecoveryPr", "webPublishObjects", "extLst",
]  # fmt: skip


@dataclass(frozen=True, slots=True)
class NewName:
    """A defined name to add.

    Attributes
    ----------
    name, refers : str
        The name, and what it refers to.
    sheet : str or None
        Name of the sheet that it belongs to, None where it holds everywhere.
    hidden : bool
        Whether it is kept out of sight.
    """

    name: str
    refers: str
    sheet: str | None = None
    hidden: bool = False


class BookEdit:
    """The workbook part under edit.

    Parameters
    ----------
    edit : PackageEdit
        The package.
    book : Book
        Its workbook part as it is.
    """

    def __init__(self, edit: PackageEdit, book: Book) -> None:
        self.edit = edit
        self.book = book
        added = book.added_sheets()
        self.kept = [one for one in book.sheets if one.name.casefold() not in added]
        self.gone = [one for one in book.sheets if one.name.casefold() in added]
        self._new_sheets: list[tuple[str, str]] = []
        self._new_names: list[NewName] = []
        self.recalculate = False

    @property
    def sheet_names(self) -> list[str]:
        """Names of all sheets that the workbook will have."""
        return [one.name for one in self.kept] + [name for name, _ in self._new_sheets]

    def add_sheet(self, name: str, identifier: str) -> None:
        """Add a sheet whose part the relationship ``identifier`` names."""
        self._new_sheets.append((name, identifier))

    def add_name(self, name: NewName) -> None:
        """Add a defined name."""
        self._new_names.append(name)

    def has_name(self, name: str) -> bool:
        """Tell whether the user's workbook has a defined name."""
        return any(one.casefold() == name.casefold() for one, _, _ in self.book.names())

    def mark_column(self, number: int, sheet: str, cells: Iterable[CellRange]) -> None:
        """Mark an added column, so that a later run finds it."""
        refers = ",".join(f"{quoted(sheet)}!{_absolute(one)}" for one in cells)
        self.add_name(NewName(f"{COLUMN_MARK}{number:05d}", refers, hidden=True))

    def mark_touched(self, number: int, sheet: str) -> None:
        """Mark a sheet of the user's that gains something."""
        refers = f"{quoted(sheet)}!$A$1:$XFD$1048576"
        self.add_name(NewName(f"{TOUCHED_MARK}{number:03d}", refers, hidden=True))

    def mark_sheet(self, number: int, sheet: str) -> None:
        """Mark an added sheet."""
        self.add_name(NewName(f"{SHEET_MARK}{number:03d}", f"{quoted(sheet)}!$A$1", hidden=True))

    def remove_earlier_sheets(self) -> None:
        """Remove the sheets of an earlier annotation with all that only they use."""
        package = self.edit.package
        doomed: list[str] = []
        for one in self.gone:
            self.edit.unrelate(self.book.part, relation_id(one.element))
            if one.part is not None:
                doomed.append(one.part)
        if not doomed:
            return
        at = 0
        while at < len(doomed):
            for relation in package.relationships(doomed[at]).values():
                part = package.name_of(relation.target) if not relation.external else None
                if part is not None and part not in doomed:
                    doomed.append(part)
            at += 1
        sources = set(doomed)
        used = all_targets(package, lambda source: source in sources or source == self.book.part)
        keep = {one.part for one in self.kept}
        for part in doomed:
            if part not in keep and part.casefold() not in used and part != self.book.part:
                self.edit.remove(part)

    def drop_calculation_chain(self) -> None:
        """Remove the stored order of calculation, which spreadsheet programs make anew."""
        for one in self.book.relations.values():
            part = self.edit.package.name_of(one.target) if one.type == "calcChain" else None
            if part is not None:
                self.edit.unrelate(self.book.part, one.id)
                self.edit.remove(part)

    def write(self) -> None:
        """Write the workbook part."""
        changes = [*self._sheet_changes(), *self._name_changes(), *self._view_changes()]
        if self.recalculate:
            changes.append(self._calculation_change())
        new = changed(self.book.data, changes)
        if new != self.book.data:
            self.edit.replace(self.book.part, new)

    def _sheet_changes(self) -> list[Change]:
        holder = self.book.root.child("sheets")
        if holder is None:
            self.edit.package.damaged("it lists no sheets")
        p = holder.prefix
        number = max((_integer(one.element.get("sheetId")) for one in self.kept), default=0)
        new = "".join(
            f'<{p}sheet xmlns:r="{OFFICE_RELATIONS}" name="{escape_attribute(name)}" '
            f'sheetId="{number + count}" r:id="{identifier}"/>'
            for count, (name, identifier) in enumerate(self._new_sheets, start=1)
        )
        changes: list[Change] = [(one.element.start, one.element.end, b"") for one in self.gone]
        return [*changes, into(self.book.data, holder, new.encode("utf-8"))] if new else changes

    def _moved(self) -> dict[int, int]:
        """Give new positions of the sheets that stay by their old ones."""
        stay = [number for number, one in enumerate(self.book.sheets) if one in self.kept]
        return {old: new for new, old in enumerate(stay)}

    def _name_changes(self) -> list[Change]:
        data, moved = self.book.data, self._moved()
        changes: list[Change] = []
        for name, _, element in self.book.names():
            scope = element.get("localSheetId")
            if name.startswith(MARKS) or (scope and _integer(scope) not in moved):
                changes.append((element.start, element.end, b""))
            elif scope and moved[_integer(scope)] != _integer(scope):
                changes.append(start_tag(data, element, localSheetId=str(moved[_integer(scope)])))
        holder = self.book.root.child("definedNames")
        p = self.book.root.prefix
        new = "".join(self._name_text(one, p) for one in self._new_names).encode("utf-8")
        if new and holder is not None:
            changes.append(into(data, holder, new))
        elif new:
            at = before(self.book.root, _ORDER, "definedNames")
            changes.append((at, at, f"<{p}definedNames>".encode() + new + f"</{p}definedNames>".encode()))
        elif holder is not None and len(changes) >= len(holder.children):
            removed = sum(1 for _, _, text in changes if not text)
            if removed == len(holder.children):
                return [(holder.start, holder.end, b"")]
        return changes

    def _name_text(self, one: NewName, p: str) -> str:
        scope = ""
        if one.sheet is not None:
            scope = f' localSheetId="{self.sheet_names.index(one.sheet)}"'
        hidden = ' hidden="1"' if one.hidden else ""
        name = escape_attribute(one.name)
        return f'<{p}definedName name="{name}"{scope}{hidden}>{escape(one.refers)}</{p}definedName>'

    def _view_changes(self) -> list[Change]:
        """Let the window's choice of sheet follow the sheets that stay."""
        if not self.gone:
            return []
        holder = self.book.root.child("bookViews")
        changes: list[Change] = []
        for view in holder.all("workbookView") if holder else ():
            new = {
                name: str(self._moved().get(_integer(view.get(name)), 0))
                for name in ("firstSheet", "activeTab")
                if view.get(name)
            }
            if new:
                changes.append(start_tag(self.book.data, view, **new))
        return changes

    def _calculation_change(self) -> Change:
        holder: Element | None = self.book.root.child("calcPr")
        if holder is not None:
            return start_tag(self.book.data, holder, fullCalcOnLoad="1")
        at = before(self.book.root, _ORDER, "calcPr")
        return at, at, f'<{self.book.root.prefix}calcPr fullCalcOnLoad="1"/>'.encode()


def quoted(sheet: str) -> str:
    """Give a sheet's name as formulas write it."""
    doubled = sheet.replace("'", "''")
    return f"'{doubled}'"


def _absolute(cells: CellRange) -> str:
    parts = reference(cells).split(":")
    fixed = []
    for part in parts:
        letters = part.rstrip("0123456789")
        fixed.append(f"${letters}${part[len(letters) :]}")
    return ":".join(fixed)


def _integer(text: str) -> int:
    return int(text) if text.isdecimal() and len(text) < 10 else 0
