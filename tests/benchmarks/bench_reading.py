"""How long 100,000 messy rows take to be understood, beside the time that opening their file takes.

Run by hand: ``python tests/benchmarks/bench_reading.py [ROWS]``.
"""

from __future__ import annotations

import io
import random
import sys
import time

import xlsxwriter

from cant.files.open import open_workbook
from cant.reading import read_workbook

HEADER = (
    "Line",
    "Track",
    "Curve no.",
    "km from",
    "km to",
    "R [m]",
    "L/R",
    "Cant",
    "Trans L1/L2",
    "Vmax",
    "Goods",
)


def messy_xlsx(rows: int) -> bytes:
    """Give a workbook of invented curves whose columns mix texts, units and numbers."""
    chance = random.Random(1)
    stream = io.BytesIO()
    book = xlsxwriter.Workbook(stream, {"constant_memory": True})
    sheet = book.add_worksheet("Curves")
    sheet.write(0, 0, "Curve register of an invented network")
    sheet.write_row(1, 0, HEADER)
    for i in range(rows):
        metres = (i * 500) % 900_000
        start = f"{metres // 1000}+{metres % 1000:03d}"
        end = f"{metres // 1000}+{metres % 1000 + 250:03d}"
        radius = chance.choice(["650 m", "R=800", "1 250", 900, 700, "1.100,5"])
        cant = chance.choice([90, "75 mm", "60", 45])
        ramps = chance.choice(["60/60", "80/70", 60, "none"])
        speeds = chance.choice([100, "110 km/h"]), chance.choice([80, "none", None])
        cells = (
            f"Line {i // 1000}",
            str(i % 2 + 1),
            f"C{i}",
            start,
            end,
            radius,
            "LR"[i % 2],
            cant,
            ramps,
            *speeds,
        )
        sheet.write_row(i + 2, 0, cells)
    book.close()
    return stream.getvalue()


def main() -> None:
    """Print both times and their ratio, the best of three runs each."""
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    data = messy_xlsx(rows)
    opened, understood = [], []
    for _ in range(3):
        start = time.perf_counter()
        workbook = open_workbook(data, "messy.xlsx")
        middle = time.perf_counter()
        reading = read_workbook(workbook)
        opened.append(middle - start)
        understood.append(time.perf_counter() - middle)
    print(f"{len(reading.curves)} rows, {int(reading.curves.rejected.sum())} refused")
    print(f"opened in {min(opened):.2f} s, understood in {min(understood):.2f} s")
    print(f"ratio {min(understood) / min(opened):.2f} (at most 1 is wanted)")


if __name__ == "__main__":
    main()
