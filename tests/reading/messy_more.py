# ruff: noqa: E501 - rows of lists stand as the user has them
"""More invented lists: layouts and notations that the first collection has not."""

from __future__ import annotations

from datetime import datetime

from messy import CH, FT, IN, MI, PSGR_FRT, Messy, curve, mi_ch, sheet

from cant.files.grid import CellRange

UNIT_ROW = Messy(
    "unit-row",
    [
        sheet("""
Curve register | | | | | | | |
prepared by drawing office | | | | | | | |
Curve | Start | End | Radius | Hand | Cant | Transition 1 | Transition 2 | Line speed | Goods
 | (km) | (km) | (ft) | L/R | (in) | (ft) | (ft) | (mph) | (mph)
1 | 10.100 | 10.350 | 2145 | L | 3.5 | 200 | 200 | 60 | 45
2 | 11.000 | 11.200 | 3000 | R | 2 1/4 | 150 | 120 | 60 | 45
 | | | | | | | |
Curve | Start | End | Radius | Hand | Cant | Transition 1 | Transition 2 | Line speed | Goods
 | (km) | (km) | (ft) | L/R | (in) | (ft) | (ft) | (mph) | (mph)
3 | 12.000 | 12.300 | 4,000 | R | 1½" | 100 | 100 | 60 | 45
Total 3 curves | | | | | | | |
L = left, R = right seen towards increasing chainage
"""),
        PSGR_FRT,
    ],
    {
        5: curve(2145 * FT, "L", 10.1, 10.35, 200 * FT, 200 * FT, 3.5 * IN, 60 * MI, Freight=45 * MI),
        6: curve(3000 * FT, "R", 11.0, 11.2, 150 * FT, 120 * FT, 2.25 * IN, 60 * MI),
        10: curve(4000 * FT, "R", 12.0, 12.3, 100 * FT, 100 * FT, 1.5 * IN, 60 * MI),
    },
)

PER_TRACK = Messy(
    "sheet-per-track",
    [
        sheet(
            """
Up line curves
No. | From (km) | To (km) | Radius (m) | LH/RH | Existing cant (mm) | Proposed cant (mm) | TL in (m) | TL out (m) | Vmax
1 | 5.100 | 5.350 | 600 | LH | 90 | 100 | 60 | 60 | 90
2 | 6.100 | 6.350 | 900 | RH | 60 | 65 | 50 | 50 | 90
""",
            "Up",
        ),
        sheet(
            """
Down line curves
No. | From (km) | To (km) | Radius (m) | LH/RH | Existing cant (mm) | Proposed cant (mm) | TL in (m) | TL out (m) | Vmax
1 | 5.102 | 5.352 | 604 | LH | 85 | 100 | 60 | 55 | 90
2 | 6.098 | 6.351 | 896 | RH | 65 | 65 | 50 | 50 | 90
""",
            "Down",
        ),
        sheet("A|B\nmade up|list", "Legend"),
    ],
    {
        3: curve(600, "L", 5.1, 5.35, 60, 60, 90, 90, Curve="1"),
        4: curve(900, "R", 6.1, 6.35, 50, 50, 60, 90),
        1003: curve(604, "L", 5.102, 5.352, 60, 55, 85, 90),
        1004: curve(896, "R", 6.098, 6.351, 50, 50, 65, 90),
    },
)

SIGNED = Messy(
    "signed-radius",
    [
        sheet("""
Radius positive = right-hand, negative = left-hand
ID | Chainage from | Chainage to | R (m) | Cant | TL1 | TL2 | V
A1 | 12+345 | 12+605 | -650 | 95 | 60 | 60 | 100 km/h
A2 | 13+000 | 13+200 | R=800 m | 70 mm | 50 | 40 | 100 km/h
A3 | 14+000 | 14+200 | 1 200 m | 45 mm | none | 40 m | 100 km/h
""")
    ],
    {
        3: curve(650, "L", 12.345, 12.605, 60, 60, 95, 100),
        4: curve(800, "R", 13.0, 13.2, 50, 40, 70, 100),
        5: curve(1200, "R", 14.0, 14.2, 0, 40, 45, 100),
    },
)

