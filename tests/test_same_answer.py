"""One line, one plan: by command, by library, as JSON, in metric and US units, mirrored and turned round."""

from __future__ import annotations

import io
import json
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from canonical import Table, csv, tables, xlsx
from openpyxl import load_workbook

import cant
from cant import cli
from cant.service import make_plan, read_curves
from cant.units import FOOT_M, INCH_MM, MILE_KM

KEYS = ("recommended_cant_mm", "status", "lower_mm", "upper_mm", "rms_speed_kmh", "equilibrium_speed_kmh")


def plan_of(sheets: dict[str, Table]) -> dict[str, Any]:
    return make_plan(read_curves(xlsx(sheets), "line.xlsx")).document()


def answers(document: dict[str, Any]) -> dict[str, dict[str, Any]]:
    """Give what matters of a plan by curve."""
    found = {}
    for entry in document["curves"]:
        speeds = {c["class"]: (c["permissible_speed_kmh"], c["run_speed_kmh"]) for c in entry["classes"]}
        deficiencies = {c["class"]: (c["deficiency_mm"], c["excess_mm"]) for c in entry["classes"]}
        found[entry["curve"]] = {
            **{key: entry[key] for key in KEYS},
            "speeds": speeds,
            "deficiencies": deficiencies,
            "today": entry["today"]["status"],
        }
    return found


def assert_alike(first: dict[str, Any], second: dict[str, Any], tolerance: float = 1e-9) -> None:
    assert first.keys() == second.keys()
    for key, value in first.items():
        other = second[key]
        if isinstance(value, dict):
            assert_alike(value, other, tolerance)
        elif isinstance(value, tuple):
            assert value == pytest.approx(other, rel=tolerance, abs=1e-6)
        elif isinstance(value, float):
            assert value == pytest.approx(other, rel=tolerance, abs=1e-6), key
        else:
            assert value == other, key


def frame(table: Table) -> pd.DataFrame:
    return pd.DataFrame(table[1:], columns=table[0])


def test_command_and_library_give_the_same_json(tmp_path: Path) -> None:
    data = xlsx(tables())
    source, target = tmp_path / "line.xlsx", tmp_path / "plan.json"
    source.write_bytes(data)
    with pytest.raises(SystemExit) as ended:
        cli.main(["plan", str(source), "--json", str(target)])
    assert not ended.value.code
    by_command = json.loads(target.read_text(encoding="utf-8"))
    by_library = make_plan(read_curves(data, str(source))).document()
    assert by_command == json.loads(json.dumps(by_library))


def test_data_frames_give_the_same_plan_as_the_workbook() -> None:
    sheets = tables()
    planned = cant.plan(
        frame(sheets["Curves"]),
        frame(sheets["Traffic"]),
        frame(sheets["Limits"]),
        dict(sheets["Settings"][1:]),
    )
    assert_alike(answers(planned.document()), answers(plan_of(sheets)))


def test_files_given_separately_replace_the_sheets(tmp_path: Path) -> None:
    sheets = tables()
    names = {name: tmp_path / f"{name}.csv" for name in sheets}
    for name, path in names.items():
        path.write_bytes(csv(sheets[name]))
    target = tmp_path / "plan.json"
    arguments = ["plan", names["Curves"], "--traffic", names["Traffic"], "--limits", names["Limits"]]
    arguments += ["--settings", names["Settings"], "--json", target]
    with pytest.raises(SystemExit) as ended:
        cli.main([str(a) for a in arguments])
    assert not ended.value.code
    assert_alike(answers(json.loads(target.read_text())), answers(plan_of(sheets)))


def test_frames_say_what_the_json_says() -> None:
    planned = make_plan(read_curves(xlsx(tables()), "line.xlsx"))
    frames, document = planned.to_frames(), planned.document()
    curves = frames["curves"].set_index("curve")
    for entry in document["curves"]:
        assert curves.loc[entry["curve"], "recommended_cant_mm"] == entry["recommended_cant_mm"]
        assert curves.loc[entry["curve"], "status"] == entry["status"]
        assert curves.loc[entry["curve"], "as_read_radius_m"] == entry["as_read"]["radius_m"]
    proposed = frames["classes"].query("cant == 'proposed'")
    assert len(proposed) == sum(len(entry["classes"]) for entry in document["curves"])
    assert set(frames) >= {"curves", "classes", "findings", "options", "rejected", "limits", "traffic"}


