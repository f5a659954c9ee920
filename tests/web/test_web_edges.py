"""Lists at the edge: nothing usable, hardly anything known, one curve; and the sample as packed."""

from __future__ import annotations

import io
import json
import re
from importlib.resources import files
from pathlib import Path

import openpyxl
import pytest
from web_tools import TRAINS, Browser

from webapp.uploads import shown_name

PAGES = ("list", "trains", "limits", "cants", "line", "findings", "files", "print", "plan.json", "workbook")
SHORT = "Curve,Radius (m),Speed (km/h)"
LISTS = {
    "nothing usable": f"{SHORT}\nA,?,80\nB,,60\n",
    "one bare curve": f"{SHORT}\nA,500,80\n",
    "no names": "Radius (m),Speed (km/h),Hand,Cant (mm)\n500,80,L,\n600,90,,70\n",
    "hardly any bend": f"{SHORT},Cant (mm)\nA,20000,60,0\nB,15000,60,0\n",
    "touching reverse curves": (
        "Curve,Start (km),End (km),Radius (m),Hand,Transition in,Transition out,Cant,Speed\n"
        "A,1.0,1.2,300,L,0,0,0,40\nB,1.2,1.4,300,R,0,0,0,40\nC,1.4,1.6,300,L,0,0,0,40\n"
    ),
    "standing train": f"{SHORT},Cant (mm),Speed Goods (km/h)\nA,500,80,60,0\nB,600,80,60,none\n",
}
UNSAID = re.compile(r"\b(nan|None|inf)\b")


@pytest.mark.parametrize("name", LISTS)
def test_every_page_stands_whatever_the_list(browser: Browser, tmp_path: Path, name: str) -> None:
    file = tmp_path / "list.csv"
    file.write_text(LISTS[name], encoding="utf-8")
    if "Speed Goods" in LISTS[name]:
        plan = with_trains_in_a_workbook(browser, tmp_path, LISTS[name])
    else:
        plan = browser.upload(file)
        assert browser.post(f"{plan}/trains", TRAINS).status_code == 303
    browser.post(f"{plan}/limits/choose", {"source": "set:typical"})
    assert browser.post(f"{plan}/confirm").status_code == 303
    for page in PAGES:
        for units in ("metric", "us"):
            answer = browser.get(f"{plan}/{page}?units={units}")
            assert answer.status_code == 200, (page, answer.text[-500:])
            if page != "workbook":
                assert not UNSAID.search(answer.text.split("<main", 1)[-1]), page
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    for number in range(1, len(document["curves"]) + 1):
        answer = browser.get(f"{plan}/curves/{number}")
        assert answer.status_code == 200
        assert not UNSAID.search(answer.text.split("<main", 1)[-1])
    answer = browser.get(f"/api/v1{plan}/curves")
    assert answer.status_code == 200
    assert answer.json is not None
    assert answer.json["total"] == len(document["curves"])
    if not document["curves"]:
        assert "Cants of 0 curves" in browser.get(f"{plan}/cants").text
        assert "nothing to draw" in browser.get(f"{plan}/line").text


def with_trains_in_a_workbook(browser: Browser, tmp_path: Path, curves: str) -> str:
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "Curves"
    for line in curves.splitlines():
        sheet.append([float(c) if c.replace(".", "").isdigit() else c for c in line.split(",")])
    trains = book.create_sheet("Traffic")
    for row in (["Class", "Category", "Speed"], ["Express", "passenger", 120], ["Goods", "freight", 70]):
        trains.append(row)
    file = tmp_path / "list.xlsx"
    book.save(file)
    return browser.upload(file)


def test_pages_lead_back_until_the_cants_are_asked_for(browser: Browser, bare_list: Path) -> None:
    plan = browser.upload(bare_list)
    for page in ("cants", "line", "findings", "print", "curves/1", "workbook", "plan.json"):
        answer = browser.get(f"{plan}/{page}")
        assert answer.status_code == 302, page
        assert answer.headers["Location"] == f"{plan}/list"
    assert "not planned yet" in browser.get(f"{plan}/files").text
    assert browser.post(f"{plan}/confirm").status_code == 422


def test_packed_sample_is_the_one_of_the_repository(sample_file: Path) -> None:
    packed = files("webapp").joinpath("sample", sample_file.name).read_bytes()

    def cells(data: bytes) -> dict[str, list[tuple[object, ...]]]:
        book = openpyxl.load_workbook(io.BytesIO(data))
        return {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in book}

    assert cells(packed) == cells(sample_file.read_bytes())


@pytest.mark.parametrize(
    ("given", "shown"),
    [
        ("curves.xlsx", "curves.xlsx"),
        ("../../etc/passwd", "passwd"),
        ("C:\\Users\\anna\\line 4.csv", "line 4.csv"),
        ("a\x00b\n.csv", "ab.csv"),
        ("...", "curves"),
        ("Übersicht Bögen.ods", "Übersicht Bögen.ods"),
        ("x" * 300 + ".xlsx", "x" * 115 + ".xlsx"),
    ],
)
def test_file_names_as_shown(given: str, shown: str) -> None:
    assert shown_name(given) == shown
