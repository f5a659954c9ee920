"""What the command prints: a plan on one screen, limit sets as tables, and the lines for standard error.

A person reads it between two coffees: counts first, then the curves that need a decision, the gravest first,
then the cautions and the files.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING

import numpy as np

from cant.limit_sets import as_table, describe, headers
from cant.model.limits import LimitSet
from cant.model.plan import STATUSES
from cant.model.reading import Reading
from cant.writing.document import cautions_of
from cant.writing.plan_sheets import STATUS_WORDS

if TYPE_CHECKING:
    from cant.writing.planned import PlannedLine

WIDTH = 100
_SHOWN = 12
_GRAVE = ("not assessed", "not compliant", "restrict", "exceptional")


def summary(planned: PlannedLine, files: Sequence[str], notes: Sequence[str] = ()) -> str:
    """Give the summary of a plan.

    Parameters
    ----------
    planned : PlannedLine
        The plan.
    files : sequence of str
        Names of the files written.
    notes : sequence of str
        What to know about them.
    """
    parts = [_head(planned), _counts(planned), _decisions(planned), _findings(planned)]
    cautions = [_wrapped(text, "! ") for text in cautions_of(planned.plan.limits)]
    parts.append("Cautions\n" + "\n".join(cautions))
    said = [*planned.reading.notes, *notes]
    if said:
        parts.append("Notes\n" + "\n".join(_wrapped(text, "- ") for text in said))
    parts.append("Written\n" + "\n".join(f"  {name}" for name in files))
    return "\n\n".join(part for part in parts if part)


def not_assessed_line(planned: PlannedLine) -> str:
    """Give the one line that counts the rows without an assessment, "" where there is none.

    Parameters
    ----------
    planned : PlannedLine
        The plan.
    """
    unread = int(np.count_nonzero(planned.plan.curves.rejected))
    stray = _stray_rows(planned.reading)
    gaps = planned.plan.counts().get("not assessed", 0)
    total = unread + stray + gaps
    if not total:
        return ""
    rows = "row was" if total == 1 else "rows were"
    return f"cant: {total} {rows} not assessed; the outputs name each with its reason"


def rejected_line(reading: Reading) -> str:
    """Give the one line that counts the rows a reading refused."""
    total = int(np.count_nonzero(reading.curves.rejected)) + _stray_rows(reading)
    rows = "row" if total == 1 else "rows"
    return f"cant: {total} {rows} cannot be assessed as they stand"


def limit_sets_text() -> str:
    """Give the list of limit sets that come with the program."""
    lines = ["Limit sets that come with the program (cant limits NAME prints one):", ""]
    for entry in describe():
        mark = "" if entry["verified"] else "  UNVERIFIED"
        lines.append(f"{entry['name']}{mark}")
        lines.append(textwrap.indent(_wrapped(f"{entry['title']}. {entry['edition']}", ""), "    "))
        lines.append(textwrap.indent(_wrapped(entry["completeness"], ""), "    "))
        lines.append("")
    lines.append("A value of a set is no permission: your railway's own standard decides.")
    return "\n".join(lines)


def limit_set_text(limits: LimitSet) -> str:
    """Give one limit set as a table.

    Parameters
    ----------
    limits : LimitSet
        The set.
    """
    head = [limits.name, *(part for part in (limits.title, limits.edition, limits.document) if part)]
    lines = [_wrapped(part, "") for part in head]
    if limits.completeness:
        lines.append(_wrapped(limits.completeness, ""))
    if limits.equilibrium_constant is not None:
        lines.append(f"Equilibrium constant {limits.equilibrium_constant:g} mm m/(km/h)2")
    if limits.rail_spacing_mm is not None:
        lines.append(f"Rail spacing {limits.rail_spacing_mm:g} mm")
    titles = headers(limits)
    rows = [[_word(row[title]) for title in titles] for row in as_table(limits)]
    used = [i for i in range(len(titles)) if any(row[i] for row in rows)]
    table = text_table([titles[i] for i in used], [[row[i] for i in used] for row in rows])
    return "\n".join([*lines, "", table, "", *cautions_of(limits)[:1]])


def text_table(titles: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """Give a table in columns parted by two blanks, with a rule below the titles."""
    body = [list(row) for row in rows]
    widths = [max(len(title), *(len(row[i]) for row in body), 0) for i, title in enumerate(titles)]
    lines = [titles, ["-" * width for width in widths], *body]
    return "\n".join(
        "  ".join(word.ljust(width) for word, width in zip(line, widths, strict=True)).rstrip()
        for line in lines
    )


def _head(planned: PlannedLine) -> str:
    limits, settings = planned.plan.limits, planned.plan.settings
    title = limits.title or limits.name
    edition = f", {limits.edition}" if limits.edition else ""
    edited = ", edited" if limits.edited else ""
    unverified = "" if limits.verified else " (UNVERIFIED)"
    return (
        f"{planned.reading.file or 'Curves'}: {len(planned.plan.assessed)} curves planned\n"
        f"Limits: {title}{edition}{edited}{unverified}\n"
        f"Method: {settings.method}; tiers: {', '.join(settings.tiers)}"
    )


def _counts(planned: PlannedLine) -> str:
    counts = planned.plan.counts()
    rows = [[str(counts[s]), s, STATUS_WORDS[s]] for s in STATUSES if counts.get(s)]
    unread = int(np.count_nonzero(planned.plan.curves.rejected)) + _stray_rows(planned.reading)
    if unread:
        rows.append([str(unread), "rejected", "rows that cannot be read as curves"])
    return text_table(["Curves", "Status", "Meaning"], rows)


def _decisions(planned: PlannedLine) -> str:
    """Name the curves that need a decision, the gravest first, with their reasons."""
    plan = planned.plan
    grave = [(s, int(i)) for s in _GRAVE for i in plan.assessed if plan.status[int(i)] == s]
    lines = []
    for status, index in grave[:_SHOWN]:
        name = " ".join(
            word
            for word in (plan.curves.line[index], plan.curves.track[index], plan.curves.curve[index])
            if word
        )
        lines.append(_wrapped(f"{name}: {status}. {planned.explanation.reason(index)}", "  "))
        lines += [_wrapped(str(o["text"]), "    - ") for o in planned.explanation.options(index)]
    for row in planned.reading.rejected[:_SHOWN]:
        where = f"sheet '{row.sheet}', row {row.row}" if row.sheet else f"row {row.row}"
        lines.append(_wrapped(f"{where}: rejected. {row.problem}", "  "))
    left = max(len(grave) - _SHOWN, 0) + max(len(planned.reading.rejected) - _SHOWN, 0)
    if left:
        lines.append(f"  ... and {left} more: see the outputs")
    return "What needs a decision\n" + "\n".join(lines) if lines else ""


def _findings(planned: PlannedLine) -> str:
    lines = [_wrapped(f"{f.severity}: {f.text}", "  ") for f in planned.explanation.plan_findings]
    return "Of the whole line\n" + "\n".join(lines) if lines else ""


def _stray_rows(reading: Reading) -> int:
    """Count the rejected rows that did not even become a curve of the list."""
    known = set(zip(reading.curves.sheet, reading.curves.row.tolist(), strict=True))
    return len({(row.sheet, row.row) for row in reading.rejected} - known)


def _wrapped(text: str, mark: str) -> str:
    return textwrap.fill(
        text, WIDTH, initial_indent=mark, subsequent_indent=" " * len(mark), break_on_hyphens=False
    )


def _word(value: float | str | None) -> str:
    if value is None:
        return ""
    return value if isinstance(value, str) else f"{value:g}"
