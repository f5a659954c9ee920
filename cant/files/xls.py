"""An old binary workbook (.xls), read by a bounded child process."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path
from typing import Any, NoReturn

from cant.errors import FileError, Place
from cant.files.formats import from_serial, is_date_format
from cant.files.grid import CellError, CellRange, Sheet, Value, Workbook

TIMEOUT_SECONDS = 40
_CHILD = Path(__file__).with_name("xls_child.py")
_PROBLEMS = {
    "password": "is password-protected; open it, save it without a password, and try again",
    "large": "is too large to be read safely; keep the curve list in a file of its own",
    "missing": "cannot be read because the package xlrd is missing; install it, or save the file as .xlsx",
    "damaged": "is damaged or no workbook; open it in a spreadsheet program and save it as .xlsx",
}


def read_xls(data: bytes, file: str) -> Workbook:
    """Read an .xls file.

    Parameters
    ----------
    data : bytes
        The whole file.
    file : str
        Its name, for messages.

    Returns
    -------
    Workbook
        Values; what the file stores does not tell calculated cells, so ``formulas`` stays empty.

    Raises
    ------
    FileError
        Damaged, password-protected, or too large.
    """
    answer = _ask_child(data, file)
    if "problem" in answer:
        _refuse(str(answer["problem"]), file)
    codes = [str(code) for code in answer["formats"]]
    dates = {number for number, code in enumerate(codes) if is_date_format(code)}
    sheets = [_sheet(one, codes, dates, bool(answer["epoch_1904"])) for one in answer["sheets"]]
    return Workbook(file, "xls", sheets)


def _refuse(problem: str, file: str) -> NoReturn:
    raise FileError(_PROBLEMS.get(problem, _PROBLEMS["damaged"]), Place(file)) from None


def _ask_child(data: bytes, file: str) -> dict[str, Any]:
    command = [sys.executable, "-I", str(_CHILD)]
    try:
        done = subprocess.run(  # noqa: S603
            command, input=data, capture_output=True, timeout=TIMEOUT_SECONDS, check=False
        )
    except subprocess.TimeoutExpired:
        _refuse("large", file)
    if done.returncode < 0:
        _refuse("large", file)
    try:
        answer: dict[str, Any] = json.loads(done.stdout)
    except ValueError:
        _refuse("damaged", file)
    return answer


def _sheet(one: dict[str, Any], codes: list[str], dates: set[int], epoch_1904: bool) -> Sheet:
    rows = [
        _row(values, styles, dates, epoch_1904)
        for values, styles in zip(one["rows"], one["styles"], strict=True)
    ]
    while rows and not rows[-1]:
        rows.pop()
    formats = {
        (row, column): codes[style]
        for row, styles in enumerate(one["styles"], start=1)
        for column, style in enumerate(styles)
        if codes and codes[style] != "General"
    }
    sheet = Sheet(
        name=str(one["name"]),
        rows=rows,
        merged=[CellRange(top + 1, left, bottom, right - 1) for top, bottom, left, right in one["merged"]],
        hidden_rows=frozenset(one["hidden_rows"]),
        hidden_columns=frozenset(one["hidden_columns"]),
        visible=bool(one["visible"]),
        number_formats=formats,
    )
    sheet.next_column = sheet.width
    return sheet


def _row(values: list[Any], styles: list[int], dates: set[int], epoch_1904: bool) -> list[Value]:
    row = [_value(value, style in dates, epoch_1904) for value, style in zip(values, styles, strict=True)]
    while row and row[-1] is None:
        row.pop()
    return row


def _value(value: Any, is_date: bool, epoch_1904: bool) -> Value:
    if isinstance(value, list):
        return value[0] if isinstance(value[0], bool) else CellError(value[0])
    if isinstance(value, str):
        return value if value and not value.isspace() else None
    if value is None:
        return None
    number = float(value)
    return from_serial(number, epoch_1904) if is_date else number
