"""Traffic, limits, settings and turnouts read to the letter, and every mistake one clear error."""

from __future__ import annotations

import math
from collections.abc import Callable

import pandas as pd
import pytest

from cant.errors import InputError
from cant.files.grid import CellError, Sheet, Uncalculated, Value, Workbook
from cant.model.curves import DOES_NOT_RUN
from cant.reading import read_frames, read_workbook, sheet_from_frame
from cant.reading.limits import read_limits
from cant.reading.records import MOST_ROWS
from cant.reading.settings import read_settings, settings_from_mapping
from cant.reading.traffic import read_traffic
from cant.reading.turnouts import read_turnouts

CURVES: list[list[Value]] = [
    [
        "Line",
        "Track",
        "Curve",
        "Start",
        "End",
        "Radius",
        "Hand",
        "Transition in",
        "Transition out",
        "Cant",
        "Speed",
    ],
    ["A", "1", "1", 1.0, 1.3, 800.0, "L", 80.0, None, 70.0, 100.0],
    ["A", "1", "2", 2.0, 2.4, 1200.0, "R", 0.0, 90.0, 60.0, 120.0],
]
TRAFFIC: list[list[Value]] = [
    ["Class", "Category", "Speed (mph)", "Trains per day", "Mass (kg)", "Regular", "Line", "Track"],
    ["Fast", "Reisezug", 100.0, 30.0, 300000.0, None, None, None],
    ["Goods", "freight", 50.0, None, None, "no", None, None],
    ["Goods", "freight", 40.0, None, None, "no", "A", "1"],
    ["Ore", "mineral", 0.0, 5.0, None, True, None, None],
]
LIMITS: list[list[Value]] = [
    [
        "Quantity",
        "Normal",
        "Exceptional",
        "Unit",
        "Category",
        "Situation",
        "Speed over (mph)",
        "Radius up to (ft)",
        "Kind",
    ],
    ["cant", 6.0, 7.0, "in", None, None, None, None, "ceiling"],
    ["Cant Deficiency", 130.0, None, None, "Passenger", "Bahnsteig", 50.0, 1000.0, None],
    ["felt acceleration", "none", None, "m/s²", None, None, None, None, None],
    ["cant gradient", 400.0, None, "1 in n", None, None, None, None, None],
    ["cant excess", "90,5", None, "mm", None, None, None, None, "design"],
]


def book(**sheets: list[list[Value]]) -> Workbook:
    return Workbook(
        "line.xlsx", "xlsx", [Sheet(name, [list(r) for r in rows]) for name, rows in sheets.items()]
    )


def test_traffic_in_its_units() -> None:
    traffic, _ = read_traffic(Sheet("Traffic", TRAFFIC), "line.xlsx")
    fast, goods, local, ore = traffic.rows
    assert (fast.name, fast.category, fast.mass_t, fast.regular) == ("Fast", "passenger", 300.0, True)
    assert fast.speed_kmh == pytest.approx(160.9344)
    assert (goods.trains_per_day, goods.mass_t, goods.regular) == (None, None, False)
    assert (local.line, local.track) == ("A", "1")
    assert (ore.category, ore.speed_kmh, ore.regular) == ("mineral", 0.0, True)
    assert str(ore.place) == "line.xlsx, sheet 'Traffic', cell A5"


