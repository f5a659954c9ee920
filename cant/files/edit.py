"""Edits of a package: which parts are new, replaced or gone, and the bookkeeping that follows from it.

Content types and relationships are collected while others work and written once at the end; every part that
nobody touched goes into the new archive as it is, still compressed.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable

from cant.files.archive import Packed, archive_pieces, copied, packed
from cant.files.markup import Element, elements, escape_attribute
from cant.files.package import Package, relationships_part, resolve

RELATIONS = "http://schemas.openxmlformats.org/package/2006/relationships"
OFFICE_RELATIONS = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_LARGE = 1 << 18
"""Parts larger than this [bytes] are held compressed, as the new archive has them."""

_HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'

Change = tuple[int, int, bytes]
"""Replace the bytes from a start to an end by others."""


def changed(data: bytes, changes: Iterable[Change]) -> bytes:
    """Apply changes that do not overlap.

    Those that put something in at one place come in the order given, and before one that replaces what stands
    there.
    """
    out: list[bytes] = []
    at = 0
    for start, end, new in sorted(changes, key=lambda one: one[:2]):
        out += (data[at:start], new)
        at = end
    out.append(data[at:])
    return b"".join(out)


def into(data: bytes, element: Element, inner: bytes) -> Change:
    """Make the change that puts bytes at the end of an element, which may be an empty tag."""
    if not element.is_empty_tag:
        return element.inner_end, element.inner_end, inner
    tag = data[element.start : element.end]
    opened = tag[: tag.rindex(b"/")].rstrip() + b">"
    return element.start, element.end, opened + inner + f"</{element.tag}>".encode()


def start_tag(data: bytes, element: Element, **attributes: str | None) -> Change:
    """Make the change that sets or removes (None) attributes of an element, the others as they are."""
    tag = data[element.start : element.inner].decode("utf-8")
    for name, value in attributes.items():
        own = re.compile(r"\s" + re.escape(name) + r"""\s*=\s*("[^"]*"|'[^']*')""")
        tag = own.sub("", tag, count=1)
        if value is not None:
            cut = len(tag) - (2 if tag.endswith("/>") else 1)
            tag = f'{tag[:cut].rstrip()} {name}="{escape_attribute(value)}"{tag[cut:]}'
    return element.start, element.inner, tag.encode("utf-8")


def before(root: Element, order: list[str], name: str, unknown: str = "extLst") -> int:
    """Give the position for a new child ``name`` of ``root`` in a fixed order of children.

    Parameters
    ----------
    root : Element
        The parent.
    order : list of str
        The order that the standard fixes.
    name : str
        The new child; it goes behind others of its name.
    unknown : str
        The known element that unknown ones stand for.
    """
    rank = order.index(name)
    for child in root.children:
        known = child.name if child.name in order else unknown
        if order.index(known) > rank:
            return child.start
    return root.inner_end


