"""The whole way of ``cant plan`` stage by stage: seconds and memory for registers of several sizes.

Run by hand::

    python tests/benchmarks/bench_plan.py [ROWS ...]

Prints one line a stage; growth should be no faster than the rows.
"""

from __future__ import annotations

import io
import random
import resource
import sys
import time
from collections.abc import Callable
from typing import TypeVar

import xlsxwriter

from cant.service import annotated_workbook, make_plan, read_curves

Result = TypeVar("Result")

CLASSES = (
    ("Express", "passenger", 160, 30, 430, 0.25, 1.6),
    ("Regional", "passenger", 120, 40, 180, 0.3, 1.5),
    ("Freight", "freight", 90, 25, 1500, 0.2, 1.8),
    ("Heavy", "freight", 70, 12, 3200, 0.2, 2.1),
)
LIMITS = (
    ("cant", 150, 160, "mm"),
    ("minimum cant", 20, None, "mm"),
    ("cant deficiency", 130, 150, "mm"),
    ("cant excess", 90, 110, "mm"),
    ("cant gradient", 2.0, 2.5, "mm/m"),
    ("rate of change of cant", 50, 60, "mm/s"),
    ("rate of change of cant deficiency", 50, 75, "mm/s"),
    ("abrupt change of cant deficiency", 60, 80, "mm"),
)


def register(rows: int) -> bytes:
    """Make a register of curves, a third of them in chains, as a workbook."""
    chance = random.Random(1)
    stream = io.BytesIO()
    book = xlsxwriter.Workbook(stream, {"constant_memory": True})
    sheet = book.add_worksheet("Curves")
    heads = ["Line", "Track", "Curve", "Start (km)", "End (km)", "Radius (m)", "Hand", "Length (m)"]
    heads += ["Transition in (m)", "Transition out (m)", "Cant (mm)", "Speed (km/h)", "Situation", "Remarks"]
    sheet.write_row(0, 0, heads)
    km = 0.0
    for number in range(rows):
        if number % 1000 == 0:
            km = 0.0
        shared = number % 3 == 1
        radius = chance.choice([300, 450, 600, 800, 1000, 1400, 2000, 3000])
        speed = min(160, 5 * int((radius * 22) ** 0.5 // 5))
        transition = max(30, speed // 10 * 8)
        start = km + (transition / 1000 if shared else 0.5 + chance.random())
        length = chance.randint(120, 600)
        km = start + length / 1000
        place = [f"Line {number // 1000}", "1", str(number), round(start, 3), round(km, 3), radius]
        rest = [chance.choice("LR"), length, transition, transition, 5 * chance.randint(0, 25), speed]
        sheet.write_row(number + 1, 0, [*place, *rest, "", f"note {number}"])
    traffic = book.add_worksheet("Traffic")
    traffic.write_row(
        0,
        0,
        ["Class", "Category", "Speed", "Trains per day", "Mass", "Roll coefficient", "Centre of gravity"],
    )
    for line, row in enumerate(CLASSES, start=1):
        traffic.write_row(line, 0, row)
    limits = book.add_worksheet("Limits")
    limits.write_row(0, 0, ["Quantity", "Normal", "Exceptional", "Unit"])
    for line, limit in enumerate(LIMITS, start=1):
        limits.write_row(line, 0, ["" if value is None else value for value in limit])
    settings = book.add_worksheet("Settings")
    settings.write_row(0, 0, ["Name", "Value"])
    settings.write_row(1, 0, ["Tiers", "normal, exceptional"])
    book.close()
    return stream.getvalue()


def timed(name: str, work: Callable[[], Result]) -> Result:
    """Do some work and print how long it took and the largest memory so far."""
    begin = time.process_time()
    result = work()
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    used = time.process_time() - begin
    print(f"  {name:<12} {used:8.2f} s of processor   peak {peak:7.0f} MiB", flush=True)
    return result


def main(sizes: list[int]) -> None:
    """Time each stage for each size."""
    for rows in sizes:
        data = register(rows)
        print(f"{rows} curves, {len(CLASSES)} classes, {len(data) / 1e6:.1f} MB")
        reading = timed("read", lambda data=data: read_curves(data, "register.xlsx"))
        planned = timed("plan", lambda reading=reading: make_plan(reading))
        size = timed("json", lambda planned=planned: sum(len(piece) for piece in planned.json_chunks()))
        book = timed(
            "workbook", lambda planned=planned, data=data: annotated_workbook(planned, data, "register.xlsx")
        )
        print(f"  JSON {size / 1e6:.1f} MB, workbook {len(book.data) / 1e6:.1f} MB")


if __name__ == "__main__":
    main([int(word) for word in sys.argv[1:]] or [1000, 10_000])
