"""The shared strings of a workbook."""

from __future__ import annotations

import re
from functools import lru_cache

from cant.errors import FileError
from cant.files.markup import unescape
from cant.files.package import Package
from cant.files.text import from_cell_text

MAX_STRINGS = 3_000_000
MAX_TEXT_BYTES = 4_000_000
"""Largest piece of XML that is one text; a cell holds 32,767 characters."""


def shared_strings(package: Package, part: str) -> list[str | None]:
    """Give the shared strings in order; a text of nothing but blanks is None.

    Raises
    ------
    FileError
        Damaged, or far more strings than a workbook holds.
    """
    data = package.plain_xml(part)
    prefix = b"x:" if b"<x:sst" in data[:4096] else b""
    if data.count(b"<" + prefix + b"si>") + data.count(b"<" + prefix + b"si/>") > MAX_STRINGS:
        message = f"is refused for safety: it has more than {MAX_STRINGS} different texts"
        raise FileError(message, package.place)
    pattern = _items(prefix)
    found: list[str | None] = []
    for simple, rich in pattern.findall(data):
        text = simple.decode("utf-8") if simple else rich_text(rich, prefix)
        if "&" in text or "\r" in text:
            text = unescape(text)
        if "_x" in text:
            text = from_cell_text(text)
        found.append(text if text and not text.isspace() else None)
    return found


@lru_cache(maxsize=8)
def _items(prefix: bytes) -> re.Pattern[bytes]:
    p = re.escape(prefix)
    return re.compile(
        rb"<" + p + rb"si(?:/>|>(?:<" + p + rb"t(?: [^<>]*)?>([^<]*)</" + p + rb"t></" + p
        + rb"si>|(.*?)</" + p + rb"si>))",
        re.DOTALL,
    )  # fmt: skip


@lru_cache(maxsize=8)
def _runs(prefix: bytes) -> tuple[re.Pattern[bytes], re.Pattern[bytes]]:
    p = re.escape(prefix)
    phonetic = re.compile(rb"<" + p + rb"rPh[\s>].*?</" + p + rb"rPh>", re.DOTALL)
    return phonetic, re.compile(rb"<" + p + rb"t(?: [^<>]*)?>([^<]*)</" + p + rb"t>")


def rich_text(inner: bytes, prefix: bytes) -> str:
    """Give the text of formatted runs, pronunciation hints left out, entities not yet resolved."""
    phonetic, run = _runs(prefix)
    if b"rPh" in inner:
        inner = phonetic.sub(b"", inner)
    return b"".join(run.findall(inner)).decode("utf-8")
