"""The traffic table: one row a class of train."""

from __future__ import annotations

from cant.errors import InputError
from cant.files.grid import Sheet
from cant.model.traffic import Traffic, TrainClass
from cant.reading.records import Cell, Record, RecordTable, read_records
from cant.reading.text import fold
from cant.reading.words import lexicon

MOST_CLASSES = 200


def read_traffic(sheet: Sheet, file: str) -> tuple[Traffic, RecordTable]:
    """Read the traffic table of a sheet.

    Raises
    ------
    InputError
        A heading or unit that is not known, no row, a class without name or category, a negative value, the
        same class twice for the same line and track, too many classes.
    """
    table = read_records(sheet, file, "traffic")
    rows = [_train_class(record) for record in table.records]
    seen: dict[tuple[str, str, str], TrainClass] = {}
    for row in rows:
        key = (row.name.casefold(), row.line, row.track)
        if key in seen:
            where = f" on line '{row.line}', track '{row.track}'" if row.line or row.track else ""
            first = seen[key].place.row
            message = f"class '{row.name}' is there twice{where} (row {first} too); each belongs there once"
            raise InputError(message, row.place)
        seen[key] = row
    if len({name for name, _, _ in seen}) > MOST_CLASSES:
        message = (
            f"the traffic table has more than {MOST_CLASSES} classes, which is as many as are planned for"
        )
        raise InputError(message, rows[-1].place)
    return Traffic.of(rows), table


def _train_class(record: Record) -> TrainClass:
    name = record["Class"]
    if name.blank:
        message = "a row of the traffic table has no class; each row names its class"
        raise InputError(message, name.place)
    return TrainClass(
        name=name.text,
        category=_category(record["Category"]),
        speed_kmh=_amount(record, "Speed", "km/h"),
        trains_per_day=_amount(record, "Trains per day"),
        mass_t=_amount(record, "Mass", "t"),
        roll_coefficient=_amount(record, "Roll coefficient"),
        centre_of_gravity_m=_amount(record, "Centre of gravity", "m"),
        regular=record["Regular"].yes_no(default=True) if "Regular" in record else True,
        line=record["Line"].text if "Line" in record and not record["Line"].blank else "",
        track=record["Track"].text if "Track" in record and not record["Track"].blank else "",
        place=name.place,
    )


def _category(cell: Cell) -> str:
    if cell.blank:
        message = "a class has no category; passenger, freight, or a word of your own that the limits use"
        raise InputError(message, cell.place)
    return category_word(cell.text)


def category_word(text: str) -> str:
    """Give the category that a text names: passenger or freight in any language, else the user's word."""
    word = " ".join(text.casefold().split())
    known = lexicon("categories").get(fold(text))
    return known if known is not None and len(fold(text)) > 2 else word


def _amount(record: Record, name: str, unit: str = "") -> float | None:
    cell = record.get(name)
    if cell is None:
        return None
    value = cell.number(unit)
    if value is not None and value < 0:
        message = f"'{cell.text}' is negative; {cell.heading} is 0 or more"
        raise InputError(message, cell.place)
    return value
