"""A planned line as everybody above sees it: its records, and the outputs made of them."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import TYPE_CHECKING, Any

from cant.writing import document, frames
from cant.writing.records import PlannedRecords

if TYPE_CHECKING:
    import pandas as pd


class PlannedLine(PlannedRecords):
    """A plan with the reading it came from, the words that go with it, and the forms it is given out in."""

    def document(self) -> dict[str, Any]:
        """Give the JSON of the plan as one dict (contract: metric always)."""
        return {"curves": list(self.records()), **document.frame_of(self)}

    def json_chunks(self, also: Callable[[dict[str, Any]], object] | None = None) -> Iterator[bytes]:
        """Give the JSON of the plan as UTF-8 in pieces, without holding it all.

        Parameters
        ----------
        also : callable, optional
            Called with each record, for another output that is made of them in the same pass.
        """
        return document.chunks(self, also)

    def to_frames(self) -> dict[str, pd.DataFrame]:
        """Give the plan as data frames: see :func:`cant.writing.frames.to_frames`."""
        return frames.to_frames(self)
