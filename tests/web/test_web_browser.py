"""The whole way in a real browser: desktop and phone, by keyboard, without a console error, accessible."""

from __future__ import annotations

import io
import json
import re
from pathlib import Path

import openpyxl
import pytest
from axe_playwright_python.sync_playwright import Axe
from screen_tools import SCREENS, Visit, Visitor, tab_to

pytestmark = pytest.mark.browser

SERIOUS = ("serious", "critical")
RULES = ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"]


def plan_bare_list(visitor: Visitor, file: Path) -> str:
    """Go from a list without trains and limits to its cants; give the address of the plan."""
    page = visitor.go("/")
    page.get_by_label("A workbook or a text table").set_input_files(file)
    page.get_by_role("button", name="Read this list").click()
    page.get_by_role("link", name="This is right: on to the trains").click()
    for row, (name, category, speed) in enumerate(
        [("Express", "passenger", "140"), ("Goods", "freight", "80")]
    ):
        page.locator(f"[name='{row}-name']").fill(name)
        page.locator(f"[name='{row}-category']").fill(category)
        page.locator(f"[name='{row}-speed_kmh']").fill(speed)
    page.get_by_role("button", name="Take these trains").click()
    page.get_by_label("Take the limits of").select_option("set:typical")
    page.get_by_role("button", name="Take them").click()
    page.get_by_role("button", name="Plan the cants").click()
    page.get_by_role("heading", name="Cants of 3 curves").wait_for()
    return page.url.removeprefix(visitor.address).removesuffix("/cants")


@pytest.mark.parametrize("script", [True, False], ids=["with script", "without script"])
@pytest.mark.parametrize("screen", SCREENS)
def test_from_upload_to_downloaded_workbook(visit: Visit, bare_list: Path, screen: str, script: bool) -> None:
    visitor = visit(screen, java_script_enabled=script)
    plan = plan_bare_list(visitor, bare_list)
    page = visitor.page
    with page.expect_download() as waited:
        page.get_by_role("link", name="Download the workbook").click()
    book = openpyxl.load_workbook(io.BytesIO(waited.value.path().read_bytes()))
    document = json.loads(visitor.context.request.get(f"{visitor.address}{plan}/plan.json").body())
    cells = {v for sheet in book for row in sheet.iter_rows(values_only=True) for v in row}
    assert {c["recommended_cant_mm"] for c in document["curves"]} <= cells
    page.get_by_role("link", name="A2", exact=True).click()
    page.get_by_role("heading", name="Curve A2").wait_for()
    page.get_by_role("link", name="Next curve: A3").click()
    page.get_by_role("heading", name="Curve A3").wait_for()
    page.get_by_role("link", name="Along the line").click()
    assert page.locator("svg.strip").count() >= 1
    page.locator("svg.strip a").first.click()
    page.get_by_role("heading", name="Curve A1").wait_for()
    assert visitor.said == []


def test_whole_way_by_keyboard_alone(visit: Visit) -> None:
    visitor = visit()
    page = visitor.go("/")
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.className") == "skip"
    page.keyboard.press("Enter")
    assert page.evaluate("document.activeElement.id") == "main"
    tab_to(page, "form[action='/plans/sample'] button")
    page.keyboard.press("Enter")
    page.get_by_role("heading", name="Cants of").wait_for()
    tab_to(page, ".counts a.status-change")
    page.keyboard.press("Enter")
    page.wait_for_url("**status=change*")
    tab_to(page, "input[type='search']")
    page.keyboard.type("101")
    page.keyboard.press("Enter")
    page.wait_for_url("**search=101*")
    tab_to(page, "table.curves tbody th a")
    page.keyboard.press("Enter")
    page.get_by_role("heading", name="Curve 101").wait_for()
    tab_to(page, ".scroll")
    tab_to(page, "svg.strip a")
    tab_to(page, "footer a")
    page.keyboard.press("Shift+Tab")
    page.go_back()
    page.go_back()
    with page.expect_download() as waited:
        tab_to(page, "a[href$='/workbook']", 400)
        page.keyboard.press("Enter")
    assert waited.value.suggested_filename == "dunmarrow_keldrith-cants.xlsx"
    assert visitor.said == []


