"""The whole way through the pages without script, on both kinds of database."""

from __future__ import annotations

import io
import json
import re
from collections.abc import Callable
from pathlib import Path

import openpyxl
import pytest
from flask import Flask
from web_tools import TRAINS, Browser


@pytest.fixture
def anywhere(start: Callable[..., Flask], database_url: str) -> Browser:
    return Browser(start(database_url))


def test_from_bare_list_to_workbook(anywhere: Browser, bare_list: Path) -> None:
    plan = anywhere.upload(bare_list)
    shown = anywhere.get(f"{plan}/list")
    assert "3 of 3 curve rows can be planned" in shown.text
    assert "Transition out (m)" in shown.text
    assert "Plan the cants" not in shown.text

    assert "one row for each class of train is needed" in anywhere.get(f"{plan}/trains").text
    answer = anywhere.post(f"{plan}/trains", TRAINS)
    assert answer.headers["Location"] == f"{plan}/limits"

    page = anywhere.get(f"{plan}/limits").text
    assert "Choose a set" in page
    assert "Plan the cants" not in page
    anywhere.post(f"{plan}/limits/choose", {"source": "set:typical"})
    page = anywhere.get(f"{plan}/limits").text
    assert "UNVERIFIED" in page
    assert "Plan the cants" in page

    assert anywhere.get(f"{plan}/cants").status_code == 302
    answer = anywhere.post(f"{plan}/confirm")
    assert answer.headers["Location"] == f"{plan}/cants"
    page = anywhere.get(f"{plan}/cants").text
    assert "Cants of 3 curves" in page
    assert "UNVERIFIED" in page

    answer = anywhere.get(f"{plan}/workbook")
    assert answer.status_code == 200
    assert "aldmere-cants.xlsx" in answer.headers["Content-Disposition"]
    book = openpyxl.load_workbook(io.BytesIO(answer.data))
    document = json.loads(anywhere.get(f"{plan}/plan.json").data)
    values = {v for sheet in book for row in sheet.iter_rows(values_only=True) for v in row}
    assert {c["recommended_cant_mm"] for c in document["curves"]} <= values
    assert anywhere.get(f"{plan}/original").data == bare_list.read_bytes()


def test_sample_in_one_click(anywhere: Browser) -> None:
    plan = anywhere.sample()
    page = anywhere.get(f"{plan}/cants").text
    document = json.loads(anywhere.get(f"{plan}/plan.json").data)
    assert f"Cants of {len(document['curves'])} curves" in page
    for number, curve in enumerate(document["curves"], start=1):
        assert curve["curve"] in page, number
    assert anywhere.get(plan).headers["Location"] == f"{plan}/cants"
    assert "dunmarrow_keldrith.xlsx" in anywhere.get("/").text


def test_every_curve_has_its_page(browser: Browser) -> None:
    plan = browser.sample()
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    links = re.findall(r'href="([^"]+/curves/\d+)"', browser.get(f"{plan}/cants?size=250").text)
    assert len(set(links)) == len(document["curves"])
    for link in dict.fromkeys(links):
        answer = browser.get(link)
        assert answer.status_code == 200
        assert "As read from the list" in answer.text
    assert browser.get(f"{plan}/curves/9999").status_code == 404
    assert browser.get(f"{plan}/curves/0").status_code == 404


def test_edited_limits_change_the_plan_and_are_named(anywhere: Browser) -> None:
    plan = anywhere.sample()
    before = json.loads(anywhere.get(f"{plan}/plan.json").data)
    page = anywhere.get(f"{plan}/limits").text
    normal = dict(re.findall(r'name="(\d+-normal)" value="([^"]*)"', page))
    clauses = dict(re.findall(r'name="(\d+-clause)" value="([^"]*)"', page))
    assert normal["0-normal"] == "150"
    sent = {
        "units": "metric",
        **normal,
        **clauses,
        "0-normal": "90",
        "0-exceptional": "90",
        "keep-as": "Tight",
    }
    assert anywhere.post(f"{plan}/limits", sent).status_code == 303
    page = anywhere.get(f"{plan}/limits").text
    assert "edited here" in page
    assert "Delete the kept limits Tight" in page
    after = json.loads(anywhere.get(f"{plan}/plan.json").data)
    assert after["limits"]["edited"] is True
    assert max(c["recommended_cant_mm"] or 0 for c in before["curves"] if c["status"] != "kept") > 90
    free = [c for c in after["curves"] if c["status"] in ("change", "exceptional")]
    assert free
    assert max(c["recommended_cant_mm"] for c in free) <= 90
    assert "edited" in anywhere.get(f"{plan}/cants").text

    anywhere.post(f"{plan}/limits/choose", {"source": "file"})
    again = json.loads(anywhere.get(f"{plan}/plan.json").data)
    assert again["curves"] == before["curves"]
    anywhere.post(f"{plan}/limits/choose", {"source": "kept:Tight"})
    kept = json.loads(anywhere.get(f"{plan}/plan.json").data)
    assert kept["curves"] == after["curves"]


