"""A file from a form: its bytes and a name that can be shown, or a clear refusal."""

from __future__ import annotations

import unicodedata
from pathlib import PurePosixPath, PureWindowsPath

from flask import request

from cant.errors import FileError, InputError, Place

LONGEST_FILE_NAME = 120


def uploaded(field: str) -> tuple[bytes, str] | None:
    """Give the file of a form's field as (bytes, name), None where none was chosen.

    Raises
    ------
    FileError
        Where the file is empty.
    """
    given = request.files.get(field)
    if given is None or not given.filename:
        return None
    name = shown_name(given.filename)
    data = given.read()
    if not data:
        message = "the file is empty; choose a workbook or a csv file with a curve list"
        raise FileError(message, Place(name))
    return data, name


def needed(field: str, words: str) -> tuple[bytes, str]:
    """Give the file of a field; InputError where none was chosen."""
    found = uploaded(field)
    if found is None:
        message = f"no file was chosen; choose {words}"
        raise InputError(message)
    return found


def shown_name(name: str) -> str:
    """Give the last part of a file name, printable and not too long; the ending stays."""
    last = PureWindowsPath(PurePosixPath(name).name).name
    printable = "".join(
        c for c in unicodedata.normalize("NFC", last) if c.isprintable() and c not in '<>:"|?*/\\'
    ).strip(". ")
    if len(printable) > LONGEST_FILE_NAME:
        stem, dot, ending = printable.rpartition(".")
        keep = LONGEST_FILE_NAME - len(ending) - 1
        printable = f"{stem[:keep]}{dot}{ending}" if dot and keep > 0 else printable[:LONGEST_FILE_NAME]
    return printable or "curves"
