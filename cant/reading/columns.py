"""The columns dictionary (columns.toml): which columns there are, and by which headings they go.

Data, so that the reader, the template, the help page and the documentation cannot disagree.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from cant.reading.text import fold

KINDS = frozenset(
    {
        "name",
        "text",
        "word",
        "number",
        "unit",
        "yes_no",
        "location",
        "radius",
        "degree",
        "versine",
        "chord",
        "hand",
        "length",
        "transition",
        "transition_pair",
        "shape",
        "cant",
        "speed",
        "situation",
        "element",
    }
)
"""What the values of a column can be; each kind has its own notation."""

TABLES = ("curves", "traffic", "limits", "settings", "turnouts")


@dataclass(frozen=True)
class ColumnInfo:
    """One column that the program knows.

    Attributes
    ----------
    name : str
        Canonical heading.
    table : str
        One of :data:`TABLES`.
    kind : str
        One of :data:`KINDS`.
    unit : str
        Symbol of the unit where the heading names none, "" where the column has none.
    required : bool
        Whether a row cannot be used without it.
    helper : bool
        True for what is only understood in lists of other makes.
    fills_down : bool
        True where a blank repeats the value above it (names of lines and tracks).
    help : str
        One sentence for people.
    headings : dict of str to tuple of str
        Accepted headings by language.
    weak : tuple of str
        Headings so short that values and neighbours must agree.
    """

    name: str
    table: str
    kind: str
    unit: str = ""
    required: bool = False
    helper: bool = False
    fills_down: bool = False
    help: str = ""
    headings: dict[str, tuple[str, ...]] | None = None
    weak: tuple[str, ...] = ()


@cache
def all_columns() -> tuple[ColumnInfo, ...]:
    """Give every column of columns.toml, in its order."""
    data = tomllib.loads(files("cant.reading").joinpath("columns.toml").read_text(encoding="utf-8"))
    return tuple(
        ColumnInfo(
            **{
                **entry,
                "weak": tuple(entry.get("weak", ())),
                "headings": {k: tuple(v) for k, v in entry.get("headings", {}).items()},
            }
        )
        for entry in data["column"]
    )


def columns_of(table: str, helpers: bool = False) -> tuple[ColumnInfo, ...]:
    """Give the columns of one table, without or with the helper columns."""
    return tuple(c for c in all_columns() if c.table == table and (helpers or not c.helper))


@cache
def column(table: str, name: str) -> ColumnInfo:
    """Give a column by table and canonical heading; KeyError where there is none."""
    for info in all_columns():
        if info.table == table and info.name == name:
            return info
    raise KeyError(name)


@cache
def strong_headings(table: str) -> dict[str, tuple[tuple[str, str], ...]]:
    """Give folded heading -> ((column, language), ...) of one table, weak headings left out."""
    found: dict[str, dict[tuple[str, str], None]] = {}
    for info in columns_of(table, helpers=True):
        found.setdefault(fold(info.name), {})[(info.name, "en")] = None
        for language, headings in (info.headings or {}).items():
            for heading in headings:
                if fold(heading) not in {fold(w) for w in info.weak}:
                    found.setdefault(fold(heading), {})[(info.name, language)] = None
    return {key: tuple(value) for key, value in found.items()}


@cache
def weak_headings(table: str) -> dict[str, tuple[str, ...]]:
    """Give folded heading -> columns it may mean, for headings that need the values' agreement."""
    found: dict[str, dict[str, None]] = {}
    for info in columns_of(table, helpers=True):
        for heading in info.weak:
            found.setdefault(fold(heading), {})[info.name] = None
    return {key: tuple(value) for key, value in found.items()}
