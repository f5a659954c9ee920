"""A cant held by hand, taken back; options and plans compared; the history: without a browser's script."""

from __future__ import annotations

import html
import io
import json
import re
from typing import Any

import openpyxl
import pytest
from flask import Flask
from web_tools import CURVES, Browser, FormFields

PROPOSAL = re.compile(r'name="proposal" value="([^"]+)"')
BACK = re.compile(r'action="([^"]+/changes/[^"]+/back)"')


def document(browser: Browser, plan: str) -> dict[str, Any]:
    found: dict[str, Any] = json.loads(browser.get(f"{plan}/plan.json").data)
    return found


def curve_number(browser: Browser, plan: str, status: str) -> tuple[int, dict[str, Any]]:
    for number in range(1, 40):
        answer = browser.get(f"/api/v1{plan}/curves/{number}")
        if answer.status_code == 200 and (record := json.loads(answer.data)) and record["status"] == status:
            return number, record
    message = f"the sample has no curve with status {status}"
    raise AssertionError(message)


def by_name(found: dict[str, Any], record: dict[str, Any]) -> dict[str, Any]:
    keys = ("sheet", "row", "curve")
    return next(c for c in found["curves"] if all(c[k] == record[k] for k in keys))


def hold(browser: Browser, plan: str, number: int, cant: str, because: str = "drainage", **more: str) -> Any:
    form = {"units": "metric", "cant": cant, "because": because, "who": "M. Verin", **more}
    return browser.post(f"{plan}/curves/{number}/hold", form)


def test_held_cant_is_kept_marked_checked_and_taken_back(browser: Browser) -> None:
    plan = browser.sample()
    before = document(browser, plan)
    number, record = curve_number(browser, plan, "change")
    assert record["recommended_cant_mm"] != 15.0
    assert hold(browser, plan, number, "15").status_code == 303
    after = document(browser, plan)
    mine = by_name(after, record)
    assert mine["recommended_cant_mm"] == 15.0
    assert mine["cant_held"] == {"cant_mm": 15.0, "because": "drainage"}
    assert mine["existing_cant_mm"] == record["existing_cant_mm"]
    assert "held by hand (drainage)" in mine["reason"]
    page = browser.get(f"{plan}/curves/{number}").text
    assert "held by hand" in page
    assert "by hand</span>" in browser.get(f"{plan}/cants?size=250").text
    book = openpyxl.load_workbook(io.BytesIO(browser.get(f"{plan}/workbook").data))
    cells = {v for sheet in book for row in sheet.iter_rows(values_only=True) for v in row}
    assert "held by hand: drainage" in cells
    back = BACK.search(page)
    assert back is not None
    assert browser.post(back.group(1), {"number": str(number)}).status_code == 303
    assert document(browser, plan) == before
    assert browser.post(back.group(1)).status_code == 422


def test_history_says_what_who_when_and_why(browser: Browser) -> None:
    plan = browser.sample()
    number, record = curve_number(browser, plan, "change")
    hold(browser, plan, number, "15", "drainage <near> the weir")
    hold(browser, plan, number, "20", "raised after a visit")
    page = browser.get(f"{plan}/history").text
    said = html.unescape(page)
    assert f"Curve {record['curve']}: cant held at 15" in said
    assert "drainage <near> the weir" in said
    assert "<near>" not in page
    assert said.count("M. Verin") == 2
    assert len(BACK.findall(page)) == 1, "the second cant held takes the place of the first"
    step = re.search(r"from=1&amp;to=2|from=2&amp;to=3", page)
    assert step is not None
    compared = html.unescape(browser.get(f"{plan}/compare?from=1&to=3").text)
    assert "cant held" in compared
    assert record["curve"] in compared


@pytest.mark.parametrize(
    ("form", "said"),
    [
        ({"cant": ""}, "cant is missing"),
        ({"cant": "high"}, "not a number"),
        ({"cant": "301"}, "may not be above"),
        ({"cant": "-5"}, "may not be below"),
        ({"because": " "}, "reason is missing"),
        ({"who": "x" * 81}, "at most 80"),
    ],
)
def test_what_cannot_be_held_is_told_and_nothing_kept(
    browser: Browser, form: dict[str, str], said: str
) -> None:
    plan = browser.sample()
    number, _ = curve_number(browser, plan, "change")
    sent = {"units": "metric", "cant": "50", "because": "why", "who": "", **form}
    answer = browser.post(f"{plan}/curves/{number}/hold", sent)
    assert answer.status_code == 422
    assert said in html.unescape(answer.text).casefold()
    assert "None: no cant is held" in browser.get(f"{plan}/history").text


