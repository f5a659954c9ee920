"""Rows of a limits table that contradict themselves, and the ways in which a unit is stated there."""

from __future__ import annotations

from typing import Any

import canonical
import pytest

from cant import service
from cant.errors import InputError
from cant.model.limits import LimitRow


def limits_of(heads: list[Any], *rows: list[Any]) -> tuple[LimitRow, ...]:
    sheets = canonical.tables() | {"Limits": [heads, *rows]}
    reading = service.read_curves(canonical.xlsx(sheets), "line.xlsx")
    assert reading.limits is not None
    return reading.limits.rows


HEADS = ["Quantity", "Normal", "Exceptional", "Unit"]
BANDS = [*HEADS, "Speed over", "Speed up to (mph)", "Radius over", "Radius up to"]


@pytest.mark.parametrize(
    ("heads", "row", "where", "says"),
    [
        (HEADS, ["cant", 160, 120, "mm"], "cell C2", "stricter than the normal"),
        (HEADS, ["cant gradient", 400, 500, "1 in n"], "cell C2", "stricter than the normal"),
        (HEADS, ["cant", "-", 160, "mm"], "cell B2", "no Normal value"),
        (HEADS, ["cant step", 0, None, "mm"], "cell B2", "above 0"),
        (HEADS, ["speed step", -5, None, "km/h"], "cell B2", "above 0"),
        (HEADS, ["cant gradient", "1 in some", None, "1 in n"], "cell B2", "'some'"),
        (HEADS, ["cant", "6 km/h", None, "mm"], "cell B2", "km/h"),
        (BANDS, ["cant", 160, None, "mm", 100, 60], "cell F2", "never holds"),
        (BANDS, ["cant", 160, None, "mm", None, None, 500, 500], "cell H2", "never holds"),
        (["Quantity", "Normal (in)", "Unit"], ["cant", 6, "mm"], "cell C2", "one unit a rule"),
        (["Quantity", "Normal (in)"], ["cant gradient", 2], "cell B2", "no unit of cant gradient"),
    ],
)
def test_a_row_that_contradicts_itself_is_refused_at_its_cell(
    heads: list[Any], row: list[Any], where: str, says: str
) -> None:
    with pytest.raises(InputError, match=says) as error:
        limits_of(heads, row)
    assert where in str(error.value)
    assert "sheet 'Limits'" in str(error.value)


@pytest.mark.parametrize(
    ("heads", "row", "normal_mm"),
    [
        (["Quantity", "Normal (in)"], ["cant", 6], 152.4),
        (["Quantity", "Normal (in)", "Exceptional (mm)"], ["cant", 6, 160], 152.4),
        (HEADS, ["cant", "6 in", None, "mm"], 152.4),
        (HEADS, ["cant", "6 in", None, None], 152.4),
        (HEADS, ["cant gradient", "1:400", "1 in 300", None], 2.5),
        (HEADS, ["cant gradient", "1 in 400", 300, "1 in n"], 2.5),
        (BANDS, ["cant", 160, None, "mm", 60, 60], 160.0),
    ],
)
def test_a_unit_beside_a_value_or_in_the_heading_is_never_lost(
    heads: list[Any], row: list[Any], normal_mm: float
) -> None:
    (found,) = limits_of(heads, row)
    assert found.canonical(found.normal, 1500.0) == pytest.approx(normal_mm)


def test_rows_of_a_category_that_no_class_has_are_told() -> None:
    sheets = canonical.tables()
    sheets["Limits"].append(["cant deficiency", 60, None, "mm", "pasenger", None, None])
    planned = service.make_plan(service.read_curves(canonical.xlsx(sheets), "line.xlsx"))
    told = [f["text"] for f in planned.document()["findings"] if f["code"] == "category-without-class"]
    row = len(sheets["Limits"])
    assert told == [
        f"No class of the traffic has the category 'pasenger': the limits of row {row} hold for none."
    ]
