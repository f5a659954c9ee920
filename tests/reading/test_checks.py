"""Checks of rows and signs: each names its row, and what is merely odd is told and not refused."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from messy import sheet, traffic_of

from cant.files.grid import CellRange, Sheet, Value, Workbook
from cant.model.limits import LimitRow, LimitSet
from cant.model.reading import Reading
from cant.reading import read_workbook


def read(*sheets: Sheet, **more: Any) -> Reading:
    return read_workbook(Workbook("list.xlsx", "xlsx", list(sheets)), **more)


def canonical(*rows: list[Value]) -> Sheet:
    header: list[Value] = [
        "Curve",
        "Start",
        "End",
        "Radius",
        "Hand",
        "Cant",
        "Cant at least",
        "Cant at most",
        "Speed",
    ]
    return Sheet("Curves", [header, *rows])


def row(name: str, **cells: Value) -> list[Value]:
    number = float(name)
    usual: dict[str, Value] = {
        "start": number,
        "end": number + 0.25,
        "radius": 800.0,
        "hand": "L",
        "cant": 60.0,
        "low": None,
        "high": None,
        "speed": 100.0,
    }
    return [name, *(usual | cells).values()]


@pytest.mark.parametrize(
    ("cells", "column"),
    [
        ({"radius": None}, "Radius"),
        ({"radius": 0}, "Radius"),
        ({"radius": "straight", "hand": None}, "Radius"),
        ({"radius": 0, "hand": "right", "cant": 0}, "Radius"),
        ({"radius": 0.5}, "Radius"),
        ({"radius": 2e6}, "Radius"),
        ({"radius": "tight"}, "Radius"),
        ({"cant": 301.0}, "Cant"),
        ({"cant": -200.0}, "Cant"),
        ({"speed": -5.0}, "Speed"),
        ({"speed": 0.0}, "Speed"),
        ({"speed": 900.0}, "Speed"),
        ({"start": 5.0, "end": 5.0}, "End"),
        ({"hand": "Q"}, "Hand"),
        ({"start": "north"}, "Start"),
    ],
)
def test_a_fault_refuses_its_row_alone_and_keeps_it_in_the_list(cells: dict[str, Value], column: str) -> None:
    reading = read(canonical(row("1"), row("2", **cells), row("3")))
    assert {(r.row, r.column) for r in reading.rejected} == {(3, column)}
    assert reading.curves.rejected.tolist() == [False, True, False]
    assert reading.curves.curve == ["1", "2", "3"]


def test_a_list_that_descends_keeps_its_ends_and_one_row_that_turns_round_is_refused() -> None:
    down = [row(str(i), start=i + 0.25, end=float(i)) for i in range(1, 5)]
    assert not read(canonical(*down)).rejected
    assert read(canonical(*down)).curves.as_read(0)["start_km"] == 1.25
    mixed = read(canonical(*down, row("9")))
    assert [r.row for r in mixed.rejected] == [6]


@pytest.mark.parametrize(
    ("rows", "refused", "hands"),
    [
        ([("L", 800.0), ("R", -700.0), ("L", 650.0), ("R", -900.0)], [], [1, -1, 1, -1]),
        ([("L", -800.0), ("R", 700.0), ("", -650.0), ("", 900.0)], [], [1, -1, 1, -1]),
        ([("L", 800.0), ("R", 700.0), ("L", 650.0), ("R", -900.0)], [5], [1, -1, 1, -1]),
        ([("L", 800.0), ("L", 700.0), ("L", 650.0), ("L", -900.0)], [5], [1, 1, 1, 1]),
    ],
)
def test_signs_of_radii_beside_hands(
    rows: list[tuple[str, float]], refused: list[int], hands: list[int]
) -> None:
    given = [row(str(i + 1), hand=hand or None, radius=radius) for i, (hand, radius) in enumerate(rows)]
    reading = read(canonical(*given))
    assert [r.row for r in reading.rejected] == refused
    assert reading.curves.hand.tolist() == hands
    assert (reading.curves.radius_m > 0).all()


def test_a_negative_cant_of_the_canonical_table_stays_negative() -> None:
    given = [
        row("1", cant=50.0),
        row("2", hand="R", cant=-40.0),
        row("3", cant=50.0),
        row("4", hand="R", cant=-30.0),
    ]
    assert read(canonical(*given)).curves.cant_mm.tolist() == [50, -40, 50, -30]


def test_a_cant_whose_sign_repeats_the_hand_loses_it_elsewhere() -> None:
    reading = read(
        sheet("""
