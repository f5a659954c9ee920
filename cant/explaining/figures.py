"""Figures that no limit asks for and an engineer does: exact forms, wheel loads, jerk, roll, smallest radius.

Added to the records of a plan in batches, so that the functions of :mod:`cant.quantities` see whole arrays.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from cant.model.curves import FloatArray
from cant.planning import Plan
from cant.planning.line import Line
from cant.planning.rules import Asked
from cant.quantities.inclined_plane import equilibrium_cant_exact, unbalanced_acceleration_exact
from cant.quantities.kinematics import centripetal_acceleration
from cant.quantities.loads import wheel_load_shift, wheel_load_shift_at_rest
from cant.quantities.speeds import smallest_radius
from cant.quantities.transitions import jerk, roll_rate

Record = dict[str, Any]
_QUANTITIES = ("cant deficiency", "cant excess", "felt acceleration")
_LIMIT_KEYS = ("deficiency_limit_mm", "excess_limit_mm", "felt_limit_ms2")
Classes = Callable[[Record], list[Record]]


def add_figures(plan: Plan, indices: Sequence[int], records: Sequence[Record]) -> None:
    """Add figures to records of a plan, in place.

    Parameters
    ----------
    plan : Plan
        The plan.
    indices : sequence of int
        Curves, n of them.
    records : sequence of dict
        Their records as :meth:`Plan.record` gives them. Each class of ``classes`` and of ``today.classes``
        gains ``equilibrium_cant_exact_mm`` [mm], ``centripetal_acceleration_ms2`` and
        ``unbalanced_acceleration_exact_ms2`` [m/s2], ``wheel_load_shift`` and ``wheel_load_shift_at_rest``
        [-] (None without a height of the centre of gravity), and ``smallest_radius_m`` [m]: the radius at
        which it would just keep its deficiency limit at this cant and its run speed (None where deficiency is
        not limited); ``deficiency_limit_mm``, ``excess_limit_mm`` [mm], ``felt_limit_ms2`` [m/s2]: its normal
        limits at the run speed, ``share_of_limit`` [-] the largest share that it uses of one of them, and
        ``share_of``, ``share_clause`` which one that is. Each class of a transition gains ``jerk_ms3``
        [m/s3], from the change of deficiency, and ``roll_rate_deg_s`` [deg/s].
    """
    line = plan.outcome.line.take(np.asarray(indices, dtype=np.int64))
    names = plan.traffic.class_names
    exceptional = plan.settings.allows_exceptional
    views: tuple[tuple[str, Classes], ...] = (
        ("recommended_cant_mm", lambda record: record["classes"]),
        ("existing_cant_mm", lambda record: record["today"]["classes"]),
    )
    for cant_key, classes in views:
        cant = np.array([[record[cant_key]] for record in records], dtype=np.float64)
        speed = _gather(records, classes, names, "run_speed_kmh")
        unbalanced = _gather(records, classes, names, "equilibrium_cant_mm") - cant
        for key, values in _of_classes(line, cant, speed, unbalanced, exceptional).items():
            _spread(records, classes, names, key, values)
        felt = _gather(records, classes, names, "felt_acceleration_ms2")
        _add_shares(plan, line, records, classes, speed, unbalanced, felt)
    for side in ("in", "out"):
        _add_to_ends(line, records, side, names)


def _of_classes(
    line: Line, cant_mm: FloatArray, speed_kmh: FloatArray, unbalanced_mm: FloatArray, exceptional: bool
) -> dict[str, FloatArray]:
    """Work out the figures of each class, shape (n, k)."""
    spacing, height, radius = line.spacing_mm, line.gravity_height_m, line.radius_m
    limit = Asked(line, np.nan_to_num(speed_kmh), exceptional).limit("cant deficiency").value
    return {
        "equilibrium_cant_exact_mm": equilibrium_cant_exact(speed_kmh, radius, spacing),
        "centripetal_acceleration_ms2": centripetal_acceleration(speed_kmh, radius),
        "unbalanced_acceleration_exact_ms2": unbalanced_acceleration_exact(
            speed_kmh, radius, cant_mm, spacing
        ),
        "wheel_load_shift": wheel_load_shift(unbalanced_mm, height, spacing),
        "wheel_load_shift_at_rest": wheel_load_shift_at_rest(cant_mm, height, spacing),
        "smallest_radius_m": np.where(
            np.isfinite(limit), smallest_radius(speed_kmh, cant_mm, limit, line.constant), np.nan
        ),
    }


def _add_shares(
    plan: Plan,
    line: Line,
    records: Sequence[Record],
    classes: Classes,
    speed_kmh: FloatArray,
    unbalanced_mm: FloatArray,
    felt_ms2: FloatArray,
) -> None:
    """Add the normal limits of each class and the largest share of one of them that it uses."""
    names = plan.traffic.class_names
    asked = Asked(line, np.nan_to_num(speed_kmh), False)
    values = (np.maximum(unbalanced_mm, 0.0), np.maximum(-unbalanced_mm, 0.0), np.abs(felt_ms2))
    shares, rows = [], []
    for key, quantity, value in zip(_LIMIT_KEYS, _QUANTITIES, values, strict=True):
        limit = asked.limit(quantity)
        _spread(records, classes, names, key, np.where(np.isfinite(limit.value), limit.value, np.nan))
        with np.errstate(divide="ignore", invalid="ignore"):
            share = np.where(np.isfinite(limit.value) & (limit.value > 0), value / limit.value, np.nan)
        if quantity != "cant deficiency":
            # The excess of an occasional train is shown and does not bind.
            share = np.where(line.regular | (unbalanced_mm > 0), share, np.nan)
        shares.append(np.broadcast_to(share, speed_kmh.shape))
        rows.append(np.broadcast_to(limit.row, speed_kmh.shape))
    every = np.nan_to_num(np.stack(shares), nan=-1.0)
    which = every.argmax(axis=0)
    largest = every.max(axis=0)
    row = np.take_along_axis(np.stack(rows), which[None], axis=0)[0]
    _spread(records, classes, names, "share_of_limit", np.where(largest < 0, np.nan, largest))
    column = {name: j for j, name in enumerate(names)}
    for i, record in enumerate(records):
        for entry in classes(record):
            j = column[entry["class"]]
            limited = largest[i, j] >= 0
            stated = plan.limits.rows[int(row[i, j])] if limited and row[i, j] >= 0 else None
            entry["share_of"] = _QUANTITIES[which[i, j]] if limited else None
            entry["share_clause"] = stated.clause or None if stated is not None else None


def _add_to_ends(line: Line, records: Sequence[Record], side: str, names: list[str]) -> None:
    def classes(record: Record) -> list[Record]:
        end = record["transitions"].get(side)
        return list(end["classes"]) if end else []

    of_cant = _gather(records, classes, names, "rate_of_change_of_cant_mm_per_s")
    of_deficiency = _gather(records, classes, names, "rate_of_change_of_cant_deficiency_mm_per_s")
    _spread(records, classes, names, "jerk_ms3", jerk(of_deficiency, line.spacing_mm))
    turning = np.degrees(roll_rate(of_cant, line.spacing_mm))
    _spread(records, classes, names, "roll_rate_deg_s", turning)


def _gather(records: Sequence[Record], classes: Classes, names: list[str], key: str) -> FloatArray:
    """Put a figure of the classes into an array, shape (n, k); nan where a class has none."""
    column = {name: j for j, name in enumerate(names)}
    values = np.full((len(records), len(names)), np.nan)
    for i, record in enumerate(records):
        for entry in classes(record):
            if entry[key] is not None:
                values[i, column[entry["class"]]] = entry[key]
    return values


def _spread(
    records: Sequence[Record], classes: Classes, names: list[str], key: str, values: FloatArray
) -> None:
    column = {name: j for j, name in enumerate(names)}
    whole = np.broadcast_to(values, (len(records), len(names)))
    plain = whole.astype(object)
    plain[~np.isfinite(whole)] = None
    for row, record in zip(plain.tolist(), records, strict=True):
        for entry in classes(record):
            entry[key] = row[column[entry["class"]]]
