# ruff: noqa: E501, W291 - rows of lists stand as the user has them
"""Invented lists of a second hand: other words, other quirks, the same trade."""

from __future__ import annotations

from datetime import datetime

from messy import CH, FT, IN, MI, PSGR_FRT, YD, Messy, curve, sheet, traffic_of

from cant.files.grid import CellRange, Sheet

NORDIC = Messy(
    "swedish-register",
    [
        sheet("""
Bandel 931 Älvdunga - Norrdunga
Kurvregister, uppdaterat efter mätning

Kurva nr | Spår | Km+m från | Km+m till | Radie | Riktning | Rälsförhöjning | Brist | ÖK 1 | ÖK 2 | Sth A | Sth B | Gods | Anm.
1 | U | 12+345 | 12+705 | 600 | höger | 110 | 85 | 70 | 70 | 110 | 120 | 90 |
2 | U | 13+100 | 13+300 | 1 200 | vänster | 50 | 60 | 40 | 50 | 110 | 120 | 90 | plattform
3 | N | 13+098 | 13+299 | 1 204 | vänster | 50 | 60 | 40 | 50 | 110 | 120 | 90 |
Summa | | | | | | | | | | | | |
"""),
        traffic_of(("A", "passenger", 160.0), ("B", "passenger", 180.0), ("Gods", "freight", 100.0)),
    ],
    {
        5: curve(600, "R", 12.345, 12.705, 70, 70, 110, None, A=110, B=120, Gods=90, Track="U", Curve="1"),
        6: curve(1200, "L", 13.1, 13.3, 40, 50, 50, None, A=110, B=120, Gods=90),
        7: curve(1204, "L", 13.098, 13.299, 40, 50, 50, None, Track="N"),
    },
)

NORWEGIAN_STACKED = Messy(
    "norwegian-stacked",
    [
        sheet(
            """
Sporgeometri Fjellvangbanen | | | | | | | | |
Kurve | Km | | Radius | Retning | Overhøyde | Overgangskurve | | Hastighet | 
nr. | fra | til | [m] | | [mm] | inn [m] | ut [m] | pers.tog | godstog
1 | 102,345 | 102,600 | 300 | V | 130 | 60 | 55 | 70 | 60
2 | 103,000 | 103,150 | 450 | H | 90 | 50 | 50 | 80 | 70
""",
            merged=(CellRange(2, 1, 2, 2), CellRange(2, 6, 2, 7), CellRange(2, 8, 2, 9)),
        ),
        PSGR_FRT,
    ],
    {
        4: curve(300, "L", 102.345, 102.6, 60, 55, 130, None, Passenger=70, Freight=60),
        5: curve(450, "R", 103.0, 103.15, 50, 50, 90, None, Passenger=80, Freight=70),
    },
)

US_COMMON = Messy(
    "us-track-chart",
    [
        sheet(
            """
PINE HOLLOW SUBDIVISION - CURVE LIST | | | | | | | | | |
Timetable 7 | | | | | | | | | |
CURVE # | BEGIN MP | END MP | DEGREE | DIRECTION | LENGTH (FT) | SUPERELEV. | SPIRAL LENGTH | MAX SPEED | | REMARKS
 | | | | | | (INCHES) | (FT) | PASS | FRT |
24 | 201.32 | 201.58 | 4° 00' | LEFT | 1372 | 3.00 | 310 | 45 | 35 | LUBRICATOR
25 | 202.10 | 202.25 | 1° 30' | RIGHT | 792 | 1.50 | 155 / 186 | 60 | 50 |
26 | 203.4 | 203.45 | 6° 15' | LEFT | 264 | 4 | 0 | 30 | 25 |
""",
            merged=(CellRange(3, 8, 3, 9),),
        ),
        PSGR_FRT,
    ],
    {
        5: curve(
            1746.375 / 4,
            "L",
            201.32 * MI,
            201.58 * MI,
            310 * FT,
            310 * FT,
            3 * IN,
            None,
            length_m=1372 * FT,
            Passenger=45 * MI,
            Freight=35 * MI,
        ),
        6: curve(
            1746.375 / 1.5,
            "R",
            202.1 * MI,
            202.25 * MI,
            155 * FT,
            186 * FT,
            1.5 * IN,
            None,
            length_m=792 * FT,
        ),
        7: curve(
            1746.375 / 6.25,
            "L",
            203.4 * MI,
            203.45 * MI,
            0,
            0,
            4 * IN,
            None,
            length_m=264 * FT,
            Freight=25 * MI,
        ),
    },
)

