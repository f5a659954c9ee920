"""Invented lists of a fourth hand: whole documents with covers, pages and habits of their own."""

from __future__ import annotations

from messy import FT, IN, MI, PSGR_FRT, Messy, curve, sheet, traffic_of

from cant.files.grid import CellRange

COVER = Messy(
    "cover-sheet",
    [
        sheet("Maintenance department\nCurve list 12\nPrepared by | J. Doe\nDate | 2026", "Cover"),
        sheet(
            """
Mulgabee Branch - Curve list (track: single)
All cants in mm. Radii in m. Left/right facing increasing km.

Item | Curve | Tangent point 1 | Tangent point 2 | Rad. | Hand | SE | Entry TL | Exit TL | Speed (km/h) | |
 | | (km) | (km) | | | | (m) | (m) | Railcar | Loco hauled | Goods
1 | MB1 | 12.345 | 12.700 | 402 | L | 75 | 40 | 40 | 90 | 80 | 65
2 | MB2 | 13.100 | 13.300 | 805 | R | 40 | 30 | 30 | 110 | 100 | 80
 | Fell siding | 13.500 | | | | | | | | |
3 | MB3 | 14.000 | 14.250 | 604 | L | 55 | nil | 40 | 100 | 90 | -
""",
            "Curves MB",
            merged=(CellRange(4, 9, 4, 11),),
        ),
        traffic_of(
            ("Railcar", "passenger", 120.0), ("Loco hauled", "passenger", 110.0), ("Goods", "freight", 80.0)
        ),
    ],
    {
        6: curve(
            402, "L", 12.345, 12.7, 40, 40, 75, None, Railcar=90, Goods=65, Curve="MB1", **{"Loco hauled": 80}
        ),
        7: curve(805, "R", 13.1, 13.3, 30, 30, 40, None, Railcar=110, Goods=80, **{"Loco hauled": 100}),
        9: curve(604, "L", 14.0, 14.25, 0, 40, 55, None, Railcar=100, Goods=None),
    },
)

GERMAN_TRACKS = Messy(
    "german-tracks",
    [
        sheet(
            """
Bogenliste Strecke 4321 Tiefmoor - Hohenquell
 | | | Gleis 1 | | | | Gleis 2 | | |
Bogen | von km | bis km | Radius | Überh. | L ÜB 1 | L ÜB 2 | Radius | Überh. | L ÜB 1 | L ÜB 2
B1 | 10,250 | 10,480 | 500 | 105 | 60 | 60 | 504 | 100 | 55 | 60
B2 | 11,020 | 11,300 | 1.450 | 40 | 40 | 40 | 1.446 | 45 | 40 | 40
""",
            merged=(CellRange(2, 3, 2, 6), CellRange(2, 7, 2, 10)),
        )
    ],
    {
        4: curve(500, None, 10.25, 10.48, 60, 60, 105),
        5: curve(1450, None, 11.02, 11.3, 40, 40, 40),
        1004: curve(504, None, 10.25, 10.48, 55, 60, 100),
        1005: curve(1446, None, 11.02, 11.3, 40, 40, 45),
    },
)

US_MIXED = Messy(
    "us-mixed",
    [
        sheet(
            """
COYOTE FLAT SUB - MAIN 1
Curve | MP | Length (ft) | Deg-Min | Dir. | Elev | Timetable speed | | Equil. speed | Notes
 | | | | | (in) | P | F | |
56.2 | 56.21 | 1320 | 2-30 | LH | 2-1/4 | 60 | 50 | 36 | timber bridge
56.9 | 56.90 | 880 | 1-00 | RH | 0-3/4 | 79 | 60 | 33 |
57.4 | 57.42 | 640 | 5-45 | LH | 4 | 40 | 30 | 31 |
""",
            merged=(CellRange(2, 6, 2, 7),),
        ),
        PSGR_FRT,
    ],
    {
        4: curve(
            1746.375 / 2.5,
            "L",
            56.21 * MI,
            None,
            None,
            None,
            2.25 * IN,
            None,
            length_m=1320 * FT,
            Passenger=60 * MI,
            Freight=50 * MI,
        ),
        5: curve(
            1746.375, "R", 56.9 * MI, None, None, None, 0.75 * IN, None, length_m=880 * FT, Passenger=79 * MI
        ),
        6: curve(1746.375 / 5.75, "L", 57.42 * MI, None, None, None, 4 * IN, None, Freight=30 * MI),
    },
)

SPANISH_TEXT = Messy(
    "spanish-text-cells",
    [
        sheet("""
Curva | Situación | Radio | Peralte | Transiciones | V.máx
C-101 | del km 12,345 al km 12,800 | R=450 m izq. | p=110 mm | 60 m / 55 m | 90 km/h
C-102 | del km 13,100 al km 13,355 | R=1.200 m der. | p=40 mm | 40 m / 40 m | 100 km/h
""")
    ],
    {
        2: curve(450, "L", 12.345, 12.8, 60, 55, 110, 90, situation=None),
        3: curve(1200, "R", 13.1, 13.355, 40, 40, 40, 100, situation=None),
    },
)

RANGE_CELL = Messy(
    "range-cell",
    [
        sheet("""
Curve | Chainage | Radius (m) | Hand | Cant (mm) | Speed (km/h)
1 | 12.345 - 12.800 | 450 | L | 110 | 90
2 | 13+100 – 13+355 | 1200 | R | 40 | 100
3 | km 14.000 to km 14.250 | 800 | R | 60 | 100
""")
    ],
    {
        2: curve(450, "L", 12.345, 12.8, None, None, 110, 90),
        3: curve(1200, "R", 13.1, 13.355, None, None, 40, 100),
        4: curve(800, "R", 14.0, 14.25, None, None, 60, 100),
    },
)

POLISH_TWO = Messy(
    "polish-two-speeds",
    [
        sheet("""
Linia kolejowa nr 998, szlak Brzoźnik - Dębosław, tor 1
Nr | Km pocz. łuku | Km końca łuku | R | Kier. | h | Lp1 | Lp2 | Vp/Vt
1 | 12+345 | 12+700 | 650 | L | 90 | 60 | 60 | 110/70
2 | 13+100 | 13+300 | 1500 | P | 30 | 30 | 40 | 120/80
"""),
        PSGR_FRT,
    ],
    {
        3: curve(650, "L", 12.345, 12.7, 60, 60, 90, None, Passenger=110, Freight=70),
        4: curve(1500, "R", 13.1, 13.3, 30, 40, 30, None, Passenger=120, Freight=80),
    },
)

FRENCH_POINTS = Messy(
    "french-points",
    [
        sheet("""
Courbe | ORP | FRP | FRP | ORP | Rayon | Sens | Dévers | Vitesse
 | entrée | entrée | sortie | sortie | m | | mm | km/h
1 | 10,000 | 10,080 | 10,400 | 10,475 | 600 | G | 110 | 100
2 | 12,000 | 12,040 | 12,200 | 12,240 | 1500 | D | 40 | 100
""")
    ],
    {
        3: curve(600, "L", 10.08, 10.4, 80, 75, 110, 100),
        4: curve(1500, "R", 12.04, 12.2, 40, 40, 40, 100),
    },
)

LAYOUTS = [COVER, GERMAN_TRACKS, US_MIXED, SPANISH_TEXT, RANGE_CELL, POLISH_TWO, FRENCH_POINTS]
