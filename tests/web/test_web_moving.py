"""The slider of a curve in a real browser: the plan's numbers; by keyboard, on a phone, without script."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Page
from screen_tools import Visit, Visitor, tab_to

from cant import service
from cant.service import PlannedLine

pytestmark = pytest.mark.browser
SAMPLE = Path(__file__).parents[2] / "sample_data" / "dunmarrow_keldrith.xlsx"
RULES = ["wcag2a", "wcag2aa", "wcag22aa"]
FIGURES = ("deficiency_mm", "excess_mm", "unbalanced_acceleration_ms2", "run_speed_kmh")


@pytest.fixture(scope="module")
def planned() -> PlannedLine:
    return service.make_plan(service.read_curves(SAMPLE.read_bytes(), SAMPLE.name))


def sample(visitor: Visitor) -> str:
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("heading", name="Cants of").wait_for()
    return page.url.removeprefix(visitor.address).removesuffix("/cants")


def index_of(planned: PlannedLine, status: str, *, shared: bool = False) -> int:
    return next(
        i
        for i in map(int, planned.plan.assessed)
        if planned.plan.status[i] == status
        and planned.plan.record(i)["shares_transition_with_next"] is shared
    )


def settled(page: Page, cant: float) -> None:
    page.wait_for_function(
        "mm => document.querySelector('#at-cant .verdict').dataset.cant == mm"
        " && document.getElementById('at-cant').getAttribute('aria-busy') == 'false'",
        arg=str(cant),
    )


def held_alone(planned: PlannedLine, index: int, cant: float) -> dict[str, Any]:
    """Plan the whole line anew with every cant held, the curve's at another height."""
    plan = planned.plan
    keys = [
        {k: getattr(plan.curves, k)[i] for k in ("sheet", "line", "track", "curve")}
        | {"row": int(plan.curves.row[i])}
        for i in range(len(plan.curves))
    ]
    changes = [
        {"what": "cant held", "on": keys[i], "cant_mm": cant if i == index else plan.proposed_mm[i]}
        for i in map(int, plan.assessed)
        if plan.outcome.planned[i] and plan.proposed_mm[i] >= 0
    ]
    return service.plan_option(planned, {"changes": changes}).record(index)


def test_slider_says_the_plans_numbers_at_every_step(visit: Visit, planned: PlannedLine) -> None:
    visitor = visit()
    address = sample(visitor)
    index = index_of(planned, "change", shared=True)
    page = visitor.go(f"{address}/curves/{index + 1}")
    slide = page.locator("#slide")
    levels = [float(mm) for mm in page.locator("#move").get_attribute("data-levels").split()]
    assert levels[int(slide.input_value())] == planned.plan.proposed_mm[index]
    for step, mm in enumerate(levels):
        with page.expect_response(f"**/at?cant={mm:g}*") as waited:
            slide.fill(str(step)) if step != int(slide.input_value()) else slide.dispatch_event("input")
        told = json.loads(waited.value.body())["record"]
        expected = held_alone(planned, index, mm)
        for mine, theirs in zip(told["classes"], expected["classes"], strict=True):
            assert {k: mine[k] for k in FIGURES} == pytest.approx({k: theirs[k] for k in FIGURES}), mm
        assert told["limits_passed"] == expected["limits_passed"], mm
        settled(page, mm)
        cells = page.locator("#at-cant tr[data-class]").first.locator("td").all_inner_texts()
        assert cells[2].startswith(f"{expected['classes'][0]['deficiency_mm']:.1f}")
        assert cells[3].startswith(f"{expected['classes'][0]['excess_mm']:.1f}")
        assert page.locator("[name='cant']").input_value() == f"{mm:g}"
    assert visitor.said == []