def test_us_units_are_taken_as_shown(browser: Browser) -> None:
    plan = browser.sample()
    number, record = curve_number(browser, plan, "change")
    assert hold(browser, plan, number, "2", units="us").status_code == 303
    assert by_name(document(browser, plan), record)["recommended_cant_mm"] == pytest.approx(50.8)


def test_comparing_first_keeps_nothing_until_it_is_kept(browser: Browser) -> None:
    plan = browser.sample()
    before = document(browser, plan)
    number, record = curve_number(browser, plan, "change")
    answer = hold(browser, plan, number, "15", "", compare="yes")
    assert answer.status_code == 200
    said = html.unescape(answer.text)
    assert "Nothing has been kept yet" in said
    assert f"{record['recommended_cant_mm']:.0f} → 15" in said
    assert document(browser, plan) == before
    signed = PROPOSAL.search(answer.text)
    assert signed is not None
    form = {"proposal": html.unescape(signed.group(1)), "because": "agreed on site", "who": "M. Verin"}
    refused = browser.post(f"{plan}/keep-proposal", {**form, "because": ""})
    assert refused.status_code == 422
    assert browser.post(f"{plan}/keep-proposal", form).status_code == 303
    assert by_name(document(browser, plan), record)["recommended_cant_mm"] == 15.0
    assert "agreed on site" in browser.get(f"{plan}/history").text
    assert by_name(document(browser, plan), record)["cant_held"]["because"] == "agreed on site"


def test_option_is_planned_compared_and_taken(browser: Browser) -> None:
    plan = browser.sample()
    number, record = curve_number(browser, plan, "restrict")
    option = record["options"][0]
    answer = browser.post(f"{plan}/curves/{number}/options/1")
    assert answer.status_code == 200
    signed = PROPOSAL.search(answer.text)
    assert signed is not None
    form = {"proposal": html.unescape(signed.group(1)), "because": "budget agreed"}
    assert browser.post(f"{plan}/keep-proposal", form).status_code == 303
    mine = by_name(document(browser, plan), record)
    assert mine["status"] == option["status"]
    assert mine["recommended_cant_mm"] == option["cant_mm"]
    assert browser.post(f"{plan}/curves/{number}/options/9").status_code == 422


def test_proposal_of_another_plan_or_browser_is_refused(browser: Browser, other_browser: Browser) -> None:
    plan, other = browser.sample(), browser.sample()
    number, _ = curve_number(browser, plan, "change")
    signed = PROPOSAL.search(hold(browser, plan, number, "15", compare="yes").text)
    assert signed is not None
    form = {"proposal": html.unescape(signed.group(1)), "because": "why"}
    assert browser.post(f"{other}/keep-proposal", form).status_code == 422
    foreign = other_browser.sample()
    assert other_browser.post(f"{foreign}/keep-proposal", form).status_code == 422
    assert other_browser.post(f"{plan}/keep-proposal", form).status_code == 404
    assert browser.post(f"{plan}/keep-proposal", {**form, "proposal": "x.y"}).status_code == 422


def test_two_revisions_of_a_list_are_compared(browser: Browser, app: Flask, tmp_path: Any) -> None:
    texts = {"old.csv": CURVES, "new.csv": CURVES.replace("A2,3.100,3.420,600", "A2,3.100,3.420,700")}
    plans = []
    for name, text in texts.items():
        file = tmp_path / name
        file.write_text(text + ("Aldmere,1,A4,7.0,7.2,900,L,60,60,30,100\n" if name == "new.csv" else ""))
        plan = browser.upload(file)
        trains = {"units": "metric", "rows": "1", "0-name": "Express", "0-category": "passenger"}
        assert browser.post(f"{plan}/trains", {**trains, "0-speed_kmh": "120"}).status_code == 303
        assert browser.post(f"{plan}/limits/choose", {"source": "set:typical"}).status_code == 303
        assert browser.post(f"{plan}/confirm").status_code == 303
        plans.append(plan)
    said = html.unescape(browser.get(f"{plans[1]}/compare?with={plans[0].rsplit('/', 1)[1]}").text)
    assert "A4" in said
    assert "only in the second" in said
    assert "radius" in said
    assert browser.get(f"{plans[1]}/compare?with=nothing").status_code == 404
    assert "Compare with this plan" in browser.get(f"{plans[1]}/compare").text