GERMAN_CSV_LIKE = Messy(
    "german-csv",
    [
        sheet(
            """
Strecke;Gleis;Bogen;von km;bis km;Halbmesser m;Richtung;u vorh. mm;u gepl. mm;l_u1 m;l_u2 m;V zul;V Gz;Zwangspunkt
4711;1;B1;10,250;10,480;500;re;105;120;55,5;60;80;60;
4711;1;B2;11,020;11,300;1.450;li;40;40;40;40;100;80;Bahnsteig
4711;1;B3;12,500;12,640;875,5;re;60;65;0;45;100;80;BÜ
;2;B1;10,252;10,481;504;re;105;120;55;60;80;60;
""".replace(";", "|"),
            as_text=True,
        ),
        PSGR_FRT,
    ],
    {
        2: curve(500, "R", 10.25, 10.48, 55.5, 60, 105, 80, Freight=60, Line="4711", Track="1"),
        3: curve(1450, "L", 11.02, 11.3, 40, 40, 40, 100, Freight=80, situation="platform"),
        4: curve(875.5, "R", 12.5, 12.64, 0, 45, 60, 100, situation="level crossing"),
        5: curve(504, "R", 10.252, 10.481, 55, 60, 105, 80, Line="4711", Track="2"),
    },
)

GB_MODERN = Messy(
    "gb-modern",
    [
        sheet(
            """
Route: Harrow Moor to Tarnby Fold | | | | | | | | | | |
Data from alignment database; radii in metres, cant in mm | | | | | | | | | | |
ELR | Track ID | Curve | Mileage (M.Yds) | | Hand | Radius | Cant | Transition | | Speeds (mph) |
 | | | From | To | | | | Lead-in | Lead-out | Passenger | Freight
HMS | 1100 | 14 | 22.0110 | 22.0543 | L | 604 | 150 | 66 | 80 | 70 | 60
HMS | 1100 | 15 | 22.1320 | 22.1700 | R | 1005 | 75 | 50 | 50 | 70 | 60
HMS | 2100 | 14 | 22.0112 | 22.0540 | L | 608 | 150 | 66 | 80 | 70 | none
""",
            merged=(CellRange(3, 3, 3, 4), CellRange(3, 8, 3, 9), CellRange(3, 10, 3, 11)),
        ),
        PSGR_FRT,
    ],
    {
        5: curve(
            604,
            "L",
            22 * MI + 110 * YD / 1000,
            22 * MI + 543 * YD / 1000,
            66,
            80,
            150,
            None,
            Passenger=70 * MI,
            Freight=60 * MI,
            Track="1100",
        ),
        6: curve(1005, "R", 22 * MI + 1320 * YD / 1000, 22 * MI + 1700 * YD / 1000, 50, 50, 75, None),
        7: curve(
            608, "L", 22 * MI + 112 * YD / 1000, 22 * MI + 540 * YD / 1000, 66, 80, 150, None, Freight=-1
        ),
    },
)

FRENCH_REGISTER = Messy(
    "french-register",
    [
        sheet(
            """
Répertoire des courbes | | | | | | | | | |
Ligne de Valmorin à Crestaille - Voie 2 | | | | | | | | | |
Désignation | Position (PK) | | Rayon | Sens | Dévers existant | Dévers projeté | Longueur RP | | Vitesse |
 | début | fin | m | | mm | mm | entrée | sortie | voyageurs | marchandises
C1 | 12,345 | 12,800 | 600 | gauche | 110 | 125 | 80 | 80 | 110 | 80
C2 | 13,200 | 13,455 | 1 500 | droite | 45 | 50 | 40 | - | 110 | 80
Gare de Crestaille | | | | | | | | | |
C3 | 14,000 | 14,100 | ∞ | | 0 | 0 | | | 110 | 80
C4 | 14,100 | 14,300 | 400 | droite | 140 | 140 | 0 | 75 | 80 | 60
""",
            merged=(CellRange(3, 1, 3, 2), CellRange(3, 7, 3, 8), CellRange(3, 9, 3, 10)),
        ),
        PSGR_FRT,
    ],
    {
        5: curve(600, "L", 12.345, 12.8, 80, 80, 110, None, Passenger=110, Freight=80),
        6: curve(1500, "R", 13.2, 13.455, 40, None, 45, None),
        9: curve(400, "R", 14.1, 14.3, 0, 75, 140, None, Freight=60),
    },
)