class PackageEdit:
    """A package under edit.

    Parameters
    ----------
    package : Package
        The package as it is.
    """

    def __init__(self, package: Package) -> None:
        self.package = package
        self.changed: dict[str, bytes | Packed] = {}
        self.removed: set[str] = set()
        self._types: dict[str, str] = {}
        self._defaults: dict[str, str] = {}
        self._related: dict[str, list[tuple[str, str, str]]] = {}
        self._unrelated: dict[str, set[str]] = {}

    def has(self, part: str) -> bool:
        """Tell whether a part exists, new ones included."""
        name = self.package.name_of(part)
        return part in self.changed or (name is not None and name not in self.removed)

    def xml(self, part: str) -> bytes:
        """Give a part's XML as it is now."""
        new = self.new_content(part)
        return self.package.plain_xml(part) if new is None else new

    def new_content(self, part: str) -> bytes | None:
        """Give the content of a part that is new or replaced, None where it is as it was."""
        content = self.changed.get(part)
        return content.unpacked() if isinstance(content, Packed) else content

    def replace(self, part: str, content: bytes | Iterable[bytes]) -> None:
        """Give an existing part new content; one in pieces is compressed at once, piece by piece."""
        if isinstance(content, bytes):
            self.changed[part] = packed(part, (content,)) if len(content) > _LARGE else content
        else:
            self.changed[part] = packed(part, content)

    def add(self, part: str, content: bytes | Iterable[bytes], content_type: str) -> None:
        """Add a part."""
        self.replace(part, content)
        self._types[part] = content_type

    def add_default(self, extension: str, content_type: str) -> None:
        """State the content type of all parts with an extension, where none is stated yet."""
        self._defaults[extension] = content_type

    def remove(self, part: str) -> None:
        """Remove a part with its own relationships."""
        for name in (part, relationships_part(part)):
            self.changed.pop(name, None)
            known = self.package.name_of(name)
            if known is not None:
                self.removed.add(known)

    def free_part(self, stem: str, extension: str) -> str:
        """Give a part name that is not taken: the stem, a number, the extension."""
        number = 1
        while self.has(f"{stem}{number}{extension}"):
            number += 1
        return f"{stem}{number}{extension}"

    def relate(self, part: str, kind: str, target: str) -> str:
        """Add a relationship and give its identifier.

        Parameters
        ----------
        part : str
            The part it starts from.
        kind : str
            Its type in full.
        target : str
            The part it points to.
        """
        new = self._related.setdefault(part, [])
        number = len(new) + 1
        gone = self._unrelated.get(part, set())
        taken = (set(self.package.relationships(part)) - gone) | {one[0] for one in new}
        while f"rId{number}" in taken:
            number += 1
        new.append((f"rId{number}", kind, "/" + target))
        return f"rId{number}"

    def unrelate(self, part: str, identifier: str) -> None:
        """Remove a relationship."""
        self._unrelated.setdefault(part, set()).add(identifier)

    def build(self) -> list[bytes | memoryview]:
        """Put the new archive together, in pieces."""
        for part in self._related.keys() | self._unrelated.keys():
            self._write_relations(part)
        self._write_types()
        archive = self.package.archive
        members: list[Packed] = []
        left = dict(self.changed)
        for name in archive.members:
            if name in self.removed:
                continue
            members.append(_member(name, left.pop(name)) if name in left else copied(archive, name))
        members += [_member(name, content) for name, content in left.items()]
        return archive_pieces(members)

    def _write_relations(self, part: str) -> None:
        name = self.package.name_of(relationships_part(part)) or relationships_part(part)
        if name in self.removed:
            return
        data = self.xml(name) if self.has(name) else f'{_HEAD}<Relationships xmlns="{RELATIONS}"/>'.encode()
        root = elements(data, name, self.package.place)
        gone = self._unrelated.get(part, set())
        changes: list[Change] = [
            (one.start, one.end, b"") for one in root.all("Relationship") if one.get("Id") in gone
        ]
        new = "".join(
            f'<{root.prefix}Relationship Id="{number}" Type="{kind}" Target="{escape_attribute(target)}"/>'
            for number, kind, target in self._related.get(part, [])
        )
        if new:
            changes.append(into(data, root, new.encode()))
        self.replace(name, changed(data, changes))

    def _write_types(self) -> None:
        name = self.package.content_types_name
        data = self.xml(name)
        root = elements(data, name, self.package.place)
        gone = {"/" + part.casefold() for part in self.removed}
        changes: list[Change] = [
            (one.start, one.end, b"")
            for one in root.all("Override")
            if one.get("PartName").casefold() in gone
        ]
        known = {one.get("Extension").casefold() for one in root.all("Default")}
        new = "".join(
            f'<{root.prefix}Default Extension="{extension}" ContentType="{kind}"/>'
            for extension, kind in self._defaults.items()
            if extension not in known
        )
        new += "".join(
            f'<{root.prefix}Override PartName="/{escape_attribute(part)}" ContentType="{kind}"/>'
            for part, kind in self._types.items()
            if part in self.changed
        )
        if new:
            changes.append(into(data, root, new.encode()))
        if changes:
            self.replace(name, changed(data, changes))


def _member(name: str, content: bytes | Packed) -> Packed:
    return content if isinstance(content, Packed) else packed(name, (content,))


def all_targets(package: Package, skip: Callable[[str], bool]) -> set[str]:
    """Give, in lower case, the parts that any part points to, but for the parts that ``skip`` names."""
    found: set[str] = set()
    for name in package.archive.members:
        folder, slash, file = name.rpartition("_rels/")
        if not slash or not file.endswith(".rels"):
            continue
        source = folder + file.removesuffix(".rels")
        if skip(source):
            continue
        for one in package.tree(name).all("Relationship"):
            if one.get("TargetMode") != "External":
                found.add(resolve(source, one.get("Target")).casefold())
    return found
