"""What the tests of background work share: a service in which every list is long, and its queue by hand."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

from flask import Flask
from web_tools import Browser
from werkzeug.test import TestResponse

from webapp.context import EXTENSION, Running
from webapp.working.settings import Work
from webapp.working.worker import do_waiting

EVERYTHING = Work(long_file_kb=0, long_curves=0)
"""Settings under which every list is long."""
SHOWN = re.compile(r'data-asks="([^"]+)"')


def parts_of(app: Flask) -> Running:
    """Give the parts of a running service."""
    parts: Running = app.extensions[EXTENSION]
    return parts


def work_off(app: Flask) -> int:
    """Do all that waits, in this process; give the number of pieces."""
    return do_waiting(parts_of(app).config, parts_of(app).database)


def worked(app: Flask, ask: Callable[[], TestResponse]) -> TestResponse:
    """Ask until the answer is there, and do what is waiting meanwhile."""
    for _ in range(5):
        answer = ask()
        if answer.status_code != 202:
            return answer
        assert work_off(app) > 0
    message = "the work never ends"
    raise AssertionError(message)


def planned_sample(app: Flask, browser: Browser) -> str:
    """Plan the sample line in the background; give the address of its pages."""
    path = browser.sample()
    assert worked(app, lambda: browser.get(f"{path}/cants")).status_code == 200
    return path


def piece_shown(answer: TestResponse) -> str:
    """Give the JSON address of the work that a waiting page tells of."""
    found = SHOWN.search(answer.text)
    assert found is not None, answer.text
    return found.group(1)


def plain(value: Any) -> Any:
    """Give JSON without the moments that differ from one answer to the next."""
    return {k: v for k, v in value.items() if k not in ("made", "day")} if isinstance(value, dict) else value