UNSETTLED_SIGN = Messy(
    "unsettled-sign",
    [
        sheet("""
Curve | km from | km to | Radius (m) | Cant (mm) | Speed (km/h)
1 | 10.100 | 10.350 | -650 | 90 | 100
2 | 11.000 | 11.200 | 900 | 60 | 100
""")
    ],
    {
        2: curve(650, None, 10.1, 10.35, None, None, 90, 100),
        3: curve(900, None, 11.0, 11.2, None, None, 60, 100),
    },
    questions=1,
)

ANSWERED_SIGN = Messy(
    "answered-sign",
    UNSETTLED_SIGN.sheets,
    {
        2: curve(650, "R", 10.1, 10.35, None, None, 90, 100),
        3: curve(900, "L", 11.0, 11.2, None, None, 60, 100),
    },
    answers={"answers": {"Curves": {"Radius (m)": "negative is right-hand"}}},
)

VERSINES = Messy(
    "versines",
    [
        sheet("""
Stringlining of the harbour loop, versines in mm on a chord of 20 m
Curve | km | km end | Versine | Hand | Elevation (mm) | Speed (km/h)
1 | 1.100 | 1.300 | 100 | L | 60 | 50
2 | 2.100 | 2.300 | 62,5 | R | 40 | 50
""")
    ],
    {
        3: curve(500, "L", 1.1, 1.3, None, None, 60, 50),
        4: curve(800, "R", 2.1, 2.3, None, None, 40, 50),
    },
)

CHORD_COLUMN = Messy(
    "chord-column",
    [
        sheet("""
Curve No | From | To | Versine (mm) | Chord (m) | L/R | SE | V
1 | 1.100 | 1.300 | 25 | 10 | L | 60 | 50
2 | 2.100 | 2.300 | 62.5 | 20 | R | 40 | 50
""")
    ],
    {
        2: curve(500, "L", 1.1, 1.3, None, None, 60, 50),
        3: curve(800, "R", 2.1, 2.3, None, None, 40, 50),
    },
)

DEGREE_ASKED = Messy(
    "degree-asked",
    [
        sheet("""
Curve | km from | km to | Degree | Cant (mm) | Speed (km/h)
1 | 10.100 | 10.350 | 2.0 | 90 | 80
2 | 11.000 | 11.200 | 3°30' | 110 | 80
""")
    ],
    {2: curve(float("nan"), None, 10.1, 10.35), 3: curve(float("nan"), None, 11.0, 11.2)},
    questions=1,
    extra={"compare": False},
)

DEGREE_ANSWERED = Messy(
    "degree-answered",
    DEGREE_ASKED.sheets,
    {
        2: curve(572.987, None, 10.1, 10.35, None, None, 90, 80),
        3: curve(327.46, None, 11.0, 11.2, None, None, 110, 80),
    },
    answers={"answers": {"*": {"Degree": "20 m"}}},
)

US_STATIONS = Messy(
    "us-stations",
    [
        sheet("""
CURVE DATA, MILL CREEK BRANCH
Curve | TS | SC | CS | ST | Degree of curve | Dir | Superelevation | Psgr | Frt
 | Sta. | Sta. | Sta. | Sta. | (100 ft chord) | | (in.) | (mph) | (mph)
C-1 | 1234+00 | 1237+00 | 1245+50.5 | 1248+50.5 | 2°15' | Left | 2-1/2 | 50 | 40
C-2 | 1300+00 | 1302+00 | 1310+00 | 1312+00 | 1°00' | Right | 3/4 | 50 | 40
"""),
        PSGR_FRT,
    ],
    {
        4: curve(
            776.17,
            "L",
            123700 * FT / 1000,
            124550.5 * FT / 1000,
            300 * FT,
            300 * FT,
            2.5 * IN,
            None,
            Passenger=50 * MI,
            Freight=40 * MI,
        ),
        5: curve(
            1746.4,
            "R",
            130200 * FT / 1000,
            131000 * FT / 1000,
            200 * FT,
            200 * FT,
            0.75 * IN,
            None,
            Passenger=50 * MI,
        ),
    },
)