def kept_after_a_look(browser: Browser, plan: str, answer: Any) -> dict[str, Any]:
    """Look at what a form would change, see that nothing is kept, keep it, and give the JSON then."""
    before = document(browser, plan)
    assert answer.status_code == 200, answer.text
    assert "Nothing has been kept yet" in answer.text
    assert document(browser, plan) == before
    signed = PROPOSAL.search(answer.text)
    assert signed is not None
    form = {"proposal": html.unescape(signed.group(1)), "because": "what if"}
    assert browser.post(f"{plan}/keep-proposal", form).status_code == 303
    return document(browser, plan)


def test_what_if_the_method_and_tiers_were_others(browser: Browser) -> None:
    plan = browser.sample()
    form = {"units": "metric", "method": "least", "tiers": "exceptional", "compare": "yes"}
    after = kept_after_a_look(browser, plan, browser.post(f"{plan}/choice", form))
    assert after["settings"]["method"] == "least"
    assert "exceptional" in after["settings"]["tiers"]


def test_what_if_a_limit_were_another(browser: Browser) -> None:
    plan = browser.sample()
    form = FormFields(browser.get(f"{plan}/limits").text, "/limits").sent
    assert form["0-normal"]
    form |= {"units": "metric", "compare": "yes", "keep-as": "", "0-normal": "61"}
    answer = browser.post(f"{plan}/limits", form)
    after = kept_after_a_look(browser, plan, answer)
    assert any(row["Normal"] == 61 for row in after["limits"]["rows"])


def test_what_if_a_class_ran_slower(browser: Browser) -> None:
    plan = browser.sample()
    form = FormFields(browser.get(f"{plan}/trains").text, "").sent
    form |= {"units": "metric", "compare": "yes", "0-speed_kmh": "60"}
    answer = browser.post(f"{plan}/trains", form)
    kept_after_a_look(browser, plan, answer)
    assert FormFields(browser.get(f"{plan}/trains").text, "").sent["0-speed_kmh"] == "60"


def test_what_if_the_limits_were_another_set_or_file(browser: Browser) -> None:
    plan = browser.sample()
    answer = browser.post(f"{plan}/limits/choose", {"source": "set:eu-1299-2014", "compare": "yes"})
    after = kept_after_a_look(browser, plan, answer)
    assert after["limits"]["name"] == "eu-1299-2014"
    table = "Quantity,Normal,Unit\ncant,83,mm\ncant deficiency,110,mm\n"
    answer = browser.post(
        f"{plan}/limits/file", {"file": (io.BytesIO(table.encode()), "own.csv"), "compare": "yes"}
    )
    after = kept_after_a_look(browser, plan, answer)
    assert max(c["recommended_cant_mm"] or 0 for c in after["curves"]) <= 83
    back = browser.post(f"{plan}/limits/choose", {"source": "file", "compare": "yes"})
    assert kept_after_a_look(browser, plan, back)["limits"]["name"] != "own"


def test_what_if_the_trains_were_those_of_a_file(browser: Browser) -> None:
    plan = browser.sample()
    heading, *rows = browser.get(f"{plan}/trains/file").text.splitlines()
    speed = heading.split(",").index("Speed (km/h)")
    slower = [",".join("55" if i == speed else cell for i, cell in enumerate(row.split(","))) for row in rows]
    table = "\n".join([heading, *slower]).encode()
    form = {"file": (io.BytesIO(table), "own.csv"), "compare": "yes"}
    after = kept_after_a_look(browser, plan, browser.post(f"{plan}/trains/file", form))
    assert {row["speed_kmh"] for row in after["traffic"]} == {55}


def test_live_answer_is_the_plans_record(browser: Browser) -> None:
    plan = browser.sample()
    number, record = curve_number(browser, plan, "change")
    cant = record["recommended_cant_mm"]
    at = json.loads(browser.get(f"{plan}/curves/{number}/at?cant={cant}").data)["record"]
    for key in ("status", "limits_passed", "lower_mm", "upper_mm", "upper_by"):
        assert at[key] == record[key], key
    for mine, theirs in zip(at["classes"], record["classes"], strict=True):
        assert mine == {k: theirs[k] for k in mine}
    for bad in ("", "x", "-5", "301", "nan", "inf"):
        assert browser.get(f"{plan}/curves/{number}/at?cant={bad}").status_code == 422, bad
        assert browser.get(f"{plan}/curves/{number}/held?cant={bad}").status_code == 422, bad
    assert browser.get(f"{plan}/curves/999/at?cant=5").status_code == 404
