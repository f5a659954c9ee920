"""What a file is, by its first bytes and never by its name."""

from __future__ import annotations

from enum import Enum
from typing import NoReturn

from cant.errors import FileError, Place
from cant.files.archive import Archive
from cant.files.package import CONTENT_TYPES

WANTED = "give an .xlsx, .xlsm, .xls, .ods, .csv or .tsv file"


class Kind(Enum):
    """The kinds of file that hold tables."""

    PACKAGE = "Office Open XML"
    ODS = "OpenDocument spreadsheet"
    XLS = "xls"
    TEXT = "separated text"


_SIGNATURES = (
    (b"%PDF", "a PDF document"),
    (b"\x89PNG\r\n", "a picture (PNG)"),
    (b"\xff\xd8\xff", "a picture (JPEG)"),
    (b"GIF8", "a picture (GIF)"),
    (b"II*\0", "a picture (TIFF)"),
    (b"MM\0*", "a picture (TIFF)"),
    (b"{\\rtf", "a text document (RTF)"),
    (b"\x1f\x8b", "a gzip archive"),
    (b"7z\xbc\xaf", "a 7-Zip archive"),
    (b"Rar!", "a RAR archive"),
    (b"BZh", "a bzip2 archive"),
    (b"\xfd7zXZ", "an xz archive"),
    (b"SQLite format 3", "a database (SQLite)"),
    (b"PAR1", "a Parquet file"),
    (b"AC10", "a drawing (DWG)"),
    (b"MZ", "a program"),
    (b"\x7fELF", "a program"),
)
_OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
_OLD_XLS = (b"\x09\x00\x04\x00", b"\x09\x02\x06\x00", b"\x09\x04\x06\x00", b"\x09\x08\x08\x00")
_MARKUP = (
    (b"<!doctype html", "a web page"),
    (b"<html", "a web page"),
    (b"<?xml", "an XML document"),
    (b"<svg", "a picture (SVG)"),
    (b"mime-version:", "a web archive"),
)
_TEXT_ODS = b"application/vnd.oasis.opendocument.spreadsheet"


def recognise(data: bytes, file: str) -> Kind:
    """Tell what a file is.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        Its name, for messages.

    Raises
    ------
    FileError
        Not a table; the message calls it what it is. Also a damaged or refused archive.
    """
    if not data.strip(b"\r\n\t \0\xef\xbb\xbf"):
        message = "is empty; it should hold a table with a row of headings"
        raise FileError(message, Place(file))
    if data.startswith(b"PK"):
        return _zip_kind(Archive(data, file), file)
    if data.startswith(_OLE):
        return _ole_kind(data, file)
    for signature, name in _SIGNATURES:
        if data.startswith(signature) and not (signature in (b"MZ", b"BZh") and b"\0" not in data[:4096]):
            _not_a_table(name, file)
    if data[:4] in _OLD_XLS:
        message = "is a workbook of a program from before 1997; save it as .xlsx and try again"
        raise FileError(message, Place(file))
    head = data[:512].lstrip(b"\xef\xbb\xbf\r\n\t ").lower()
    for signature, name in _MARKUP:
        if head.startswith(signature):
            _not_a_table(name + (" saved under a workbook's name" if _claims_workbook(file) else ""), file)
    return Kind.TEXT


def _claims_workbook(file: str) -> bool:
    return file.lower().endswith((".xls", ".xlsx", ".xlsm", ".ods"))


def _not_a_table(name: str, file: str) -> NoReturn:
    message = f"is {name}, not a table; {WANTED}"
    raise FileError(message, Place(file))


def _password(file: str) -> NoReturn:
    message = "is password-protected; open it, save it without a password, and try again"
    raise FileError(message, Place(file))


def _zip_kind(archive: Archive, file: str) -> Kind:
    names = {name.casefold() for name in archive.members}
    if CONTENT_TYPES.casefold() in names:
        return _package_kind(names, file)
    if "mimetype" in archive:
        kind = archive.read("mimetype").strip() if archive.members["mimetype"].size < 200 else b""
        if kind.startswith(_TEXT_ODS):
            return _ods_kind(archive, file)
        if kind.startswith(b"application/vnd.oasis.opendocument"):
            _not_a_table("an OpenDocument file other than a spreadsheet", file)
    if any(name.endswith(".iwa") for name in names):
        _not_a_table("a document of a program that keeps its own format", file)
    _not_a_table("a zip archive", file)


def _package_kind(names: set[str], file: str) -> Kind:
    if any(name.startswith("word/") for name in names) and not any(name.startswith("xl/") for name in names):
        _not_a_table("a text document (.docx)", file)
    if any(name.startswith("ppt/") for name in names) and not any(name.startswith("xl/") for name in names):
        _not_a_table("a presentation (.pptx)", file)
    return Kind.PACKAGE


def _ods_kind(archive: Archive, file: str) -> Kind:
    if "META-INF/manifest.xml" in archive and b"encryption-data" in archive.read("META-INF/manifest.xml"):
        _password(file)
    return Kind.ODS


def _ole_kind(data: bytes, file: str) -> Kind:
    def has(stream: str) -> bool:
        return stream.encode("utf-16-le") in data

    if has("EncryptedPackage"):
        _password(file)
    if has("WordDocument"):
        _not_a_table("a text document (.doc)", file)
    if has("PowerPoint Document"):
        _not_a_table("a presentation (.ppt)", file)
    if not has("Workbook") and not has("Book"):
        _not_a_table("a compound document with no workbook in it, or a damaged one", file)
    return Kind.XLS