Kurve | von km | bis km | Radius | Richtung | Überhöhung | v
1 | 1,100 | 1,350 | 600 | L | 100 | 90
2 | 2,100 | 2,350 | 700 | R | -80 | 90
3 | 3,100 | 3,350 | 800 | R | -60 | 90
4 | 4,100 | 4,350 | 900 | L | 50 | 90
""")
    )
    assert reading.curves.cant_mm.tolist() == [100, 80, 60, 50]


def test_speed_and_radius_that_hardly_belong_together_are_told() -> None:
    reading = read(canonical(row("1"), row("2", radius=65.0, speed=120.0)))
    assert not reading.rejected
    assert any("rows 3" in note and "check both" in note for note in reading.notes)


def test_remarks_are_situations_only_where_the_limits_have_rules_for_them() -> None:
    text = """
Curve | km from | km to | Radius (m) | Cant (mm) | Speed (km/h) | Obs. | Tunnel
1 | 1.100 | 1.350 | 600 | 100 | 90 | quai voie 1 | x
2 | 2.100 | 2.350 | 700 | 80 | 90 | new rails |
"""
    limits = LimitSet(
        name="own",
        rows=(
            LimitRow(quantity="cant", normal=100, unit="mm", situation="platform"),
            LimitRow(quantity="cant", normal=120, unit="mm", situation="tunnel"),
        ),
    )
    assert read(sheet(text)).curves.as_read(0)["situation"] is None
    assert read(sheet(text), limits=limits).curves.as_read(0)["situation"] == "platform; tunnel"
    assert read(sheet(text), limits=limits).curves.as_read(1)["situation"] is None


def test_one_value_merged_over_both_transitions_is_both() -> None:
    merged = (CellRange(2, 4, 2, 5),)
    reading = read(
        sheet(
            "Curve | km from | km to | Radius (m) | Trans in (m) | Trans out (m)\n1 | 1.1 | 1.3 | 600 | 60 |",
            merged=merged,
        )
    )
    read_values = reading.curves.as_read(0)
    assert (read_values["transition_in_m"], read_values["transition_out_m"]) == (60, 60)


def test_columns_of_speeds_that_no_class_takes_are_told() -> None:
    text = """
Curve | km from | km to | Radius (m) | Cant (mm) | Line speed | V Merci | V Rango C | V Rango P
1 | 1.100 | 1.350 | 600 | 100 | 90 | 70 | 100 | 110
"""
    reading = read(sheet(text), traffic_of(("Regionale", "passenger", 120.0), ("Merci", "freight", 90.0)))
    assert any("V Rango C" in note for note in reading.notes)
    assert set(reading.curves.class_speeds) == {"Merci"}


def test_two_speeds_in_a_cell_are_asked_for_where_the_traffic_leaves_it_open() -> None:
    text = """
Curve | km from | km to | Radius (m) | Cant (mm) | Speed
1 | 1.100 | 1.350 | 600 | 100 | 90/70
"""
    three = traffic_of(("A", "passenger", 120.0), ("B", "passenger", 100.0), ("C", "mineral", 90.0))
    [question] = read(sheet(text), three).questions
    assert question.rows == (2,)
    answers = {"answers": {"Curves": {"Speed": "the first is the line speed"}}}
    assert read(sheet(text), three, answers=answers).curves.speed_kmh.tolist() == [90]


def test_a_hidden_column_gives_way_to_a_visible_one() -> None:
    text = """
Curve | km from | km to | Radius (m) | Existing cant (mm) | Cant (mm) | Speed (km/h)
1 | 1.100 | 1.350 | 600 | 100 | 90 | 90
"""
    shown, hidden = sheet(text), sheet(text)
    hidden.hidden_columns = frozenset({4})
    assert read(shown).curves.cant_mm.tolist() == [100]
    assert read(hidden).curves.cant_mm.tolist() == [90]


def test_cant_in_is_inches_where_no_cant_out_stands_beside_it() -> None:
    text = "Curve | MP from | MP to | Degree | Cant in | Psgr mph\n1 | 1.1 | 1.3 | 2°15' | 3.5 | 45"
    assert read(sheet(text)).curves.cant_mm.tolist() == [pytest.approx(88.9)]


def test_a_mid_ordinate_over_a_chord_of_feet_is_in_inches() -> None:
    """On a chord of 62 ft an inch is a degree of curve (practice of 49 CFR 213): 2 in is about 873 m."""
    header = "Curve | MP from | MP to | Mid-ordinate (62 ft chord) | Elev (in) | Psgr mph"
    text = f"{header}\n1 | 1.1 | 1.3 | 2 | 3.5 | 45"
    assert read(sheet(text)).curves.radius_m.tolist() == [pytest.approx(873, rel=0.01)]


def test_a_mileage_in_a_metric_sheet_is_asked_for() -> None:
    text = """