MERGED_DOWN = Messy(
    "merged-down",
    [
        sheet(
            """
Line | Track | Curve | Start km | End km | Radius | L/R | Cant | Speed
Ostvang | Up | 12a | 10.100 | 10.250 | 650 | L | 90 | 100
 | | 12b | 10.250 | 10.400 | 720 | L | 80 | 100
 | Down | 12a | 10.102 | 10.251 | 654 | L | 90 | 100
 | | 13 | 11.102 | 11.251 | 900 | R | | 100
""",
            merged=(CellRange(2, 0, 5, 0), CellRange(2, 1, 3, 1), CellRange(4, 1, 5, 1)),
        )
    ],
    {
        2: curve(650, "L", 10.1, 10.25, None, None, 90, 100, Line="Ostvang", Track="Up"),
        3: curve(720, "L", 10.25, 10.4, None, None, 80, 100, Line="Ostvang", Track="Up"),
        4: curve(654, "L", 10.102, 10.251, None, None, 90, 100, Line="Ostvang", Track="Down"),
        5: curve(900, "R", 11.102, 11.251, None, None, None, 100, Line="Ostvang", Track="Down"),
    },
)

BAD_ROWS = Messy(
    "bad-rows",
    [
        sheet("""
Curve | Start | End | Radius | Hand | Cant | Transition in | Transition out | Speed
1 | 10.100 | 10.350 | 650 | L | 90 | 60 | 60 | 100
2 | 11.000 | 11.200 | | R | 60 | 50 | 50 | 100
3 | 12.000 | 12.200 | 700 | R | 450 | 50 | 50 | 100
4 | 13.000 | 13.200 | 700 | X | 60 | -50 | 50 | 100
5 | 14.000 | 14.200 | 600/650 | L | 60 | 50 | 50 | 100
6 | 15.000 | 15.200 | see drawing | L | 60 | 50 | 50 | 100
7 | 16.200 | 16.000 | 800 | L | 60 | 50 | 50 | 100
1 | 17.200 | 17.300 | 800 | L | 60 | 50 | 50 | 100
9 | 18.200 | 18.300 | 1000 | L | 60 | 50 | 50 | 100
"""),
        PSGR_FRT,
    ],
    {
        2: curve(650, "L", 10.1, 10.35, 60, 60, 90, 100),
        3: {},
        4: {"radius_m": 700.0},
        5: {},
        6: {},
        7: {},
        8: {},
        9: {},
        10: curve(1000, "L", 18.2, 18.3, 50, 50, 60, 100),
    },
    rejected=(2, 3, 4, 5, 6, 7, 8, 9),
)

DESCENDING = Messy(
    "descending",
    [
        sheet("""
Kurva | Från km | Till km | Radie (m) | V/H | Rälsförhöjning (mm) | Övergångskurva (m) | Sth | Gods
1 | 45,800 | 45,500 | 600 | V | 100 | 60 | 110 | 80
2 | 44,400 | 44,150 | 850 | H | 75 | 50/60 | 110 | 80
"""),
        PSGR_FRT,
    ],
    {
        2: curve(600, "L", 45.8, 45.5, 60, 60, 100, 110, Freight=80),
        3: curve(850, "R", 44.4, 44.15, 50, 60, 75, 110, Freight=80),
    },
)

DANISH = Messy(
    "danish",
    [
        sheet("""
Strækning | Spor | Kurve nr. | Fra km | Til km | Radius [m] | V/H | Overhøjde [mm] | Overgangskurve ind [m] | Overgangskurve ud [m] | Hastighed [km/t] | Gods
Lundvang | 1 | 3 | 10,250 | 10,500 | 1.000 | V | 60 | 40 | 40 | 120 | 80
Lundvang | 1 | 4 | 11,250 | 11,500 | 1.400 | H | 40 | 40 | 30 | 120 | 80
"""),
        PSGR_FRT,
    ],
    {
        2: curve(1000, "L", 10.25, 10.5, 40, 40, 60, 120, Freight=80, Line="Lundvang", Track="1"),
        3: curve(1400, "R", 11.25, 11.5, 40, 30, 40, 120, Freight=80),
    },
)

