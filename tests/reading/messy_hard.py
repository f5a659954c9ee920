# ruff: noqa: E501 - rows of lists stand as the user has them
"""Invented lists with the traps that catch a hurried reader."""

from __future__ import annotations

from messy import CH, FT, IN, MI, PSGR_FRT, Messy, curve, mi_yd, sheet, traffic_of

from cant.files.grid import CellRange

NBSP = "\u00a0"

BLANK_COLUMN = Messy(
    "blank-column",
    [
        sheet(
            f"""
 | Curve register of the Marlen Vale line | | | | | | | | |
 | revised by maintenance | | | | | | | | |
 | | | | | | | | | |
 | Curve\nNo. | Chainage\nfrom (km) | Chainage\nto (km) | Radius\n(m) | Hand of\ncurve | Super-\nelevation\n(mm) | | Max. speed\n(km/h) | Goods\ntrains
 | 1 | 1{NBSP}012.345 | 1{NBSP}012.600 | 1{NBSP}250 m | L | 45 mm | | 110 | 80
 | 2 | 1{NBSP}014.100 | 1{NBSP}014.350 | 650* | R | 95 | | 100 | 80
""".replace("\\n", "\n")
            .replace("Curve\nNo.", "Curve No.")
            .replace("Chainage\nfrom", "Chainage from")
            .replace("Chainage\nto", "Chainage to")
            .replace("Radius\n", "Radius ")
            .replace("Hand of\n", "Hand of ")
            .replace("Super-\nelevation\n", "Superelevation ")
            .replace("Max. speed\n", "Max. speed ")
            .replace("Goods\n", "Goods ")
        ),
        PSGR_FRT,
    ],
    {
        5: curve(1250, "L", 1012.345, 1012.6, None, None, 45, 110, Freight=80),
        6: curve(650, "R", 1014.1, 1014.35, None, None, 95, 100, Freight=80),
    },
)

MIXED_CANT_UNITS = Messy(
    "mixed-cant-units",
    [
        sheet("""
Curve | From km | To km | Radius (m) | Hand | Cant (mm) | Trans. in | Trans. out | Speed
1 | 1.100 | 1.350 | 600 | L | 100 | 60 | 60 | 90
2 | 2.100 | 2.350 | 700 | R | 3 1/2" | 60 | 60 | 90
3 | 3.100 | 3.350 | 800 | R | 7 cm | 60 | 60 | 90
4 | 4.100 | 4.350 | 40 ch | R | 2 in | 200 ft | 60 m | 55 mph
""")
    ],
    {
        2: curve(600, "L", 1.1, 1.35, 60, 60, 100, 90),
        3: curve(700, "R", 2.1, 2.35, 60, 60, 88.9, 90),
        4: curve(800, "R", 3.1, 3.35, 60, 60, 70, 90),
        5: curve(40 * CH, "R", 4.1, 4.35, 200 * FT, 60, 50.8, 55 * MI),
    },
)

GERMAN_PAIR = Messy(
    "german-pair",
    [
        sheet("""
Bogenverzeichnis Strecke 1234 Auenquell – Breitmoor, Richtungsgleis
Bogen-Nr | Bogenanfang | Bogenende | Halbmesser | Krümmung | Überhöhung Ist | Überhöhung Soll | Übergangsbogen | V Reise/Güter
1 | 12,3+45 | 12,6+05 | 600 m | links | 95 | 100 | 60/60 | 100/80
2 | 13,0+00 | 13,2+10 | 1.100 m | rechts | 45 | 50 | 40/50 | 100/80
3 | 14,0+00 | 14,2+10 | 950 m | rechts | 50 | 50 | 40/50 | 100/80
"""),
        PSGR_FRT,
    ],
    {
        3: curve(600, "L", 12.345, 12.605, 60, 60, 95, None, Passenger=100, Freight=80),
        4: curve(1100, "R", 13.0, 13.21, 40, 50, 45, None, Passenger=100, Freight=80),
        5: curve(950, "R", 14.0, 14.21, 40, 50, 50, None, Passenger=100, Freight=80),
    },
)

COMPOUND_PARENT = Messy(
    "compound-parent",
    [
        sheet("""
Curve | Start (km) | End (km) | Radius (m) | Hand | Cant (mm) | Transition in (m) | Transition out (m) | Speed (km/h)
11 | 9.100 | 9.300 | 900 | R | 60 | 50 | 50 | 90
12 | 10.100 | 10.500 | | L | | | |
12a | 10.100 | 10.250 | 650 | L | 90 | 60 | 0 | 90
12b | 10.250 | 10.500 | 720 | L | 80 | 0 | 60 | 90
""")
    ],
    {
        2: curve(900, "R", 9.1, 9.3, 50, 50, 60, 90),
        4: curve(650, "L", 10.1, 10.25, 60, 0, 90, 90),
        5: curve(720, "L", 10.25, 10.5, 0, 60, 80, 90),
    },
)

