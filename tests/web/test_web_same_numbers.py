"""Page, JSON of the page, JSON interface, command and workbook say the same numbers for every sample."""

from __future__ import annotations

import html
import io
import json
import re
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from click.testing import CliRunner
from web_tools import Browser

from cant.cli import cant
from webapp.measures import ABSENT, measures

ROOT = Path(__file__).resolve().parents[2]
SAMPLES = sorted((ROOT / "sample_data").glob("*.xlsx"))
CELL = re.compile(r'<td role="cell" class="n[^"]*" data-label="([^,"]+)[^"]*">([^<]*)</td>')


@pytest.fixture(params=SAMPLES, ids=lambda path: path.stem)
def sample(request: pytest.FixtureRequest) -> Path:
    found: Path = request.param
    return found


def planned(browser: Browser, sample: Path) -> str:
    plan = browser.upload(sample)
    assert browser.post(f"{plan}/confirm").status_code == 303
    return plan


def command(sample: Path, tmp_path: Path) -> dict[str, Any]:
    out = tmp_path / "plan.json"
    done = CliRunner().invoke(cant, ["plan", str(sample), "--json", str(out)], catch_exceptions=False)
    assert done.exit_code == 0, done.output
    found: dict[str, Any] = json.loads(out.read_text(encoding="utf-8"))
    return found


def test_json_is_the_same_by_command_page_and_interface(
    browser: Browser, sample: Path, tmp_path: Path
) -> None:
    plan = planned(browser, sample)
    by_command = command(sample, tmp_path)
    by_page = json.loads(browser.get(f"{plan}/plan.json").data)
    by_interface = json.loads(browser.get(f"/api/v1{plan}/result").data)
    assert by_page == by_interface
    for document in (by_command, by_page):
        document["input"].pop("file")
        document["limits"].pop("name", None)
        document["limits"].pop("title", None)
    assert {k: by_page[k] for k in ("curves", "rejected", "questions", "settings", "counts", "traffic")} == {
        k: by_command[k] for k in ("curves", "rejected", "questions", "settings", "counts", "traffic")
    }


@pytest.mark.parametrize("units", ["metric", "us"])
def test_table_shows_the_numbers_of_the_json(browser: Browser, sample: Path, units: str) -> None:
    plan = planned(browser, sample)
    curves = json.loads(browser.get(f"{plan}/plan.json").data)["curves"]
    page = html.unescape(browser.get(f"{plan}/cants?size=250&units={units}").text)
    rows = [dict(CELL.findall(row)) for row in page.split('<tr role="row">')[2:]]
    assert len(rows) == len(curves)
    shown = measures(units)
    for row, curve in zip(rows, curves, strict=True):
        assert row["Proposed"] == shown.show("cant", curve["recommended_cant_mm"])
        assert row["Today"] == shown.show("cant", curve["existing_cant_mm"])
        assert row["Start"] == shown.show("chainage", curve["as_read"]["start_km"])
        assert row["Radius"].split()[0] == shown.show("radius", curve["radius_m"])


def test_page_of_a_curve_shows_the_numbers_of_the_json(browser: Browser, sample: Path) -> None:
    plan = planned(browser, sample)
    answer = json.loads(browser.get(f"/api/v1{plan}/curves?size=250").data)
    shown = measures("metric")
    for curve in answer["curves"]:
        page = html.unescape(browser.get(f"{plan}/curves/{curve['number']}?units=metric").text)
        assert f"Cant {shown.with_unit('cant', curve['recommended_cant_mm'])}" in page or (
            curve["recommended_cant_mm"] is None and "No cant proposed" in page
        )
        assert curve["reason"] or curve["status"] == "not assessed"
        for figures in curve["classes"]:
            for kind, key in (
                ("cant exact", "deficiency_mm"),
                ("cant exact", "excess_mm"),
                ("speed", "permissible_speed_kmh"),
                ("acceleration", "unbalanced_acceleration_ms2"),
            ):
                text = shown.show(kind, figures[key])
                assert text == ABSENT or f">{text}<" in page, (curve["curve"], figures["class"], key)


def test_workbook_holds_the_numbers_of_the_json(browser: Browser, sample: Path) -> None:
    plan = planned(browser, sample)
    document = json.loads(browser.get(f"{plan}/plan.json").data)
    factor = 25.4 if document["settings"]["units"] == "us" else 1.0
    book = openpyxl.load_workbook(io.BytesIO(browser.get(f"{plan}/workbook").data), data_only=True)
    for curve in document["curves"]:
        if curve["recommended_cant_mm"] is None:
            continue
        row = [cell.value for cell in book[curve["sheet"]][curve["row"]]]
        numbers = [v for v in row if isinstance(v, (int, float))]
        assert any(v == pytest.approx(curve["recommended_cant_mm"] / factor, abs=1e-6) for v in numbers), (
            curve["curve"],
            row,
        )
        assert curve["status"] in row


def test_many_at_once_see_each_their_own_curve(browser: Browser, sample_file: Path) -> None:
    """Words and records are made when asked for; eight askers at once must not get each other's."""
    plan = planned(browser, sample_file)
    curves = json.loads(browser.get(f"{plan}/plan.json").data)["curves"]
    numbers = [c["number"] for c in json.loads(browser.get(f"/api/v1{plan}/curves?size=250").data)["curves"]]
    cookie = browser.client.get_cookie("cant")
    assert cookie is not None
    key = cookie.value

    def ask(place: int) -> tuple[str, str]:
        client = browser.client.application.test_client()
        client.set_cookie("cant", key)
        units = ("metric", "us")[place % 2]
        with client.get(f"{plan}/curves/{numbers[place]}?units={units}") as page:
            text = html.unescape(page.text)
        with client.get(f"/api/v1{plan}/curves/{numbers[place]}") as answer:
            assert answer.json == {"number": numbers[place], **curves[place]}
        shown = measures(units).with_unit("cant", curves[place]["recommended_cant_mm"])
        return text, f"Cant {shown}" if curves[place][
            "recommended_cant_mm"
        ] is not None else "No cant proposed"

    with ThreadPoolExecutor(8) as threads:
        answers = list(threads.map(ask, list(range(len(curves))) * 2))
    for place, (text, said) in enumerate(answers):
        assert f"<h1>Curve {curves[place % len(curves)]['curve']} " in text
        assert said in text
