"""How a file was understood, for ``cant read``: JSON, and a table that a person checks in half a minute."""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

from cant.model.reading import ColumnReading, Reading

_WIDTH = 34


def reading_document(reading: Reading) -> dict[str, Any]:
    """Give everything that was understood, doubted and refused as plain values for JSON."""
    curves = reading.curves
    return {
        "file": reading.file,
        "sheets": [asdict(sheet) for sheet in reading.sheets],
        "columns": [asdict(column) | {"samples": list(column.samples)} for column in reading.columns],
        "curves": [
            {
                "sheet": curves.sheet[i],
                "row": int(curves.row[i]),
                "line": curves.line[i],
                "track": curves.track[i],
                "curve": curves.curve[i],
                "rejected": bool(curves.rejected[i]),
                "as_read": curves.as_read(i),
                "class_speeds_kmh": _class_speeds(reading, i),
            }
            for i in range(len(curves))
        ],
        "rejected": [row.as_json() for row in reading.rejected],
        "questions": [question.as_json() for question in reading.questions],
        "traffic": None if reading.traffic is None else reading.traffic.model_dump(mode="json"),
        "limits": None
        if reading.limits is None
        else {"name": reading.limits.name, "rows": len(reading.limits.rows)},
        "settings": None if reading.settings is None else reading.settings.model_dump(mode="json"),
        "turnouts": [turnout.model_dump(mode="json") for turnout in reading.turnouts],
        "notes": list(reading.notes),
    }


def _class_speeds(reading: Reading, index: int) -> dict[str, float | str]:
    found: dict[str, float | str] = {}
    for name, column in reading.curves.class_speeds.items():
        value = float(column[index])
        if value == value:
            found[name] = "none" if value < 0 else value
    return found


def reading_table(reading: Reading) -> str:
    """Give the columns as a table for the terminal, with what is asked and refused below it."""
    lines: list[str] = []
    for sheet in reading.sheets:
        if sheet.role == "other":
            lines.append(f"Sheet '{sheet.sheet}': not used")
            continue
        lines.append(f"Sheet '{sheet.sheet}': {sheet.role}, rows {sheet.first_row} to {sheet.last_row}")
        rows = [_cells(c) for c in reading.columns if c.sheet == sheet.sheet]
        lines += ["  " + line for line in _table([("heading", "read as", "unit", "for example", ""), *rows])]
    count = len(reading.curves)
    refused = int(reading.curves.rejected.sum())
    asked = _count(len(reading.questions), "question")
    lines.append(f"{_count(count, 'curve')}, {refused} that cannot be assessed, {asked}")
    for question in reading.questions:
        where = f"sheet '{question.sheet}', " if question.sheet else ""
        lines.append(f"? {where}column '{question.column}': {question.question}")
        lines += [f"    answer: {choice}" for choice in question.choices]
    lines += [f"! row {r.row}, {r.column or 'row'} '{r.value}': {r.problem}" for r in reading.rejected[:50]]
    if len(reading.rejected) > 50:
        lines.append(f"! ... and {len(reading.rejected) - 50} more")
    lines += [f"- {note}" for note in reading.notes]
    return "\n".join(lines)


def _count(number: int, word: str) -> str:
    return f"{number} {word}" if number == 1 else f"{number} {word}s"


def _cells(column: ColumnReading) -> tuple[str, ...]:
    remark = "; ".join(
        t for t in (column.confidence if column.confidence != "certain" else "", column.note) if t
    )
    unit = f"{column.unit} ({column.unit_from})" if column.unit and column.unit_from else column.unit
    return (column.heading, column.meaning or "(left as it is)", unit, " | ".join(column.samples), remark)


def _table(rows: list[tuple[str, ...]]) -> list[str]:
    cut = [(*(c if len(c) <= _WIDTH else c[: _WIDTH - 1] + "…" for c in row[:-1]), row[-1]) for row in rows]
    widths = [max(len(row[i]) for row in cut) for i in range(len(cut[0]) - 1)]
    return [
        "  ".join([*(c.ljust(w) for c, w in zip(row, widths, strict=False)), row[-1]]).rstrip() for row in cut
    ]
