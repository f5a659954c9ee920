"""What a reading and a plan follow from, and how they are made of it: the same here and in the background."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from cant import service
from cant.model.reading import Reading
from cant.service import PlannedLine, Progress
from webapp.changes import together
from webapp.decisions import Decided
from webapp.tables import TRAFFIC_FILE, traffic_csv

READING_KINDS = ("answers", "traffic", "limits")
PLAN_KINDS = ("answers", "traffic", "limits", "settings", "change")


@dataclass(frozen=True)
class Basis:
    """A file and what is decided over it.

    Attributes
    ----------
    file_name, file_digest : str
    decided : Decided
    """

    file_name: str
    file_digest: str
    decided: Decided

    def key(self, kinds: tuple[str, ...]) -> str:
        """Give a key under which what follows from the file and some kinds of decisions may be kept."""
        return f"{self.file_digest}/{self.file_name}/{self.decided.digest(*kinds)}"

    def texts(self, kinds: tuple[str, ...]) -> Mapping[str, str]:
        """Give the ruling texts of some kinds of decisions."""
        return {kind: self.decided.texts.get(kind, "null") for kind in kinds}

    def read(self, data: bytes) -> Reading:
        """Read the file; CantError where it, or an answer, cannot be used."""
        decided = self.decided
        traffic = None if decided.traffic is None else (traffic_csv(decided.traffic), TRAFFIC_FILE)
        return service.read_curves(
            data, self.file_name, traffic=traffic, limits=decided.limits, answers=decided.answers
        )

    def plan(self, reading: Reading, progress: Progress | None = None) -> PlannedLine:
        """Plan what was read; CantError where there are no trains or limits, or they cannot be used."""
        decided = self.decided
        return service.make_plan(
            reading,
            traffic=decided.traffic,
            limits=decided.limits,
            settings=decided.settings,
            decision=together(decided.changes),
            progress=progress,
        )
