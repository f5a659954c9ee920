"""Help is made from the code's own data: nothing that the program knows is missing from it."""

from __future__ import annotations

import html

from web_tools import Browser

from cant import limit_sets
from cant.model.limits import QUANTITIES
from cant.model.plan import STATUSES
from cant.model.settings import METHODS
from cant.quantities.catalogue import CATALOGUE, SYMBOLS
from cant.reading.columns import TABLES, columns_of
from cant.writing.cautions import CAUTIONS
from webapp.words import STATUS_HELP, STATUS_MARK


def page(browser: Browser, address: str) -> str:
    answer = browser.get(address)
    assert answer.status_code == 200
    return html.unescape(answer.text)


def test_every_column_is_documented_with_its_headings(browser: Browser) -> None:
    text = page(browser, "/help/columns")
    for table in TABLES:
        for column in columns_of(table):
            assert f"<dt>{column.name}" in text
            assert column.help in text
            for headings in (column.headings or {}).values():
                assert ", ".join(headings) in text


def test_every_formula_is_documented_with_its_source(browser: Browser) -> None:
    text = page(browser, "/help/formulas")
    for formula in CATALOGUE.values():
        assert formula.template in text
        assert formula.source in text
    for name, symbol in SYMBOLS.items():
        assert f"<i>{name}</i>" in text
        assert symbol.words[1:] in text


def test_every_quantity_method_status_and_caution_is_documented(browser: Browser) -> None:
    text = page(browser, "/help/terms")
    for name in (*QUANTITIES, *METHODS):
        assert name in text
    text = page(browser, "/help/")
    for status in STATUSES:
        assert status in text
        assert STATUS_HELP[status]
        assert STATUS_MARK[status]
    for caution in CAUTIONS:
        assert caution in text


def test_every_limit_set_is_shown_with_each_value_and_clause(browser: Browser) -> None:
    contents = page(browser, "/help/limits")
    for name in limit_sets.names():
        limits = limit_sets.load(name)
        assert (limits.title or name) in contents
        text = page(browser, f"/help/limits/{name}")
        for row in limits.rows:
            assert row.clause in text
            assert row.note in text
        assert ("UNVERIFIED" in text) == (not limits.verified)
    assert browser.get("/help/limits/nothing").status_code == 404
