"""XML parts as bytes: checked, brought to plain notation where needed, seen as elements with positions.

Positions are what an edit in place needs and what tree libraries throw away. No part may declare a document
type, so that no entity can expand.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import NoReturn
from xml.parsers import expat

from cant.errors import FileError, Place

MAX_DEPTH = 256
MAX_ELEMENTS = 600_000
MAX_UNUSUAL_BYTES = 40_000_000
"""Largest part that is rewritten to plain notation."""

_DECLARATION = re.compile(rb"\s*<\?xml[^>]*\?>\s*")
_ENCODING = re.compile(rb"""encoding\s*=\s*["']([\w.-]+)["']""")
_TAG = re.compile(rb"""<(?:[^>"']|"[^"]*"|'[^']*')*>""")
_ENTITY = re.compile(r"&(?:#x([0-9A-Fa-f]+)|#([0-9]+)|(lt|gt|amp|quot|apos));")
_SPECIAL = re.compile("[&<>\r]")
_NAMED = {"lt": "<", "gt": ">", "amp": "&", "quot": '"', "apos": "'"}
_UNPLAIN = (b" >", b"\n>", b"\t>", b"\r>")


def utf8_part(data: bytes, name: str, place: Place) -> bytes:
    """Check a part and give it in UTF-8.

    Parameters
    ----------
    data : bytes
        The part.
    name : str
        Its name, for messages.
    place : Place
        The file.

    Returns
    -------
    bytes
        The same bytes where they are UTF-8 already (less a byte order mark).

    Raises
    ------
    FileError
        Not well-formed, of an unknown encoding, or with a document type declaration.
    """
    check_well_formed(data, name, place)
    encoding = _encoding(data)
    if encoding == "utf-8":
        return data.removeprefix(b"\xef\xbb\xbf")
    try:
        text = data.decode(encoding).removeprefix("\ufeff")
    except (LookupError, UnicodeDecodeError):
        _damaged(name, f"its encoding {encoding} is not usable", place)
    return b'<?xml version="1.0" encoding="UTF-8" standalone="yes"?>' + _DECLARATION.sub(
        b"", text.encode("utf-8"), count=1
    )


def _encoding(data: bytes) -> str:
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        return "utf-16"
    if data.startswith(b"<\0"):
        return "utf-16-le"
    if data.startswith(b"\0<"):
        return "utf-16-be"
    declaration = _DECLARATION.match(data.removeprefix(b"\xef\xbb\xbf"))
    found = _ENCODING.search(declaration.group()) if declaration else None
    name = found.group(1).decode().lower() if found else "utf-8"
    return "utf-8" if name in ("utf-8", "utf8", "us-ascii", "ascii") else name


def check_well_formed(data: bytes, name: str, place: Place) -> None:
    """Refuse a part that is not well-formed XML or declares a document type.

    Raises
    ------
    FileError
        With what is wrong.
    """
    parser = expat.ParserCreate()

    def doctype(*_: object) -> NoReturn:
        message = f"is refused for safety: its part {name} declares a document type, which no workbook does"
        raise FileError(message, place)

    parser.StartDoctypeDeclHandler = doctype
    try:
        parser.Parse(data, True)
    except expat.ExpatError as error:
        _damaged(name, f"{expat.ErrorString(error.code)} in line {error.lineno}", place)
    except (LookupError, ValueError):
        _damaged(name, "its encoding is not usable", place)


def _damaged(name: str, what: str, place: Place) -> NoReturn:
    message = f"is damaged: part {name}: {what}; open it in a spreadsheet program and save it anew"
    raise FileError(message, place)


def is_plain(data: bytes) -> bool:
    """Tell whether a checked part has no comments, CDATA, instructions or blanks before the end of a tag."""
    declaration = _DECLARATION.match(data)
    start = declaration.end() if declaration else 0
    if b"<!" in data or data.find(b"<?", start) >= 0:
        return False
    return not any(sign in data for sign in _UNPLAIN)


def plain(data: bytes, name: str, place: Place) -> bytes:
    """Rewrite a checked part in plain notation: same elements, attributes and text, no comments, no CDATA.

    Raises
    ------
    FileError
        The part is too large for that, or nested too deeply.
    """
    if len(data) > MAX_UNUSUAL_BYTES:
        message = f"is refused for safety: its part {name} is very large and of an unusual notation"
        raise FileError(message, place)
    out: list[str] = ['<?xml version="1.0" encoding="UTF-8" standalone="yes"?>']
    depth = 0
    parser = expat.ParserCreate()
    parser.ordered_attributes = True
    parser.buffer_text = True

    def start(tag: str, attributes: list[str]) -> None:
        nonlocal depth
        depth += 1
        _check_depth(depth, name, place)
        pairs = zip(attributes[::2], attributes[1::2], strict=True)
        out.append("<" + tag + "".join(f' {key}="{escape_attribute(value)}"' for key, value in pairs) + ">")

    def end(tag: str) -> None:
        nonlocal depth
        depth -= 1
        if out[-1].startswith("<" + tag) and not out[-1].endswith("/>") and out[-1][len(tag) + 1] in " >":
            out[-1] = out[-1][:-1] + "/>"
        else:
            out.append(f"</{tag}>")

    parser.StartElementHandler = start
    parser.EndElementHandler = end
    parser.CharacterDataHandler = lambda text: out.append(escape(text))
    parser.Parse(data, True)
    return "".join(out).encode("utf-8")


def _check_depth(depth: int, name: str, place: Place) -> None:
    if depth > MAX_DEPTH:
        message = f"is refused for safety: its part {name} is nested {MAX_DEPTH} deep and more"
        raise FileError(message, place)


def escape(text: str) -> str:
    """Give text for the content of an XML element."""
    if not _SPECIAL.search(text):
        return text
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;").replace("\r", "&#13;")


def escape_attribute(text: str) -> str:
    """Give text for an XML attribute in double quotes."""
    return escape(text).replace('"', "&quot;").replace("\n", "&#10;").replace("\t", "&#9;")


def unescape(text: str) -> str:
    """Resolve the entities and character references of checked XML, and its line ends."""
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    if "&" not in text:
        return text
    return _ENTITY.sub(_character, text)


def _character(match: re.Match[str]) -> str:
    hexadecimal, decimal, named = match.groups()
    if named:
        return _NAMED[named]
    return chr(int(hexadecimal, 16) if hexadecimal else int(decimal))


@dataclass(slots=True)
class Element:
    """An element with its place in the bytes.

    Attributes
    ----------
    tag : str
        Name with its prefix.
    attributes : dict of str to str
        Values by name with prefix.
    start, inner, inner_end, end : int
        Where its start tag begins and ends, and where its end tag begins and ends; for an empty element tag
        ``inner`` = ``inner_end`` = ``end``.
    children : list of Element
        Elements inside.
    """

    tag: str
    attributes: dict[str, str]
    start: int
    inner: int
    inner_end: int = 0
    end: int = 0
    children: list[Element] = field(default_factory=list)

    @property
    def name(self) -> str:
        """Name without its prefix."""
        return self.tag.rpartition(":")[2]

    @property
    def prefix(self) -> str:
        """Prefix with its colon, or ""."""
        head, colon, _ = self.tag.rpartition(":")
        return head + colon

    @property
    def is_empty_tag(self) -> bool:
        """Whether it is written ``<name/>``."""
        return self.inner == self.end

    def child(self, name: str) -> Element | None:
        """Give the first child of a name, prefix ignored."""
        return next((one for one in self.children if one.name == name), None)

    def all(self, name: str) -> Iterator[Element]:
        """Give the children of a name, prefix ignored."""
        return (one for one in self.children if one.name == name)

    def walk(self) -> Iterator[Element]:
        """Give the element and all below it, in the order of the document."""
        stack = [self]
        while stack:
            one = stack.pop()
            yield one
            stack.extend(reversed(one.children))

    def get(self, name: str, default: str = "") -> str:
        """Give an attribute by its name without prefix."""
        if name in self.attributes:
            return self.attributes[name]
        for key, value in self.attributes.items():
            if key.rpartition(":")[2] == name and not key.startswith("xmlns"):
                return value
        return default

    def flag(self, name: str) -> bool:
        """Tell whether an attribute says yes."""
        return self.get(name).strip().lower() in ("1", "true", "on")


def elements(data: bytes, name: str, place: Place) -> Element:
    """See a checked UTF-8 part as elements.

    Raises
    ------
    FileError
        Too many elements, or nested too deeply.
    """
    if data.count(b"<") > 2 * MAX_ELEMENTS:
        _too_many(name, place)
    root: list[Element] = []
    stack: list[Element] = []
    count = 0
    parser = expat.ParserCreate()

    def start(tag: str, attributes: dict[str, str]) -> None:
        nonlocal count
        count += 1
        if count > MAX_ELEMENTS:
            _too_many(name, place)
        at = parser.CurrentByteIndex
        close = _TAG.match(data, at)
        one = Element(tag, attributes, at, close.end() if close else at)
        (stack[-1].children if stack else root).append(one)
        stack.append(one)
        _check_depth(len(stack), name, place)

    def end(_: str) -> None:
        one = stack.pop()
        if data[one.inner - 2 : one.inner] == b"/>":
            one.inner_end = one.end = one.inner
            return
        one.inner_end = parser.CurrentByteIndex
        one.end = data.index(b">", one.inner_end) + 1

    parser.StartElementHandler = start
    parser.EndElementHandler = end
    try:
        parser.Parse(data, True)
    except expat.ExpatError as error:
        _damaged(name, expat.ErrorString(error.code), place)
    return root[0]


def _too_many(name: str, place: Place) -> NoReturn:
    message = f"is refused for safety: its part {name} has far more elements than a workbook's"
    raise FileError(message, place)


def text_of(data: bytes, element: Element) -> str:
    """Give the text of an element that holds only text."""
    return unescape(data[element.inner : element.inner_end].decode("utf-8"))
