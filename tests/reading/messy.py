# ruff: noqa: E501 - rows of lists stand as the user has them
"""Invented curve lists as they come: each a text of cells, with what a careful colleague reads in them.

Lines, places and figures are invented. A cell ends at ``|``; a bare number with a point becomes a number cell,
as a spreadsheet would keep it, everything else stays text.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import Any

from cant.files.grid import CellRange, Sheet, Value, Workbook
from cant.reading import read_workbook

CH, MI, YD, FT, IN = 20.1168, 1.609344, 0.9144, 0.3048, 25.4


def cell(text: str) -> Value:
    """Turn a text into the cell a spreadsheet would keep."""
    word = text.strip()
    if word.startswith("'"):
        return word[1:]
    if re.fullmatch(r"-?\d+(\.\d+)?", word):
        return float(word)
    return word or None


def sheet(
    text: str, name: str = "Curves", merged: tuple[CellRange, ...] = (), as_text: bool = False
) -> Sheet:
    """Make a sheet from lines of cells; the first and last line end are dropped."""
    rows = [
        [(c.strip() or None) if as_text else cell(c) for c in line.split("|")]
        for line in text.strip("\n").split("\n")
    ]
    return Sheet(name, [row if any(v is not None for v in row) else [] for row in rows], list(merged))


def traffic_of(*classes: tuple[str, str, float]) -> Sheet:
    """Make a traffic sheet of (class, category, speed)."""
    rows: list[list[Value]] = [["Class", "Category", "Speed", "Trains per day", "Mass"]]
    rows += [[name, category, speed, 10.0, 500.0] for name, category, speed in classes]
    return Sheet("Traffic", rows)


@dataclass
class Messy:
    """One list: its sheets, and by (sheet, row) what is to be read in it."""

    name: str
    sheets: list[Sheet]
    expected: dict[int, dict[str, Any]]
    rejected: tuple[int, ...] = ()
    questions: int = 0
    answers: dict[str, Any] | None = None
    extra: dict[str, Any] = field(default_factory=dict)

    def read(self):
        """Read the list with its answers."""
        return read_workbook(Workbook(f"{self.name}.xlsx", "xlsx", self.sheets), answers=self.answers)


def km(value: float) -> float:
    return value


def mi_ch(miles: int, chains: float) -> float:
    """Miles and chains in kilometres."""
    return miles * MI + chains * CH / 1000


def mi_yd(miles: int, yards: float) -> float:
    """Miles and yards in kilometres."""
    return miles * MI + yards * YD / 1000


def curve(
    radius: float, hand: str | None = None, start: float | None = None, end: float | None = None,
    t_in: float | None = None, t_out: float | None = None, cant: float | None = None, speed: float | None = None,
    **more: Any,
) -> dict[str, Any]:  # fmt: skip
    """Give what is read of one curve; None is a blank."""
    return {
        "radius_m": radius, "hand": hand, "start_km": start, "end_km": end, "transition_in_m": t_in,
        "transition_out_m": t_out, "cant_mm": cant, "speed_kmh": speed, **more,
    }  # fmt: skip


PSGR_FRT = traffic_of(("Passenger", "passenger", 200.0), ("Freight", "freight", 120.0))


GB_CHAINS = Messy(
    "gb-chains",
    [
        sheet("""
Tarnbeck & Harrow Moor line, DOWN MAIN
Issue 4, all cants as surveyed

