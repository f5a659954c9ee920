"""One column of a curve table while it is being understood: its cells, its heading, and what was decided."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import islice

from cant.files.grid import Value
from cant.reading.headings import Heading
from cant.reading.text import fold, is_blank, shown, squeeze


@dataclass
class Column:
    """One column of a curve table with its meaning.

    Attributes
    ----------
    index : int
    heading : Heading
    meaning : str
        Canonical name; ``Speed`` with ``train`` where it is a class's; "" where it is the user's own.
    unit, unit_from : str
        As far as heading or unit row say; "" where nothing says it yet.
    train : str
        Folded words of the train that a speed column names, "" for the line speed.
    train_name : str
        The same as the user wrote it.
    confidence, note : str
    train_part : str
        Folded lowest part of a speed heading, whole: ``tipo n``.
    literal : bool
        True for a canonical ``Speed NAME``.
    cells : list of Value
        Values of the data rows.
    """

    index: int
    heading: Heading
    meaning: str = ""
    unit: str = ""
    unit_from: str = ""
    train: str = ""
    train_name: str = ""
    confidence: str = "certain"
    note: str = ""
    literal: bool = False
    cells: Sequence[Value] = field(default_factory=list)
    train_part: str = ""

    @property
    def notation(self) -> str:
        """Notation that the heading names."""
        return self.heading.notation

    @property
    def is_canonical(self) -> bool:
        """Whether the heading is the canonical one of the meaning, but for case and unit."""
        return self.literal or (not self.train and self.heading.words == fold(self.meaning))

    def samples(self, count: int = 3) -> tuple[str, ...]:
        """Give some values as they stand."""
        texts = (squeeze(shown(cell)) for cell in dict.fromkeys(self.cells) if not is_blank(cell))
        return tuple(islice(dict.fromkeys(islice(texts, 4 * count)), count))
