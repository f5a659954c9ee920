"""The sheet of terms and formulas: what every word and symbol of the workbook means."""

from __future__ import annotations

from cant.model.plan import STATUSES
from cant.quantities.catalogue import CATALOGUE, SYMBOLS
from cant.writing.book.status import STATUS_WORDS
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets

TERMS: tuple[tuple[str, str], ...] = (
    (
        "cant",
        "height of the outer rail above the inner one, over the rail spacing; negative: outer rail lower",
    ),
    ("rail spacing", "distance between the two wheel-rail contact points, about gauge plus one rail head"),
    ("equilibrium cant", "cant at which a train at a speed presses on both rails alike: C V^2 / R"),
    ("cant deficiency", "equilibrium cant less cant, where positive"),
    ("cant excess", "cant less equilibrium cant, where positive"),
    ("unbalanced acceleration", "lateral acceleration in the track plane; negative: towards the inside"),
    (
        "felt acceleration",
        "the same on the vehicle floor: (1 + s) times, s the roll coefficient of the class",
    ),
    ("planned speed", "the speed stated for the class on the curve, else the lower of class and line speed"),
    ("permissible speed", "highest multiple of the speed step at which all limits that depend on speed hold"),
    ("run speed", "the lower of planned and permissible speed"),
    ("rms speed", "root-mean-square speed of the classes, weighted by tonnes"),
    ("lowest speed", "speed below which cant excess goes over its limit"),
    ("normal, exceptional", "tiers of a limit: the exceptional value needs approval"),
    ("lower, upper bound", "range of cants that the curve itself permits at planned speeds, before the grid"),
    (
        "shared transition",
        "the transition between two curves that follow each other; changes are signed there",
    ),
    ("cant ramp", "length over which the cant is built up, where it is not the transition's"),
)


def write_terms(book: NewSheets, name: str) -> None:
    """Write the sheet.

    Parameters
    ----------
    book : NewSheets
    name : str
    """
    sheet = book.table(name)
    sheet.header(
        [
            Heading("Term or symbol", 26.0),
            Heading("Meaning", 62.0),
            Heading("Unit", 15.0),
            Heading("Formula", 60.0),
            Heading("Source", 40.0),
        ]
    )
    for term, words in TERMS:
        sheet.row([term, words, None, None, None])
    for status in STATUSES:
        sheet.row([f"status '{status}'", STATUS_WORDS[status], None, None, None])
    sheet.line("Formulas", bold=True)
    for entry in CATALOGUE.values():
        text = entry.template.replace("{", "").replace("}", "")
        sheet.row([entry.symbol, entry.words, entry.unit, text, entry.source])
    sheet.line("Symbols in the formulas", bold=True)
    for symbol, meaning in SYMBOLS.items():
        sheet.row([symbol, meaning.words, meaning.unit, None, None])