@pytest.mark.parametrize(("screen", "scheme"), [("desktop", "light"), ("phone", "dark")])
def test_every_page_is_accessible_and_fits_the_screen(visit: Visit, screen: str, scheme: str) -> None:
    visitor = visit(screen, color_scheme=scheme)
    page = visitor.go("/")
    axe = Axe()
    page.get_by_role("button", name="Plan the sample line").click()
    plan = page.url.removeprefix(visitor.address).removesuffix("/cants")
    steps = ["cants", "list", "trains", "limits", "line", "findings", "files", "print", "curves/1", "delete"]
    helps = ["", "terms", "formulas", "columns", "limits", "limits/typical"]
    for path in ["/", "/nothing-here", *(f"{plan}/{s}" for s in steps), *(f"/help/{h}" for h in helps)]:
        visitor.go(path)
        found = axe.run(page, options={"runOnly": {"type": "tag", "values": RULES}})
        bad = [v for v in found.response["violations"] if v["impact"] in SERIOUS]
        told = [(v["id"], v["nodes"][0]["html"][:200], v["nodes"][0]["failureSummary"]) for v in bad]
        assert told == [], path
        beyond = page.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        assert beyond <= 0, f"{path} is {beyond} px wider than the screen"
    assert [s for s in visitor.said if "404" not in s] == []


def test_two_browsers_never_see_each_others_plans(visit: Visit) -> None:
    one, other = visit(), visit()
    page = one.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    plan = page.url
    answer = other.page.goto(plan)
    assert answer is not None
    assert answer.status == 404
    other.go("/").get_by_text("None yet").wait_for()
    assert page.goto(plan).status == 200


def test_bad_field_keeps_what_was_typed_and_says_why(visit: Visit) -> None:
    visitor = visit("phone")
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("link", name="Trains", exact=False).first.click()
    field = page.locator("[name='0-speed_kmh']")
    field.fill("fast")
    page.get_by_role("button", name="Take these trains").click()
    page.get_by_role("alert").wait_for()
    assert field.input_value() == "fast"
    described = field.get_attribute("aria-describedby")
    assert "not a number" in page.locator(f"#{described}").inner_text()


def test_page_for_print_leaves_the_tools_out(visit: Visit) -> None:
    visitor = visit()
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("link", name="Page for print").click()
    page.emulate_media(media="print")
    assert not page.locator("header.top").is_visible()
    assert not page.locator("nav.steps").is_visible()
    assert page.get_by_text("Approved").is_visible()
    assert page.pdf(format="A4").startswith(b"%PDF")


@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_line_picture_is_legible_on_paper(visit: Visit, tmp_path: Path, scheme: str) -> None:
    visitor = visit(color_scheme=scheme)
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("link", name="Along the line").click()
    page.emulate_media(media="print")
    for control in ("header.top", "nav.steps", "form.filters", "ul.zoom"):
        assert page.locator(control).count() == 1
        assert not page.locator(control).is_visible(), control
    paint = "s => { const c = getComputedStyle(document.querySelector(s)); return [c.fill, c.stroke] }"
    assert page.evaluate(paint, "svg.strip .panel")[0] == "rgb(255, 255, 255)"
    assert page.evaluate(paint, "svg.strip .below")[1] == "rgb(0, 0, 0)"
    assert page.evaluate(paint, "svg.strip .permissible.class-0")[0] == "rgb(20, 67, 122)"
    assert page.evaluate(paint, "svg.strip .planned.class-0")[0] == "none"
    file = tmp_path / "line.pdf"
    page.pdf(path=file, prefer_css_page_size=True)
    boxes = re.findall(rb"/MediaBox\s*\[\s*0 0 ([\d.]+) ([\d.]+)", file.read_bytes())
    assert boxes
    for width, height in boxes:
        assert (float(width), float(height)) == pytest.approx((842, 595), abs=2)  # A4 lying, in points
    tallest = page.evaluate(
        "Math.max(...[...document.querySelectorAll('svg.strip')].map(s => s.getBoundingClientRect().height))"
    )
    assert tallest < (210 - 2 * 12) / 25.4 * 96, "a strip fits between the margins of a sheet"