ITALIAN_POINTS = Messy(
    "italian-points",
    [
        sheet("""
N. | Inizio raccordo | Inizio curva | Fine curva | Fine raccordo | R [m] | Dir. | h [mm] | V [km/h]
1 | 10+000 | 10+060 | 10+300 | 10+365 | 450 | dx | 120 | 80
2 | 11+500 | 11+540 | 11+700 | 11+740 | 1.000 | sx | 45 | 90
""")
    ],
    {
        2: curve(450, "R", 10.06, 10.3, 60, 65, 120, 80),
        3: curve(1000, "L", 11.54, 11.7, 40, 40, 45, 90),
    },
)

POLISH_WIDE = Messy(
    "polish-wide",
    [
        sheet("""
Wykaz łuków poziomych, linia 999 Brzoźnik – Dębosław
Lp. | Nr łuku | km początku | km końca | R | Kierunek | h | Długość KP | Długość łuku | Vmax | Vtow
1 | 12 | 45,120 | 45,560 | 700 | w lewo | 80 | 60 | 440 | 100 | 70
2 | 13 | 46,200 | 46,380 | 1200 | w prawo | 40 | 40 | 180 | 100 | 70
Razem | | | | | | | | 620 | |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(700, "L", 45.12, 45.56, 60, 60, 80, 100, length_m=440, Freight=70, Curve="12"),
        4: curve(1200, "R", 46.2, 46.38, 40, 40, 40, 100, length_m=180, Freight=70),
    },
)

BRAZIL_DEGREE = Messy(
    "brazil-degree",
    [
        sheet("""
Trecho Serra Verdal, bitola 1,00 m
Nº | Estaca inicial | km inicial | km final | Grau (corda 20 m) | Sentido | Superelevação (mm) | Espiral | VMA (km/h)
1 | 120 | 12,400 | 12,650 | 4°00' | E | 80 | 40 | 50
2 | 180 | 13,600 | 13,700 | 2°30' | D | 50 | 30 | 60
""")
    ],
    {
        3: curve(286.54, "L", 12.4, 12.65, 40, 40, 80, 50),
        4: curve(458.4, "R", 13.6, 13.7, 30, 30, 50, 60),
    },
)

INDIA_FULL = Messy(
    "india-full",
    [
        sheet("""
List of curves, Section RNP-KLM (Single line) BG
S.No. | Curve No. | Km from | Km to | Direction (LH/RH) | Degree of curve | Radius (m) | Length of curve (m) | Transition length (m) | Superelevation provided (mm) | Max. permissible speed (kmph) | Booked speed of goods train (kmph)
1 | 1 | 101.235 | 101.610 | LH | 2° | 875 | 375 | 90 | 75 | 100 | 65
2 | 2 | 103.400 | 103.655 | RH | 1°30' | 1167 | 255 | 60 | 50 | 100 | 65
3 | 2A | 103.800 | 103.900 | RH | 1.0 | 1750 | 100 | 40 | 25 | 100 | 65
"""),
        PSGR_FRT,
    ],
    {
        3: curve(875, "L", 101.235, 101.61, 90, 90, 75, 100, length_m=375, Freight=65, Curve="1"),
        4: curve(1167, "R", 103.4, 103.655, 60, 60, 50, 100, length_m=255),
        5: curve(1750, "R", 103.8, 103.9, 40, 40, 25, 100, length_m=100, Curve="2A"),
    },
)

CZECH_STACKED = Messy(
    "czech-stacked",
    [
        sheet(
            """
Traťový úsek: Horní Mlžná - Dolní Mlžná | | | | | | | | |
Číslo | Staničení | | Poloměr | Směr | Převýšení | Délka | | Rychlost |
oblouku | začátek | konec | R [m] | | D [mm] | přechodnice 1 | přechodnice 2 | V [km/h] | nákladní
1 | 5,120 | 5,405 | 350 | vlevo | 120 | 55 | 60 | 70 | 60
2 | 6,000 | 6,200 | 500 | vpravo | 80 | 45 | 45 | 80 | 60
""",
            merged=(CellRange(2, 1, 2, 2), CellRange(2, 6, 2, 7), CellRange(2, 8, 2, 9)),
        ),
        PSGR_FRT,
    ],
    {
        4: curve(350, "L", 5.12, 5.405, 55, 60, 120, 70, Freight=60),
        5: curve(500, "R", 6.0, 6.2, 45, 45, 80, 80, Freight=60),
    },
)

AU_MIX = Messy(
    "australian-mix",
    [
        sheet("""
Curve & Gradient Diagram Extract - Mulgabee Branch
Curve ID | Start km | Finish km | Radius (m) | LH/RH | Applied Superelevation (mm) | Ls1 (m) | Ls2 (m) | Normal speed board (km/h) | Freight | Deficiency (mm)
M-01 | 101.250 | 101.610 | 402 | LH | 80 | 40 | 40 | 80 | 70 | 75
M-02 | 102.000 | 102.300 | 805 | RH | 40 | 30 | 30 | 100 | 80 | 60
M-03 | 103.000 | 103.200 | STR | | | | | 115 | 80 |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(402, "L", 101.25, 101.61, 40, 40, 80, 80, Freight=70),
        4: curve(805, "R", 102.0, 102.3, 30, 30, 40, 100, Freight=80),
    },
)

dated = sheet("""
Curve | Chainage from | Chainage to | Radius (m) | Hand | Cant (mm) | Transitions (m) | Speed (km/h)
1 | 10.100 | 10.350 | 650 | L | 90 | 60/60 | 100
2 | 11.000 | 11.200 | 900 | R | 60 | x | 100
3 | 12.000 | 12.200 | 900 | R | 60 | y | 100
""")
dated.rows[2][6] = datetime(1940, 12, 1)
dated.number_formats[(3, 6)] = "mmm\\-yy"
dated.rows[3][6] = datetime(2026, 10, 12)
dated.number_formats[(4, 6)] = "d-mmm"
DATED = Messy(
    "dated",
    [dated],
    {
        2: curve(650, "L", 10.1, 10.35, 60, 60, 90, 100),
        3: curve(900, "R", 11.0, 11.2, 12, 40, 60, 100),
        4: {},
    },
    rejected=(4,),
)

CHAINS_R = Messy(
    "radius-question",
    [
        sheet("""
Curve No | From | To | Radius | Direction | Superelevation | Max speed | Min speed goods
1 | 10.100 | 10.350 | 40 | L | 3.5 | 50 | 25
2 | 11.000 | 11.200 | 60 | R | 2.25 | 50 | 25
Speeds in mph, chainages in km
""")
    ],
    {
        2: curve(40 * CH, "L", 10.1, 10.35, None, None, 3.5 * IN, 50 * MI),
        3: curve(60 * CH, "R", 11.0, 11.2, None, None, 2.25 * IN, 50 * MI),
    },
)

HIDDEN = Messy(
    "hidden-rows",
    [
        Sheet(
            "Curves",
            sheet("""
Curve | Start (km) | End (km) | Radius (m) | Old cant | Cant (mm) | Speed (km/h)
1 | 1.100 | 1.350 | 600 | 80 | 100 | 90
2 | 2.100 | 2.350 | 700 | 60 | 80 | 90
2 | 2.100 | 2.350 | 710 | 60 | 75 | 90
3 | 3.100 | 3.350 | 800 | 60 | 60 | 90
""").rows,
            hidden_rows=frozenset({4, 5}),
        )
    ],
    {
        2: curve(600, None, 1.1, 1.35, None, None, 100, 90),
        3: curve(700, None, 2.1, 2.35, None, None, 80, 90),
        4: {},
        5: curve(800, None, 3.1, 3.35, None, None, 60, 90),
    },
    rejected=(4,),
)

LAYOUTS = [
    NORDIC, NORWEGIAN_STACKED, US_COMMON, GERMAN_CSV_LIKE, GB_MODERN, FRENCH_REGISTER, ITALIAN_POINTS, POLISH_WIDE,
    BRAZIL_DEGREE, INDIA_FULL, CZECH_STACKED, AU_MIX, DATED, CHAINS_R, HIDDEN,
]  # fmt: skip
