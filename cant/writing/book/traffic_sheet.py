"""The traffic as used, one row a class, line and track; the sheets of calculation refer to its cells."""

from __future__ import annotations

from cant.model.traffic import Traffic, TrainClass
from cant.writing.book.inputs import Inputs
from cant.writing.book.ledger import FIXED, INPUT, Ledger, LedgerColumn, quoted
from cant.writing.columns import Cell
from cant.writing.sheets import NewSheets

FIRST_ROW = 5
_LETTERS = {
    "class": "A",
    "category": "B",
    "speed": "C",
    "trains": "D",
    "mass": "E",
    "roll": "F",
    "height": "G",
    "regular": "H",
}


class TrafficSheet:
    """The sheet "Traffic used".

    Parameters
    ----------
    traffic : Traffic
    inputs : Inputs
    name : str
        Name of the sheet.
    """

    def __init__(self, traffic: Traffic, inputs: Inputs, name: str) -> None:
        self._traffic = traffic
        self._inputs = inputs
        self.name = name
        self._row = {id(row): FIRST_ROW + i for i, row in enumerate(traffic.rows)}
        self._of_place: dict[tuple[str, str], dict[str, TrainClass]] = {}

    def column(self, key: str) -> str:
        """Give a column with its sheet, as formulas refer to it."""
        return f"{quoted(self.name)}!${_LETTERS[key]}$"

    def train(self, line: str, track: str, name: str) -> TrainClass:
        """Give the row of the traffic table that holds for a class on a line and track."""
        if (line, track) not in self._of_place:
            self._of_place[line, track] = self._traffic.on(line, track)
        return self._of_place[line, track][name]

    def row_of(self, train: TrainClass) -> int:
        """Give the row of the sheet in which a row of the traffic table stands."""
        return self._row[id(train)]

    def write(self, book: NewSheets) -> None:
        """Write the sheet."""
        sheet = book.table(self.name)
        sheet.paragraph(
            "The traffic as read. The speeds, numbers, masses and coefficients are inputs: the sheets of "
            "calculation refer to these cells.",
            8,
            110,
        )
        rows, display = self._traffic.rows, self._inputs.display
        ledger = Ledger(sheet, FIRST_ROW, len(rows))

        def add(key: str, heading: str, unit: str, values: list[Cell], number: bool, width: float) -> None:
            ledger.add(
                LedgerColumn(
                    key,
                    heading,
                    unit,
                    "as read",
                    values,
                    "General" if number else None,
                    INPUT if number else FIXED,
                    None,
                    width,
                )
            )

        add("class", "Class", "", [row.name for row in rows], False, 18)
        add("category", "Category", "", [row.category for row in rows], False, 12)
        for key, heading, kind, name in (
            ("speed", "Speed", "speed", "speed_kmh"),
            ("trains", "Trains per day", "count", "trains_per_day"),
            ("mass", "Mass of a train", "mass", "mass_t"),
            ("roll", "Roll coefficient s", "number", "roll_coefficient"),
            ("height", "Centre of gravity h", "height", "centre_of_gravity_m"),
        ):
            shown = display[kind]
            add(key, heading, shown.unit, [shown.value(getattr(row, name)) for row in rows], True, 11)
        add("regular", "Regular", "", ["yes" if row.regular else "no" for row in rows], False, 9)
        add("line", "Line", "blank: everywhere", [row.line for row in rows], False, 20)
        add("track", "Track", "blank: all", [row.track for row in rows], False, 10)
        add("place", "Read from", "", [_place(row) for row in rows], False, 24)
        ledger.write(keep=1)


def _place(row: TrainClass) -> str:
    place = row.place
    return ", ".join(word for word in (place.sheet or "", f"row {place.row}" if place.row else "") if word)
