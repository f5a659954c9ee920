"""How fast workbooks are read and annotated, as ratios to openpyxl in the same run; run by hand.

Reads 100,000 rows and annotates 10,000; ``--small`` takes a tenth of both. Each measurement is made in a
process of its own, so that its peak of memory is its own; times are of the processor, so that neighbours on
the machine do not count.
"""

from __future__ import annotations

import argparse
import io
import json
import resource
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import openpyxl
import xlsxwriter

from cant.files.additions import AddedColumn, OutCell, SheetAddition
from cant.files.annotate import annotate
from cant.files.open import open_workbook

COLUMNS = 14
ADDED = 20


def curve_list(rows: int) -> bytes:
    """Give a workbook of curves: 14 columns of names, numbers, dates and remarks."""
    out = io.BytesIO()
    with xlsxwriter.Workbook(out) as book:
        page = book.add_worksheet("Curves")
        date, length = book.add_format({"num_format": "yyyy-mm-dd"}), book.add_format({"num_format": "0.000"})
        page.write_row(0, 0, [f"Column {number}" for number in range(COLUMNS)])
        for row in range(1, rows + 1):
            page.write_row(row, 0, ["Vale line", "Up", f"C{row}"])
            page.write_number(row, 3, row * 0.4, length)
            page.write_number(row, 4, row * 0.4 + 0.2, length)
            page.write_row(row, 5, [300 + row % 700, "LR"[row % 2], 200, 40, 40, row % 30 * 5, 100])
            page.write_number(row, 12, 44000 + row % 2000, date)
            page.write_string(row, 13, f"remark & {row % 50}")
    return out.getvalue()


def read_ours(data: bytes) -> int:
    return len(open_workbook(data, "curves.xlsx").sheets[0].rows)


def read_openpyxl(data: bytes) -> int:
    book = openpyxl.load_workbook(io.BytesIO(data), read_only=True)
    return sum(1 for _ in book.worksheets[0].iter_rows(values_only=True))


def annotate_ours(data: bytes) -> int:
    rows = range(2, data_rows(data) + 2)
    columns = [
        AddedColumn(
            f"Added {number}",
            {
                row: OutCell(
                    row * 1.5,
                    f"F{row}*1.5" if number % 2 else None,
                    "0.0",
                    "FFEE99" if row % 20 == 0 else None,
                )
                for row in rows
            },
        )
        for number in range(ADDED)
    ]
    start = time.process_time()
    annotate(data, [SheetAddition("Curves", 1, columns)])
    return round((time.process_time() - start) * 1000)


def annotate_openpyxl(data: bytes) -> int:
    start = time.process_time()
    book = openpyxl.load_workbook(io.BytesIO(data))
    page = book["Curves"]
    fill = openpyxl.styles.PatternFill("solid", fgColor="FFEE99")
    for number in range(ADDED):
        page.cell(1, COLUMNS + 1 + number, f"Added {number}")
        for row in range(2, page.max_row + 1):
            cell = page.cell(row, COLUMNS + 1 + number, f"=F{row}*1.5" if number % 2 else row * 1.5)
            cell.number_format = "0.0"
            if row % 20 == 0:
                cell.fill = fill
    book.save(io.BytesIO())
    return round((time.process_time() - start) * 1000)


def data_rows(data: bytes) -> int:
    return read_ours(data) - 1


TASKS: dict[str, Callable[[bytes], int]] = {
    one.__name__: one for one in (read_ours, read_openpyxl, annotate_ours, annotate_openpyxl)
}


def measured(task: str, rows: int) -> dict[str, float]:
    """Measure one task in a process of its own."""
    command = [sys.executable, __file__, "--task", task, "--rows", str(rows)]
    done = subprocess.run(command, input=curve_list(rows), capture_output=True, check=True)
    result: dict[str, float] = json.loads(done.stdout)
    return result


def run_task(task: str) -> None:
    data = sys.stdin.buffer.read()
    start = time.process_time()
    value = TASKS[task](data)
    seconds = value / 1000 if task.startswith("annotate") else time.process_time() - start
    peak = _peak_mib()
    print(json.dumps({"seconds": seconds, "peak_mib": peak}))


def _peak_mib() -> float:
    """Give the peak of this process alone; what is asked of the system elsewhere counts the parent's too."""
    status = Path("/proc/self/status")
    if status.exists():
        return int(status.read_text().partition("VmHWM:")[2].split()[0]) / 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def compare(kind: str, rows: int, target: float) -> None:
    ours, theirs = measured(f"{kind}_ours", rows), measured(f"{kind}_openpyxl", rows)
    print(
        f"{kind:9} {rows:7} rows: {ours['seconds']:7.2f} s, {ours['peak_mib']:5.0f} MiB; openpyxl "
        f"{theirs['seconds']:7.2f} s; ratio {ours['seconds'] / theirs['seconds']:.2f} (target {target})"
    )


def growth(kind: str, rows: int) -> None:
    few, many = (measured(f"{kind}_ours", one)["seconds"] for one in (rows // 10, rows))
    print(f"{kind:9} ten times the rows ({rows // 10} to {rows}): {many / few:.1f} times the time")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--task", choices=TASKS)
    parser.add_argument("--rows", type=int)
    parser.add_argument("--small", action="store_true", help="a tenth of the rows")
    chosen = parser.parse_args()
    if chosen.task:
        run_task(chosen.task)
        return
    part = 10 if chosen.small else 1
    compare("read", 100_000 // part, 0.7)
    compare("annotate", 10_000 // part, 0.25)
    growth("read", 100_000 // part)
    growth("annotate", 100_000 // part)


if __name__ == "__main__":
    main()