CONTRADICTING_DEGREE = Messy(
    "contradicting-degree",
    [
        sheet("""
Curve | From km | To km | Degree | Radius (m) | Hand | Ca (mm) | Speed (kmph)
1 | 1.100 | 1.350 | 2.5 | 700 | L | 80 | 90
2 | 2.100 | 2.350 | 2 | 875 | R | 60 | 90
3 | 3.100 | 3.350 | 1 | 875 | R | 60 | 90
4 | 4.100 | 4.350 | 1 | 1750 | R | 40 | 90
5 | 5.100 | 5.350 | 3 | | R | 40 | 60
""")
    ],
    {
        2: curve(700, "L", 1.1, 1.35, None, None, 80, 90),
        3: curve(875, "R", 2.1, 2.35, None, None, 60, 90),
        4: {},
        5: curve(1750, "R", 4.1, 4.35, None, None, 40, 90),
        6: curve(582.1, "R", 5.1, 5.35, None, None, 40, 60),
    },
    rejected=(4,),
)

BARE_MILES_YARDS = Messy(
    "bare-miles-yards",
    [
        sheet(
            """
Curve|Start mileage|End mileage|Radius (m)|Hand|Cant (mm)|Length (m)|Speed (mph)
1|12.0748|12.1012|805|L|90|241.4|60
2|13.1650|14.0120|1210|R|60|210.3|60
3|15.0022|15.0300|905|R|80|254.2|60
""",
            as_text=True,
        )
    ],
    {
        2: curve(805, "L", mi_yd(12, 748), mi_yd(12, 1012), None, None, 90, 60 * MI, length_m=241.4),
        3: curve(1210, "R", mi_yd(13, 1650), mi_yd(14, 120), None, None, 60, 60 * MI, length_m=210.3),
        4: curve(905, "R", mi_yd(15, 22), mi_yd(15, 300), None, None, 80, 60 * MI, length_m=254.2),
    },
)

DECIMAL_MILES = Messy(
    "decimal-miles",
    [
        sheet("""
Curve | From MP | To MP | Deg. of curve | Hand | Elev. | Spiral in | Spiral out | Passenger | Freight
100A | 12.05 | 12.21 | 4 | L | 4 | 240 | 240 | 45 | 35
100B | 12.21 | 12.33 | 3.5 | L | 3 1/4 | 0 | 200 | 45 | 35
101 | 13.95 | 14.07 | 2 | R | 2.5 | 160 | 160 | 60 | 40
"""),
        PSGR_FRT,
    ],
    {
        2: curve(
            1746.375 / 4,
            "L",
            12.05 * MI,
            12.21 * MI,
            240 * FT,
            240 * FT,
            4 * IN,
            None,
            Passenger=45 * MI,
            Freight=35 * MI,
        ),
        3: curve(
            1746.375 / 3.5, "L", 12.21 * MI, 12.33 * MI, 0, 200 * FT, 3.25 * IN, None, Passenger=45 * MI
        ),
        4: curve(
            1746.375 / 2, "R", 13.95 * MI, 14.07 * MI, 160 * FT, 160 * FT, 2.5 * IN, None, Freight=40 * MI
        ),
    },
)

SECTIONS_SWITCH_TRACK = Messy(
    "sections-switch-track",
    [
        sheet("""
Seznam oblouků trati Dolní Mlžná – Horní Mlžná
Č. oblouku | km začátek | km konec | Poloměr [m] | Směr | Převýšení [mm] | Délka přechodnice [m] | Rychlost [km/h]
kolej č. 1
1 | 10,250 | 10,600 | 500 | levý | 92 | 70 | 80
2 | 11,000 | 11,200 | 800 | pravý | 50 | 50 | 80
kolej č. 2
1 | 10,251 | 10,602 | 504 | levý | 90 | 70 | 80
2 | 11,002 | 11,199 | 796 | pravý | 52 | 50 | 80
Celkem 4 oblouky
""")
    ],
    {
        4: curve(500, "L", 10.25, 10.6, 70, 70, 92, 80, Track="kolej č. 1"),
        5: curve(800, "R", 11.0, 11.2, 50, 50, 50, 80),
        7: curve(504, "L", 10.251, 10.602, 70, 70, 90, 80, Track="kolej č. 2"),
        8: curve(796, "R", 11.002, 11.199, 50, 50, 52, 80),
    },
)

