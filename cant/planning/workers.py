"""Independent parts of a plan worked on side by side.

Threads, because the arrays need not be copied to another process and numpy lets other threads work while it
computes; no part may change what another reads.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TypeVar

Part = TypeVar("Part")
Result = TypeVar("Result")

MOST = 2
"""Between two computations only one thread works at a time: more than these mostly wait for each other."""


def side_by_side(work: Callable[[Part], Result], parts: Sequence[Part]) -> list[Result]:
    """Do the same work on several parts, and give the results in their order.

    Parameters
    ----------
    work : callable
    parts : sequence
        A single one is worked on right here.
    """
    threads = min(len(parts), os.cpu_count() or 1, MOST)
    if threads < 2:
        return [work(part) for part in parts]
    with ThreadPoolExecutor(threads, thread_name_prefix="plan") as pool:
        return list(pool.map(work, parts))
