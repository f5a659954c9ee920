"""Opens every hostile file, one after the other, within 2 GiB; says on standard output what came of each."""

from __future__ import annotations

import json
import resource
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

from hostile import FILES

from cant.errors import FileError
from cant.files.open import open_workbook


def main() -> None:
    bound = 2 << 30
    resource.setrlimit(resource.RLIMIT_AS, (bound, bound))
    for name, one in FILES.items():
        data = one.make()
        start = time.perf_counter()
        try:
            workbook = open_workbook(data, name + one.suffix)
            outcome = {"read": [sheet.rows[:2] for sheet in workbook.sheets[:2]]}
        except FileError as error:
            outcome = {"refused": str(error)}
        outcome |= {"name": name, "seconds": time.perf_counter() - start}
        outcome["peak_mib"] = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
        print(json.dumps(outcome, default=str), flush=True)


if __name__ == "__main__":
    main()
