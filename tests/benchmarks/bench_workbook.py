"""What the workbook costs: ``cant plan`` as a whole against LibreOffice opening and recalculating its result.

Run by hand::

    python tests/benchmarks/bench_workbook.py [ROWS ...]

For each size it prints the seconds of the whole command (wall clock and processor, in a process of its
own), its
peak of memory, the size of the file, and how long LibreOffice takes to load, recalculate and save it.
"""

from __future__ import annotations

import resource
import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from bench_plan import register

PROFILE = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load">
<prop oor:name="OOXMLRecalcMode" oor:op="fuse"><value>0</value></prop></item></oor:items>
"""
"""Settings of LibreOffice: recalculate every file when it is loaded."""


def timed(command: list[str]) -> tuple[float, float, float]:
    """Run a command; give wall clock and processor seconds, and the peak of all children so far [MiB]."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    begin = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    wall = time.perf_counter() - begin
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    used = after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime
    return wall, used, after.ru_maxrss / 1024


def main(sizes: list[int]) -> None:
    """Measure each size."""
    office = shutil.which("soffice")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        profile = folder / "profile"
        (profile / "user").mkdir(parents=True)
        (profile / "user" / "registrymodifications.xcu").write_text(PROFILE, encoding="utf-8")
        for rows in sorted(sizes):
            source, result = folder / f"{rows}.xlsx", folder / f"{rows}_plan.xlsx"
            source.write_bytes(register(rows))
            command = [sys.executable, "-m", "cant", "plan", str(source), "--out", str(result)]
            wall, used, peak = timed(command)
            size = result.stat().st_size / 1e6
            print(f"{rows:>7} curves: cant plan {wall:7.1f} s wall, {used:7.1f} s of processor,", end=" ")
            print(f"peak {peak:6.0f} MiB, file {size:6.1f} MB", flush=True)
            if office is not None:
                out = ["--convert-to", "xlsx", "--outdir", str(folder / "out"), str(result)]
                command = [office, f"-env:UserInstallation={profile.as_uri()}", "--headless", *out]
                wall, used, _ = timed(command)
                print(f"{'':>15} LibreOffice {wall:6.1f} s wall, {used:7.1f} s of processor", flush=True)


if __name__ == "__main__":
    main([int(word) for word in sys.argv[1:]] or [1000, 10_000])
