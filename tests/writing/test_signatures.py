"""Signatures on the summary sheet: names and days where somebody signed, room to sign by hand elsewhere."""

from __future__ import annotations

import io
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from openpyxl import load_workbook

from cant import service
from cant.model.signatures import Signature, Signatures

ROOT = Path(__file__).resolve().parents[2]
SAMPLE = ROOT / "sample_data" / "dunmarrow_keldrith.xlsx"
DIGEST = "ab" * 32


@pytest.fixture(scope="module")
def planned() -> tuple[service.PlannedLine, bytes]:
    data = SAMPLE.read_bytes()
    return service.make_plan(service.read_curves(data, SAMPLE.name)), data


def block(planned: tuple[service.PlannedLine, bytes], signatures: Signatures | None) -> list[list[Any]]:
    """Give the rows of the summary from the heading of the signatures on."""
    made = service.annotated_workbook(*planned, SAMPLE.name, signatures=signatures)
    sheet = load_workbook(io.BytesIO(made.data))["Plan summary"]
    rows = [[cell.value for cell in row] for row in sheet.iter_rows()]
    formulas = [c for row in sheet.iter_rows() for c in row if c.data_type == "f"]
    assert not formulas
    first = next(i for i, row in enumerate(rows) if row[1] == "Name")
    return rows[first:]


def test_without_signatures_there_is_room_to_sign(planned: tuple[service.PlannedLine, bytes]) -> None:
    rows = block(planned, None)
    assert [row[0] for row in rows[1:4]] == ["Prepared", "Checked", "Approved"]
    assert not any(value for row in rows[1:4] for value in row[1:])
    assert len([row for row in rows if any(row)]) == 4


def test_signatures_stand_with_name_and_day_over_their_digest(
    planned: tuple[service.PlannedLine, bytes],
) -> None:
    nasty = '=HYPERLINK("http://x","y")'
    signed = Signatures(
        DIGEST,
        (Signature("prepared", nasty, date(2026, 12, 1)), Signature("checked", "Bo Lind", date(2026, 12, 2))),
    )
    rows = block(planned, signed)
    assert [(row[0], row[1], row[5] or "") for row in rows[1:4]] == [
        ("Prepared", nasty, "2026-12-01"),
        ("Checked", "Bo Lind", "2026-12-02"),
        ("Approved", None, ""),
    ]
    assert any(DIGEST in str(value) for row in rows[4:] for value in row)


def test_the_text_tells_signatures_apart_and_gives_them_back() -> None:
    day = date(2026, 12, 1)
    one = Signatures(DIGEST, (Signature("prepared", "Anna", day),))
    others = (
        one,
        Signatures("cd" * 32, one.signed),
        Signatures(DIGEST, (Signature("prepared", "Bert", day),)),
        Signatures(DIGEST, (*one.signed, Signature("checked", "Bert \u2028=1+1", day))),
        Signatures(DIGEST, ()),
    )
    assert len({other.as_text() for other in others}) == 5
    assert [Signatures.from_text(other.as_text()) for other in others] == list(others)
    assert one.of("prepared") is one.signed[0]
    assert one.of("approved") is None
