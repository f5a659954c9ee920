"""A whole workbook: which sheet holds what, and everything that was understood, asked and refused.

The roles of sheets are settled here; each table is read by a module of its own.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from cant.errors import InputError, Place
from cant.files.grid import Sheet, Workbook
from cant.model.limits import LimitSet
from cant.model.reading import ColumnReading, Reading, SheetReading
from cant.model.settings import METHODS, Settings
from cant.model.traffic import Traffic, TrainClass
from cant.model.turnouts import Turnout
from cant.reading.answers import answers_from
from cant.reading.checks import check_duplicates
from cant.reading.curve_sheets import column_readings, join, read_sheet, sheet_readings, tell_sheets_apart
from cant.reading.draft import Context, Draft
from cant.reading.layout import find_blocks
from cant.reading.limits import read_limits
from cant.reading.meanings import decide
from cant.reading.records import find_header_row
from cant.reading.settings import is_settings_sheet, read_settings
from cant.reading.situations import known_situations
from cant.reading.text import fold
from cant.reading.traffic import read_traffic
from cant.reading.turnouts import read_turnouts
from cant.reading.words import lexicon


@dataclass
class _Tables:
    traffic: Traffic | None = None
    limits: LimitSet | None = None
    settings: Settings | None = None
    turnouts: list[Turnout] = field(default_factory=list)
    columns: list[ColumnReading] = field(default_factory=list)
    sheets: list[SheetReading] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)


def read_workbook(
    workbook: Workbook,
    *,
    answers: Mapping[str, Any] | None = None,
    traffic: Workbook | None = None,
    limits: LimitSet | None = None,
    limits_table: Workbook | None = None,
    settings: Workbook | None = None,
    methods: Sequence[str] = METHODS,
) -> Reading:
    """Read a curve workbook as a careful colleague would.

    Parameters
    ----------
    workbook : Workbook
        Holds the curve sheets, and ``Traffic``, ``Limits``, ``Settings``, ``Turnouts`` where it has them.
    answers : mapping, optional
        Answers and corrections, see :mod:`cant.reading.answers`.
    traffic, limits_table, settings : Workbook, optional
        Files given separately: each replaces the sheet.
    limits : LimitSet, optional
        A set that comes with the program; it replaces the sheet (``limits_table`` comes before it).
    methods : sequence of str
        Names that the setting ``Method`` may have.

    Returns
    -------
    Reading
        Rows that cannot be assessed are listed and marked, never left out.

    Raises
    ------
    InputError
        What concerns the whole plan: a heading, unit, class, quantity or setting that is not known, an empty
        table, a sheet twice.
    """
    roles = _roles(workbook)
    tables = _Tables(limits=limits)
    _read_tables(tables, roles, workbook, traffic, limits_table, settings, methods)
    context = Context(
        workbook.file,
        tables.traffic,
        tables.limits,
        answers_from(answers),
        known_situations(tables.limits),
        notes=tables.notes,
    )
    drafts = _read_curves(roles["curves"], workbook, context)
    context.notes.extend(context.answers.not_used())
    tell_sheets_apart(drafts)
    check_duplicates(drafts)
    _need_class_speeds(tables.traffic, drafts)
    _tell_traffic_without_curve(tables.traffic, drafts, context.notes)
    return Reading(
        file=workbook.file,
        curves=join(drafts, workbook.file),
        traffic=tables.traffic,
        limits=tables.limits,
        settings=tables.settings,
        rejected=[row for draft in drafts for row in draft.rejected_rows()],
        questions=context.questions,
        columns=column_readings(drafts) + tables.columns,
        sheets=sheet_readings(drafts) + tables.sheets + _others(roles["other"]),
        notes=[*workbook.notes, *context.notes],
        turnouts=tables.turnouts,
    )


def read_tables(
    *,
    traffic: Workbook | None = None,
    limits_table: Workbook | None = None,
    settings: Workbook | None = None,
    methods: Sequence[str] = METHODS,
) -> tuple[Traffic | None, LimitSet | None, Settings | None]:
    """Read the tables that stand beside a curve list, without the list.

    The files are those of :func:`read_workbook`, None is given back where none was; InputError where a table
    cannot be used.
    """
    tables = _Tables()
    none: dict[str, list[Sheet]] = {role: [] for role in ("traffic", "limits", "settings", "turnouts")}
    _read_tables(tables, none, Workbook("", "csv", []), traffic, limits_table, settings, methods)
    return tables.traffic, tables.limits, tables.settings


def _roles(workbook: Workbook) -> dict[str, list[Sheet]]:
    roles: dict[str, list[Sheet]] = {
        role: [] for role in ("curves", "traffic", "limits", "settings", "turnouts", "other")
    }
    names: dict[str, str] = {}
    for sheet in workbook.sheets:
        if sheet.name.casefold() in names and sheet.name:
            message = f"the sheet '{sheet.name}' is there twice; each name belongs there once"
            raise InputError(message, Place(workbook.file, sheet.name))
        names[sheet.name.casefold()] = sheet.name
        roles[_role(sheet)].append(sheet)
    for role in ("traffic", "limits", "settings", "turnouts"):
        if len(roles[role]) > 1:
            first, second = roles[role][:2]
            message = f"a {role} table is there twice (sheet '{first.name}' too); one belongs there"
            raise InputError(message, Place(workbook.file, second.name))
    return roles


def _role(sheet: Sheet) -> str:
    named = lexicon("sheets").get(fold(sheet.name))
    if named is not None:
        return named
    if not any(sheet.rows):
        return "other"
    if find_header_row(sheet, "limits") is not None:
        return "limits"
    if _names_turnouts(sheet):
        return "turnouts"
    if find_header_row(sheet, "traffic") is not None and not _has_radius(sheet):
        return "traffic"
    if _has_radius(sheet):
        return "curves"
    return "settings" if is_settings_sheet(sheet) else "other"


HEAD_ROWS = 200
"""What a sheet holds is told from so many rows."""

_GEOMETRY = frozenset({"Radius", "Degree", "Versine", "Radius at start", "Radius at end"})


def _has_radius(sheet: Sheet) -> bool:
    top = Sheet(sheet.name, sheet.rows[:HEAD_ROWS], [m for m in sheet.merged if m.last_row <= HEAD_ROWS])
    return any(item.meaning in _GEOMETRY for block in find_blocks(top) for item in decide(block, {}))


def _names_turnouts(sheet: Sheet) -> bool:
    texts = {fold(str(c)) for cells in sheet.rows[:60] for c in cells if isinstance(c, str)}
    return any(t.startswith("radius on the straight") for t in texts) and any(
        "branch speed" in t for t in texts
    )


def _read_tables(
    tables: _Tables,
    roles: dict[str, list[Sheet]],
    workbook: Workbook,
    traffic: Workbook | None,
    limits_table: Workbook | None,
    settings: Workbook | None,
    methods: Sequence[str],
) -> None:
    if found := _table_sheet("traffic", roles, workbook, traffic):
        tables.traffic, table = read_traffic(*found)
        _note_table(tables, table.columns, table.where, table.unknown, found[0])
    wanted = limits_table is not None or tables.limits is None
    if wanted and (found := _table_sheet("limits", roles, workbook, limits_table)):
        tables.limits, table = read_limits(*found)
        _note_table(tables, table.columns, table.where, table.unknown, found[0])
    if found := _table_sheet("settings", roles, workbook, settings):
        tables.settings, where, columns = read_settings(*found, methods)
        _note_table(tables, columns, where, {}, found[0])
    if (found := _table_sheet("turnouts", roles, workbook, None)) and any(found[0].rows):
        tables.turnouts, table = read_turnouts(*found)
        _note_table(tables, table.columns, table.where, table.unknown, found[0])


def _table_sheet(
    role: str, roles: dict[str, list[Sheet]], workbook: Workbook, given: Workbook | None
) -> tuple[Sheet, str] | None:
    if given is None:
        return (roles[role][0], workbook.file) if roles[role] else None
    sheets = [s for s in given.sheets if any(s.rows)]
    if not sheets:
        message = f"the file holds no table; a {role} table belongs there"
        raise InputError(message, Place(given.file))
    chosen = [s for s in sheets if lexicon("sheets").get(fold(s.name)) == role] or [
        s for s in sheets if _role(s) == role
    ]
    if len(chosen) > 1:
        message = f"a {role} table is there twice (sheet '{chosen[0].name}' too); one belongs there"
        raise InputError(message, Place(given.file, chosen[1].name))
    return (chosen or sheets)[0], given.file


def _note_table(
    tables: _Tables, columns: list[ColumnReading], where: SheetReading, unknown: dict[str, int], sheet: Sheet
) -> None:
    tables.columns += columns
    tables.columns += [
        ColumnReading(sheet.name, index, heading, "", note="not known, not used")
        for heading, index in unknown.items()
    ]
    tables.sheets.append(where)


def _read_curves(sheets: list[Sheet], workbook: Workbook, context: Context) -> list[Draft]:
    drafts = [draft for sheet in sheets for draft in read_sheet(sheet, context)]
    if not drafts:
        message = (
            "no curve table found: a header row with at least a radius (or degree or versine) is needed, "
            "such as Curve, Start, End, Radius, Hand, Cant, Speed"
        )
        raise InputError(
            message, Place(workbook.file, workbook.sheets[0].name if len(workbook.sheets) == 1 else "")
        )
    if not any(len(draft) for draft in drafts):
        message = "the curve table is empty: it needs at least one row below its headings"
        raise InputError(message, Place(workbook.file, drafts[0].sheet, drafts[0].block.header_last))
    return drafts


def _need_class_speeds(traffic: Traffic | None, drafts: list[Draft]) -> None:
    """Refuse a class without speed, unless every usable row of a track on which it runs gives its speed."""
    if traffic is None or all(row.speed_kmh is not None for row in traffic.rows):
        return
    for draft in drafts:
        usable = [index for index in range(len(draft)) if index not in draft.problems]
        on: dict[tuple[str, str], list[TrainClass]] = {}
        for index in usable:
            key = draft.line[index], draft.track[index]
            if key not in on:
                on[key] = [row for row in traffic.on(*key).values() if row.speed_kmh is None]
            for row in on[key]:
                given = draft.class_speeds.get(row.name)
                if given is None or np.isnan(given[index]):
                    message = (
                        f"class '{row.name}' has no speed, and not every curve row gives it (row "
                        f"{draft.rows[index]} does not); fill in Speed, or a column 'Speed {row.name}'"
                    )
                    raise InputError(message, row.place)


def _tell_traffic_without_curve(traffic: Traffic | None, drafts: list[Draft], notes: list[str]) -> None:
    """Note rows of traffic for a line or track that no curve is on: a typing error leaves them unused."""
    tracks = {where for draft in drafts for where in zip(draft.line, draft.track, strict=True)}
    for row in traffic.rows if traffic is not None and tracks else ():
        if not any(row.line in ("", line) and row.track in ("", track) for line, track in tracks):
            named = [f"{what} '{name}'" for what, name in (("line", row.line), ("track", row.track)) if name]
            notes.append(
                f"{row.place}: no curve is on {', '.join(named)}: this row of '{row.name}' is not used"
            )


def _others(sheets: list[Sheet]) -> list[SheetReading]:
    return [SheetReading(sheet.name, "other", columns=sheet.width) for sheet in sheets]
