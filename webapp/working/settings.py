"""How much work is done in the background, by how many, for how long: one record with defaults."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, field, fields

from webapp.guarding.bounds import PREFIX, whole_number


def _processors() -> int:
    return max((os.cpu_count() or 1) - 1, 1)


@dataclass(frozen=True)
class Work:
    """Settings of background work; each is set by the variable of its name in capitals behind ``CANT_``.

    Attributes
    ----------
    workers : int
        Pieces of work done at the same time; beside them one that is soon done. 0: none by this service, for
        others do it (``python -m webapp.working``).
    work_minutes : int
        How long one piece may take.
    work_mb : int
        Memory that one piece may take [MB of 1e6 bytes].
    waiting_per_person, waiting_in_all : int
        Pieces of one person, and of all, that may wait at the same time.
    long_file_kb : int
        From this size on [kB of 1e3 bytes] a list is read and planned in the background.
    long_curves : int
        Above so many curves workbook and JSON are made in the background.
    curves_in_memory : int
        Curves of all computed plans kept at hand together; the latest plan is kept however long it is.
    """

    workers: int = field(default_factory=_processors)
    work_minutes: int = 30
    work_mb: int = 4_000
    waiting_per_person: int = 10
    waiting_in_all: int = 200
    long_file_kb: int = 200
    long_curves: int = 500
    curves_in_memory: int = 150_000

    @classmethod
    def from_environment(cls, given: Mapping[str, str]) -> Work:
        """Take the settings from variables; InputError where one is not a whole number."""
        usual = cls()
        found = {}
        for one in fields(cls):
            least = 0 if one.name in ("workers", "long_file_kb") else 1
            name = f"{PREFIX}{one.name.upper()}"
            found[one.name] = whole_number(given, name, getattr(usual, one.name), least)
        return cls(**found)