CM_OLD = Messy(
    "cm-old",
    [
        sheet("""
Curva | PK inicio | PK fin | Radio | Peralte | Sentido | Velocidad
1 | 12,345 | 12,600 | 350 | 12,5 | D | 70
2 | 13,000 | 13,200 | 500 | 8 | I | 70
3 | 14,000 | 14,200 | 800 | 5,5 | I | 70
""")
    ],
    {
        2: curve(350, "R", 12.345, 12.6, None, None, 125, 70),
        3: curve(500, "L", 13.0, 13.2, None, None, 80, 70),
        4: curve(800, "L", 14.0, 14.2, None, None, 55, 70),
    },
)

GB_OLD = Messy(
    "gb-old",
    [
        sheet(
            """
Curve | Mileage | Radius | Hand | Cant | Length | Speed
 | from | to | chains | | ins | yards | mph
1 | 12m 34ch | 12m 51ch | 52 | L | 3½ | 374 | 50
2 | 13m 02.5ch | 13m 22.5ch | 60 | R | 2¾ | 440 | 50
""",
            merged=(CellRange(1, 1, 1, 2),),
        )
    ],
    {},
    extra={"skip": True},
)

GB_OLD2 = Messy(
    "gb-old2",
    [
        sheet(
            """
Curve | Mileage | | Radius | Hand | Cant | Length | Speed
 | from | to | chains | | ins | yards | mph
1 | 12m 34ch | 12m 51ch | 52 | L | 3½ | 374 | 50
2 | 13m 02.5ch | 13m 22.5ch | 60 | R | 2¾ | 440 | 50
""",
            merged=(CellRange(1, 1, 1, 2),),
        )
    ],
    {
        3: curve(
            52 * CH, "L", mi_ch(12, 34), mi_ch(12, 51), None, None, 3.5 * IN, 50 * MI, length_m=374 * 0.9144
        ),
        4: curve(
            60 * CH,
            "R",
            mi_ch(13, 2.5),
            mi_ch(13, 22.5),
            None,
            None,
            2.75 * IN,
            50 * MI,
            length_m=440 * 0.9144,
        ),
    },
)

CHAINS_BY_SIZE = Messy(
    "chains-by-size",
    [
        sheet("""
Curve | From (m.ch) | To | R | Hand | Cant (mm) | Speed (mph)
1 | 12.34 | 12.51 | 52 | L | 90 | 75
2 | 13.02 | 13.22 | 60.5 | R | 75 | 75
""")
    ],
    {
        2: curve(52 * CH, "L", mi_ch(12, 34), mi_ch(12, 51), None, None, 90, 75 * MI),
        3: curve(60.5 * CH, "R", mi_ch(13, 2), mi_ch(13, 22), None, None, 75, 75 * MI),
    },
)

dates = sheet("""
Curve | MP from | MP to | D | L/R | E (in) | Spiral | Psgr | Frt
1 | 10.10 | 10.35 | 1.5 | L | x | 150 | 50 | 40
2 | 11.10 | 11.35 | 1 | R | 1 | 100 | 50 | 40
""")
dates.rows[1][5] = datetime(2026, 1, 2)
dates.number_formats[(2, 5)] = "d-mmm"
DATES = Messy(
    "dates",
    [dates, PSGR_FRT],
    {
        2: curve(
            1746.375 / 1.5, "L", 10.10 * MI, 10.35 * MI, 150 * FT, 150 * FT, 0.5 * IN, None, Passenger=50 * MI
        ),
        3: curve(1746.375, "R", 11.10 * MI, 11.35 * MI, 100 * FT, 100 * FT, 1 * IN, None, Freight=40 * MI),
    },
)

