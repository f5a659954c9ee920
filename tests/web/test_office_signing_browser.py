"""The whole sign-off in a real browser: three people, from a first password to a plan that is approved."""

from __future__ import annotations

import io
import re
from collections.abc import Callable, Iterator
from datetime import UTC, datetime, timedelta

import openpyxl
import pytest
from axe_playwright_python.sync_playwright import Axe
from flask import Flask
from people_tools import OTHER_PASSWORD, PASSWORD, code_at, made, people_of
from playwright.sync_api import Browser as Chromium
from playwright.sync_api import Page
from screen_tools import SCREENS, Visitor
from test_web_browser import RULES, SERIOUS
from web_tools import served

from webapp.people import passwords
from webapp.people.settings import SignIn

pytestmark = pytest.mark.browser
FIRST = "first-pass-word-once"


@pytest.fixture
def house_at(start: Callable[..., Flask]) -> Iterator[tuple[Flask, str]]:
    """Run a service with accounts; Anna has a password for a single use."""
    app = start(sign_in=SignIn(accounts=True))
    soon = datetime.now(UTC) + timedelta(hours=1)
    people_of(app).accounts.add("anna", "Anna Holt", ["prepare"], passwords.hashed(FIRST), soon)
    made(app, "bo", ["check"], "Bo Lind")
    made(app, "cleo", ["approve"], "Cleo Marsh")
    with served(app) as address:
        yield app, address


@pytest.fixture(params=SCREENS)
def visitors(
    request: pytest.FixtureRequest, chromium: Chromium, house_at: tuple[Flask, str]
) -> Iterator[list[Visitor]]:
    """Give three people, each with a browser of his own."""
    contexts = [
        chromium.new_context(viewport=SCREENS[request.param], accept_downloads=True) for _ in range(3)
    ]
    for context in contexts:
        context.set_default_timeout(20_000)
    yield [Visitor(context, house_at[1]) for context in contexts]
    for context in contexts:
        context.close()


def enter(page: Page, name: str, password: str) -> None:
    """Sign in at the door."""
    page.get_by_label("Name").fill(name)
    page.get_by_label("Password").fill(password)
    page.get_by_role("button", name="Sign in").click()


def check_page(page: Page) -> None:
    """Find nothing grave for who does not see well, and nothing wider than the screen."""
    found = Axe().run(page, options={"runOnly": {"type": "tag", "values": RULES}})
    grave = [v for v in found.response["violations"] if v["impact"] in SERIOUS]
    assert grave == [], [(v["id"], v["nodes"][0]["html"]) for v in grave]
    assert page.evaluate("document.documentElement.scrollWidth <= document.documentElement.clientWidth")


def test_whole_sign_off(visitors: list[Visitor], house_at: tuple[Flask, str]) -> None:
    anna, bo, cleo = visitors
    page = anna.go("/")
    check_page(page)
    enter(page, "anna", FIRST)
    page.get_by_role("heading", name="Choose your own password").wait_for()
    check_page(page)
    page.get_by_label("Your password").fill(FIRST)
    page.get_by_label("New password", exact=True).fill(OTHER_PASSWORD)
    page.get_by_label("New password again").fill(OTHER_PASSWORD)
    page.get_by_role("button", name="Change it").click()
    page.get_by_role("heading", name="Your account").wait_for()
    check_page(page)
    page.get_by_role("link", name="Second factor").click()
    check_page(page)
    assert page.locator("svg.qr").bounding_box()["width"] > 100
    secret = page.locator("code").inner_text().replace(" ", "")
    page.get_by_label("Your password").fill(OTHER_PASSWORD)
    page.get_by_label("Code").fill(code_at(secret, datetime.now(UTC)))
    page.get_by_role("button", name="Turn it on").click()
    page.get_by_text("The second factor is on.").wait_for()
    for link in ("Signed in", "Keys for programs"):
        page.get_by_role("link", name=link).click()
        check_page(page)
        page.get_by_role("link", name="Back to your account").click()
    page.get_by_role("link", name="Start", exact=True).click()
    page.get_by_role("button", name="Plan the sample line").click()
    page.get_by_role("link", name="Sign off").click()
    check_page(page)
    page.get_by_label("Hand it, to check, to").select_option(label="Bo Lind (bo)")
    page.get_by_label("Note").fill("the platform on track 2 first, please")
    page.get_by_label("Your password").fill(OTHER_PASSWORD)
    page.get_by_role("button", name="Sign: prepared").click()
    page.get_by_text("Signed: prepared. Bo Lind (bo) has the plan in hand now.").wait_for()

    page = bo.go("/")
    enter(page, "bo", PASSWORD)
    page.get_by_role("heading", name="For you to check").wait_for()
    page.get_by_text("the platform on track 2 first, please").wait_for()
    check_page(page)
    page.get_by_role("link", name="dunmarrow_keldrith.xlsx").first.click()
    page.get_by_label("Hand it, to approve, to").select_option(label="Cleo Marsh (cleo)")
    page.get_by_label("Your password").fill(PASSWORD)
    page.get_by_role("button", name="Sign: checked").click()
    page.get_by_text("Signed: checked.").wait_for()

    page = cleo.go("/")
    enter(page, "cleo", PASSWORD)
    page.get_by_role("heading", name="For you to approve").wait_for()
    page.get_by_role("link", name="dunmarrow_keldrith.xlsx").first.click()
    check_page(page)
    page.get_by_label("Your password").fill(PASSWORD)
    page.get_by_role("button", name="Sign: approved").click()
    page.get_by_text("The plan is prepared, checked and approved.").wait_for()
    check_page(page)

    page = anna.page
    page.get_by_role("link", name="Take away").click()
    with page.expect_download() as waited:
        page.get_by_role("link", name="Your workbook with the plan").click()
    book = openpyxl.load_workbook(io.BytesIO(waited.value.path().read_bytes()))
    cells = {str(v) for row in book["Plan summary"].iter_rows(values_only=True) for v in row}
    assert {"Anna Holt (anna)", "Bo Lind (bo)", "Cleo Marsh (cleo)"} <= cells
    page.get_by_role("button", name="Sign out").click()
    page.get_by_role("heading", name="Sign in").wait_for()
    page.go_back()
    assert not re.search("Your workbook with the plan", page.content())
    said = anna.said + bo.said + cleo.said
    assert len(said) == 1  # what signing out cleared, which this browser tells of its own accord
    assert 'Cleared data types: "cache", "cookies", "storage"' in said[0]
