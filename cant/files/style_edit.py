"""Cell styles added to a workbook's own: clones with another fill or number format, and whole foreign styles.

A cell's style is a number into a list of the styles part. Entries are only ever appended, or found
again where an equal one is there, so that every number in the user's sheets keeps its meaning.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from cant.errors import Place
from cant.files.edit import Change, before, changed, into, start_tag
from cant.files.formats import BUILT_IN, CellFormats, is_date_format
from cant.files.markup import Element, elements, escape_attribute

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
EMPTY_STYLES = (
    f'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n<styleSheet xmlns="{MAIN}">'
    '<fonts count="1"><font><sz val="11"/><name val="Calibri"/><family val="2"/></font></fonts>'
    '<fills count="2"><fill><patternFill patternType="none"/></fill>'
    '<fill><patternFill patternType="gray125"/></fill></fills>'
    '<borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
    '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
    '<cellXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/></cellXfs>'
    '<cellStyles count="1"><cellStyle name="Normal" xfId="0" builtinId="0"/></cellStyles></styleSheet>'
).encode()
_ORDER = [
    "numFmts", "fonts", "fills", "borders", "cellStyleXfs", "cellXfs", "cellStyles", "dxfs", "tableStyles",
    "colors", "extLst",
]  # fmt: skip
_EDITED = ("fonts", "fills", "borders", "cellXfs", "dxfs")
_FIRST_OWN_FORMAT = 164
_ATTRIBUTE = re.compile(r"""\s([\w:.-]+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")


@dataclass
class _Section:
    """One list of the styles part, its entries as text."""

    entries: list[str]
    known: dict[str, int]
    first_new: int
    element: Element | None

    def number(self, entry: str) -> int:
        """Give the number of an entry, appended if it is not there."""
        found = self.known.get(entry)
        if found is None:
            found = self.known[entry] = len(self.entries)
            self.entries.append(entry)
        return found


@dataclass(frozen=True, slots=True)
class StyleNeed:
    """What a cell needs of its style.

    Attributes
    ----------
    base : int
        Style to clone.
    number_format : str or None
        Number format; None keeps that of the base, except that a number is shown neither as date nor as text.
    fill : str or None
        Ground, ``RRGGBB``.
    is_number : bool
        Whether the cell holds a number.
    """

    base: int
    number_format: str | None
    fill: str | None
    is_number: bool


class StyleEdit:
    """The styles part under edit.

    Parameters
    ----------
    data : bytes
        The part.
    name : str
        Its name, for messages.
    place : Place
        The file.
    """

    def __init__(self, data: bytes, name: str, place: Place) -> None:
        self.data = data
        self.root = elements(data, name, place)
        self.prefix = self.root.prefix
        self.formats = CellFormats(self.root)
        self._sections = {
            name: self._section(name) for name in ("fonts", "fills", "borders", "cellXfs", "dxfs")
        }
        self._format_ids = self._own_formats()
        self._new_formats: list[str] = []
        self._made: dict[StyleNeed, int] = {}

    def _section(self, name: str) -> _Section:
        element = self.root.child(name)
        entries = [self._text(one) for one in element.children] if element else []
        known: dict[str, int] = {}
        for number, entry in enumerate(entries):
            known.setdefault(entry, number)
        return _Section(entries, known, len(entries), element)

    def _text(self, element: Element) -> str:
        return self.data[element.start : element.end].decode("utf-8")

    def _own_formats(self) -> dict[str, int]:
        ids = {code: number for number, code in BUILT_IN.items() if number < 14 or number == 49}
        ids["General"] = 0
        element = self.root.child("numFmts")
        for one in element.all("numFmt") if element else ():
            if one.get("numFmtId").isdecimal():
                ids[one.get("formatCode")] = int(one.get("numFmtId"))
        return ids

    @property
    def count(self) -> int:
        """Number of cell styles."""
        return len(self._sections["cellXfs"].entries)

    def format_id(self, code: str) -> int:
        """Give the number of a number format, added if need be."""
        if code not in self._format_ids:
            number = max([_FIRST_OWN_FORMAT - 1, *self._format_ids.values()]) + 1
            self._format_ids[code] = number
            escaped = escape_attribute(code)
            self._new_formats.append(f'<{self.prefix}numFmt numFmtId="{number}" formatCode="{escaped}"/>')
        return self._format_ids[code]

    def cell_style(self, need: StyleNeed) -> int:
        """Give the number of the cell style that a cell needs."""
        if need not in self._made:
            self._made[need] = self._clone(need)
        return self._made[need]

    def _clone(self, need: StyleNeed) -> int:
        cell_xfs = self._sections["cellXfs"]
        code = need.number_format
        if code is None and need.is_number:
            own = self.formats.code(need.base)
            code = "General" if own == "@" or need.base in self.formats.dates or is_date_format(own) else None
        entry = cell_xfs.entries[need.base] if need.base < len(cell_xfs.entries) else self._plain_xf()
        attributes: dict[str, str | None] = {"quotePrefix": None, "pivotButton": None}
        if code is not None:
            attributes |= {"numFmtId": str(self.format_id(code)), "applyNumberFormat": "1"}
        if need.fill is not None:
            attributes |= {"fillId": str(self._fill(need.fill)), "applyFill": "1"}
        return cell_xfs.number(with_attributes(entry, attributes))

    def _plain_xf(self) -> str:
        return f'<{self.prefix}xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/>'

    def _fill(self, colour: str) -> int:
        p = self.prefix
        fills = self._sections["fills"]
        while len(fills.entries) < 2:  # the first two are reserved by the standard
            kind = ("none", "gray125")[len(fills.entries)]
            fills.entries.append(f'<{p}fill><{p}patternFill patternType="{kind}"/></{p}fill>')
        return fills.number(
            f'<{p}fill><{p}patternFill patternType="solid"><{p}fgColor rgb="FF{colour}"/>'
            f'<{p}bgColor indexed="64"/></{p}patternFill></{p}fill>'
        )

    def conditional_style(self, fill: str | None, font: str | None) -> int:
        """Give the number of a format for conditional formats."""
        p = self.prefix
        inner = f'<{p}font><{p}color rgb="FF{font}"/></{p}font>' if font else ""
        if fill:
            inner += (
                f'<{p}fill><{p}patternFill patternType="solid"><{p}fgColor rgb="FF{fill}"/>'
                f'<{p}bgColor rgb="FF{fill}"/></{p}patternFill></{p}fill>'
            )
        return self._sections["dxfs"].number(f"<{p}dxf>{inner}</{p}dxf>")

    def take_over(self, other: StyleEdit) -> tuple[list[int], list[int]]:
        """Add all styles of another workbook.

        Parameters
        ----------
        other : StyleEdit
            The other workbook's styles, unchanged.

        Returns
        -------
        tuple of (list of int, list of int)
            New numbers of its cell styles and conditional formats. Its default style becomes the default.
        """
        moved = {
            name: [
                self._sections[name].number(self._own(entry, other))
                for entry in other._sections[name].entries
            ]
            for name in ("fonts", "fills", "borders", "dxfs")
        }
        styles = []
        for number, entry in enumerate(other._sections["cellXfs"].entries):
            styles.append(0 if number == 0 else self._take_over_xf(entry, other, number, moved))
        return styles, moved["dxfs"]

    def _moved(self, name: str, other: StyleEdit) -> list[int]:
        section = self._sections[name]
        return [section.number(self._own(entry, other)) for entry in other._sections[name].entries]

    def _take_over_xf(self, entry: str, other: StyleEdit, number: int, moved: dict[str, list[int]]) -> int:
        own = {name: plain or quoted for name, plain, quoted in _ATTRIBUTE.findall(entry)}
        attributes: dict[str, str | None] = {"xfId": "0"}
        for name, section in (("fontId", "fonts"), ("fillId", "fills"), ("borderId", "borders")):
            attributes[name] = str(moved[section][int(own.get(name, "0"))])
        if int(own.get("numFmtId", "0")) >= _FIRST_OWN_FORMAT:
            attributes["numFmtId"] = str(self.format_id(other.formats.code(number)))
        return self._sections["cellXfs"].number(with_attributes(self._own(entry, other), attributes))

    def _own(self, entry: str, other: StyleEdit) -> str:
        """Give another part's entry with this part's prefix."""
        if other.prefix == self.prefix:
            return entry
        return re.sub(r"(</?)" + re.escape(other.prefix) + r"(?=\w)", r"\g<1>" + self.prefix, entry)

    def result(self) -> bytes:
        """Give the part with all that was added."""
        changes = [change for name in self._sections for change in self._written(name)]
        if self._new_formats:
            changes += self._written_entries("numFmts", self.root.child("numFmts"), self._new_formats)
        return changed(self.data, changes)

    def _written(self, name: str) -> list[Change]:
        section = self._sections[name]
        return self._written_entries(name, section.element, section.entries[section.first_new :])

    def _written_entries(self, name: str, element: Element | None, new: list[str]) -> list[Change]:
        if not new:
            return []
        inner = "".join(new).encode("utf-8")
        if element is None:
            at = before(self.root, _ORDER, name)
            tag = f"{self.prefix}{name}"
            return [(at, at, f'<{tag} count="{len(new)}">'.encode() + inner + f"</{tag}>".encode())]
        count = str(len(element.children) + len(new))
        if element.is_empty_tag:
            tag = f"{self.prefix}{name}"
            opened = f'<{tag} count="{count}">'.encode()
            return [(element.start, element.end, opened + inner + f"</{tag}>".encode())]
        return [start_tag(self.data, element, count=count), into(self.data, element, inner)]


def with_attributes(entry: str, attributes: dict[str, str | None]) -> str:
    """Give an element's text with attributes of its start tag set, or removed where None."""
    close = entry.index(">") - (1 if entry[entry.index(">") - 1] == "/" else 0)
    head, tail = entry[:close], entry[close:]
    for name, value in attributes.items():
        head = re.sub(r"\s" + name + r"""\s*=\s*("[^"]*"|'[^']*')""", "", head)
        if value is not None:
            head = f'{head.rstrip()} {name}="{value}"'
    return head + tail
