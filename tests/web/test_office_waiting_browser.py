"""A waiting page in a real browser: it tells of the work, goes on by itself, and needs no script."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import pytest
from axe_playwright_python.sync_playwright import Axe
from flask import Flask
from screen_tools import Visit
from web_tools import served
from work_tools import EVERYTHING, parts_of, work_off

from webapp.keeping.work_claims import Claims
from webapp.working.orders import KINDS

pytestmark = pytest.mark.browser
RULES = ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"]


@pytest.fixture
def long(start: Callable[..., Flask]) -> Flask:
    return start(work=EVERYTHING)


@pytest.fixture
def address(long: Flask) -> Iterator[str]:
    """Run a service in which every list is long, in this process; nobody works unless a test does."""
    with served(long) as address:
        yield address


def test_progress_is_shown_and_the_page_goes_on(visit: Visit, long: Flask) -> None:
    visitor = visit("phone")
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_text("Next to be begun").wait_for()
    assert page.get_by_role("progressbar").get_attribute("value") is None
    claims = Claims(parts_of(long).database)
    piece = claims.take(KINDS)
    assert piece is not None
    claims.tell(piece, 0.42, "choosing cants")
    page.get_by_text("42 %, choosing cants").wait_for()
    assert page.get_by_role("progressbar").get_attribute("value") == "0.42"
    found = Axe().run(page, options={"runOnly": {"type": "tag", "values": RULES}})
    assert found.response["violations"] == []
    claims.give_back(piece, counts=False)
    assert work_off(long) == 1
    page.get_by_role("heading", name="Cants of").wait_for()
    page.get_by_role("link", name="Download the workbook").click()
    page.get_by_role("heading", name="Making the workbook").wait_for()
    assert work_off(long) == 1
    page.get_by_role("heading", name="The workbook is ready").wait_for()
    with page.expect_download() as waited:
        page.get_by_role("link", name="Download it").click()
    assert waited.value.suggested_filename.endswith("-cants.xlsx")
    assert visitor.said == []


@pytest.mark.parametrize("script", [True, False], ids=["with script", "without script"])
def test_a_proposal_goes_on_after_its_work(visit: Visit, long: Flask, script: bool) -> None:
    visitor = visit("desktop", java_script_enabled=script)
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("heading", name="Planning the cants").wait_for()
    assert work_off(long) == 1
    page.get_by_role("heading", name="Cants of").wait_for()
    plan = page.url.removesuffix("/cants")
    page.goto(f"{plan}/limits")
    page.get_by_label("Take the limits of").select_option("set:typical")
    page.get_by_role("button", name="See what it would change to take these limits").click()
    page.get_by_role("heading", name="Planning the cants").wait_for()
    assert work_off(long) == 1
    if not script:
        page.get_by_role("button", name="Look whether it is done").click()
    page.get_by_role("heading", name="What this would change").wait_for()
    page.goto(f"{plan}/cants")
    page.get_by_role("heading", name="Cants of").wait_for()


def test_cancelled_by_hand_and_begun_again(visit: Visit, long: Flask) -> None:
    visitor = visit("desktop")
    page = visitor.go("/")
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("button", name="Cancel it").click()
    page.get_by_role("heading", name="Cancelled: planning the cants").wait_for()
    page.get_by_role("button", name="Start it again").click()
    page.get_by_role("heading", name="Planning the cants").wait_for()
    assert work_off(long) == 1
    page.get_by_role("heading", name="Cants of").wait_for()
