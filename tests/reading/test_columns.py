"""The columns dictionary: complete, without contradictions, and understood heading by heading."""

from __future__ import annotations

import re

import pytest

from cant.files.grid import Sheet
from cant.reading.columns import KINDS, TABLES, all_columns, columns_of, strong_headings
from cant.reading.headings import MILES_CHAINS, MILES_YARDS, analyse, matches
from cant.reading.layout import Block, BlockColumn
from cant.reading.meanings import decide
from cant.reading.text import fold
from cant.units import UNITS

LANGUAGES = ("en", "de", "fr", "es", "it", "pt", "pl", "cs", "no", "sv", "da")
CONTRACT = {
    "curves": "Line, Track, Curve, Start, End, Radius, Hand, Length, Transition in, Transition out, "
    "Cant ramp in, Cant ramp out, Shape, Cant, Cant fixed, Cant at most, Cant at least, Speed, Situation",
    "traffic": "Class, Category, Speed, Trains per day, Mass, Roll coefficient, Centre of gravity, Regular, "
    "Line, Track",
    "limits": "Quantity, Normal, Exceptional, Unit, Category, Situation, Speed over, Speed up to, "
    "Radius over, Radius up to, Per metre of radius, Kind, Clause, Note",
}


@pytest.mark.parametrize("table", sorted(CONTRACT))
def test_every_canonical_heading_is_there_and_no_other(table: str) -> None:
    assert [c.name for c in columns_of(table)] == CONTRACT[table].split(", ")


def test_every_column_is_whole() -> None:
    for info in all_columns():
        assert info.table in TABLES
        assert info.kind in KINDS, info.name
        assert info.help.endswith("."), info.name
        assert not info.unit or info.unit in UNITS


@pytest.mark.parametrize("language", LANGUAGES)
def test_every_language_has_the_main_columns_of_a_curve_list(language: str) -> None:
    for name in (
        "Line",
        "Track",
        "Curve",
        "Start",
        "End",
        "Radius",
        "Hand",
        "Length",
        "Transition",
        "Cant",
        "Speed",
    ):
        info = next(c for c in all_columns() if c.table == "curves" and c.name == name)
        assert info.headings is not None
        assert info.headings.get(language), (name, language)


def test_a_heading_never_has_two_meanings_in_one_table() -> None:
    for table in TABLES:
        for heading, meanings in strong_headings(table).items():
            assert len({meaning for meaning, _ in meanings}) == 1, (table, heading, meanings)


@pytest.mark.parametrize("name", [c.name for c in all_columns() if c.table == "curves"])
def test_every_heading_is_recognised_also_in_capitals_and_with_a_unit(name: str) -> None:
    info = next(c for c in all_columns() if c.table == "curves" and c.name == name)
    weak = {fold(w) for w in info.weak}
    for heading in (h for group in (info.headings or {}).values() for h in group if fold(h) not in weak):
        with_unit = f"{heading} ({info.unit})" if info.unit else heading
        for text in (heading, heading.replace("ß", "SS").upper(), with_unit, heading.replace(" ", "\n")):
            found = matches(analyse(text).words)
            assert found, text
            assert found[0].meaning == name, (text, found)


@pytest.mark.parametrize(
    ("text", "words", "unit", "notation", "chord"),
    [
        ("Radius (m)", "radius", "m", "", None),
        ("r [m]", "r", "m", "", None),
        ("Mileage from (m.ch)", "mileage from", "mi", MILES_CHAINS, None),
        ("Start (miles.yds)", "start", "", MILES_YARDS, None),
        ("PSGR MPH", "psgr", "mph", "", None),
        ("ELEV (IN)", "elev", "in", "", None),
        ("Versine(20m chord)", "versine", "", "", 20.0),
        ("Flèche 20 m (mm)", "fleche", "mm", "", 20.0),
        ("Flecha c/20 m", "flecha", "", "", 20.0),
        ("mid-ordinate (62 ft chord)", "mid ordinate", "", "", 62 * 0.3048),
        ("Superelev. (cm)", "superelev", "cm", "", None),
        ("Transition in", "transition in", "", "", None),
        ("Rad m", "rad", "m", "", None),
        ("TP km", "tp km", "km", "", None),
        ("Speed over (mph)", "speed over", "mph", "", None),
        ("Cant\n(mm)", "cant", "mm", "", None),
        ("Radius  in  feet", "radius in", "ft", "", None),
    ],
)
def test_headings_taken_apart(text: str, words: str, unit: str, notation: str, chord: float | None) -> None:
    heading = analyse(text)
    assert (heading.words, heading.unit, heading.notation) == (words, unit, notation)
    assert heading.chord_m == (None if chord is None else pytest.approx(chord))


@pytest.mark.parametrize(
    ("text", "meaning", "train"),
    [
        ("Speed Express", "Speed", "express"),
        ("Vmax pas.", "Speed", "pas"),
        ("vGz", "Speed", "gz"),
        ("PS HST", "Speed", "hst"),
        ("FRT MPH", "Speed", "frt"),
        ("Booked goods", "Speed", "goods"),
        ("V fret", "Speed", "fret"),
        ("V mercancías", "Speed", "mercancias"),
        ("Merci", "Speed", "merci"),
        ("Hast. gods", "Speed", "gods"),
        ("V nákl.", "Speed", "nakl"),
        ("货车V", "Speed", "货车"),
        ("Line speed", "Speed", ""),
        ("Vmax", "Speed", ""),
        ("Sth", "Speed", ""),
        ("Cant", "Cant", ""),
        ("Frt tonnage", "", ""),
    ],
)
def test_speed_headings(text: str, meaning: str, train: str) -> None:
    sheet = Sheet("s", [[text]])
    [column] = decide(Block(sheet, 1, 1, 1, [BlockColumn(0, (text,))]), {})
    if text == "Frt tonnage":
        assert column.meaning != "Speed"
    else:
        assert (column.meaning, column.train) == (meaning, train)


def test_the_program_names_no_unit_that_it_does_not_know() -> None:
    for info in all_columns():
        for headings in (info.headings or {}).values():
            for heading in headings:
                assert not re.search(r"\((mm|cm|m|km|in|ft|mph)\)", heading), heading