def test_limits_and_trains_go_out_and_come_in(browser: Browser, bare_list: Path) -> None:
    sample = browser.sample()
    limits = browser.get(f"{sample}/limits/file").data
    trains = browser.get(f"{sample}/trains/file").data
    plan = browser.upload(bare_list)
    answer = browser.post(f"{plan}/trains/file", {"file": (io.BytesIO(trains), "trains.csv")})
    assert answer.status_code == 303, answer.text
    answer = browser.post(f"{plan}/limits/file", {"file": (io.BytesIO(limits), "limits.csv")})
    assert answer.status_code == 303, answer.text
    assert browser.get(f"{plan}/trains/file").data == trains
    assert browser.get(f"{plan}/limits/file").data == limits
    assert browser.post(f"{plan}/confirm").status_code == 303
    assert "Cants of 3 curves" in browser.get(f"{plan}/cants").text


def test_choice_of_tiers_is_taken(browser: Browser) -> None:
    plan = browser.sample()
    assert "exceptional" in browser.get(f"{plan}/cants").text
    answer = browser.post(f"{plan}/choice", {"units": "metric", "method": "rms", "tiers": "normal"})
    assert answer.status_code == 303
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert document["settings"]["tiers"] == ["normal"]
    assert not [c for c in document["curves"] if c["status"] == "exceptional"]


def test_bad_file_is_refused_with_its_place_and_not_kept(browser: Browser, tmp_path: Path) -> None:
    bad = tmp_path / "bad.xlsx"
    bad.write_bytes(b"PK\x03\x04 no workbook")
    with bad.open("rb") as opened:
        answer = browser.post("/plans", {"file": (opened, "bad.xlsx")})
    assert answer.status_code == 422
    assert "bad.xlsx" in answer.text.lower()
    assert "None yet" in browser.get("/").text
    assert browser.post("/plans", {}).status_code == 422
    empty = browser.post("/plans", {"file": (io.BytesIO(b""), "empty.csv")})
    assert empty.status_code == 422
    assert "The file is empty" in empty.text or "the file is empty" in empty.text


def test_problems_are_named_by_cell(browser: Browser) -> None:
    plan = browser.sample()
    page = browser.get(f"{plan}/list").text
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert document["rejected"]
    for row in document["rejected"]:
        assert f">{row['row']}</td>" in page


def test_plan_is_renamed_kept_and_deleted(anywhere: Browser) -> None:
    plan = anywhere.sample()
    anywhere.post(f"{plan}/name", {"name": "  Spring renewal  "})
    assert "Spring renewal" in anywhere.get("/").text
    assert anywhere.post(f"{plan}/name", {"name": " "}).status_code == 422
    assert (
        "is kept until"
        in anywhere.client.post(f"{plan}/keep", data={"token": anywhere.token}, follow_redirects=True).text
    )
    assert "cannot be undone" in anywhere.get(f"{plan}/delete").text
    assert anywhere.post(f"{plan}/delete").status_code == 303
    assert anywhere.get(f"{plan}/cants").status_code == 404
    assert "Spring renewal" not in anywhere.get("/").text.split("Your plans")[1]


def test_units_switch_holds_everywhere(browser: Browser) -> None:
    plan = browser.sample()
    assert (
        browser.post("/units", {"units": "us", "back": f"{plan}/cants"}).headers["Location"]
        == f"{plan}/cants"
    )
    page = browser.get(f"{plan}/cants").text
    assert "Proposed, in" in page
    assert "mph" in browser.get(f"{plan}/curves/1").text
    assert "km/h" not in re.sub(r"mm, km/h, m", "", browser.get(f"{plan}/trains").text)
    reasons = re.findall(r'class="words">([^<]+)<', page)
    assert reasons
    assert not [r for r in reasons if " mm" in r or "km/h" in r]
    metric = browser.get(f"{plan}/cants?units=metric").text
    assert "Proposed, mm" in metric
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert document["settings"]["units"] == "metric"


def test_classes_named_by_the_list_stand_in_the_form(browser: Browser, tmp_path: Path) -> None:
    file = tmp_path / "line.csv"
    file.write_text(
        "Curve,Radius (m),Hand,Cant (mm),Speed Express (km/h),Speed Goods (km/h)\n"
        "A,500,L,60,100,60\nB,600,R,70,110,70\n"
    )
    plan = browser.upload(file)
    page = browser.get(f"{plan}/trains").text
    assert re.findall(r'name="\d-name" value="([^"]+)"', page) == ["Express", "Goods"]
    form = {
        "rows": "2",
        "units": "metric",
        "0-name": "Express",
        "0-category": "passenger",
        "0-regular": "yes",
    }
    form |= {"1-name": "Goods", "1-category": "freight", "1-regular": "yes"}
    answer = browser.post(f"{plan}/trains", form)
    assert answer.status_code == 303, answer.text
    browser.post(f"{plan}/limits/choose", {"source": "set:typical"})
    assert browser.post(f"{plan}/confirm").status_code == 303
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    assert [c["speed_kmh"] for c in document["curves"][0]["classes"]] == [100, 60]
    assert "a new workbook is made" in browser.get(f"{plan}/files").text
    assert "a new workbook is made" not in browser.get(f"{browser.sample()}/files").text
