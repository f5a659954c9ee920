"""Makes the sample files of this folder, so that they can be reviewed as text.

Every line, place, standard and figure here is invented. Run it after a change, from anywhere::

    python sample_data/make_sample.py [FOLDER]
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import TypeAlias

from openpyxl import Workbook
from openpyxl.styles import Alignment, Font, PatternFill
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

Cell: TypeAlias = str | float | int | None

CURVE_HEADERS = (
    "Line",
    "Track",
    "Curve",
    "Start (km)",
    "End (km)",
    "Radius (m)",
    "Hand",
    "Length (m)",
    "Transition in (m)",
    "Transition out (m)",
    "Cant ramp in (m)",
    "Cant ramp out (m)",
    "Shape",
    "Cant (mm)",
    "Cant fixed",
    "Cant at most (mm)",
    "Cant at least (mm)",
    "Speed (km/h)",
    "Speed Heavy freight (km/h)",
    "Situation",
    "Remarks",
)

# One row a curve; "." is a blank cell. Length "=" is the distance between the two chainages.
#      curve start  end    R    hand len trans.   ramps   shape  cant fix most least V   heavy situation; remark
TRACK_1 = """
101    | 0.412  | 0.586  | 310  | L | = | 40  | 40  | . | .  | . | 60  | .   | 80 | .  | 60  | .    | platform | Dunmarrow, platform 1
102    | 0.760  | 0.905  | 420  | R | = | 60  | 70  | . | .  | . | 70  | .   | .  | .  | 70  | .    | .        | Reverse curve, first half
103    | 0.975  | 1.160  | 380  | L | = | 70  | 60  | . | .  | . | 65  | .   | .  | .  | 70  | .    | .        | Reverse curve, second half
104    | 2.210  | 2.455  | 640  | L | = | 80  | 80  | . | .  | . | 70  | yes | .  | .  | 100 | .    | bridge   | Steel span over the Harl, open deck
105    | 3.980  | 4.260  | 900  | R | = | 90  | 50  | . | .  | . | 80  | .   | .  | .  | 110 | .    | .        | Compound curve, flatter part
106    | 4.310  | 4.655  | 620  | R | = | 50  | 90  | . | .  | . | 120 | .   | .  | .  | 110 | .    | .        | Compound curve, sharper part
107    | 6.120  | 6.480  | 1100 | L | = | 100 | 100 | . | .  | . | 75  | .   | .  | .  | 120 | .    | level crossing | Weir Lane crossing
108    | 8.050  | 8.610  | 1450 | R | = | 110 | 110 | . | .  | . | 100 | .   | .  | .  | 140 | .    | .        | .
109    | 10.240 | 10.905 | 2200 | L | = | 110 | 110 | . | .  | . | 80  | .   | .  | .  | 160 | .    | .        | .
110    | 12.630 | 13.140 | 1800 | R | = | 120 | 120 | . | .  | . | 90  | .   | .  | .  | 160 | .    | .        | .
111    | 14.870 | 15.260 | 900  | L | = | 120 | 120 | . | .  | . | 110 | .   | .  | .  | 140 | 40   | .        | Rising 14 per mille: heavy trains crawl
112    | 16.390 | 16.820 | 800  | R | = | 130 | 130 | . | .  | . | 125 | .   | .  | .  | 140 | 30   | .        | Steepest part of the climb
113    | 18.020 | 18.340 | .    | L | = | 100 | 100 | . | .  | . | 60  | .   | .  | .  | 140 | .    | .        | Radius to be surveyed
114    | 19.500 | 19.910 | 1600 | L | = | 110 | 110 | . | .  | . | 70  | .   | .  | .  | 150 | .    | .        | .
115    | 19.870 | 20.240 | 1700 | L | = | 110 | 110 | . | .  | . | 70  | .   | .  | .  | 150 | .    | .        | Start lies before the end of 114
116    | 22.105 | 22.640 | 1250 | R | = | .   | .   | . | .  | . | 85  | .   | .  | .  | 130 | .    | .        | No record of the transitions
117    | 24.300 | 24.615 | 5200 | L | = | 0   | 0   | 40| 40 | . | 20  | .   | .  | .  | 160 | .    | .        | No transitions, cant ramps on the straight
118    | 26.480 | 26.905 | 1150 | R | 390 | 100 | 90 | . | . | . | 95 | . | .  | .  | 130 | .    | .        | Stated length is not that of the chainages
119    | 28.760 | 28.915 | 250  | L | = | 40  | 40  | . | .  | . | 60  | .   | .  | .  | 50  | .    | .        | Keldrith yard throat
120    | 29.140 | 29.255 | 190  | R | = | 24  | 24  | . | .  | . | 30  | .   | .  | .  | 40  | .    | .        | Keldrith quay curve
"""

TRACK_2 = """
201    | 0.410  | 0.590  | 306  | L | = | 40  | 40  | . | .  | . | 60  | .   | .  | .  | 60  | .    | platform | Dunmarrow, platform 2; heavy trains wait here
202    | 0.758  | 0.908  | 424  | R | = | 60  | 64  | . | .  | . | 70  | .   | .  | .  | 70  | .    | .        | Reverse curve, first half
203    | 0.972  | 1.164  | 384  | L | = | 64  | 60  | . | .  | . | 65  | .   | .  | .  | 70  | .    | .        | Reverse curve, second half
204    | 2.208  | 2.458  | 644  | L | = | 80  | 80  | . | .  | . | 85  | .   | .  | .  | 100 | .    | bridge   | Concrete deck, ballasted
205    | 3.978  | 4.262  | 896  | R | = | 90  | 48  | . | .  | . | 80  | .   | .  | .  | 110 | .    | .        | Compound curve of three parts
206    | 4.310  | 4.505  | 616  | R | = | 48  | 60  | . | .  | . | 120 | .   | .  | .  | 110 | .    | .        | Compound curve of three parts
207    | 4.565  | 4.760  | 1200 | R | = | 60  | 70  | . | .  | . | 60  | .   | .  | .  | 110 | .    | .        | Compound curve of three parts
208    | 6.118  | 6.482  | 1104 | L | = | 100 | 100 | . | .  | . | 90  | .   | .  | 60 | 120 | .    | level crossing | Road profile needs 60 mm at least
209    | 8.048  | 8.612  | 1446 | R | = | 110 | 110 | . | .  | . | 125 | .   | .  | .  | 140 | .    | .        | Low rail crushed and spalling
210    | 10.238 | 10.908 | 2204 | L | = | 110 | 110 | . | .  | bloss | 80 | . | .  | .  | 160 | .    | .        | Transitions relaid as Bloss curves
211    | 12.628 | 13.142 | 1796 | R | = | 120 | 120 | . | .  | . | 90  | .   | .  | .  | 160 | .    | .        | .
212    | 14.868 | 15.262 | 904  | L | = | 120 | 120 | . | .  | . | 120 | .   | .  | .  | 140 | .    | .        | Falling 14 per mille
213    | 16.388 | 16.822 | 804  | R | = | 130 | 130 | . | .  | . | 130 | .   | .  | .  | 130 | .    | .        | .
214    | 18.018 | 18.342 | 1296 | L | = | 70  | 70  | . | .  | . | 60  | .   | .  | .  | 140 | .    | .        | Short transitions
215    | 18.430 | 18.700 | 1500 | R | = | 70  | 90  | . | .  | . | 60  | .   | .  | .  | 140 | .    | .        | Transitions overlap with those of 214
216    | 20.860 | 21.230 | 1704 | L | = | 110 | 110 | . | .  | . | 70  | .   | .  | .  | 150 | .    | .        | .
217    | 22.100 | 22.644 | 1246 | R | = | 100 | 100 | . | .  | . | .   | .   | .  | .  | 130 | .    | .        | Cant of today not recorded
218    | 24.298 | 24.617 | 2600 | L | = | 0   | 0   | . | .  | . | 0   | .   | .  | .  | 160 | .    | .        | Slued in haste, no transitions
219    | 26.478 | 26.907 | 1154 | R | = | 100 | 90  | . | .  | . | 95  | .   | .  | .  | 130 | none | tunnel   | Heavy trains take the loop
220    | 28.758 | 28.917 | 254  | L | = | 40  | 40  | . | .  | . | 150 | .   | .  | .  | 50  | .    | .        | Cant over what the radius allows
221    | 29.138 | 29.257 | 186  | R | = | 24  | 24  | . | .  | . | 30  | .   | .  | .  | fast| .    | .        | Speed not filled in as a number
"""

TRAFFIC_HEADERS = (
    "Class",
    "Category",
    "Speed (km/h)",
    "Trains per day",
    "Mass (t)",
    "Roll coefficient",
    "Centre of gravity (m)",
    "Regular",
    "Line",
    "Track",
)
TRAFFIC: tuple[tuple[Cell, ...], ...] = (
    ("Express", "passenger", 160, 34, 430, 0.25, 1.55, None, None, None),
    ("Regional", "passenger", 120, 46, 180, 0.30, 1.50, None, None, None),
    ("Freight", "freight", 90, 28, 1500, 0.20, 1.80, None, None, None),
    ("Heavy freight", "freight", 70, 14, 3200, 0.20, 2.10, None, None, None),
    ("Heavy freight", "freight", 80, 14, 850, 0.20, 1.30, None, None, "1"),
)

LIMIT_HEADERS = (
    "Quantity",
    "Normal",
    "Exceptional",
    "Unit",
    "Category",
    "Situation",
    "Speed over",
    "Speed up to",
    "Radius over",
    "Radius up to",
    "Per metre of radius",
    "Kind",
    "Clause",
    "Note",
)
#  quantity | normal | exceptional | unit | category | situation | V over | V to | R over | R to | slope | kind | clause | note
LIMITS = """
cant                              | 150   | 160  | mm   | .         | .              | . | .   | . | .   | .     | . | DK-12 3.1 | Plain track
cant                              | 100   | 110  | mm   | .         | platform       | . | .   | . | .   | .     | . | DK-12 3.2 | .
cant                              | 90    | 100  | mm   | .         | level crossing | . | .   | . | .   | .     | . | DK-12 3.3 | .
cant                              | -33.3 | .    | mm   | .         | .              | . | .   | . | 275 | 0.667 | . | DK-12 3.4 | Stiff wagons at low speed
minimum cant                      | 20    | .    | mm   | .         | .              | . | .   | . | .   | .     | . | DK-12 3.5 | .
cant step                         | 5     | .    | mm   | .         | .              | . | .   | . | .   | .     | . | DK-12 3.6 | .
cant deficiency                   | 130   | 150  | mm   | passenger | .              | . | .   | . | .   | .     | . | DK-12 4.1 | .
cant deficiency                   | 100   | 110  | mm   | freight   | .              | . | .   | . | .   | .     | . | DK-12 4.2 | .
cant excess                       | 90    | 110  | mm   | .         | .              | . | .   | . | .   | .     | . | DK-12 4.3 | .
felt acceleration                 | 1.1   | 1.3  | m/s2 | passenger | .              | . | .   | . | .   | .     | . | DK-12 4.4 | .
cant gradient                     | 2.0   | 2.5  | mm/m | .         | .              | . | .   | . | .   | .     | . | DK-12 5.1 | .
rate of change of cant            | 50    | 60   | mm/s | .         | .              | . | .   | . | .   | .     | . | DK-12 5.2 | .
rate of change of cant deficiency | 50    | 75   | mm/s | .         | .              | . | .   | . | .   | .     | . | DK-12 5.3 | .
abrupt change of cant deficiency  | 100   | 110  | mm   | .         | .              | . | 70  | . | .   | .     | . | DK-12 5.4 | .
abrupt change of cant deficiency  | 60    | 80   | mm   | .         | .              | 70| 170 | . | .   | .     | . | DK-12 5.4 | .
abrupt change of cant deficiency  | 40    | 60   | mm   | .         | .              | 170 | . | . | .   | .     | . | DK-12 5.4 | .
speed step                        | 5     | .    | km/h | .         | .              | . | .   | . | .   | .     | . | DK-12 6.1 | .
curve length                      | 1.8   | .    | s    | .         | .              | . | .   | . | .   | .     | . | DK-12 6.2 | .
"""

SETTINGS: tuple[tuple[Cell, ...], ...] = (
    ("Rail spacing", 1500),
    ("Method", "rms"),
    ("Tiers", "normal, exceptional"),
    ("Keep within", 5),
)

US_CURVES = """
7A  | 41.120 | 41.310 | 1910 | L | = | 200 | 216 | 2.5  | 45 | .              | .
7B  | 41.351 | 41.540 | 1640 | R | = | 216 | 200 | 3    | 45 | .              | Reverse curve with 7A
8   | 43.705 | 44.010 | 2865 | L | = | 250 | 250 | 3.5  | 60 | .              | .
9   | 46.230 | 46.480 | 3820 | R | = | 280 | 280 | 3    | 70 | level crossing | County road
10  | 47.915 | 48.300 | 5730 | L | = | 250 | 250 | 2    | 79 | .              | .
11  | 50.040 | 50.390 | 1433 | R | = | 220 | 220 | 4    | 40 | .              | Coal trains stall here in autumn
12  | 52.610 | 52.960 | 11459| L | = | 150 | 150 | 0.5  | 79 | .              | .
"""
US_HEADERS = (
    "Line",
    "Track",
    "Curve",
    "Start (mi)",
    "End (mi)",
    "Radius (ft)",
    "Hand",
    "Length (ft)",
    "Transition in (ft)",
    "Transition out (ft)",
    "Cant (in)",
    "Speed (mph)",
    "Situation",
    "Remarks",
)
US_TRAFFIC: tuple[tuple[Cell, ...], ...] = (
    ("Class", "Category", "Speed (mph)", "Trains per day", "Mass (short ton)", "Roll coefficient", "Regular"),
    ("Intercity", "passenger", 79, 8, 620, 0.2, None),
    ("Mixed freight", "freight", 60, 14, 6200, 0.2, None),
    ("Coal", "freight", 40, 10, 15400, 0.2, None),
    ("Ballast train", "freight", 15, 1, 2100, 0.2, "no"),
)
US_LIMITS = """
cant                              | 6    | .    | in       | .         | .              | . | .  | . | .  | . | . | TS 2.1 | .
cant                              | 4    | .    | in       | .         | level crossing | . | .  | . | .  | . | . | TS 2.2 | .
cant step                         | 0.25 | .    | in       | .         | .              | . | .  | . | .  | . | . | TS 2.3 | .
cant deficiency                   | 3    | 4    | in       | passenger | .              | . | .  | . | .  | . | . | TS 3.1 | .
cant deficiency                   | 2    | .    | in       | freight   | .              | . | .  | . | .  | . | . | TS 3.2 | .
cant excess                       | 2    | 2.5  | in       | .         | .              | . | .  | . | .  | . | . | TS 3.3 | .
cant gradient                     | 0.5  | 0.75 | in/31 ft | .         | .              | . | .  | . | .  | . | . | TS 4.1 | .
rate of change of cant            | 1.25 | 1.5  | in/s     | .         | .              | . | .  | . | .  | . | . | TS 4.2 | .
rate of change of cant deficiency | 1.25 | 1.75 | in/s     | .         | .              | . | .  | . | .  | . | . | TS 4.3 | .
abrupt change of cant deficiency  | 1.5  | .    | in       | .         | .              | . | .  | . | .  | . | . | TS 4.4 | .
speed step                        | 5    | .    | mph      | .         | .              | . | .  | . | .  | . | . | TS 5.1 | .
"""
US_SETTINGS: tuple[tuple[Cell, ...], ...] = (
    ("Equilibrium constant", "0.0007 in/(mph^2 deg)"),
    ("Tiers", "normal, exceptional"),
)

BRANCH_CURVES = """
Line;Track;Curve;Start (km);End (km);Radius (m);Hand;Transition in (m);Transition out (m);Cant (mm);Speed (km/h)
Ostwell branch;1;1;0.820;1.015;450;L;45;45;60;70
Ostwell branch;1;2;1.640;1.905;600;R;50;50;50;80
Ostwell branch;1;3;1.955;2.210;560;L;50;50;55;80
Ostwell branch;1;4;3.480;3.760;1000;R;60;60;30;80
"""
BRANCH_TRAFFIC = """
Class;Category;Speed (km/h);Trains per day;Mass (t);Roll coefficient
Railcar;passenger;80;24;95;0.25
Timber;freight;60;4;900;0.2
"""


def cell(text: str) -> Cell:
    """Turn a word of a text table into a cell: "." is blank, what reads as a number is one."""
    word = text.strip()
    if word == ".":
        return None
    try:
        number = float(word)
    except ValueError:
        return word
    return int(number) if number.is_integer() and "." not in word else number


def table(text: str, sep: str = "|") -> list[list[Cell]]:
    """Turn a text table into rows of cells."""
    return [[cell(word) for word in line.split(sep)] for line in text.strip().splitlines()]


def with_length(row: list[Cell], start: int, unit_m: float) -> list[Cell]:
    """Fill in a length given as "=" from the chainages that stand at ``start`` and after it."""
    first, last = row[start], row[start + 1]
    if row[start + 4] == "=" and isinstance(first, int | float) and isinstance(last, int | float):
        row[start + 4] = round((last - first) * unit_m, 1)
    return row


def curve_rows(text: str, line: str, track: str, unit_m: float) -> list[list[Cell]]:
    """Give the rows of a curve sheet; line, track and curve are names and stay text."""
    rows = [with_length(row, 1, unit_m) for row in table(text)]
    return [[line, track, str(row[0]), *row[1:]] for row in rows]


def write_sheet(sheet: Worksheet, headers: Sequence[Cell], rows: Iterable[Sequence[Cell]]) -> None:
    """Write a plain table with a header that stays in view and widths that fit."""
    sheet.append(list(headers))
    for row in rows:
        sheet.append(list(row))
    for column, heading in enumerate(headers, start=1):
        top = sheet.cell(1, column)
        top.font = Font(bold=True)
        top.fill = PatternFill("solid", fgColor="DDE6E4")
        top.alignment = Alignment(wrap_text=True, vertical="top")
        texts = [str(sheet.cell(r, column).value or "") for r in range(2, sheet.max_row + 1)]
        longest = max((len(text) for text in texts), default=0)
        wide = max(longest, *(len(word) for word in str(heading).split()))
        sheet.column_dimensions[get_column_letter(column)].width = min(max(wide + 2, 8), 48)
        if "(km)" in str(heading) or "(mi)" in str(heading):
            for r in range(2, sheet.max_row + 1):
                sheet.cell(r, column).number_format = "0.000"
    sheet.freeze_panes = "D2" if sheet.title.startswith("Curves") else "A2"


def main_line() -> Workbook:
    """Make the sample line: two tracks, four classes, and nearly everything that can happen to a curve."""
    book = Workbook()
    book.remove(book.worksheets[0])
    name = "Dunmarrow-Keldrith"
    rows = curve_rows(TRACK_1, name, "1", 1000.0) + curve_rows(TRACK_2, name, "2", 1000.0)
    write_sheet(book.create_sheet("Curves"), CURVE_HEADERS, rows)
    write_sheet(book.create_sheet("Traffic"), TRAFFIC_HEADERS, TRAFFIC)
    write_sheet(book.create_sheet("Limits"), LIMIT_HEADERS, table(LIMITS))
    write_sheet(book.create_sheet("Settings"), ("Name", "Value"), SETTINGS)
    return book


def us_line() -> Workbook:
    """Make a line in inches, feet, miles and miles an hour, with an occasional train."""
    book = Workbook()
    book.remove(book.worksheets[0])
    rows = curve_rows(US_CURVES, "Tarrow subdivision", "Main", 5280.0)
    write_sheet(book.create_sheet("Curves"), US_HEADERS, rows)
    write_sheet(book.create_sheet("Traffic"), US_TRAFFIC[0], US_TRAFFIC[1:])
    headers = [
        {"Speed over": "Speed over (mph)", "Speed up to": "Speed up to (mph)"}.get(h, h)
        for h in LIMIT_HEADERS
    ]
    write_sheet(book.create_sheet("Limits"), headers, table(US_LIMITS))
    write_sheet(book.create_sheet("Settings"), ("Name", "Value"), US_SETTINGS)
    return book


def write_csv(path: Path, text: str) -> None:
    """Write a small table as csv with commas."""
    with path.open("w", newline="", encoding="utf-8") as stream:
        csv.writer(stream, lineterminator="\n").writerows(
            line.split(";") for line in text.strip().splitlines()
        )


def main(folder: Path) -> None:
    """Write every sample into a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    main_line().save(folder / "dunmarrow_keldrith.xlsx")
    us_line().save(folder / "tarrow_us_units.xlsx")
    write_csv(folder / "ostwell_branch.csv", BRANCH_CURVES)
    write_csv(folder / "ostwell_traffic.csv", BRANCH_TRAFFIC)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).resolve().parent)
