# ruff: noqa: E501 - rows of lists stand as the user has them
"""Invented lists of a third hand: the odd ones, and those that must be asked about."""

from __future__ import annotations

from messy import CH, IN, MI, PSGR_FRT, YD, Messy, curve, sheet

from cant.files.grid import CellRange

ENTRY_EXIT = Messy(
    "entry-exit",
    [
        sheet("""
Alignment register - branch to Fell End
Curve ref. | Beginning chainage (m) | Ending chainage (m) | Direction of turn | Curve radius R (m) | Trans. length entry (m) | Trans. length exit (m) | Cant existing/proposed (mm) | Design speed (km/h) | Cant deficiency at Vmax (mm) | Equilibrium speed
FE-1 | 1250.5 | 1510.0 | Left | 402.3 | 45 | 50 | 90/105 | 70 | 54 | 55
FE-2 | 2000 | 2240 | Right | 1006 | 30 | 30 | 25/30 | 90 | 70 | 45
""")
    ],
    {
        3: curve(402.3, "L", 1.2505, 1.51, 45, 50, 90, 70),
        4: curve(1006, "R", 2.0, 2.24, 30, 30, 25, 90),
    },
)

MISSING_NAMES = Messy(
    "removed-curve",
    [
        sheet("""
Curve | Start (km) | End (km) | Radius (m) | Hand | Cant (mm) | Speed (km/h) | Remarks
1 | 1.100 | 1.350 | 600 | L | 100 | 90 |
2 | | | | | | | see drawing 12
3 | 3.100 | 3.350 | 800 | R | 60 | 90 |
Media Luna | | | | | | | halt
4 | 4.100 | 4.350 | 700 | R | n/a | 90 | cant not measured
TOTAL | | | 4 curves | | | |
""")
    ],
    {
        2: curve(600, "L", 1.1, 1.35, None, None, 100, 90),
        3: {},
        4: curve(800, "R", 3.1, 3.35, None, None, 60, 90),
        6: curve(700, "R", 4.1, 4.35, None, None, None, 90),
    },
    rejected=(3,),
)

ASK_MILES = Messy(
    "ask-miles",
    [
        sheet("""
Curve | Mileage start | Mileage end | Radius (m) | Hand | Cant (mm) | Speed (mph)
1 | 12.34 | 12.51 | 1046 | L | 90 | 75
2 | 13.02 | 13.22 | 1207 | R | 75 | 75
""")
    ],
    {2: {}, 3: {}},
    questions=1,
)

ASK_CANT = Messy(
    "ask-cant",
    [
        sheet("""
Curve | km from | km to | Radius (m) | Hand | Superelevation | Speed
1 | 10.100 | 10.350 | 400 | L | 4.5 | 60
2 | 11.000 | 11.200 | 500 | R | 3.5 | 60
""")
    ],
    {2: {}, 3: {}},
    questions=1,
)

ASK_D = Messy(
    "ask-d",
    [
        sheet("""
Curve | km from | km to | Radius (m) | Hand | D | Speed (km/h)
1 | 10.100 | 10.350 | 400 | L | 100 | 80
2 | 11.000 | 11.200 | 500 | R | 80 | 80
""")
    ],
    {2: {}, 3: {}},
    questions=1,
)