Curve | Mileage from | Mileage to | Radius (m) | Cant (mm) | Speed (km/h)
1 | 1.134 | 1.395 | 600 | 100 | 90
2 | 2.116 | 2.352 | 700 | 80 | 90
"""
    [question] = read(sheet(text)).questions
    assert set(question.choices) == {"decimal miles", "kilometres"}


def test_a_row_without_curvature_hand_or_cant_is_straight_track() -> None:
    reading = read(
        canonical(row("1"), row("2", radius=0, hand=None, cant=None), row("3", radius=0, hand="G"))
    )
    assert [r.row for r in reading.rejected] == [4]
    assert any("row 3: straight track" in note for note in reading.notes)


@pytest.mark.parametrize(
    ("header", "values", "radius_m", "cant_mm"),
    [
        (
            ["Curve", "Start", "End", "Radius", "Cant", "Speed (mph)"],
            ["1", 1000, 1300, 40, 75, 50],
            804.672,
            75,
        ),
        (
            ["Curve", "Start", "End", "Radius (ft)", "Cant", "Speed (mph)"],
            ["1", 1, 2, 2865, 3.5, 50],
            873.252,
            88.9,
        ),
        (["Curve", "Start", "End", "Radius", "Cant", "Speed (mph)"], ["1", 1000, 1300, 800, 75, 50], 800, 75),
        (["Curve", "Start", "End", "Radius", "Cant", "Speed"], ["1", 1000, 1300, 800, 5, 80], 800, 5),
    ],
    ids=["chains", "inches", "metres beside mph", "a small cant in metric units"],
)
def test_canonical_headings_without_units_beside_imperial_ones(
    header: list[Value], values: list[Value], radius_m: float, cant_mm: float
) -> None:
    reading = read(Sheet("Curves", [header, values]))
    assert not reading.rejected
    assert reading.curves.radius_m[0] == pytest.approx(radius_m)
    assert reading.curves.cant_mm[0] == pytest.approx(cant_mm)


def test_one_speed_among_pairs_is_the_lines_and_speeds_up_no_class() -> None:
    header: list[Value] = ["Curve", "Start", "End", "Radius", "Cant", "Speed"]
    rows: list[list[Value]] = [["1", 1000, 1300, 800, 75, "80/60"], ["2", 2000, 2300, 800, 75, 90]]
    traffic = traffic_of(("Fast", "passenger", 120.0), ("Goods", "freight", 60.0))
    reading = read(Sheet("Curves", [header, *rows]), traffic)
    speeds = reading.curves.class_speeds
    assert (speeds["Fast"][0], speeds["Goods"][0]) == (80, 60)
    assert np.isnan([speeds["Fast"][1], speeds["Goods"][1]]).all()
    assert reading.curves.speed_kmh[1] == 90


def test_bounds_of_a_site_that_cross_are_told_and_left_to_the_planner() -> None:
    reading = read(canonical(row("1", low=90.0, high=50.0)))
    assert not reading.rejected
    assert any("row 2: Cant at least is above Cant at most" in note for note in reading.notes)


@pytest.mark.parametrize(
    ("heading", "radius_m"),
    [
        # R = c / (2 sin(D / 2)) for a chord c, R = a / D for an arc a: the definitions themselves.
        ("Degree (100 ft chord)", 15.24 / np.sin(np.radians(5))),
        ("Degree (100 ft arc)", 30.48 / np.radians(10)),
        ("Degree (30.5 m chord)", 15.25 / np.sin(np.radians(5))),
        ("Degree (20 m chord)", 10 / np.sin(np.radians(5))),
    ],
)
def test_a_degree_goes_by_the_chord_or_arc_that_its_heading_names(heading: str, radius_m: float) -> None:
    header: list[Value] = ["Curve", "km", heading, "Cant (mm)", "Speed (km/h)"]
    reading = read(Sheet("List", [header, ["1", 1.0, 10, 80, 40], ["2", 2.0, 8, 80, 45]]))
    assert reading.curves.radius_m[0] == pytest.approx(radius_m, rel=1e-6)


def test_a_degree_over_a_length_that_is_not_known_is_refused_and_not_taken_for_100_ft() -> None:
    header: list[Value] = ["Curve", "km", "Degree (10 m chord)", "Cant (mm)", "Speed (km/h)"]
    reading = read(Sheet("List", [header, ["1", 1.0, 2, 80, 40], ["2", 2.0, 1, 80, 45]]))
    assert [r.row for r in reading.rejected] == [2, 3]
    assert "over 10 m is not known" in reading.rejected[0].problem
