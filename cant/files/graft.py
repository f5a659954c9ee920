"""Whole sheets taken from one workbook into another: cells, charts, notes, pictures, under free names.

The source is a workbook that this program made, so its notation is plain; the target is anybody's.
"""

from __future__ import annotations

import posixpath
import re
from collections.abc import Iterable, Iterator, Mapping

from cant.files.book import Book, SheetEntry
from cant.files.book_edit import BookEdit, NewName, quoted
from cant.files.edit import OFFICE_RELATIONS, PackageEdit
from cant.files.markup import escape, escape_attribute, unescape
from cant.files.package import Package, Relationship, relationships_part
from cant.files.style_edit import EMPTY_STYLES, StyleEdit

_STRING_CELL = re.compile(rb'<c r="([A-Z]{1,3}[0-9]+)"((?: s="[0-9]+")?) t="s"><v>([0-9]+)</v></c>')
_STYLE = re.compile(rb'(<(?:c r="[A-Z0-9]+"|row [^>]*?|col [^>]*?) (?:s|style)=")([0-9]+)(?=")')
_CONDITIONAL_STYLE = re.compile(rb' (\w*[dD]xfId)="([0-9]+)"')
_SELECTED = re.compile(rb' tabSelected="1"')
_METADATA = re.compile(rb' cm="\d+"')
_ITEM = re.compile(rb"<si>(.*?)</si>|<si/>", re.DOTALL)
_FORMULAS = re.compile(rb"(<(f|c:f|formula|formula1|formula2)(?:\s[^>]*)?>)([^<]*)(</\2>)")
_LOCATION = re.compile(rb'( location=")([^"]*)(")')
_TABLE_ID = re.compile(rb'(<table [^>]*?\bid=")(\d+)(")')
_TABLE_NAMES = re.compile(rb'( (?:name|displayName)=")([^"]*)(")')
_MAX_SHEET_NAME = 31
_ADAPTED = (".xml", ".vml")
_ROW_END = b"</row>"