PORTUGUESE_OLD = Messy(
    "portuguese-old",
    [
        sheet("""
Linha do Vale, via ascendente
Nº da curva | PK inicial | PK final | Raio (m) | Sentido | Desenvolvimento (m) | Sobrelevação (cm) | Transição entrada | Transição saída | Velocidade máxima | Vel. mercadorias | Obs.
1 | 45+120 | 45+480 | 400 | Esquerda | 360 | 9,5 | 50 | 50 | 80 | 60 | ponte
2 | 46+000 | 46+200 | 1.000 | Direita | 200 | 4 | 40 | 0 | 90 | 70 |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(400, "L", 45.12, 45.48, 50, 50, 95, 80, length_m=360, Freight=60),
        4: curve(1000, "R", 46.0, 46.2, 40, 0, 40, 90, length_m=200, Freight=70),
    },
)

SPANISH_DEGREE = Messy(
    "mexican-degree",
    [
        sheet("""
Línea Norte, distrito Sierra
Curva | Km inicial | Km final | Grado métrico (cuerda de 20 m) | Sentido | Sobreelevación (cm) | Espiral entrada (m) | Espiral salida (m) | Vel. pasajeros (km/h) | Vel. carga (km/h)
C-1 | 101+200 | 101+450 | 3°00' | Izq | 7.5 | 40 | 40 | 70 | 50
C-2 | 102+000 | 102+180 | 2°15' | Der | 5 | 30 | 35 | 70 | 50
"""),
        PSGR_FRT,
    ],
    {
        3: curve(382.0, "L", 101.2, 101.45, 40, 40, 75, None, Passenger=70, Freight=50),
        4: curve(509.3, "R", 102.0, 102.18, 30, 35, 50, None, Passenger=70, Freight=50),
    },
)

GB_TWO_COLUMN_MILES = Messy(
    "gb-yards-text",
    [
        sheet("""
Curve | Start mileage | End mileage | Radius | Hand | Cant | Line speed | Freight
2 | 12m 0748y | 12m 1012y | 40 chains | LH | 4" | 60 | 45
3 | 13m 1650y | 14m 0120y | 60 chains | RH | 2 1/2" | 60 | 45
"""),
        PSGR_FRT,
    ],
    {
        2: curve(
            40 * CH,
            "L",
            12 * MI + 748 * YD / 1000,
            12 * MI + 1012 * YD / 1000,
            None,
            None,
            4 * IN,
            60 * MI,
            Freight=45 * MI,
        ),
        3: curve(
            60 * CH, "R", 13 * MI + 1650 * YD / 1000, 14 * MI + 120 * YD / 1000, None, None, 2.5 * IN, 60 * MI
        ),
    },
)

ENGLISH_ELEMENTS = Messy(
    "english-elements",
    [
        sheet("""
Horizontal alignment, down line
El. | Element | Start chainage | End chainage | Length (m) | Start radius (m) | End radius (m) | Hand | Applied cant (mm)
1 | Straight | 1+000.000 | 1+200.000 | 200.000 | | | | 0
2 | Spiral | 1+200.000 | 1+260.000 | 60.000 | | 500 | L |
3 | Circular curve | 1+260.000 | 1+500.000 | 240.000 | 500 | 500 | L | 110
4 | Spiral | 1+500.000 | 1+540.000 | 40.000 | 500 | 800 | L |
5 | Circular curve | 1+540.000 | 1+700.000 | 160.000 | 800 | 800 | L | 70
6 | Spiral | 1+700.000 | 1+750.000 | 50.000 | 800 | | L |
7 | Straight | 1+750.000 | 2+000.000 | 250.000 | | | | 0
""")
    ],
    {
        5: curve(500, "L", 1.26, 1.5, 60, 40, 110, None, length_m=240),
        7: curve(800, "L", 1.54, 1.7, 40, 50, 70, None, length_m=160),
    },
)

REPEATED_PAGES = Messy(
    "repeated-pages",
    [
        sheet("""
Kurvverzeichnis Blatt 1
Nr | von km | bis km | Radius | Richt. | Überhöhung | Vmax | V Gz
 | | | m | | mm | km/h | km/h
1 | 1,100 | 1,350 | 600 | L | 100 | 90 | 80
2 | 2,100 | 2,350 | 700 | R | 80 | 90 | 80
Übertrag | | | | | | |
Kurvverzeichnis Blatt 2
Nr | von km | bis km | Radius | Richt. | Überhöhung | Vmax | V Gz
 | | | m | | mm | km/h | km/h
3 | 3,100 | 3,350 | 650 | L | 90 | 90 | 80
4 | 4,100 | 4,350 | 1.250 | R | 40 | 90 | 80
Anzahl Bögen: 4
"""),
        PSGR_FRT,
    ],
    {
        4: curve(600, "L", 1.1, 1.35, None, None, 100, 90, Freight=80),
        5: curve(700, "R", 2.1, 2.35, None, None, 80, 90),
        10: curve(650, "L", 3.1, 3.35, None, None, 90, 90),
        11: curve(1250, "R", 4.1, 4.35, None, None, 40, 90),
    },
)

SIDE_BY_SIDE_MERGED = Messy(
    "side-by-side-merged",
    [
        sheet(
            """
Comparison of both tracks | | | | | | | | |
Voie 1 | | | | | Voie 2 | | | |
Courbe | PK début | PK fin | Rayon | Dévers | Courbe | PK début | PK fin | Rayon | Dévers
1 | 10,100 | 10,350 | 650 | 90 | 1 | 10,098 | 10,352 | 654 | 85
2 | 11,000 | 11,200 | 900 | 60 | 2 | 11,002 | 11,203 | 896 | 65
""",
            merged=(CellRange(1, 0, 1, 9), CellRange(2, 0, 2, 4), CellRange(2, 5, 2, 9)),
        )
    ],
    {
        4: curve(650, None, 10.1, 10.35, None, None, 90, Track="Voie 1"),
        5: curve(900, None, 11.0, 11.2, None, None, 60),
        1004: curve(654, None, 10.098, 10.352, None, None, 85, Track="Voie 2"),
        1005: curve(896, None, 11.002, 11.203, None, None, 65),
    },
)

TWO_RADII = Messy(
    "two-radii",
    [
        sheet("""
Curve | km start | km end | R | LR | h | lp1 | lp2 | V1 | V2
1 | 10.100 | 10.350 | 650 | L | 90 | 60 | 60 | 100 | 80
2 | 11.000 | 11.200 | 900 | R | 60 | 40 | 50 | 100 | 80
V1 = passenger trains, V2 = freight trains, lp = transition in m, h = cant in mm
"""),
        PSGR_FRT,
    ],
    {
        2: curve(650, "L", 10.1, 10.35, 60, 60, 90, None, Passenger=100, Freight=80),
        3: curve(900, "R", 11.0, 11.2, 40, 50, 60, None, Passenger=100, Freight=80),
    },
)

LAYOUTS = [
    ENTRY_EXIT, MISSING_NAMES, ASK_MILES, ASK_CANT, ASK_D, PORTUGUESE_OLD, SPANISH_DEGREE, GB_TWO_COLUMN_MILES,
    ENGLISH_ELEMENTS, REPEATED_PAGES, SIDE_BY_SIDE_MERGED, TWO_RADII,
]  # fmt: skip