@pytest.mark.parametrize("screen", ["desktop", "phone"])
def test_cant_set_by_hand_compared_and_taken_back(visit: Visit, planned: PlannedLine, screen: str) -> None:
    visitor = visit(screen, reduced_motion="reduce")
    address = sample(visitor)
    index = index_of(planned, "change")
    page = visitor.go(f"{address}/curves/{index + 1}")
    page.get_by_label("Cant", exact=True).last.fill("15")
    settled(page, 15.0)
    page.get_by_label("Reason").fill("drainage near the weir")
    page.get_by_label("Your name").fill("M. Verin")
    page.get_by_role("button", name="See what it would change").click()
    page.get_by_text("Nothing has been kept yet").wait_for()
    page.get_by_role("button", name="Keep it").click()
    page.get_by_role("heading", name="Cants of").wait_for()
    visitor.go(f"{address}/curves/{index + 1}")
    page.locator(".verdict .by-hand").first.wait_for()
    page.get_by_role("button", name="Take it back").first.click()
    page.get_by_text("Taken back:").first.wait_for()
    assert page.locator(".verdict .by-hand").count() == 0
    visitor.go(f"{address}/history")
    assert page.get_by_text("drainage near the weir").count() == 1
    wide = page.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
    assert wide <= 0
    assert visitor.said == []


def test_moved_and_held_by_keyboard_alone(visit: Visit, planned: PlannedLine) -> None:
    visitor = visit()
    address = sample(visitor)
    index = index_of(planned, "change")
    page = visitor.go(f"{address}/curves/{index + 1}")
    cant = float(planned.plan.proposed_mm[index])
    tab_to(page, "#slide")
    page.keyboard.press("ArrowLeft")
    settled(page, cant - 5)
    assert page.locator("#slide").get_attribute("aria-valuetext") == f"{cant - 5:g} mm"
    page.wait_for_function(
        "mm => document.getElementById('chain-around').dataset.cant == mm", arg=f"{cant - 5:g}"
    )
    tab_to(page, "[name='because']")
    page.keyboard.type("as agreed")
    page.keyboard.press("Enter")
    page.get_by_text(f"cant held at {cant - 5:.0f}").first.wait_for()
    assert visitor.said == []


def test_without_script_the_form_does_the_same(visit: Visit, planned: PlannedLine) -> None:
    visitor = visit("phone", java_script_enabled=False)
    address = sample(visitor)
    index = index_of(planned, "change")
    page = visitor.go(f"{address}/curves/{index + 1}")
    assert not page.locator("#slide").is_visible()
    page.locator("[name='cant']").fill("15")
    page.get_by_role("button", name="Look at this cant").click()
    assert page.locator("#at-cant .verdict").get_attribute("data-cant") == "15.0"
    page.locator("[name='because']").fill("as agreed")
    page.get_by_role("button", name="Hold this cant").click()
    page.get_by_text("cant held at 15").first.wait_for()


def test_pages_of_decisions_are_accessible_and_fit_a_phone(visit: Visit, planned: PlannedLine) -> None:
    visitor = visit("phone", color_scheme="dark")
    address = sample(visitor)
    index = index_of(planned, "restrict")
    page = visitor.go(f"{address}/curves/{index + 1}")
    page.get_by_role("button", name="See what it would change").first.click()
    page.get_by_text("Nothing has been kept yet").wait_for()
    axe = Axe()
    pages = [None, f"{address}/compare", f"{address}/history", f"{address}/curves/{index + 1}"]
    for path in pages:
        if path:
            visitor.go(path)
        found = axe.run(
            page, options={"runOnly": {"type": "tag", "values": ["wcag2a", "wcag2aa", "wcag22aa"]}}
        )
        bad = [v for v in found.response["violations"] if v["impact"] in ("serious", "critical")]
        assert [(v["id"], v["nodes"][0]["html"][:200]) for v in bad] == [], path
        wide = page.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        assert wide <= 0, path


def test_option_is_looked_at_and_taken(visit: Visit, planned: PlannedLine) -> None:
    visitor = visit("phone")
    address = sample(visitor)
    index = index_of(planned, "restrict")
    option = planned.record(index)["options"][0]
    page = visitor.go(f"{address}/curves/{index + 1}")
    page.get_by_role("button", name="See what it would change").first.click()
    page.get_by_text("Nothing has been kept yet").wait_for()
    page.locator("[name='because']").fill("agreed with operations")
    page.get_by_role("button", name="Keep it").click()
    page.get_by_role("heading", name="Cants of").wait_for()
    page = visitor.go(f"{address}/curves/{index + 1}")
    verdict = page.locator(".verdict").first.inner_text().replace("\xa0", " ")
    assert option["status"] in verdict
    assert f"Cant {option['cant_mm']:.0f} mm" in verdict
    assert visitor.go(f"{address}/history").get_by_text("agreed with operations").count() == 1
    assert visitor.said == []
