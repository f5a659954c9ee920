"""A person at a real browser, for tests: screens, what the console said, the keyboard."""

from __future__ import annotations

from collections.abc import Callable

from playwright.sync_api import BrowserContext, Page, ViewportSize

ARGUMENTS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--no-first-run",
]
SCREENS: dict[str, ViewportSize] = {
    "desktop": {"width": 1280, "height": 900},
    "phone": {"width": 360, "height": 740},
}


class Visitor:
    """A person at a screen; whatever the console says is kept."""

    def __init__(self, context: BrowserContext, address: str) -> None:
        self.context, self.address = context, address
        self.page: Page = context.new_page()
        self.said: list[str] = []
        self.page.on("console", lambda message: self.said.append(message.text))
        self.page.on("pageerror", lambda error: self.said.append(str(error)))

    def go(self, path: str) -> Page:
        """Open a page of the service."""
        self.page.goto(self.address + path)
        return self.page


Visit = Callable[..., Visitor]


def tab_to(page: Page, selector: str, most: int = 90) -> None:
    """Press Tab until the element has the focus."""
    for _ in range(most):
        page.keyboard.press("Tab")
        if page.evaluate("s => document.activeElement.matches(s)", selector):
            return
    message = f"the keyboard does not reach {selector}"
    raise AssertionError(message)