class Graft:
    """Takes all sheets of a workbook into another.

    Parameters
    ----------
    source : Package
        A workbook made by this program.
    edit : PackageEdit
        The target package.
    book : BookEdit
        Its workbook part.
    styles : StyleEdit
        Its styles.
    """

    def __init__(self, source: Package, edit: PackageEdit, book: BookEdit, styles: StyleEdit) -> None:
        self.source = source
        self.edit = edit
        self.book = book
        self.own = Book(source)
        part = source.related(self.own.part, "styles")
        data = source.plain_xml(part) if part else EMPTY_STYLES
        self.cell_styles, self.conditional = styles.take_over(StyleEdit(data, part or "", source.place))
        self._style_numbers = {b"%d" % old: b"%d" % new for old, new in enumerate(self.cell_styles)}
        self.strings = self._strings()
        self.renamed = self._names()
        self._parts: dict[str, str] = {}

    def _strings(self) -> list[bytes]:
        part = self.source.related(self.own.part, "sharedStrings")
        found = _ITEM.finditer(self.source.plain_xml(part)) if part else ()
        return [match.group(1) or b"<t/>" for match in found]

    def _names(self) -> dict[str, str]:
        """Give the sheets' names in the target by their own: where one is taken, with a number."""
        renamed: dict[str, str] = {}
        taken = self.book.sheet_names
        for entry in self.own.sheets:
            renamed[entry.name] = free_name(entry.name, [*taken, *renamed.values()])
        return renamed

    def run(self) -> list[str]:
        """Take the sheets over and give the notes that a person should know."""
        for number, entry in enumerate(self.own.sheets, start=1):
            self._sheet(entry, number)
        for name, refers, element in self.own.names():
            self._name(name, refers, element.get("localSheetId"))
        changed_names = {old: new for old, new in self.renamed.items() if old != new}
        return [
            f"The workbook has a sheet '{old}' of its own, so the new one is called '{new}'."
            for old, new in changed_names.items()
        ]

    def _sheet(self, entry: SheetEntry, number: int) -> None:
        if entry.part is None:
            self.source.damaged(f"the part of sheet '{entry.name}' is missing")
        part = self._copy(entry.part)
        kind = "worksheet" if entry.is_worksheet else "chartsheet"
        identifier = self.edit.relate(self.book.book.part, f"{OFFICE_RELATIONS}/{kind}", part)
        name = self.renamed[entry.name]
        self.book.add_sheet(name, identifier)
        self.book.mark_sheet(number, name)

    def _name(self, name: str, refers: str, scope: str) -> None:
        refers = renamed_sheets(refers, self.renamed)
        if scope.isdecimal():
            sheet = self.renamed[self.own.sheets[int(scope)].name]
            self.book.add_name(NewName(name, refers, sheet=sheet, hidden=name == "_xlnm._FilterDatabase"))
        elif not self.book.has_name(name):
            self.book.add_name(NewName(name, refers))

    def _copy(self, part: str) -> str:
        """Copy a part with all that it points to, and give its new name."""
        if part in self._parts:
            return self._parts[part]
        stem, extension = posixpath.splitext(part)
        new = self.edit.free_part(stem.rstrip("0123456789"), extension)
        self._parts[part] = new
        self.edit.add(new, b"", self.source.content_type(part))  # takes the name before the parts below
        if part.startswith("xl/worksheets/"):
            self.edit.replace(new, map(self._adapted_sheet, whole_rows(self.source.source.pieces(part))))
        else:
            content = self.source.source.read(part)
            self.edit.replace(new, self._adapted(part, content) if extension in _ADAPTED else content)
        relations = list(self.source.relationships(part).values())
        if relations:
            self._copy_relations(new, relations)
        return new

    def _copy_relations(self, new: str, relations: Iterable[Relationship]) -> None:
        lines = []
        for one in relations:
            target, mode = one.target, ' TargetMode="External"'
            if not one.external:
                own = self.source.name_of(one.target)
                if own is None:
                    self.source.damaged(f"its part {one.target} is missing")
                target, mode = "/" + self._copy(own), ""
            kind = one.element.get("Type")
            lines.append(
                f'<Relationship Id="{one.id}" Type="{kind}" Target="{escape_attribute(target)}"{mode}/>'
            )
        text = (
            '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n<Relationships xmlns="'
            f'http://schemas.openxmlformats.org/package/2006/relationships">{"".join(lines)}</Relationships>'
        )
        self.edit.replace(relationships_part(new), text.encode("utf-8"))

    def _adapted(self, part: str, content: bytes) -> bytes:
        """Fit a part's XML to the target: names of sheets, and numbers that must be unique."""
        content = self._renamed_formulas(content)
        return self._adapted_table(content) if part.startswith("xl/tables/") else content

    def _adapted_sheet(self, content: bytes) -> bytes:
        """Fit a stretch of a worksheet to the target, rows whole: styles, texts, names of sheets."""
        content = self._renamed_formulas(content)
        pieces = _STYLE.split(content)
        pieces[2::3] = [self._style_numbers[number] for number in pieces[2::3]]
        content = b"".join(pieces)
        if self.strings:
            content = _STRING_CELL.sub(self._inline, content)
        if b' cm="' in content:
            content = _METADATA.sub(b"", content)
        if b"<sheetData" in content or not content.endswith(_ROW_END):
            content = _SELECTED.sub(b"", _CONDITIONAL_STYLE.sub(self._conditional_style, content))
        return content

    def _conditional_style(self, match: re.Match[bytes]) -> bytes:
        return b' %s="%d"' % (match[1], self.conditional[int(match[2])])

    def _inline(self, match: re.Match[bytes]) -> bytes:
        return b'<c r="%s"%s t="inlineStr"><is>%s</is></c>' % (
            match[1],
            match[2],
            self.strings[int(match[3])],
        )

    def _adapted_table(self, content: bytes) -> bytes:
        others = self._tables_of_the_target()
        numbers = [int(match[2]) for one in others for match in [_TABLE_ID.search(one)] if match]
        number = 1 + max(numbers, default=0)
        content = _TABLE_ID.sub(lambda match: match[1] + b"%d" % number + match[3], content, count=1)
        head, tag, tail = content.partition(b"<tableColumns")
        taken = {
            match[2].lower()
            for one in others
            for match in _TABLE_NAMES.finditer(one.partition(b"<tableColumns")[0])
        }

        def name(match: re.Match[bytes]) -> bytes:
            is_taken = match[2].lower() in taken or self.book.has_name(match[2].decode("utf-8"))
            return match[1] + match[2] + (b"_%d" % number if is_taken else b"") + match[3]

        return _CONDITIONAL_STYLE.sub(self._conditional_style, _TABLE_NAMES.sub(name, head) + tag + tail)

    def _tables_of_the_target(self) -> list[bytes]:
        """Give the table parts that the target has so far."""
        names = self.edit.package.archive.members.keys() - self.edit.removed | self.edit.changed.keys()
        tables = [name for name in names if name.startswith("xl/tables/") and name.endswith(".xml")]
        return [self.edit.xml(name) for name in tables if self.edit.changed.get(name) != b""]

    def _renamed_formulas(self, content: bytes) -> bytes:
        if all(old == new for old, new in self.renamed.items()):
            return content

        def formula(match: re.Match[bytes]) -> bytes:
            text = renamed_sheets(unescape(match[3].decode("utf-8")), self.renamed)
            return match[1] + escape(text).encode("utf-8") + match[4]

        def location(match: re.Match[bytes]) -> bytes:
            text = renamed_sheets(unescape(match[2].decode("utf-8")), self.renamed)
            return match[1] + escape_attribute(text).encode("utf-8") + match[3]

        return _LOCATION.sub(location, _FORMULAS.sub(formula, content))


def whole_rows(pieces: Iterable[bytes]) -> Iterator[bytes]:
    """Cut a worksheet that comes in pieces so that each ends behind a row, and the last holds the rest."""
    left = b""
    for piece in pieces:
        left += piece
        cut = left.rfind(_ROW_END)
        if cut >= 0:
            yield left[: cut + len(_ROW_END)]
            left = left[cut + len(_ROW_END) :]
    yield left


_TOKEN = re.compile(r"""("(?:[^"]|"")*")|'((?:[^']|'')+)'!|([^\W\d][\w.]*)!""")


def renamed_sheets(formula: str, names: Mapping[str, str]) -> str:
    """Give a formula with the sheets it refers to renamed; texts in it stay.

    Parameters
    ----------
    formula : str
        A formula.
    names : mapping of str to str
        New names by old.
    """
    lower = {old.casefold(): new for old, new in names.items() if old != new}
    if not lower:
        return formula

    def replaced(match: re.Match[str]) -> str:
        text, in_quotes, bare = match.groups()
        if text is not None:
            return text
        new = lower.get((in_quotes.replace("''", "'") if in_quotes is not None else bare).casefold())
        return match.group() if new is None else quoted(new) + "!"

    return _TOKEN.sub(replaced, formula)


def free_name(wanted: str, taken: Iterable[str]) -> str:
    """Give a sheet name that is not taken, case ignored: ``wanted``, else with (2), (3) ... behind it."""
    used = {name.casefold() for name in taken}
    name, number = wanted[:_MAX_SHEET_NAME], 1
    while name.casefold() in used:
        number += 1
        tail = f" ({number})"
        name = wanted[: _MAX_SHEET_NAME - len(tail)] + tail
    return name