Curve | Mileage from (m.ch) | Mileage to | Hand | Radius (ch) | Cant (mm) | Trans in (ft) | Trans out | Line speed | Fgt | Remarks
C17 | 12.34 | 12.51 | L | 52 | 90 | 165 | 165 | 75 | 60 | UWC at 12m 41ch
C18 | 12.79 | 13.06 | R | 48.5 | 100 | 180 | 165 | 75 | 60 |
Harrow Moor station
C19 | 13.1 | 13.2 | R | 80 | 45 | 0 | 0 | 75 | 60 | LC
"""),
        PSGR_FRT,
    ],
    {
        5: curve(
            52 * CH, "L", mi_ch(12, 34), mi_ch(12, 51), 165 * FT, 165 * FT, 90, 75 * MI, Freight=60 * MI
        ),
        6: curve(
            48.5 * CH, "R", mi_ch(12, 79), mi_ch(13, 6), 180 * FT, 165 * FT, 100, 75 * MI, Freight=60 * MI
        ),
        8: curve(80 * CH, "R", mi_ch(13, 10), mi_ch(13, 20), 0, 0, 45, 75 * MI, Freight=60 * MI),
    },
)

GB_YARDS = Messy(
    "gb-yards",
    [
        sheet(
            """
Ref|ELR|TID|Start (miles.yds)|End|Rad m|Hand|Existing cant|CD @ PS|PS HST|PS SP|PS MU|PS Loco
08|QZB1|1100|34.1320|34.1651|805|RH|110|92|85|80|75|60
09|QZB1|1100|35.0022|35.0310|1210|LH|75|88|85|80|75|60
10|QZB1|1100|35.0748|35.1201|990|LH|95|70|85|80|75|60
""",
            as_text=True,
        ),
        traffic_of(
            ("HST", "passenger", 200.0),
            ("Multiple unit", "passenger", 160.0),
            ("Loco hauled", "passenger", 160.0),
            ("Freight", "freight", 120.0),
        ),
    ],
    {
        2: curve(
            805, "R", mi_yd(34, 1320), mi_yd(34, 1651), cant=110, HST=85 * MI, Line="QZB1", Track="1100"
        ),
        3: curve(1210, "L", mi_yd(35, 22), mi_yd(35, 310), cant=75, HST=85 * MI),
        4: curve(
            990,
            "L",
            mi_yd(35, 748),
            mi_yd(35, 1201),
            cant=95,
            **{"Multiple unit": 75 * MI, "Loco hauled": 60 * MI},
        ),
    },
)

US_DEGREES = Messy(
    "us-degrees",
    [
        sheet("""
Elk Ridge Sub.
MP BEG | MP END | DEG-MIN-SEC | L/R | ELEV (IN) | SPIRAL (FT) E | SPIRAL (FT) W | PSGR MPH | FRT MPH
122.40 | 122.71 | 3°15'00" | L | 3 1/2 | 310 | 280 | 60 | 40
123.02 | 123.2 | 2°00'00" | R | 2 | 200 | 200 | 60 | 40
124.85 | 125.1 | 1-30-00 | R | 1¼ | 150 | 150 | 60 | 45
"""),
        PSGR_FRT,
    ],
    {
        3: curve(
            1746.375 / 3.25,
            "L",
            122.40 * MI,
            122.71 * MI,
            310 * FT,
            280 * FT,
            3.5 * IN,
            None,
            Passenger=60 * MI,
            Freight=40 * MI,
        ),
        4: curve(1746.375 / 2, "R", 123.02 * MI, 123.2 * MI, 200 * FT, 200 * FT, 2 * IN),
        5: curve(
            1746.375 / 1.5, "R", 124.85 * MI, 125.1 * MI, 150 * FT, 150 * FT, 1.25 * IN, Freight=45 * MI
        ),
    },
)

INDIA = Messy(
    "india",
    [
        sheet("""
Section MHL-DPR BG
SlNo | Curve No | From Km/TP | To Km/TP | Degree | Radius(m) | Versine(20m chord) | Ca(mm) | Transition L1/L2 | MPS | Booked goods | Remarks
9 | 14 | 231/4 | 231/9 | 2.5 | 700 | 71 | 80 | 90/90 | 110 | 65 | PSR 100
10 | 15 | 232/1 | 232/6 | 1.75 | 1000 | 50 | 60 | 80/60 | 110 | 65 |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(700, None, None, None, 90, 90, 80, 110, Freight=65, Curve="14"),
        4: curve(1000, None, None, None, 80, 60, 60, 110, Freight=65),
    },
)

