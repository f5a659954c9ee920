"""The calculation in the workbook is the plan's: LibreOffice computes every cell anew and follows inputs."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from book_tools import CALCULATIONS, differences, formulas_of, headings, recalculated, sheets_data, values_of
from openpyxl.workbook import Workbook
from reference.cases import random_case

from cant.errors import InputError
from cant.explaining import explain
from cant.model.curves import CurveList
from cant.model.limits import LimitSet
from cant.model.reading import Reading
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from cant.planning import plan_line
from cant.service import PlannedLine, limits_named, make_plan, read_curves
from cant.writing.book.selection import chosen_curves

SAMPLES = Path(__file__).resolve().parents[2] / "sample_data"
SEEDS = (0, 3, 7, 12, 21, 50, 53, 99)


def planned_of(
    curves: CurveList, traffic: Traffic, limits: LimitSet, settings: Settings, turnouts: Any = ()
) -> PlannedLine:
    plan = plan_line(curves, traffic, limits, settings, turnouts=turnouts)
    return PlannedLine(Reading(file="drawn", curves=curves), plan, explain(plan))


def sample(name: str) -> PlannedLine:
    path = SAMPLES / name
    if path.suffix == ".csv":
        table = SAMPLES / "ostwell_traffic.csv"
        limits = limits_named("typical")
        return make_plan(
            read_curves(path.read_bytes(), name, traffic=(table.read_bytes(), table.name), limits=limits)
        )
    return make_plan(read_curves(path.read_bytes(), name))


@pytest.mark.office
def test_every_stored_value_is_what_the_formula_gives(tmp_path: Path) -> None:
    """Samples in both systems of units, and random lines: every formula cell of every sheet, to 1e-9."""
    data = {name: sheets_data(sample(name)) for name in _SAMPLES}
    for seed in SEEDS:
        case = random_case(seed)
        settings = case.settings.model_copy(update={"units": "us" if seed % 3 == 0 else "metric"})
        try:
            planned = planned_of(case.curves, case.traffic, case.limits, settings)
        except InputError:
            continue
        data[f"seed{seed}"] = sheets_data(planned)
    formulas = {name: formulas_of(content) for name, content in data.items()}
    computed = recalculated(formulas, tmp_path)
    total = 0
    for name, book in formulas.items():
        count, wrong = differences(book, values_of(data[name]), computed[name])
        assert wrong == [], name
        total += count
    assert total > 17_000


_SAMPLES = ("dunmarrow_keldrith.xlsx", "tarrow_us_units.xlsx", "ostwell_branch.csv")


def changed_traffic(traffic: Traffic, name: str, speed: float) -> Traffic:
    rows = [row.model_copy(update={"speed_kmh": speed}) if row.name == name else row for row in traffic.rows]
    return Traffic.of(rows)


def changed_limits(limits: LimitSet, number: int, value: float) -> LimitSet:
    rows = list(limits.rows)
    rows[number] = rows[number].model_copy(update={"normal": value})
    return limits.model_copy(update={"rows": tuple(rows)})


def set_column(book: Workbook, sheet: str, heading: str, values: list[Any], first: int = 5) -> None:
    column = headings(book[sheet], 2)[heading]
    for row, value in enumerate(values, start=first):
        book[sheet].cell(row, column).value = value


def column_of(book: Workbook, sheet: str, heading: str, first: int = 5) -> list[Any]:
    column = headings(book[sheet], 2)[heading]
    return [book[sheet].cell(row, column).value for row in range(first, book[sheet].max_row + 1)]


@pytest.mark.office
def test_a_changed_input_gives_what_a_new_plan_gives(tmp_path: Path) -> None:
    """A speed, a limit, a radius and the chosen cants changed in the sheet, against a new plan.

    The checker's chosen cants and tiers are set to the new plan's; every other cell must follow by itself.
    Rows whose permissible speed the sheet declares fixed, or free of shared ends, may differ there.
    """
    old = sample("dunmarrow_keldrith.xlsx")
    plan = old.plan
    number = next(i for i, row in enumerate(plan.limits.rows) if row.quantity == "cant deficiency")
    limits = changed_limits(plan.limits, number, plan.limits.rows[number].normal - 25.0)
    traffic = changed_traffic(plan.traffic, "Express", 118.0)
    curves = plan.curves.take(np.arange(len(plan.curves)))
    radius = curves.radius_m.copy()
    radius[4] *= 1.3
    curves.radius_m = radius
    new = planned_of(curves, traffic, limits, plan.settings)
    book, wanted = formulas_of(sheets_data(old)), sheets_data(new)
    target = values_of(wanted)
    set_column(book, "Calculation", "Radius", column_of(target, "Calculation", "Radius"))
    set_column(book, "Calculation", "Chosen cant", column_of(target, "Calculation", "Chosen cant"))
    tier = "Limits: 1 normal, 2 exceptional"
    set_column(book, "Calculation", tier, column_of(target, "Calculation", tier))
    set_column(book, "Traffic used", "Speed", column_of(target, "Traffic used", "Speed"))
    set_column(book, "Limits used", "Normal", column_of(target, "Limits used", "Normal"))
    computed = recalculated({"changed": book}, tmp_path)["changed"]
    count, wrong = differences(book, target, computed, CALCULATIONS)
    assert count > 5000
    excused = fixed_rows(target) | fixed_rows(book)
    assert [line for line in wrong if _row(line) not in excused] == []
    unlike = sum(line.count("Run speed") for line in wrong)
    assert unlike <= 4


def fixed_rows(book: Workbook) -> set[tuple[str, int]]:
    """Give the rows whose permissible speed depends on a shared transition or is fixed, ends included."""
    basis = column_of(book, "Calculation by class", "Permissible speed is")
    found = {("Calculation by class", row) for row, word in enumerate(basis, start=5) if word != "live"}
    names = zip(
        *(column_of(book, "Calculation by class", head) for head in ("Track", "Curve", "Class")), strict=True
    )
    of_class = {name: row for row, name in enumerate(names, start=5)}
    ends = zip(
        *(column_of(book, "Calculation of ends", head) for head in ("Track", "Curve", "Class")), strict=True
    )
    for row, name in enumerate(ends, start=5):
        if ("Calculation by class", of_class[name]) in found:
            found.add(("Calculation of ends", row))
    return found


def _row(line: str) -> tuple[str, int]:
    sheet, rest = line.split("!", 1)
    return sheet, int("".join(c for c in rest.split(" ", 1)[0] if c.isdigit()))


def test_the_calculation_says_what_the_records_say() -> None:
    """Stored values are those of the JSON: the same numbers on every face."""
    planned = sample("dunmarrow_keldrith.xlsx")
    book = values_of(sheets_data(planned))
    records = [record for record in planned.records() if record["classes"]]
    head = headings(book["Calculation by class"], 2)
    entries = [(record, entry) for record in records for entry in record["classes"]]
    keys = {
        "Planned speed": "speed_kmh",
        "Permissible speed": "permissible_speed_kmh",
        "Run speed": "run_speed_kmh",
        "Equilibrium cant at run speed": "equilibrium_cant_mm",
        "Cant deficiency": "deficiency_mm",
        "Cant excess": "excess_mm",
        "Unbalanced acceleration in the track plane": "unbalanced_acceleration_ms2",
        "Felt acceleration": "felt_acceleration_ms2",
    }
    for row, (record, entry) in enumerate(entries, start=5):
        sheet = book["Calculation by class"]
        assert sheet.cell(row, head["Curve"]).value == record["curve"]
        for heading, key in keys.items():
            assert sheet.cell(row, head[heading]).value == pytest.approx(entry[key], abs=1e-12)
    head = headings(book["Calculation"], 2)
    for row, record in enumerate(records, start=5):
        for heading, key in (
            ("Lower bound", "lower_mm"),
            ("Upper bound", "upper_mm"),
            ("rms speed", "rms_speed_kmh"),
            ("Equilibrium speed of the chosen cant", "equilibrium_speed_kmh"),
        ):
            assert book["Calculation"].cell(row, head[heading]).value == pytest.approx(record[key])


def test_a_long_list_is_thinned_by_a_rule_that_the_sheet_states(monkeypatch: pytest.MonkeyPatch) -> None:
    planned = sample("dunmarrow_keldrith.xlsx")
    monkeypatch.setattr("cant.writing.plan_sheets.chosen_curves", lambda plan: chosen_curves(plan, 6))
    book = values_of(sheets_data(planned))
    status = column_of(book, "Calculation", "Status in the plan")
    assert len(status) == 6
    assert set(status[:]) >= {"restrict"}
    text = str(book["Calculation"]["A1"].value)
    assert "6 of the 37 planned curves" in text