TWO_TABLES = Messy(
    "two-tables-in-a-sheet",
    [
        sheet("""
Up main
Curve | From (km) | To (km) | Radius (m) | Hand | Cant (mm) | Speed (km/h)
1 | 1.100 | 1.350 | 600 | L | 100 | 90
2 | 2.100 | 2.350 | 700 | R | 80 | 90

Down main
Curve | From (km) | To (km) | Hand | Radius (m) | Speed (km/h) | Cant (mm)
1 | 1.102 | 1.352 | L | 604 | 90 | 95
2 | 2.102 | 2.352 | R | 696 | 90 | 85
""")
    ],
    {
        3: curve(600, "L", 1.1, 1.35, None, None, 100, 90),
        4: curve(700, "R", 2.1, 2.35, None, None, 80, 90),
        8: curve(604, "L", 1.102, 1.352, None, None, 95, 90),
        9: curve(696, "R", 2.102, 2.352, None, None, 85, 90),
    },
)

SPANISH_GROUPED = Messy(
    "spanish-grouped",
    [
        sheet(
            """
Relación de curvas, vía única
 | Situación | | Geometría | | | | Peralte | | Velocidad (km/h) | |
Curva | Desde | Hasta | Radio | Sentido | Clotoide | | Real | Prescrito | Tipo N | Tipo A | Mercancías
 | PK | PK | m | | Ent. | Sal. | mm | mm | | |
1 | 12+345 | 12+600 | 350 | D | 60 | 60 | 110 | 120 | 70 | 75 | 60
2 | 13+000 | 13+200 | 1.050 | I | 40 | 30 | 40 | 40 | 80 | 90 | 70
""",
            merged=(
                CellRange(2, 1, 2, 2),
                CellRange(2, 3, 2, 6),
                CellRange(2, 7, 2, 8),
                CellRange(2, 9, 2, 11),
                CellRange(3, 5, 3, 6),
            ),
        ),
        traffic_of(
            ("Tipo N", "passenger", 140.0), ("Tipo A", "passenger", 160.0), ("Mercancías", "freight", 100.0)
        ),
    ],
    {
        5: curve(350, "R", 12.345, 12.6, 60, 60, 110, None, **{"Tipo N": 70, "Tipo A": 75, "Mercancías": 60}),
        6: curve(1050, "L", 13.0, 13.2, 40, 30, 40, None, **{"Tipo N": 80, "Tipo A": 90, "Mercancías": 70}),
    },
)

FRENCH_COLUMNS = Messy(
    "french-columns",
    [
        sheet("""
Courbe n° | Voie | Origine | Fin | R | D | I | E | Raccordement entrée | Raccordement sortie | Vitesse | Fret | Sens
12 | 1 | PK 102+345 | PK 102+860 | 590 | 120 | 84 | 30 | 80 | 70 | 100 | 80 | à gauche
13 | 1 | PK 103+345 | PK 103+560 | 1250 | 50 | 44 | 0 | 40 | 40 | 100 | 80 | à droite
"""),
        PSGR_FRT,
    ],
    {
        2: curve(590, "L", 102.345, 102.86, 80, 70, 120, 100, Freight=80),
        3: curve(1250, "R", 103.345, 103.56, 40, 40, 50, 100, Freight=80),
    },
)

HUNGARIAN_STYLE = Messy(
    "hectometres",
    [
        sheet("""
Kurve | Station Anfang | Station Ende | Radius (m) | Richtung | Überhöhung (mm) | Länge (m) | v (km/h)
1 | 123+45 | 126+05 | 600 | L | 95 | 260 | 90
2 | 130+00 | 132+10 | 900 | R | 60 | 210 | 90
""")
    ],
    {
        2: curve(600, "L", 12.345, 12.605, None, None, 95, 90, length_m=260),
        3: curve(900, "R", 13.0, 13.21, None, None, 60, 90, length_m=210),
    },
)

POLISH_ELEMENTS = Messy(
    "polish-elements",
    [
        sheet(
            """
Typ elementu;Początek;Koniec;Długość;Promień;Przechyłka
prosta;10,000;10,200;200;∞;0
krzywa przejściowa;10,200;10,270;70;;
łuk;10,270;10,500;230;600 L;90
krzywa przejściowa;10,500;10,570;70;;
prosta;10,570;11,000;430;∞;0
łuk;11,000;11,200;200;2000 P;20
prosta;11,200;11,500;300;∞;0
""".replace(";", "|"),
            as_text=True,
        )
    ],
    {
        4: curve(600, "L", 10.27, 10.5, 70, 70, 90, None, length_m=230),
        7: curve(2000, "R", 11.0, 11.2, 0, 0, 20, None, length_m=200),
    },
)

LAYOUTS = [
    BLANK_COLUMN, MIXED_CANT_UNITS, GERMAN_PAIR, COMPOUND_PARENT, CONTRADICTING_DEGREE, BARE_MILES_YARDS, DECIMAL_MILES,
    SECTIONS_SWITCH_TRACK, TWO_TABLES, SPANISH_GROUPED, FRENCH_COLUMNS, HUNGARIAN_STYLE, POLISH_ELEMENTS,
]  # fmt: skip
