"""Figures that no limit asks for and an engineer does: exact forms, wheel loads, jerk, roll, smallest radius.

Added to the records of a plan in batches, so that the functions of :mod:`cant.quantities` see whole arrays.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any

import numpy as np

from cant.model.curves import FloatArray, none_if_nan
from cant.planning import Plan
from cant.planning.line import Line
from cant.planning.rules import Asked
from cant.quantities.inclined_plane import equilibrium_cant_exact, unbalanced_acceleration_exact
from cant.quantities.kinematics import centripetal_acceleration
from cant.quantities.loads import wheel_load_shift, wheel_load_shift_at_rest
from cant.quantities.speeds import smallest_radius
from cant.quantities.transitions import jerk, roll_rate

Record = dict[str, Any]
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
        not limited). Each class of a transition gains ``jerk_ms3`` [m/s3], from the change of deficiency,
        and ``roll_rate_deg_s`` [deg/s].
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
    for i, record in enumerate(records):
        for entry in classes(record):
            entry[key] = none_if_nan(whole[i, column[entry["class"]]])
