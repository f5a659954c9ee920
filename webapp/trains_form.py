"""The traffic table as a form: one row a class of train, shown in the units of the page."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from pydantic import ValidationError

from cant.model.traffic import Traffic, TrainClass
from webapp.forms import Fields
from webapp.measures import Measures

SPARE_ROWS = 2
MOST_ROWS = 200
NUMBERS: tuple[tuple[str, str | None], ...] = (
    ("speed_kmh", "speed exact"),
    ("trains_per_day", None),
    ("mass_t", "mass"),
    ("roll_coefficient", None),
    ("centre_of_gravity_m", "height"),
)
TEXTS = ("name", "category", "line", "track")


def shown_rows(
    traffic: Traffic | None, measures: Measures, named: Sequence[str] = ()
) -> list[dict[str, str]]:
    """Give the rows of the form for a traffic table, and blank ones to fill in.

    Parameters
    ----------
    traffic : Traffic or None
    measures : Measures
        Units in which the form is shown.
    named : sequence of str
        Classes that the curve list names in its speed columns; proposed where there is no traffic yet.

    Returns
    -------
    list of dict
        By name of the field without its row: texts as a field shows them, ``regular`` "yes" or "".
    """
    fields = Fields({}, measures)
    rows = []
    for number, row in enumerate(traffic.rows if traffic else ()):
        shown = {name: getattr(row, name) for name in TEXTS}
        shown |= {name: fields.shown(getattr(row, name), kind) for name, kind in NUMBERS}
        rows.append({**shown, "regular": "yes" if row.regular else "", "from": str(number)})
    if not rows:
        rows = [{**blank_row(), "name": name} for name in named]
    return rows + [blank_row() for _ in range(SPARE_ROWS if rows else SPARE_ROWS + 2)]


def blank_row() -> dict[str, str]:
    """Give a row to fill in."""
    return {**dict.fromkeys((*TEXTS, *(name for name, _ in NUMBERS)), ""), "regular": "yes", "from": ""}


def sent_rows(given: Mapping[str, str]) -> list[dict[str, str]]:
    """Give the rows of a form as sent, to be shown again."""
    count = min(_whole(given.get("rows", "0")), MOST_ROWS)
    names = (*TEXTS, *(name for name, _ in NUMBERS), "regular", "from", "remove")
    return [{name: given.get(f"{i}-{name}", "") for name in names} for i in range(count)]


def parse(
    given: Mapping[str, str], measures: Measures, before: Traffic | None
) -> tuple[Traffic | None, dict[str, str]]:
    """Give the traffic of a form that was sent, and the problems by field.

    Parameters
    ----------
    given : mapping of str to str
    measures : Measures
        Units in which the form was shown.
    before : Traffic or None
        What the form was shown with: what was not changed stays as exact as it was.
    """
    fields = Fields(given, measures)
    rows: list[TrainClass] = []
    for number, sent in enumerate(sent_rows(given)):
        if sent["remove"] or not any(sent[name].strip() for name in (*TEXTS, "speed_kmh")):
            continue
        row = _row(fields, number, _before(sent["from"], before))
        if row is not None:
            rows.append(row)
    _check_together(rows, fields)
    return (None, fields.problems) if fields.problems else (Traffic.of(rows), {})


def _row(fields: Fields, number: int, before: TrainClass | None) -> TrainClass | None:
    values: dict[str, object] = {
        "name": fields.text(f"{number}-name", words="the name of the class", needed=True),
        "category": fields.text(f"{number}-category", words="the category", needed=True).lower(),
        "line": fields.text(f"{number}-line"),
        "track": fields.text(f"{number}-track"),
        "regular": fields.yes(f"{number}-regular"),
    }
    for name, kind in NUMBERS:
        lowest = -1.0 if name == "roll_coefficient" else 0.0
        known = None if before is None else getattr(before, name)
        values[name] = fields.number(f"{number}-{name}", kind, before=known, lowest=lowest)
    try:
        return TrainClass.model_validate(values)
    except ValidationError as error:
        fields.problems.setdefault(f"{number}-name", error.errors()[0]["msg"])
        return None


def _check_together(rows: list[TrainClass], fields: Fields) -> None:
    if not rows and not fields.problems:
        fields.problems["0-name"] = "at least one class of train is needed"
    seen: set[tuple[str, str, str]] = set()
    for number, row in enumerate(rows):
        key = (row.name.casefold(), row.line.casefold(), row.track.casefold())
        if key in seen:
            fields.problems[f"{number}-name"] = f"{row.name} stands here twice for the same line and track"
        seen.add(key)


def _before(number: str, traffic: Traffic | None) -> TrainClass | None:
    at = _whole(number) if number else -1
    return traffic.rows[at] if traffic is not None and 0 <= at < len(traffic.rows) else None


def _whole(text: str) -> int:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 6 else 0