@pytest.mark.parametrize("table", ["traffic", "limits", "turnouts"])
def test_a_table_without_end_is_refused_before_its_rows_are_read(
    table: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    turnouts: list[list[Value]] = [
        ["Turnout", "Curve", "Radius on the straight", "Hand", "Branch speed"],
        ["T1", "1", 300.0, "L", 40.0],
    ]
    rows = {"traffic": TRAFFIC, "limits": LIMITS, "turnouts": turnouts}[table]
    read = {"traffic": read_traffic, "limits": read_limits, "turnouts": read_turnouts}[table]
    most = MOST_ROWS[table]
    assert 5_000 <= most <= 50_000
    monkeypatch.setattr("cant.reading.records.Cell", None)  # no record is made of any row
    filling = rows[-1:] * (most + 1)
    with pytest.raises(InputError, match=f"the {table} table has more than {most} rows") as caught:
        read(Sheet(table, [rows[0], *filling]), "line.xlsx")
    assert caught.value.place is not None
    assert caught.value.place.row == most + 2


def test_more_classes_than_are_planned_for_are_refused() -> None:
    head: list[Value] = ["Class", "Category", "Speed", "Track"]
    many: list[list[Value]] = [[f"C{n % 200}", "freight", 80.0, str(n // 200)] for n in range(400)]
    traffic, _ = read_traffic(Sheet("Traffic", [head, *many]), "line.xlsx")
    assert len(traffic.rows) == 400
    with pytest.raises(InputError, match="more than 200 classes"):
        read_traffic(Sheet("Traffic", [head, *many, ["C200", "freight", 80.0, None]]), "line.xlsx")


@pytest.mark.parametrize("value", [1e9, -1e308, "1e308"])
def test_a_number_that_cannot_be_computed_with_is_refused(value: Value) -> None:
    traffic: list[list[Value]] = [["Class", "Category", "Roll coefficient"], ["Fast", "passenger", value]]
    with pytest.raises(InputError, match="not possible; it is a number up to 100000000"):
        read_traffic(Sheet("Traffic", traffic), "line.xlsx")
    limits: list[list[Value]] = [["Quantity", "Normal", "Unit"], ["cant gradient", value, "mm/m"]]
    with pytest.raises(InputError, match="not possible; it is a number up to 100000000"):
        read_limits(Sheet("Limits", limits), "line.xlsx")
    with pytest.raises(InputError, match="between 0 and 1000 mm"):
        settings_from_mapping({"Underbalance": value})


def test_limits_as_stated() -> None:
    limits, _ = read_limits(Sheet("Limits", LIMITS), "line.xlsx")
    cant, deficiency, felt, gradient, excess = limits.rows
    assert (cant.normal, cant.exceptional, cant.unit, cant.kind) == (6.0, 7.0, "in", "ceiling")
    assert (deficiency.quantity, deficiency.unit, deficiency.category) == (
        "cant deficiency",
        "mm",
        "passenger",
    )
    assert deficiency.situation == "platform"
    assert deficiency.speed_over_kmh == pytest.approx(80.4672)
    assert deficiency.radius_up_to_m == pytest.approx(304.8)
    assert math.isinf(felt.normal)
    assert (gradient.normal, gradient.unit) == (400.0, "1 in n")
    assert excess.normal == 90.5
    assert limits.units == "us"


@pytest.mark.parametrize(
    ("rows", "expected"),
    [
        ([["Rail spacing", 1500.0]], {"rail_spacing_mm": 1500.0}),
        ([["Rail spacing", "60 in"]], {"rail_spacing_mm": 1524.0}),
        ([["Rail spacing (mm)", 1500.0]], {"rail_spacing_mm": 1500.0}),
        ([["Equilibrium constant", 11.8]], {"equilibrium_constant": 11.8}),
        ([["Equilibrium constant", "11,8"]], {"equilibrium_constant": 11.8}),
        ([["Equilibrium constant", "0.0007 in/(mph^2 deg)"]], {"equilibrium_constant": 11.98869}),
        ([["Tiers", "normal, exceptional"]], {"tiers": ("normal", "exceptional")}),
        ([["Tiers", None], ["Keep within", 5.0]], {"tiers": ("normal",), "keep_within_mm": 5.0}),
        ([["Maintenance allowance", "0.5 in"]], {"maintenance_allowance_mm": 12.7}),
        ([["Method", "RMS"]], {"method": "rms"}),
    ],
)
def test_settings(rows: list[list[Value]], expected: dict[str, object]) -> None:
    settings, _, _ = read_settings(Sheet("Settings", [["Setting", "Value"], *rows]), "line.xlsx")
    for name, value in expected.items():
        got = getattr(settings, name)
        assert got == (pytest.approx(value, rel=1e-6) if isinstance(value, float) else value)


def test_settings_without_a_header_row() -> None:
    settings, _, _ = read_settings(Sheet("Settings", [["Rail spacing", 1067.0], ["Keep within", 3.0]]), "")
    assert (settings.rail_spacing_mm, settings.keep_within_mm) == (1067.0, 3.0)


def test_settings_from_a_mapping_take_both_kinds_of_names() -> None:
    one = settings_from_mapping({"Rail spacing": 1500, "Tiers": ["normal", "exceptional"]})
    two = settings_from_mapping({"rail_spacing_mm": 1500.0, "tiers": ("normal", "exceptional")})
    assert one == two


def test_the_us_constant_is_that_of_60_inches() -> None:
    """0.0007 V^2 D of 49 CFR 213.57 stands for a rail spacing of about 60 in (1524 mm)."""
    settings = settings_from_mapping({"Equilibrium constant": "0.0007 in/(mph^2 deg)"})
    assert settings.spacing_mm == pytest.approx(1524, rel=0.001)


Change = Callable[[dict[str, list[list[Value]]]], None]


def put(sheet: str, row: int, column: int, value: Value) -> Change:
    def change(tables: dict[str, list[list[Value]]]) -> None:
        tables[sheet][row][column] = value

    return change


def add(sheet: str, *cells: Value) -> Change:
    return lambda tables: tables[sheet].append(list(cells))


BAD: list[tuple[str, Change, tuple[str, ...]]] = [
    (
        "unknown quantity",
        put("Limits", 1, 0, "cant of track"),
        ("Limits", "A2", "cant of track", "cant deficiency"),
    ),
    ("unknown unit", put("Limits", 1, 3, "furlong"), ("Limits", "D2", "furlong", "mm")),
    ("unit of another dimension", put("Limits", 1, 3, "km/h"), ("Limits", "D2", "km/h", "mm")),
    ("unknown kind", put("Limits", 1, 8, "maximum"), ("Limits", "I2", "maximum", "ceiling")),
    ("blank normal", put("Limits", 1, 1, None), ("Limits", "B2", "none")),
    ("a word for a number", put("Limits", 1, 1, "six"), ("Limits", "B2", "six")),
    ("negative condition", put("Limits", 2, 6, -5.0), ("Limits", "G3", "-5")),
    (
        "unknown heading over numbers",
        put("Limits", 0, 6, "Axle load over"),
        ("Limits", "G1", "Axle load over", "Speed over"),
    ),
    ("heading twice", put("Limits", 0, 8, "Unit"), ("Limits", "I1", "Unit")),
    ("missing heading", put("Limits", 0, 1, "Value"), ("Limits", "Normal")),
    ("error cell", put("Limits", 1, 1, CellError("#DIV/0!")), ("Limits", "B2", "#DIV/0!")),
    ("formula without value", put("Limits", 1, 1, Uncalculated("=B9*2")), ("Limits", "B2", "=B9*2")),
    ("negative speed of a class", put("Traffic", 1, 2, -10.0), ("Traffic", "C2", "-10")),
    ("class twice", put("Traffic", 2, 0, "Fast"), ("Traffic", "Fast", "twice")),
    ("class without category", put("Traffic", 1, 1, None), ("Traffic", "B2", "category")),
    ("class without name", put("Traffic", 1, 0, None), ("Traffic", "A2", "class")),
    ("class without speed", put("Traffic", 1, 2, None), ("Traffic", "Fast", "speed")),
    ("heading in an unknown unit", put("Traffic", 0, 2, "Speed (knots)"), ("Traffic", "C1", "knots", "km/h")),
    ("no yes or no", put("Traffic", 1, 5, "sometimes"), ("Traffic", "F2", "sometimes")),
    ("unknown setting", add("Settings", "Colour", "red"), ("Settings", "A3", "Colour", "Rail spacing")),
    ("setting twice", add("Settings", "Rail spacing", 1500.0), ("Settings", "A3", "twice")),
    ("unknown method", add("Settings", "Method", "guess"), ("Settings", "B3", "guess", "rms")),
    ("unknown tier", add("Settings", "Tiers", "all"), ("Settings", "B3", "all", "exceptional")),
    ("impossible spacing", put("Settings", 1, 1, 15.0), ("Settings", "B2", "15")),
    ("impossible constant", add("Settings", "Equilibrium constant", 1180.0), ("Settings", "B3", "1180")),
    ("class speed of no class", put("Curves", 0, 10, "Speed Trams"), ("Curves", "K1", "Trams", "Fast")),
]


@pytest.mark.parametrize(("bend", "says"), [c[1:] for c in BAD], ids=[c[0] for c in BAD])
def test_a_mistake_that_concerns_the_whole_plan_is_one_error(bend: Change, says: tuple[str, ...]) -> None:
    tables: dict[str, list[list[Value]]] = {
        "Curves": [list(r) for r in CURVES],
        "Traffic": [list(r) for r in TRAFFIC],
        "Limits": [list(r) for r in LIMITS],
        "Settings": [["Setting", "Value"], ["Rail spacing", 1500.0]],
    }
    read_workbook(book(**tables))
    bend(tables)
    with pytest.raises(InputError) as refused:
        read_workbook(book(**tables))
    message = str(refused.value)
    assert message.startswith("line.xlsx")
    for part in says:
        assert part in message
    assert "\n" not in message


@pytest.mark.parametrize("name", ["Curves", "Traffic", "Limits"])
def test_an_empty_table_is_refused(name: str) -> None:
    tables: dict[str, list[list[Value]]] = {"Curves": CURVES, "Traffic": TRAFFIC, "Limits": LIMITS}
    tables[name] = tables[name][:1]
    with pytest.raises(InputError, match="empty"):
        read_workbook(book(**tables))


def test_a_sheet_twice_is_refused() -> None:
    twice = Workbook(
        "line.xlsx", "xlsx", [Sheet("Curves", CURVES), Sheet("Limits", LIMITS), Sheet("More limits", LIMITS)]
    )
    with pytest.raises(InputError, match="twice"):
        read_workbook(twice)


def test_a_file_given_separately_replaces_the_sheet() -> None:
    other = Workbook(
        "traffic.csv", "csv", [Sheet("", [["Class", "Category", "Speed"], ["Slow", "freight", 60.0]])]
    )
    reading = read_workbook(book(Curves=CURVES, Traffic=TRAFFIC), traffic=other)
    assert reading.traffic is not None
    assert reading.traffic.class_names == ["Slow"]


def test_an_unknown_situation_rejects_its_row_alone() -> None:
    rows = [[*CURVES[0], "Situation"], [*CURVES[1], "platform; ballroom"], [*CURVES[2], "Level Crossing"]]
    reading = read_workbook(book(Curves=rows))
    [row] = reading.rejected
    assert (row.row, row.column, row.value) == (2, "Situation", "platform; ballroom")
    assert "ballroom" in row.problem
    assert "platform" in row.problem
    assert reading.curves.rejected.tolist() == [True, False]
    assert reading.curves.situations[1] == {"level crossing"}


def test_a_situation_of_the_users_own_limits_is_known() -> None:
    limits = [*LIMITS, ["cant", 4.0, None, "in", None, "Timber viaduct", None, None, None]]
    rows = [[*CURVES[0], "Situation"], [*CURVES[1], "timber  VIADUCT"], [*CURVES[2], None]]
    reading = read_workbook(book(Curves=rows, Limits=limits))
    assert not reading.rejected
    assert reading.curves.situations[0] == {"timber viaduct"}


def test_blank_zero_and_none_keep_their_meanings() -> None:
    rows = [[*CURVES[0], "Speed Goods"], [*CURVES[1], "none"], [*CURVES[2], None]]
    reading = read_workbook(book(Curves=rows, Traffic=TRAFFIC))
    curves = reading.curves
    assert curves.transition_in_m.tolist() == [80.0, 0.0]
    assert math.isnan(curves.transition_out_m[0])
    assert curves.class_speeds["Goods"][0] == DOES_NOT_RUN
    assert math.isnan(curves.class_speeds["Goods"][1])


def test_a_class_without_speed_is_taken_where_every_row_gives_it() -> None:
    traffic = [*TRAFFIC[:1], ["Fast", "passenger", None, 1.0, None, None, None, None]]
    rows = [[*CURVES[0], "Speed Fast"], [*CURVES[1], 90.0], [*CURVES[2], 110.0]]
    reading = read_workbook(book(Curves=rows, Traffic=traffic))
    assert reading.curves.class_speeds["Fast"].tolist() == [90.0, 110.0]


def test_a_negative_class_speed_is_no_none() -> None:
    rows = [[*CURVES[0], "Speed Goods"], [*CURVES[1], -1.0], [*CURVES[2], 60.0]]
    reading = read_workbook(book(Curves=rows, Traffic=TRAFFIC))
    assert [r.row for r in reading.rejected] == [2]


def test_canonical_headings_without_units_are_the_usual_units_to_the_letter() -> None:
    rows: list[list[Value]] = [
        ["Curve", "Start", "End", "Radius", "Cant", "Transition in", "Speed (mph)"],
        ["1", 1.0, 1.2, 60.0, 5.0, 20.0, 60.0],
    ]
    read = read_workbook(book(Curves=rows)).curves.as_read(0)
    assert (read["radius_m"], read["cant_mm"], read["transition_in_m"], read["start_km"]) == (
        60.0,
        5.0,
        20.0,
        1.0,
    )


def test_turnouts() -> None:
    rows: list[list[Value]] = [
        [
            "Turnout",
            "Track",
            "Curve",
            "Chainage",
            "Radius on the straight (m)",
            "Hand",
            "Branch speed (mph)",
            "Category",
        ],
        ["T1", "1", "2", "12+345", 500.0, "rechts", 40.0, "Goods"],
    ]
    [turnout], _ = read_turnouts(Sheet("Turnouts", rows), "line.xlsx")
    assert (turnout.curve, turnout.chainage_km, turnout.radius_m, turnout.hand) == ("2", 12.345, 500.0, "R")
    assert (turnout.branch_speed_kmh, turnout.category) == (pytest.approx(64.37376), "freight")
    rows[1][2] = rows[1][3] = None
    with pytest.raises(InputError, match="chainage"):
        read_turnouts(Sheet("Turnouts", rows), "line.xlsx")


def test_frames_and_sheets_are_read_alike() -> None:
    frame = pd.DataFrame([r[:] for r in CURVES[1:]], columns=CURVES[0])
    traffic = pd.DataFrame(TRAFFIC[1:], columns=TRAFFIC[0])
    limits = pd.DataFrame(LIMITS[1:], columns=LIMITS[0])
    from_frames = read_frames(frame, traffic, limits, {"Rail spacing": 1500})
    from_book = read_workbook(book(Curves=CURVES, Traffic=TRAFFIC, Limits=LIMITS))
    assert [from_frames.curves.as_read(i) for i in range(2)] == [
        from_book.curves.as_read(i) for i in range(2)
    ]
    assert from_frames.traffic is not None
    assert from_book.traffic is not None
    assert from_frames.traffic.model_dump() == from_book.traffic.model_dump()
    assert from_frames.settings is not None
    assert from_frames.settings.rail_spacing_mm == 1500.0


def test_a_frame_with_a_named_index_gives_its_index_as_a_column() -> None:
    frame = pd.DataFrame({"Curve": ["1"], "Radius": [500]}).set_index("Curve")
    assert sheet_from_frame(frame, "Curves").rows == [["Curve", "Radius"], ["1", 500.0]]


def test_a_class_without_speed_is_refused_also_where_the_list_has_no_speeds_at_all() -> None:
    traffic = [*TRAFFIC[:1], ["Fast", "passenger", None, 1.0, None, None, None, None]]
    with pytest.raises(InputError, match="class 'Fast' has no speed"):
        read_workbook(book(Curves=[row[:-1] for row in CURVES], Traffic=traffic))


def test_a_class_without_speed_on_another_track_asks_for_nothing_here() -> None:
    traffic = [*TRAFFIC[:2], ["Ore", "mineral", None, 1.0, None, None, "A", "2"]]
    reading = read_workbook(book(Curves=CURVES, Traffic=traffic))
    assert not reading.rejected


def test_canonical_sheets_without_a_track_are_one_line_whatever_the_sheet() -> None:
    first = [[row[i] for i in range(len(row)) if i not in (0, 1)] for row in CURVES]
    second = [first[0], ["7", *first[1][1:]], ["8", *first[2][1:]]]
    reading = read_workbook(book(Up=first, Down=second))
    assert set(reading.curves.track) == {""}
    assert reading.curves.sheet == ["Up", "Up", "Down", "Down"]


def test_a_class_is_found_by_its_whole_name_also_with_brackets_and_common_words() -> None:
    traffic: list[list[Value]] = [
        ["Class", "Category", "Speed"],
        ["Freight", "freight", 100.0],
        ["Freight (heavy)", "freight", 80.0],
        ["Line train", "passenger", 120.0],
    ]
    header: list[Value] = ["Speed Freight (heavy) (mph)", "Speed Freight", "Speed Line train"]
    rows = [[*CURVES[0], *header], [*CURVES[1], 10.0, 60.0, 70.0], [*CURVES[2], "none", 61.0, None]]
    speeds = read_workbook(book(Curves=rows, Traffic=traffic)).curves.class_speeds
    assert speeds["Freight (heavy)"].tolist() == [pytest.approx(16.09344), DOES_NOT_RUN]
    assert speeds["Freight"].tolist() == [60.0, 61.0]
    assert speeds["Line train"][0] == 70.0


def test_traffic_for_a_track_that_no_curve_is_on_is_told() -> None:
    stray: list[Value] = ["Goods", "freight", 30.0, None, None, None, "A", "9"]
    notes = read_workbook(book(Curves=CURVES, Traffic=[*TRAFFIC, stray], Limits=LIMITS)).notes
    told = [note for note in notes if "no curve is on" in note]
    assert told == [
        "line.xlsx, sheet 'Traffic', cell A6: no curve is on line 'A', track '9': "
        "this row of 'Goods' is not used"
    ]