D_ITALIAN = Messy(
    "italian-sections",
    [
        sheet("""
LINEA PIANDORO - MONTESARNA
Elenco delle curve

N. curva | Da km | A km | Raggio | Senso | Sopralzo (mm) | Sviluppo (m) | Raccordo 1 | Raccordo 2 | Velocità max | Velocità merci
Stazione di Piandoro
1 | 0+450 | 0+700 | 300 | Destra | 110 | 250 | 50 | 50 | 60 | 50
2 | 1+200 | 1+380 | 450 | Sinistra | 80 | 180 | 40 | 45 | 60 | 50
Fermata Valle
3 | 2+000 | 2+150 | rettifilo | | | 150 | | | 60 | 50
4 | 2+150 | 2+400 | 500 | DX | 70 | 250 | 40 | 40 | 65 | 50
Totale sviluppo | | | | | | 680
"""),
        PSGR_FRT,
    ],
    {
        6: curve(300, "R", 0.45, 0.7, 50, 50, 110, 60, length_m=250, Freight=50),
        7: curve(450, "L", 1.2, 1.38, 40, 45, 80, 60, length_m=180, Freight=50),
        10: curve(500, "R", 2.15, 2.4, 40, 40, 70, 65, length_m=250, Freight=50),
    },
)

EXIST_PROP = Messy(
    "existing-proposed-groups",
    [
        sheet(
            """
Curve | km from | km to | Radius (m) | Hand | Existing | | | Proposed | |
 | | | | | Cant | Trans in | Trans out | Cant | Trans in | Trans out
1 | 10.100 | 10.350 | 650 | L | 90 | 60 | 55 | 105 | 80 | 80
2 | 11.000 | 11.200 | 900 | R | 60 | 40 | 40 | 75 | 60 | 60
""",
            merged=(CellRange(1, 5, 1, 7), CellRange(1, 8, 1, 10)),
        )
    ],
    {
        3: curve(650, "L", 10.1, 10.35, 60, 55, 90, None),
        4: curve(900, "R", 11.0, 11.2, 40, 40, 60, None),
    },
)

FR_ELEMENTS = Messy(
    "french-elements",
    [
        sheet("""
Type | PK début | PK fin | Longueur (m) | Rayon (m) | Sens | Dévers (mm)
Alignement | 10,000 | 10,200 | 200 | | | 0
Raccordement | 10,200 | 10,280 | 80 | | G |
Cercle | 10,280 | 10,600 | 320 | 600 | G | 110
Raccordement | 10,600 | 10,670 | 70 | | G |
Alignement | 10,670 | 11,000 | 330 | | | 0
Cercle | 11,000 | 11,200 | 200 | 1500 | D | 40
Alignement | 11,200 | 11,500 | 300 | | | 0
""")
    ],
    {
        4: curve(600, "L", 10.28, 10.6, 80, 70, 110, None, length_m=320),
        7: curve(1500, "R", 11.0, 11.2, 0, 0, 40, None, length_m=200),
    },
)

METRES = Messy(
    "metres",
    [
        sheet("""
Curve ID | Start Ch. | End Ch. | Rad. | Dir | Applied cant | Entry trans. | Exit trans. | Line Speed | Freight speed
K-01 | 45320 | 45664.5 | 620 | RH | 100 | 60 | 60 | 110 | 80
K-02 | 46205 | 46480 | 1200 | LH | 55 | 40 | 40 | 110 | 80
"""),
        PSGR_FRT,
    ],
    {
        2: curve(620, "R", 45.32, 45.6645, 60, 60, 100, 110, Freight=80),
        3: curve(1200, "L", 46.205, 46.48, 40, 40, 55, 110, Freight=80),
    },
)

LAYOUTS = [
    UNIT_ROW, PER_TRACK, SIGNED, UNSETTLED_SIGN, ANSWERED_SIGN, VERSINES, CHORD_COLUMN, DEGREE_ANSWERED, US_STATIONS,
    MERGED_DOWN, BAD_ROWS, DESCENDING, DANISH, CM_OLD, GB_OLD2, CHAINS_BY_SIZE, DATES, D_ITALIAN, EXIST_PROP,
    FR_ELEMENTS, METRES,
]  # fmt: skip
