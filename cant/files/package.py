"""An Office Open XML package: parts, their content types, and the relationships between them."""

from __future__ import annotations

import posixpath
from dataclasses import dataclass
from typing import NoReturn
from urllib.parse import unquote

from cant.errors import FileError
from cant.files.archive import Archive
from cant.files.loose_parts import LooseParts
from cant.files.markup import Element, elements, is_plain, plain, utf8_part

CONTENT_TYPES = "[Content_Types].xml"
MAX_SHEETS = 255
STRICT = "http://purl.oclc.org/ooxml/"


@dataclass(frozen=True, slots=True)
class Relationship:
    """One relationship of a part.

    Attributes
    ----------
    id : str
        Its identifier in the part.
    type : str
        Last word of its type, such as ``worksheet``.
    target : str
        Name of the part it points to, or the address where it is external.
    external : bool
        Whether it leaves the package.
    element : Element
        Where it stands in the relationships part.
    """

    id: str
    type: str
    target: str
    external: bool
    element: Element


class Package:
    """A package, parts read on demand.

    Parameters
    ----------
    data : bytes or LooseParts
        The whole file, or its parts in a folder.
    file : str
        Its name, for messages.

    Raises
    ------
    FileError
        See :class:`cant.files.archive.Archive`; also where there is no list of content types.
    """

    def __init__(self, data: bytes | LooseParts, file: str = "") -> None:
        self.source = data if isinstance(data, LooseParts) else Archive(data, file)
        self.place = self.source.place
        self._names = {name.casefold(): name for name in self.source.members}
        types = self.name_of(CONTENT_TYPES)
        if types is None:
            self.damaged("it has no list of its content types")
        self.content_types_name = types
        root = self.tree(types)
        self._overrides = {
            unquote(one.get("PartName")).lstrip("/").casefold(): one.get("ContentType")
            for one in root.all("Override")
        }
        self._defaults = {
            one.get("Extension").casefold(): one.get("ContentType") for one in root.all("Default")
        }

    @property
    def archive(self) -> Archive:
        """The archive that the package is; one of loose parts has none and cannot be edited in place."""
        if isinstance(self.source, LooseParts):
            message = "a package of loose parts is no archive"
            raise TypeError(message)
        return self.source

    def damaged(self, what: str) -> NoReturn:
        """Refuse a package that does not hold together."""
        message = f"is damaged: {what}; open it in a spreadsheet program and save it anew"
        raise FileError(message, self.place)

    def name_of(self, part: str) -> str | None:
        """Give a part's name as the archive writes it, or None where there is none."""
        return self._names.get(part.casefold())

    def content_type(self, part: str) -> str:
        """Give a part's content type, "" where none is stated."""
        override = self._overrides.get(part.casefold())
        return override or self._defaults.get(part.rpartition(".")[2].casefold(), "")

    def xml(self, part: str) -> bytes:
        """Give a part as checked UTF-8 XML.

        Raises
        ------
        FileError
            The part is missing, damaged or refused.
        """
        name = self.name_of(part)
        if name is None:
            self.damaged(f"its part {part} is missing")
        return utf8_part(self.source.read(name), part, self.place)

    def plain_xml(self, part: str) -> bytes:
        """Give a part as checked UTF-8 XML in plain notation."""
        data = self.xml(part)
        return data if is_plain(data) else plain(data, part, self.place)

    def tree(self, part: str) -> Element:
        """Give a part as elements; for large parts take the bytes instead."""
        return elements(self.xml(part), part, self.place)

    def relationships(self, part: str) -> dict[str, Relationship]:
        """Give a part's relationships by their identifier; "" stands for the package."""
        name = self.name_of(relationships_part(part))
        if name is None:
            return {}
        found = {}
        for one in self.tree(name).all("Relationship"):
            external = one.get("TargetMode") == "External"
            target = one.get("Target")
            found[one.get("Id")] = Relationship(
                one.get("Id"),
                one.get("Type").rpartition("/")[2],
                target if external else resolve(part, target),
                external,
                one,
            )
        return found

    def related(self, part: str, kind: str) -> str | None:
        """Give the first part that ``part`` has a relationship of a kind to, if it is there."""
        for one in self.relationships(part).values():
            if one.type == kind and not one.external:
                return self.name_of(one.target)
        return None

    @property
    def workbook_part(self) -> str:
        """Name of the workbook part."""
        part = self.related("", "officeDocument")
        if part is None:
            self.damaged("it has no workbook part")
        return part


def relationships_part(part: str) -> str:
    """Give the name of the part that holds a part's relationships."""
    folder, name = posixpath.split(part)
    return posixpath.join(folder, "_rels", name + ".rels")


def resolve(part: str, target: str) -> str:
    """Give the name of the part that a relationship's target means."""
    target = unquote(target.replace("\\", "/"))
    if target.startswith("/"):
        return posixpath.normpath(target).lstrip("/")
    return posixpath.normpath(posixpath.join(posixpath.dirname(part), target))
