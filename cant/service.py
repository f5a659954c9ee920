"""What the command, the library and the web service call alike: bytes in, a plan and its files out.

Prints nothing, asks nobody, knows no web framework: a face parses its own input, calls one function here and
shows the result. Whatever goes wrong for the user is a :class:`cant.errors.CantError`.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from cant import limit_sets
from cant.errors import InputError, Place
from cant.explaining import Decision, Inputs, apply, explain, read_decision
from cant.files.grid import Workbook
from cant.files.open import open_workbook
from cant.model.limits import LimitSet
from cant.model.reading import Reading
from cant.model.settings import Settings
from cant.model.signatures import Signatures
from cant.model.traffic import Traffic
from cant.planning import plan_line
from cant.reading import (
    read_answers,
    read_frames,
    read_tables,
    read_workbook,
    reading_document,
    reading_table,
)
from cant.writing.annotation import AnnotatedFile, PlanWorkbook, annotate_plan
from cant.writing.planned import PlannedLine
from cant.writing.template import template_workbook

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "AnnotatedFile",
    "NamedFile",
    "PlanWorkbook",
    "PlannedLine",
    "Progress",
    "annotated_workbook",
    "answers_from",
    "limit_set_names",
    "limits_named",
    "make_plan",
    "plan_frames",
    "plan_option",
    "read_curves",
    "reading_json",
    "reading_text",
    "settings_for",
    "tables_beside",
    "template",
]

NamedFile = tuple[bytes, str]
"""Content of a file, and its name as the user gave it."""

Progress = Callable[[float, str], None]
"""Called with the share done (0 to 1) and what is being done."""


def read_curves(
    data: bytes,
    file: str,
    *,
    traffic: NamedFile | None = None,
    limits: LimitSet | NamedFile | None = None,
    settings: NamedFile | None = None,
    answers: Mapping[str, Any] | None = None,
) -> Reading:
    """Read a curve file, and what is given beside it.

    Parameters
    ----------
    data : bytes
        The curve file, a workbook or separated text.
    file : str
        Its name as the user gave it, for messages.
    traffic, settings : (bytes, str), optional
        A file that replaces the sheet of that name.
    limits : LimitSet or (bytes, str), optional
        A set, or a file that replaces the sheet.
    answers : mapping, optional
        Answers to questions and corrections of columns, as ``--reading`` takes them.

    Returns
    -------
    Reading
        The tables, and everything understood, doubted or refused on the way.

    Raises
    ------
    CantError
        A file cannot be read, or a table as a whole cannot be used.
    """
    reading = read_workbook(
        open_workbook(data, file),
        answers=answers,
        traffic=_opened(traffic),
        limits=limits if isinstance(limits, LimitSet) else None,
        limits_table=_opened(limits if isinstance(limits, tuple) else None),
        settings=_opened(settings),
    )
    return replace(reading, sha256=hashlib.sha256(data).hexdigest())


def tables_beside(
    *,
    traffic: NamedFile | None = None,
    limits: NamedFile | None = None,
    settings: NamedFile | None = None,
) -> tuple[Traffic | None, LimitSet | None, Settings | None]:
    """Read the tables that stand beside a curve file, without the file, which may say more of them.

    Parameters
    ----------
    traffic, limits, settings : (bytes, str), optional
        A file each, as :func:`read_curves` takes them.

    Returns
    -------
    traffic, limits, settings
        None where no file was given.

    Raises
    ------
    CantError
        A file cannot be read, or its table cannot be used.
    """
    return read_tables(traffic=_opened(traffic), limits_table=_opened(limits), settings=_opened(settings))


def make_plan(
    reading: Reading,
    *,
    traffic: Traffic | None = None,
    limits: LimitSet | None = None,
    settings: Settings | None = None,
    decision: Decision | None = None,
    progress: Progress | None = None,
) -> PlannedLine:
    """Plan what was read.

    Parameters
    ----------
    reading : Reading
        The file as it was understood.
    traffic, limits, settings : optional
        What is given here replaces what the reading holds.
    decision : Decision, optional
        Changes that the engineer has taken over the list as read, such as a cant held by hand.
    progress : callable, optional
        Called with the share done (0 to 1) and what is being done.

    Returns
    -------
    PlannedLine
        The plan, with words and records.

    Raises
    ------
    InputError
        There is no traffic, or there are no limits; the message says how to give them. Or the decision is of
        another list.
    """
    used_traffic = traffic or reading.traffic
    used_limits = limits or reading.limits
    if used_traffic is None:
        message = (
            "no traffic: add a sheet 'Traffic' (Class, Category, Speed, Trains per day, Mass), "
            "or give a file with --traffic"
        )
        raise InputError(message, Place(reading.file))
    if used_limits is None:
        message = (
            "no limits: add a sheet 'Limits' (Quantity, Normal, Exceptional, Unit), or give a file or one of "
            f"{', '.join(limit_sets.names())} with --limits"
        )
        raise InputError(message, Place(reading.file))
    used_settings = settings_for(settings or reading.settings or Settings(), used_limits)
    inputs = Inputs(reading.curves, used_traffic, used_limits, used_settings, tuple(reading.turnouts))
    if decision is not None:
        inputs = apply(decision, inputs)
        reading = replace(reading, curves=inputs.curves)
    plan = plan_line(
        inputs.curves,
        inputs.traffic,
        inputs.limits,
        inputs.settings,
        turnouts=reading.turnouts,
        progress=progress,
    )
    return PlannedLine(reading, plan, explain(plan))


def plan_option(planned: PlannedLine, decision: Decision | Mapping[str, Any]) -> PlannedLine:
    """Plan a line again with a decision taken, such as an option of a curve holds.

    Parameters
    ----------
    planned : PlannedLine
        The plan as it is; it stays so.
    decision : Decision or mapping
        ``option["decision"]`` of a record, or one that was read.

    Returns
    -------
    PlannedLine
        The plan with it. Its reading holds the changed curve list, its settings the tiers that it needs.

    Raises
    ------
    InputError
        The mapping is no decision, or it is of another list.
    """
    taken = decision if isinstance(decision, Decision) else read_decision(decision)
    plan, reading = planned.plan, planned.reading
    return make_plan(
        reading, traffic=plan.traffic, limits=plan.limits, settings=plan.settings, decision=taken
    )


def settings_for(settings: Settings, limits: LimitSet) -> Settings:
    """Complete settings by what the limits' own document lays down.

    Parameters
    ----------
    settings : Settings
        As stated by the user; what he states rules.
    limits : LimitSet
        The limits in use.

    Returns
    -------
    Settings
        With the document's rail spacing and printed constant where the user states neither, and its units
        where he names none.
    """
    completed = settings.with_standard(limits.rail_spacing_mm, limits.equilibrium_constant)
    if "units" in settings.model_fields_set:
        return completed
    return completed.model_copy(update={"units": limits.units})


def plan_frames(
    curves: pd.DataFrame,
    traffic: pd.DataFrame,
    limits: pd.DataFrame | LimitSet | str,
    settings: Mapping[str, Any] | None = None,
) -> PlannedLine:
    """Plan from data frames: the one function that a notebook needs.

    Parameters
    ----------
    curves : DataFrame
        One row a curve, with the headers of the curve table (``Line``, ``Track``, ``Curve``, ``Start``,
        ``End``, ``Radius (m)`` ...).
    traffic : DataFrame
        One row a class of train, with the headers of the traffic table.
    limits : DataFrame, LimitSet or str
        One row a rule, or a set, or the name of one that comes with the program.
    settings : mapping, optional
        Names and values of the settings table, such as ``{"Tiers": "normal, exceptional"}``.

    Returns
    -------
    PlannedLine
        ``to_frames()`` gives the plan as data frames again, ``document()`` its JSON.

    Raises
    ------
    CantError
        A table cannot be used: which, where, and what would be right.

    Examples
    --------
    >>> import pandas as pd
    >>> curves = pd.DataFrame({"Curve": ["7"], "Radius (m)": [600], "Hand": ["L"], "Speed (km/h)": [90]})
    >>> traffic = pd.DataFrame({"Class": ["Fast", "Goods"], "Category": ["passenger", "freight"],
    ...                         "Speed": [90, 45]})
    >>> limits = pd.DataFrame({"Quantity": ["cant deficiency", "cant excess"], "Normal": [75, 50],
    ...                        "Unit": ["mm", "mm"]})
    >>> planned = plan_frames(curves, traffic, limits, {"Equilibrium constant": 11.8})
    >>> float(planned.to_frames()["curves"]["recommended_cant_mm"][0])
    85.0
    """
    ready = limit_sets.load(limits) if isinstance(limits, str) else limits
    return make_plan(read_frames(curves, traffic, ready, settings))


def limits_named(name: str) -> LimitSet | None:
    """Give the limit set of a name that comes with the program, or None where no set has it.

    Parameters
    ----------
    name : str
        As ``cant limits`` lists it, case ignored.
    """
    known = {entry.casefold(): entry for entry in limit_sets.names()}
    found = known.get(name.strip().casefold())
    return limit_sets.load(found) if found is not None else None


def limit_set_names() -> list[str]:
    """Give the names of the limit sets that come with the program."""
    return list(limit_sets.names())


def answers_from(data: bytes, file: str) -> Mapping[str, Any]:
    """Read answers to a reading's questions, JSON or TOML, as ``--reading`` takes them.

    Parameters
    ----------
    data, file
        Content and name of the file.

    Raises
    ------
    FileError
        It is neither of the two, or holds no table of answers.
    """
    return read_answers(data, file)


def reading_json(reading: Reading) -> bytes:
    """Give how a file was understood as JSON, UTF-8."""
    return (json.dumps(reading_document(reading), ensure_ascii=False, indent=1) + "\n").encode()


def reading_text(reading: Reading) -> str:
    """Give how a file was understood as a table that a person checks in half a minute."""
    return reading_table(reading)


def annotated_workbook(
    planned: PlannedLine, data: bytes, file: str, *, signatures: Signatures | None = None
) -> AnnotatedFile:
    """Give the user's workbook with the plan written into it.

    Parameters
    ----------
    planned : PlannedLine
        The plan.
    data, file
        The curve file as it was read, and its name.
    signatures : Signatures, optional
        Who has signed the plan, for the summary sheet; without, there is room to sign by hand.

    Returns
    -------
    AnnotatedFile
        The xlsx, and what a person should know about it.
    """
    return annotate_plan(planned, data, file, signatures)


def template() -> bytes:
    """Give an empty workbook to fill in."""
    return template_workbook()


def _opened(given: NamedFile | None) -> Workbook | None:
    return open_workbook(*given) if given is not None else None