GERMAN = Messy(
    "german",
    [
        sheet("""
Strecke 9977 Ahrenmoor – Steinfurtau, Gleis 1
lfd.Nr | km von | km bis | r [m] | Ri | ü [mm] | ÜB-Länge [m] | Rampe 1:n | v [km/h] | üf [mm] | vGz | Bemerkung
12 | 45,3+20 | 45,9+64 | 620 | R | 100 | 60 | 600 | 110 | 130 | 80 | Bstg km 45,5
13 | 46,2+05 | 46,4+80 | 1.200 | L | 55 | 40 | 720 | 110 | 64 | 80 |
14 | 47,0+00 | 47,1+95 | ∞ | | | | | | | |
15 | 47,2+00 | 47,3+50 | 850,5 | L | 80 | 60/50 | 720 | 110 | 88 | 80 |
Summe | | | | | | | | | | |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(620, "R", 45.320, 45.964, 60, 60, 100, 110, Freight=80, Track="Gleis 1"),
        4: curve(1200, "L", 46.205, 46.480, 40, 40, 55, 110, Freight=80),
        6: curve(850.5, "L", 47.200, 47.350, 60, 50, 80, 110, Freight=80),
    },
)

ELEMENTS = Messy(
    "elements",
    [
        sheet(
            """
Trassierungselemente
Element-Nr|Typ (G/ÜB/K)|Station Anf.|Station Ende|Länge|R Anf.|R Ende|u Anf.|u Ende|Form
102|G|45100.00|45320.00|220.00|∞|∞|0|0|
103|ÜB|45320.00|45380.00|60.00|∞|620|0|100|Klothoide
104|K|45380.00|45700.00|320.00|620|620|100|100|
105|ÜB|45700.00|45770.00|70.00|620|-900|100|-70|Bloss
106|K|45770.00|45990.00|220.00|-900|-900|-70|-70|
107|ÜB|45990.00|46030.00|40.00|-900|∞|-70|0|Klothoide
108|G|46030.00|46500.00|470.00|∞|∞|0|0|
""",
            as_text=True,
        )
    ],
    {
        5: curve(620, None, 45.38, 45.70, 60, 70, 100, length_m=320),
        7: curve(900, None, 45.77, 45.99, 70, 40, 70, length_m=220),
    },
    questions=1,
)

FRENCH = Messy(
    "french",
    [
        sheet("""
Ligne 987650 (Valmorin – Crestaille), voie 1
N° | PK début | PK fin | Sens (G/D) | Rayon (m) | Flèche 20 m (mm) | Dévers (mm) | RP entrée | RP sortie | V (MA/AGC) | V fret | Insuff. | Obs.
23 | 102+345 | 102+860 | G | 590 | 85 | 120 | 80 | 70 | 100/115 | 80 | 84 | quai
24 | 103+100 | 103+400 | D | 1 250 | 40 | 50 | 40 | 40 | 100/115 | 80 | 61 |
"""),
        traffic_of(("MA", "passenger", 160.0), ("AGC", "passenger", 160.0), ("Fret", "freight", 100.0)),
    ],
    {
        3: curve(590, "L", 102.345, 102.860, 80, 70, 120, None, MA=100, AGC=115, Fret=80),
        4: curve(1250, "R", 103.1, 103.4, 40, 40, 50, None, MA=100, AGC=115, Fret=80),
    },
)

SPANISH = Messy(
    "spanish",
    [
        sheet("""
L. Valdesierra–Puerto Lirio
Curva | PK inicial | PK final | Mano | Radio (m) | Peralte (mm) | Clotoide ent./sal. | V viajeros (A/B) | V mercancías | Insuf. | Exceso | Obs.
31 | 12/345 | 12/902 | Izq. | 500 | 105 | 70/70 | 105/120 | 70 | 130 | 60 | Andén
32 | 13/050 | 13/200 | Der. | 800 | 60 | 50/- | 105/120 | 70 | 95 | 20 |
"""),
        traffic_of(("A", "passenger", 160.0), ("B", "passenger", 160.0), ("Carga", "freight", 100.0)),
    ],
    {
        3: curve(500, "L", 12.345, 12.902, 70, 70, 105, None, A=105, B=120, Carga=70),
        4: curve(800, "R", 13.05, 13.2, 50, None, 60, None, A=105, B=120, Carga=70),
    },
)

ARGENTINA = Messy(
    "argentina",
    [
        sheet("""
RAMAL R-9
Curva Nº | Prog. inicial | Prog. final | Radio | Peralte adop. | Coef. C | L transición | Vmáx pas. | Vmáx carga | Sentido
1 | 101,250 | 101,600 | 600 | 80 | 48000 | 60 | 90 | 60 | Izq
2 | 102,400 | 102,750 | 1.100 | 45 | 49500 | 40 | 90 | 60 | Der
"""),
        PSGR_FRT,
    ],
    {
        3: curve(600, "L", 101.25, 101.6, 60, 60, 80, None, Passenger=90, Freight=60),
        4: curve(1100, "R", 102.4, 102.75, 40, 40, 45, None, Passenger=90, Freight=60),
    },
)

ITALIAN = Messy(
    "italian",
    [
        sheet("""
Linea Montesarna–Piandoro, binario dispari
Progr. inizio | Progr. fine | Raggio (m) | DX/SX | Sopraelev. h (mm) | Raccordo (m) | V rango A | B | C | P | Merci | Note
35+210 | 35+640 | 450 | SX | 130 | 65 | 90 | 95 | 100 | 110 | 80 | PL
36+020 | 36+300 | 700 | DX | 80 | 50 | 90 | 95 | 100 | 110 | 80 |
"""),
        traffic_of(
            ("A", "passenger", 160.0),
            ("B", "passenger", 160.0),
            ("C", "passenger", 160.0),
            ("P", "passenger", 160.0),
            ("Merci", "freight", 100.0),
        ),
    ],
    {
        3: curve(450, "L", 35.21, 35.64, 65, 65, 130, None, A=90, B=95, C=100, P=110, Merci=80),
        4: curve(700, "R", 36.02, 36.3, 50, 50, 80, None, A=90, P=110, Merci=80),
    },
)

PORTUGUESE = Messy(
    "portuguese",
    [
        sheet("""
Linha do Alvarel
Curva | PK início | PK fim | Raio | Escala (mm) | Transição (m) | V (AUT) | V (MERC) | Insuf. escala
7 | 45,120 | 45,480 | 400 | 90 | 50 | 80 | 60 | 99
8 | 46,000 | 46,200 | 750 | 50 | 40 | 80 | 60 | 51
"""),
        traffic_of(("Automotora", "passenger", 120.0), ("Mercadorias", "freight", 80.0)),
    ],
    {
        3: curve(400, None, 45.12, 45.48, 50, 50, 90, None, Automotora=80, Mercadorias=60),
        4: curve(750, None, 46.0, 46.2, 40, 40, 50, None, Automotora=80, Mercadorias=60),
    },
)

BRAZIL = Messy(
    "brazil",
    [
        sheet("""
Trecho FZ-02
Curva | km ini | km fim | Raio | G20 | Flecha c/20 m | Superelev. (cm) | Esp. ent. | Esp. saída | VMA carga | VMA pass.
66 | 210+340 | 210+610 | 312,5 | 3,67 | 160 | 7,5 | 40 | 40 | 55 | 70
67 | 211+000 | 211+180 | | 2,00 | 87 | 5 | 30 | 40 | 55 | 70
"""),
        PSGR_FRT,
    ],
    {
        3: curve(312.5, None, 210.34, 210.61, 40, 40, 75, None, Freight=55, Passenger=70),
        4: curve(572.98, None, 211.0, 211.18, 30, 40, 50, None, Freight=55, Passenger=70),
    },
)

POLISH = Messy(
    "polish",
    [
        sheet("""
Linia 999, tor nr 2
Nr łuku | Początek [km] | Koniec [km] | Promień [m] | L/P | Przechyłka h [mm] | KP1 [m] | KP2 [m] | Vmax pas. | Vt | Natężenie Tg/rok | Uwagi
5 | 12,345 | 12,890 | 650 | P | 95 | 75 | 75 | 120 | 70 | 12 | rozjazd
6 | 13,100 | 13,350 | 1000 | L | 60 | 50 | 60 | 120 | 70 | 12 |
"""),
        PSGR_FRT,
    ],
    {
        3: curve(650, "R", 12.345, 12.89, 75, 75, 95, None, Passenger=120, Freight=70, Track="tor nr 2"),
        4: curve(1000, "L", 13.1, 13.35, 50, 60, 60, None, Passenger=120, Freight=70),
    },
)

CZECH = Messy(
    "czech",
    [
        sheet("""
Oblouk | Staničení ZP | KO | R (m) | směr | p (mm) | I | přech. 1 | přech. 2 | V | V nákl.
1 | 10,250 | 10,600 | 500 | L | 92 | 60 | 70 | 70 | 80 | 70
2 | 11,000 | 11,200 | 800 | P | 50 | 44 | 40 | 50 | 80 | 70
"""),
        PSGR_FRT,
    ],
    {
        2: curve(500, "L", 10.25, 10.6, 70, 70, 92, 80, Freight=70),
        3: curve(800, "R", 11.0, 11.2, 40, 50, 50, 80, Freight=70),
    },
)

NORWEGIAN = Messy(
    "norwegian",
    [
        sheet("""
Bane X1 | Kurve | Km fra (OB) | Km til | Radius | H/V | Overhøyde | Overg.k. inn | ut | Hast. pers. | Hast. gods | Merknad
X1 | 4 | 20,115 | 20,430 | 450 | H | 120 | 60 | 60 | 90 | 70 |
X1 | 5 | 21,000 | 21,210 | 900 | V | 60 | 50 | 40 | 90 | 70 | bru
"""),
        PSGR_FRT,
    ],
    {
        2: curve(450, "R", 20.115, 20.43, 60, 60, 120, None, Passenger=90, Freight=70),
        3: curve(900, "L", 21.0, 21.21, 50, 40, 60, None, Passenger=90, Freight=70),
    },
)

JAPANESE = Messy(
    "japanese",
    [
        sheet("""
線名 霧ヶ沢線
曲線番号 | 始点キロ程 | 終点 | 半径(m) | 左右 | カント(mm) | 緩和曲線(m) | 速度 | 貨物
1 | 12k345m | 12k600m | 400 | 左 | 75 | 50 | 80 | 65
2 | 13k000m | 13k150m | 600 | 右 | 50 | 40 | 85 | 65
"""),
        PSGR_FRT,
    ],
    {
        3: curve(400, "L", 12.345, 12.6, 50, 50, 75, 80, Freight=65),
        4: curve(600, "R", 13.0, 13.15, 40, 40, 50, 85, Freight=65),
    },
)

CHINESE = Messy(
    "chinese",
    [
        sheet("""
线名 | 行别 | 起点里程 | 终点 | 半径 | 缓和曲线 | 实设超高 | 客车Vmax | 货车V | 方向
云岭 | 上行 | K12+345 | K12+800 | 1200 | 80 | 60 | 120 | 80 | 左
云岭 | 上行 | K14+000 | K14+300 | 800 | 100 | 85 | 110 | 80 | 右
"""),
        PSGR_FRT,
    ],
    {
        2: curve(1200, "L", 12.345, 12.8, 80, 80, 60, None, Passenger=120, Freight=80),
        3: curve(800, "R", 14.0, 14.3, 100, 100, 85, None, Passenger=110, Freight=80),
    },
)

STACKED = Messy(
    "stacked",
    [
        sheet(
            """
 | Curve | | Chainage | | | | Transition (m) | | | Cant (mm) | | Speed (km/h) | | |
 | No | R | TS | SC | CS | ST | In | Out | Type | Exist | Design | Pass | IC | Fgt | Limit
 | 1 | 600 | 10.000 | 10.070 | 10.300 | 10.370 | 70 | 70 | clothoid | 90 | 105 | 100 | 110 | 80 | 110
 | 2 | 1500 | 11.000 | 11.040 | 11.400 | 11.450 | 40 | 50 | Bloss | 40 | 45 | 100 | 120 | 80 | 120
""",
            merged=(
                CellRange(1, 1, 1, 2),
                CellRange(1, 3, 1, 6),
                CellRange(1, 7, 1, 9),
                CellRange(1, 10, 1, 11),
                CellRange(1, 12, 1, 15),
            ),
        ),
        traffic_of(
            ("Regional", "passenger", 140.0), ("IC", "passenger", 200.0), ("Freight", "freight", 100.0)
        ),
    ],
    {
        3: curve(600, None, 10.07, 10.3, 70, 70, 90, 110, Regional=100, IC=110, Freight=80),
        4: curve(1500, None, 11.04, 11.4, 40, 50, 40, 120, Regional=100, IC=120, Freight=80),
    },
)

AUSTRALIAN = Messy(
    "australian",
    [
        sheet("""
Branch: Karrinda – Mulgabee
Curve ID | TP km | Radius | Hand | SE (applied) | Defic | Transition L | Speed boards (Normal/Railcar/Freight)
KM01 | 101.250 | 400 | LH | 75 | 60 | 40 | 80/90/70
KM02 | 102.400 | 800 | RH | 40 | 45 | 30 | 100/110/80
"""),
        traffic_of(
            ("Normal", "passenger", 160.0), ("Railcar", "passenger", 160.0), ("Freight", "freight", 100.0)
        ),
    ],
    {
        3: curve(400, "L", 101.25, None, 40, 40, 75, None, Normal=80, Railcar=90, Freight=70),
        4: curve(800, "R", 102.4, None, 30, 30, 40, None, Normal=100, Railcar=110, Freight=80),
    },
)

SIDE_BY_SIDE = Messy(
    "side-by-side",
    [
        sheet("""
CURVES rev C
 | UP LINE | | | | | | | DOWN LINE | | | | | |
 | Curve | km from | km to | R= | SE | Speed | | Curve | km from | km to | R= | SE | Speed
 | 1 | 10.100 | 10.350 | 650 | 90 | 100/80 | | 1 | 10.098 | 10.352 | 654 | 85 | 100/80
 | 2 | 11.000 | 11.200 | 900 | 60 | 100/80 | | 2 | 11.002 | 11.203 | 896 | 65 | 100/80
 | 3 | 12.000 | 12.300 | 1200 | 40 | 110/80 | | | | | | |
Notes: SE = superelevation in mm
"""),
        PSGR_FRT,
    ],
    {
        4: curve(650, None, 10.1, 10.35, None, None, 90, None, Passenger=100, Freight=80, Track="UP LINE"),
        5: curve(900, None, 11.0, 11.2, None, None, 60, None, Passenger=100, Freight=80),
        6: curve(1200, None, 12.0, 12.3, None, None, 40, None, Passenger=110, Freight=80),
        1004: curve(
            654, None, 10.098, 10.352, None, None, 85, None, Passenger=100, Freight=80, Track="DOWN LINE"
        ),
        1005: curve(896, None, 11.002, 11.203, None, None, 65, None, Passenger=100, Freight=80),
    },
)

LAYOUTS = [
    GB_CHAINS, GB_YARDS, US_DEGREES, INDIA, GERMAN, ELEMENTS, FRENCH, SPANISH, ARGENTINA, ITALIAN, PORTUGUESE,
    BRAZIL, POLISH, CZECH, NORWEGIAN, JAPANESE, CHINESE, STACKED, AUSTRALIAN, SIDE_BY_SIDE,
]  # fmt: skip
