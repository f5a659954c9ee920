"""Notes at cells: put beside those that a sheet has, told apart by their author, taken out again.

A note is an entry of the sheet's comments part and a shape of its legacy drawing. The drawing is not always
well-formed XML in old files, so shapes are added and removed as text.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

from cant.errors import column_letter
from cant.files.edit import OFFICE_RELATIONS, Change, PackageEdit, changed, into
from cant.files.grid import CellRange
from cant.files.markup import elements, escape, escape_attribute, text_of
from cant.files.package import Relationship
from cant.files.sheet_xml import parse_range
from cant.files.style_edit import MAIN
from cant.files.text import to_cell_text

AUTHOR = "cant annotation"
Cell = tuple[int, int]
"""Row from 1, column from 0."""

_COMMENTS_TYPE = "application/vnd.openxmlformats-officedocument.spreadsheetml.comments+xml"
_VML_TYPE = "application/vnd.openxmlformats-officedocument.vmlDrawing"
_EMPTY_COMMENTS = (
    f'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n<comments xmlns="{MAIN}">'
    "<authors></authors><commentList></commentList></comments>"
).encode()
_SHAPE_TYPE = (
    '<v:shapetype id="_x0000_t202" coordsize="21600,21600" o:spt="202" path="m,l,21600r21600,l21600,xe">'
    '<v:stroke joinstyle="miter"/><v:path gradientshapeok="t" o:connecttype="rect"/></v:shapetype>'
)
_EMPTY_VML = (
    '<xml xmlns:v="urn:schemas-microsoft-com:vml" xmlns:o="urn:schemas-microsoft-com:office:office" '
    'xmlns:x="urn:schemas-microsoft-com:office:excel"><o:shapelayout v:ext="edit">'
    '<o:idmap v:ext="edit" data=""/></o:shapelayout></xml>'
)
_SHAPE = re.compile(rb"<v:shape\s.*?</v:shape>", re.DOTALL)
_SHAPE_ROW = re.compile(rb"<x:Row>\s*(\d+)\s*</x:Row>")
_SHAPE_COLUMN = re.compile(rb"<x:Column>\s*(\d+)\s*</x:Column>")
_IDMAP = re.compile(rb'(<o:idmap\b[^>]*\bdata=")([^"]*)"')
_SHAPE_NUMBER = re.compile(rb'id="_x0000_s(\d{1,9})"')
_IDS_PER_BLOCK = 1023


class NotesEdit:
    """The notes of one sheet under edit.

    Parameters
    ----------
    edit : PackageEdit
        The package.
    part : str
        The worksheet part.
    """

    def __init__(self, edit: PackageEdit, part: str) -> None:
        self.edit = edit
        self.part = part
        package = edit.package
        relations = list(package.relationships(part).values())
        self.comments = self._target(relations, "comments")
        self.drawing = self._target(relations, "vmlDrawing")
        self.threads = [package.name_of(one.target) for one in relations if one.type == "threadedComment"]

    def _target(self, relations: list[Relationship], kind: str) -> str | None:
        names = (self.edit.package.name_of(one.target) for one in relations if one.type == kind)
        return next((name for name in names if name), None)

    def remove_own(self) -> None:
        """Take out the notes of an earlier annotation."""
        if self.comments is None:
            return
        data = self.edit.xml(self.comments)
        root = elements(data, self.comments, self.edit.package.place)
        authors, holder = root.child("authors"), root.child("commentList")
        if authors is None or holder is None:
            return
        own = {str(number) for number, one in enumerate(authors.children) if text_of(data, one) == AUTHOR}
        gone = [one for one in holder.all("comment") if one.get("authorId") in own]
        if not gone:
            return
        self.edit.replace(self.comments, changed(data, [(one.start, one.end, b"") for one in gone]))
        self._remove_shapes({_cell(one.get("ref")) for one in gone})

    def _remove_shapes(self, cells: set[Cell | None]) -> None:
        if self.drawing is None:
            return
        data = self._drawing_data()

        def kept(match: re.Match[bytes]) -> bytes:
            row, column = _SHAPE_ROW.search(match.group()), _SHAPE_COLUMN.search(match.group())
            if row is None or column is None or b'ObjectType="Note"' not in match.group():
                return match.group()
            return b"" if (int(row[1]) + 1, int(column[1])) in cells else match.group()

        self.edit.replace(self.drawing, _SHAPE.sub(kept, data))

    def _drawing_data(self) -> bytes:
        assert self.drawing is not None  # noqa: S101 - callers have looked
        new = self.edit.new_content(self.drawing)
        return self.edit.package.archive.read(self.drawing) if new is None else new

    def taken(self) -> set[Cell]:
        """Give the cells that have a note or a thread."""
        found: set[Cell] = set()
        for part, tag in [(self.comments, "comment"), *((name, "threadedComment") for name in self.threads)]:
            if part is None or not self.edit.has(part):
                continue
            data = self.edit.xml(part)
            for one in elements(data, part, self.edit.package.place).walk():
                cell = _cell(one.get("ref")) if one.name == tag else None
                if cell is not None:
                    found.add(cell)
        return found

    def add(self, notes: Mapping[Cell, str]) -> str | None:
        """Add notes to cells that have none.

        Parameters
        ----------
        notes : mapping of (int, int) to str
            Text by cell.

        Returns
        -------
        str or None
            Identifier of a new legacy drawing that the sheet must name, None where it names one already.
        """
        if not notes:
            return None
        self._add_comments(notes)
        return self._add_shapes(sorted(notes))

    def _add_comments(self, notes: Mapping[Cell, str]) -> None:
        if self.comments is None:
            self.comments = self.edit.free_part("xl/comments", ".xml")
            self.edit.add(self.comments, _EMPTY_COMMENTS, _COMMENTS_TYPE)
            self.edit.relate(self.part, f"{OFFICE_RELATIONS}/comments", self.comments)
        data = self.edit.xml(self.comments)
        root = elements(data, self.comments, self.edit.package.place)
        authors, holder = root.child("authors"), root.child("commentList")
        if authors is None or holder is None:
            self.edit.package.damaged(f"its part {self.comments} has no list of notes")
        p = root.prefix
        changes: list[Change] = []
        names = [text_of(data, one) for one in authors.children]
        number = names.index(AUTHOR) if AUTHOR in names else len(names)
        if AUTHOR not in names:
            changes.append(into(data, authors, f"<{p}author>{AUTHOR}</{p}author>".encode()))
        entries = "".join(
            f'<{p}comment ref="{column_letter(column)}{row}" authorId="{number}"><{p}text><{p}r><{p}t '
            f'xml:space="preserve">{escape(to_cell_text(text))}</{p}t></{p}r></{p}text></{p}comment>'
            for (row, column), text in sorted(notes.items())
        )
        changes.append(into(data, holder, entries.encode("utf-8")))
        self.edit.replace(self.comments, changed(data, changes))

    def _add_shapes(self, cells: list[Cell]) -> str | None:
        identifier = None
        if self.drawing is None:
            self.drawing = self.edit.free_part("xl/drawings/vmlDrawing", ".vml")
            self.edit.add_default("vml", _VML_TYPE)
            self.edit.replace(self.drawing, _EMPTY_VML.encode())
            identifier = self.edit.relate(self.part, f"{OFFICE_RELATIONS}/vmlDrawing", self.drawing)
        data = self._drawing_data()
        blocks = self._free_blocks(data, (len(cells) - 1) // _IDS_PER_BLOCK + 1)
        data = _IDMAP.sub(lambda match: match[1] + _joined(match[2], blocks) + b'"', data, count=1)
        shapes = "" if b'id="_x0000_t202"' in data else _SHAPE_TYPE
        for number, cell in enumerate(cells):
            shapes += _shape(blocks[number // _IDS_PER_BLOCK] * 1024 + number % _IDS_PER_BLOCK + 1, cell)
        end = data.rfind(b"</xml>")
        if end < 0:
            self.edit.package.damaged(f"its part {self.drawing} is not complete")
        self.edit.replace(self.drawing, data[:end] + shapes.encode() + data[end:])
        return identifier

    def _free_blocks(self, data: bytes, count: int) -> list[int]:
        """Give blocks of shape numbers: unused ones of this drawing, then ones that no drawing uses."""
        match = _IDMAP.search(data)
        own = _numbers(match[2]) if match else []
        busy = {int(number) // 1024 for number in _SHAPE_NUMBER.findall(data)}
        free = [block for block in own if block not in busy][:count]
        package = self.edit.package
        used = [0]
        for name in (package.archive.members.keys() - self.edit.removed) | self.edit.changed.keys():
            if name.lower().endswith(".vml"):
                new = self.edit.new_content(name)
                content = package.archive.read(name) if new is None else new
                used += [one for found in _IDMAP.findall(content) for one in _numbers(found[1])]
        first = max(used) + 1
        return free + list(range(first, first + count - len(free)))


def _numbers(text: bytes) -> list[int]:
    return [int(one) for one in text.split(b",") if one.strip().isdigit() and len(one) < 8]


def _joined(old: bytes, blocks: list[int]) -> bytes:
    return ",".join(map(str, dict.fromkeys([*_numbers(old), *blocks]))).encode()


def _shape(identifier: int, cell: Cell) -> str:
    row, column = cell
    anchor = f"{column + 1}, 15, {max(row - 2, 0)}, 10, {column + 4}, 15, {row + 4}, 4"
    return (
        f'<v:shape id="_x0000_s{identifier}" type="#_x0000_t202" style="position:absolute;'
        'margin-left:0;margin-top:0;width:200pt;height:90pt;z-index:1;visibility:hidden" '
        'fillcolor="#ffffe1" o:insetmode="auto"><v:fill color2="#ffffe1"/><v:path o:connecttype="none"/>'
        '<v:textbox style="mso-direction-alt:auto"><div style="text-align:left"></div></v:textbox>'
        '<x:ClientData ObjectType="Note"><x:MoveWithCells/><x:SizeWithCells/>'
        f"<x:Anchor>{escape_attribute(anchor)}</x:Anchor><x:AutoFill>False</x:AutoFill>"
        f"<x:Row>{row - 1}</x:Row><x:Column>{column}</x:Column></x:ClientData></v:shape>"
    )


def _cell(reference: str) -> Cell | None:
    one: CellRange | None = parse_range(reference)
    return (one.first_row, one.first_column) if one is not None else None
