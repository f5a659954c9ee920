"""How a list was read: questions answered and columns corrected on the page, as a reading file would."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest
from web_tools import TRAINS, Browser

from cant import service
from cant.errors import column_letter
from cant.model.reading import ColumnReading, Question, Reading, SheetReading
from webapp import reading_form


def field_of(page: str, heading: str) -> str:
    """Give the name of the field that says what a column is read as."""
    found = re.search(rf'name="(c-\d+)-meaning" aria-label="Column \w+ {re.escape(heading)} ', page)
    assert found is not None, heading
    return found.group(1)


@pytest.fixture
def reading(bare_list: Path) -> Reading:
    return service.read_curves(bare_list.read_bytes(), bare_list.name)


def test_page_shows_every_column_with_samples(browser: Browser, bare_list: Path, reading: Reading) -> None:
    plan = browser.upload(bare_list)
    page = browser.get(f"{plan}/list").text
    for column in reading.columns:
        assert f">{column.heading}</th>" in page
        for sample in column.samples:
            assert f"<span>{sample}</span>" in page
    assert "certain" in page


def test_corrected_column_is_read_otherwise_and_can_be_taken_back(browser: Browser, bare_list: Path) -> None:
    bare_list.write_text(bare_list.read_text().replace("Cant,Speed", "Ist,Speed").replace("Ist", "Height"))
    plan = browser.upload(bare_list)
    before = browser.get(f"{plan}/list").text
    field = field_of(before, "Height")
    answer = browser.post(f"{plan}/list", {f"{field}-meaning": "Cant"})
    assert answer.status_code == 303
    browser.post(f"{plan}/trains", TRAINS)
    browser.post(f"{plan}/limits/choose", {"source": "set:typical"})
    browser.post(f"{plan}/confirm")
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert [c["existing_cant_mm"] for c in document["curves"]] == [60, 100, 40]
    field = field_of(browser.get(f"{plan}/list").text, "Height")
    browser.post(f"{plan}/list", {f"{field}-meaning": "Cant", f"{field}-unit": "in"})
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert document["rejected"] or document["curves"][0]["existing_cant_mm"] == pytest.approx(60 * 25.4)
    browser.post(f"{plan}/list/forget")
    assert "Take my answers back" not in browser.get(f"{plan}/list").text


def test_correction_that_cannot_be_followed_is_not_kept(browser: Browser, bare_list: Path) -> None:
    plan = browser.upload(bare_list)
    page = browser.get(f"{plan}/list").text
    field = field_of(page, "Radius (m)")
    answer = browser.post(f"{plan}/list", {f"{field}-meaning": "Colour of the fence"})
    assert answer.status_code == 422
    assert "not known" in answer.text
    assert "3 of 3 curve rows" in browser.get(f"{plan}/list").text


def asked(*questions: Question) -> Reading:
    reading = service.read_curves(b"Curve,Radius (m),Speed\nA,500,80\n", "a.csv")
    reading.questions.extend(questions)
    return reading


def test_answers_have_the_format_of_a_reading_file() -> None:
    degree = Question("S1", "Deg", "Which degree?", ("100 ft arc", "100 ft chord"))
    sign = Question("S1", "Deg", "Which sign?", ("left is positive", "right is positive"))
    reading = asked(degree, sign)
    found = reading_form.answers({"q-0": "100 ft arc", "q-1": "right is positive"}, reading, None)
    assert found == {"answers": {"S1": {"Deg": ["100 ft arc", "right is positive"]}}}
    changed = reading_form.answers({"q-0": "100 ft chord"}, reading, found)
    assert changed == {"answers": {"S1": {"Deg": ["right is positive", "100 ft chord"]}}}
    assert reading_form.answers({"q-0": "made up"}, reading, None) is None


def test_corrections_are_kept_by_letter_and_merged() -> None:
    reading = service.read_curves(b"Curve,Radius (m),Speed\nA,500,80\n", "a.csv")
    radius = next(n for n, c in enumerate(reading.columns) if c.meaning == "Radius")
    letter = column_letter(reading.columns[radius].index)
    first = reading_form.answers({f"c-{radius}-unit": "ch"}, reading, None)
    assert first == {"columns": {"": {letter: {"unit": "ch"}}}}
    both = reading_form.answers({f"c-{radius}-meaning": ""}, reading, first)
    assert both == {"columns": {"": {letter: {"unit": "ch", "meaning": ""}}}}
    assert reading_form.answers({f"c-{radius}-meaning": "Radius"}, reading, None) is None
    service.read_curves(b"Curve,Radius (m),Speed\nA,500,80\n", "a.csv", answers=first)


def test_only_units_of_the_same_dimension_are_offered() -> None:
    column = ColumnReading("S", 0, "Radius", "Radius", "m")
    base = service.read_curves(b"Curve,Radius (m),Speed\nA,500,80\n", "a.csv")
    reading = Reading("a", base.curves, columns=[column], sheets=[SheetReading("S", "curves")])
    (sheet,) = reading_form.shown_sheets(reading)
    assert "ch" in sheet.columns[0].units
    assert "km/h" not in sheet.columns[0].units


def test_question_is_asked_answered_and_gone(browser: Browser, tmp_path: Path) -> None:
    """Degrees of curve without a word on which degree have several honest readings."""
    file = tmp_path / "degrees.csv"
    file.write_text(
        "Curve,Degree,Hand,Start (mi),End (mi),Elevation (in),Speed (mph)\n"
        "A,3.5,L,1.1,1.2,2,50\nB,2.25,R,2.1,2.3,1.5,60\nC,4.0,L,3.0,3.15,3,45\n"
    )
    reading = service.read_curves(file.read_bytes(), file.name)
    plan = browser.upload(file)
    page = browser.get(f"{plan}/list").text
    if not reading.questions:
        assert "to answer" not in page
        pytest.fail("this list was made to be asked about")
    assert 'id="questions"' in page
    choice = reading.questions[0].choices[0]
    answer = browser.post(f"{plan}/list", {"q-0": choice})
    assert answer.status_code == 303
    after = service.read_curves(
        file.read_bytes(),
        file.name,
        answers={"answers": {reading.questions[0].sheet: {reading.questions[0].column: choice}}},
    )
    assert f"{int((~after.curves.rejected).sum())} of 3 curve rows" in browser.get(f"{plan}/list").text
