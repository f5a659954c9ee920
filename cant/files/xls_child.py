"""The program that reads one .xls file in a process of its own: bytes in on standard input, JSON out.

Reading an old binary workbook means trusting offsets and counts that anyone can forge. Here nothing worse
can happen than that this process ends; its memory and its time are limited before the first byte is read.
It is run by path and imports nothing of the package.
"""

from __future__ import annotations

import json
import os
import sys
from typing import Any

MAX_CELLS = 3_000_000
MEMORY_BYTES = 1_200_000_000
CPU_SECONDS = 25


def limit() -> None:
    """Bound this process where the system can."""
    try:
        import resource
    except ImportError:  # no such bounds here; the parent's clock still holds
        return
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY_BYTES, MEMORY_BYTES))
    resource.setrlimit(resource.RLIMIT_CPU, (CPU_SECONDS, CPU_SECONDS))
    resource.setrlimit(resource.RLIMIT_CORE, (0, 0))
    resource.setrlimit(resource.RLIMIT_FSIZE, (0, 0))


def read(data: bytes) -> dict[str, Any]:
    """Read a workbook into plain lists.

    Returns
    -------
    dict
        ``{"sheets": [...], "formats": [...], "epoch_1904": bool}`` or ``{"problem": word}``.
    """
    import xlrd

    with open(os.devnull, "w") as silent:
        try:
            book = xlrd.open_workbook(file_contents=data, formatting_info=True, logfile=silent)
        except xlrd.XLRDError as error:
            return {"problem": "password" if "encrypted" in str(error).lower() else "damaged"}
        codes = sorted({one.format_str or "General" for one in book.format_map.values()} | {"General"})
        index = {code: number for number, code in enumerate(codes)}
        style = [index[_code(book, xf)] for xf in book.xf_list]
        if sum(sheet.nrows * max(1, sheet.ncols) for sheet in book.sheets()) > 8 * MAX_CELLS:
            return {"problem": "large"}
        left = MAX_CELLS
        sheets = []
        for sheet in book.sheets():
            rows = [_row(sheet, number) for number in range(sheet.nrows)]
            left -= sum(map(len, rows))
            if left < 0:
                return {"problem": "large"}
            sheets.append(_sheet(sheet, rows, style))
    return {"sheets": sheets, "formats": codes, "epoch_1904": bool(book.datemode)}


def _code(book: Any, xf: Any) -> str:
    known = book.format_map.get(xf.format_key)
    return (known.format_str if known else None) or "General"


def _sheet(sheet: Any, rows: list[list[Any]], style: list[int]) -> dict[str, Any]:
    return {
        "name": sheet.name,
        "visible": sheet.visibility == 0,
        "rows": rows,
        "styles": [_styles(sheet, number, style) for number in range(sheet.nrows)],
        "merged": [list(one) for one in sheet.merged_cells[:100_000]],
        "hidden_rows": [row + 1 for row, info in sheet.rowinfo_map.items() if info.hidden],
        "hidden_columns": [column for column, info in sheet.colinfo_map.items() if info.hidden],
    }


def _styles(sheet: Any, row: int, style: list[int]) -> list[int]:
    xfs = [sheet.cell_xf_index(row, column) for column in range(sheet.row_len(row))]
    return [style[xf] if xf < len(style) else 0 for xf in xfs]


def _row(sheet: Any, row: int) -> list[Any]:
    """Give a row: numbers and texts bare, truth values and errors as one-entry lists, blanks as null."""
    import xlrd

    values: list[Any] = []
    for kind, value in zip(sheet.row_types(row), sheet.row_values(row), strict=True):
        if kind == xlrd.XL_CELL_ERROR:
            values.append([xlrd.error_text_from_code.get(value, "#VALUE!")])
        elif kind == xlrd.XL_CELL_BOOLEAN:
            values.append([bool(value)])
        elif kind in (xlrd.XL_CELL_EMPTY, xlrd.XL_CELL_BLANK):
            values.append(None)
        else:
            values.append(value)
    return values


def main() -> None:
    """Read standard input, write standard output."""
    limit()
    try:
        answer = read(sys.stdin.buffer.read())
    except MemoryError:
        answer = {"problem": "large"}
    except ImportError:
        answer = {"problem": "missing"}
    except Exception:  # whatever a forged file provokes: the parent says that it is damaged
        answer = {"problem": "damaged"}
    sys.stdout.write(json.dumps(answer))


if __name__ == "__main__":
    main()