def test_the_workbook_says_what_the_json_says() -> None:
    from cant.service import annotated_workbook

    data = xlsx(tables())
    planned = make_plan(read_curves(data, "line.xlsx"))
    book = load_workbook(io.BytesIO(annotated_workbook(planned, data, "line.xlsx").data))
    rows = list(book["Curves"].iter_rows(values_only=True))
    head = list(rows[0])
    assert list(head[:13]) == tables()["Curves"][0]
    assert len(head) == len(set(head)), "an added heading must not be one that the file has already"
    cant_at, status_at = head.index("Proposed cant (mm)"), head.index("Status")
    deficiency_at = head.index("Fast: deficiency (mm)")
    for entry in planned.records():
        row = rows[entry["row"] - 1]
        assert row[cant_at] == pytest.approx(entry["recommended_cant_mm"])
        assert row[status_at] == entry["status"]
        fast = next(c for c in entry["classes"] if c["class"] == "Fast")
        assert row[deficiency_at] == pytest.approx(fast["deficiency_mm"])


def in_us_units(sheets: dict[str, Table]) -> dict[str, Table]:
    """Write the same line in feet, miles, mph; cants and limits stay millimetres where grids depend on it."""
    factors = {
        "(km)": ("(mi)", 1 / MILE_KM),
        "(m)": ("(ft)", 1 / FOOT_M),
        "(mm)": ("(in)", 1 / INCH_MM),
        "(km/h)": ("(mph)", 1 / MILE_KM),
    }
    for name in ("Curves", "Traffic"):
        head = sheets[name][0]
        for column, heading in enumerate(head):
            for unit, (other, factor) in factors.items():
                if not str(heading).endswith(unit):
                    continue
                head[column] = str(heading).replace(unit, other)
                for row in sheets[name][1:]:
                    if isinstance(row[column], int | float):
                        row[column] = float(row[column] or 0) * factor
    return sheets


def test_the_same_line_in_us_units_gives_the_same_plan() -> None:
    assert_alike(answers(plan_of(in_us_units(tables()))), answers(plan_of(tables())))


def test_mirrored_hands_give_the_same_plan() -> None:
    sheets = tables()
    for row in sheets["Curves"][1:]:
        row[6] = "L" if row[6] == "R" else "R"
    assert_alike(answers(plan_of(sheets)), answers(plan_of(tables())))


def test_shuffled_rows_give_the_same_plan() -> None:
    sheets = tables()
    sheets["Curves"][1:] = [sheets["Curves"][i] for i in (3, 1, 4, 2)]
    assert_alike(answers(plan_of(sheets)), answers(plan_of(tables())))


def test_the_chinese_worked_example() -> None:
    """An examination problem, R 600, mean 66.7, fastest 90, freight 45, I 75, E 50 mm, C 11.8.

    Printed: 84.3 to 89.8 mm, 85 mm is set; deficiency 74.3 and excess 45.2 mm (worked problems on permanent
    way of Chinese technical schools). The weights are those that make the mean 66.7.
    """
    share = (66.7**2 - 45**2) / (90**2 - 45**2)
    planned = cant.plan(
        pd.DataFrame({"Curve": ["1"], "Radius (m)": [600], "Hand": ["L"], "Speed (km/h)": [90]}),
        pd.DataFrame(
            {
                "Class": ["Passenger", "Freight"],
                "Category": ["passenger", "freight"],
                "Speed (km/h)": [90, 45],
                "Trains per day": [share, 1 - share],
                "Mass (t)": [1000, 1000],
            }
        ),
        pd.DataFrame(
            {"Quantity": ["cant deficiency", "cant excess"], "Normal": [75, 50], "Unit": ["mm", "mm"]}
        ),
        {"Equilibrium constant": 11.8},
    )
    record = planned.record(0)
    assert record["lower_mm"] == pytest.approx(84.3, abs=0.05)
    assert record["upper_mm"] == pytest.approx(89.8, abs=0.05)
    assert record["rms_speed_kmh"] == pytest.approx(66.7)
    assert record["recommended_cant_mm"] == 85
    figures = {entry["class"]: entry for entry in record["classes"]}
    assert figures["Passenger"]["deficiency_mm"] == pytest.approx(74.3, abs=0.05)
    assert figures["Freight"]["excess_mm"] == pytest.approx(45.2, abs=0.05)
