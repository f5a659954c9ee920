"""What the workbook costs: ``cant plan`` as a whole against LibreOffice opening and recalculating its result.

Run by hand::

    python tests/benchmarks/bench_workbook.py [ROWS ...]

For each size, from a workbook and from separated text, with the workbook alone and with the JSON beside it,
it prints the seconds of the whole command (wall clock and processor, in a process of its own) and its peak
of memory; and of the workbook how large it is, and how long LibreOffice takes to load, recalculate and save
it.
"""

from __future__ import annotations

import csv
import os
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from bench_plan import register

from cant.files.open import open_workbook

PROFILE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load">
<prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop></item></oor:items>
"""
"""Settings of LibreOffice: recalculate every file when it is loaded."""


def timed(command: list[str]) -> tuple[float, float, float]:
    """Run a command; give wall clock and processor seconds, and its peak of memory [MiB]."""
    begin = time.perf_counter()
    child = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    _, status, usage = os.wait4(child.pid, 0)
    wall = time.perf_counter() - begin
    child.returncode = os.waitstatus_to_exitcode(status)
    if child.returncode:
        raise subprocess.CalledProcessError(child.returncode, command)
    return wall, usage.ru_utime + usage.ru_stime, usage.ru_maxrss / 1024


def as_text(data: bytes, folder: Path) -> list[str]:
    """Write the sheets of a register as separated text; give the arguments of the command that name them."""
    paths: dict[str, Path] = {}
    for sheet in open_workbook(data, "register.xlsx").sheets:
        paths[sheet.name] = folder / f"{sheet.name}.csv"
        with paths[sheet.name].open("w", newline="", encoding="utf-8") as stream:
            csv.writer(stream).writerows(sheet.rows)
    beside = [
        word for name in ("Traffic", "Limits", "Settings") for word in (f"--{name.lower()}", paths[name])
    ]
    return [str(word) for word in (paths["Curves"], *beside)]


def measure(rows: int, folder: Path, office: list[str] | None) -> None:
    """Measure one size."""
    data = register(rows)
    source, result, document = folder / "list.xlsx", folder / "plan.xlsx", folder / "plan.json"
    source.write_bytes(data)
    outputs = {"workbook": ["--out", str(result)]}
    outputs["workbook and JSON"] = [*outputs["workbook"], "--json", str(document)]
    for kind, given in (("xlsx", [str(source)]), ("csv", as_text(data, folder))):
        for name, wanted in outputs.items():
            wall, used, peak = timed([sys.executable, "-m", "cant", "plan", *given, *wanted])
            what = f"{rows:>7} curves, {kind:>4}, {name:<17}"
            print(f"{what} {wall:7.1f} s wall, {used:7.1f} s of processor, peak {peak:6.0f} MiB", flush=True)
        if office is not None and kind == "xlsx":
            size = result.stat().st_size / 1e6
            wall, used, _ = timed([*office, "--outdir", str(folder / "out"), str(result)])
            what = f"{'LibreOffice, file of':>23} {size:6.1f} MB {'':<8}"
            print(f"{what} {wall:7.1f} s wall, {used:7.1f} s of processor", flush=True)


def main(sizes: list[int]) -> None:
    """Measure each size."""
    program = shutil.which("soffice")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        profile = folder / "profile"
        (profile / "user").mkdir(parents=True)
        (profile / "user" / "registrymodifications.xcu").write_text(PROFILE, encoding="utf-8")
        settings = f"-env:UserInstallation={profile.as_uri()}"
        office = [program, settings, "--headless", "--convert-to", "xlsx"] if program else None
        for rows in sorted(sizes):
            measure(rows, folder, office)


if __name__ == "__main__":
    main([int(word) for word in sys.argv[1:]] or [1000, 10_000])
