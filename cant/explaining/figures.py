"""Figures that no limit asks for and an engineer does: exact forms, wheel loads, jerk, roll, smallest radius.

Added to the records of a plan in batches, so that the functions of :mod:`cant.quantities` see long arrays.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np

from cant.model.curves import FloatArray, none_if_nan
from cant.model.settings import Settings
from cant.model.traffic import Traffic
from cant.quantities.inclined_plane import equilibrium_cant_exact, unbalanced_acceleration_exact
from cant.quantities.kinematics import centripetal_acceleration
from cant.quantities.loads import wheel_load_shift, wheel_load_shift_at_rest
from cant.quantities.speeds import smallest_radius
from cant.quantities.transitions import jerk, roll_rate

Record = dict[str, Any]


class Figures:
    """Adds figures to records of one plan.

    Parameters
    ----------
    traffic : Traffic
        For the heights of the centres of gravity.
    settings : Settings
        For rail spacing and constant.
    """

    def __init__(self, traffic: Traffic, settings: Settings) -> None:
        self._traffic = traffic
        self._settings = settings
        self._heights: dict[tuple[str, str], dict[str, float]] = {}

    def add(self, records: Sequence[Record]) -> None:
        """Add the figures to records, in place.

        Parameters
        ----------
        records : sequence of dict
            Records of curves as :meth:`Plan.record` gives them. Each class of ``classes`` and of
            ``today.classes`` gains ``equilibrium_cant_exact_mm`` [mm], ``centripetal_acceleration_ms2`` and
            ``unbalanced_acceleration_exact_ms2`` [m/s2], ``wheel_load_shift`` and
            ``wheel_load_shift_at_rest`` [-] (None without a height of the centre of gravity), and
            ``smallest_radius_m`` [m] (None where its deficiency is not limited). Each class of a transition
            gains ``jerk_ms3`` [m/s3] and ``roll_rate_deg_s`` [deg/s].
        """
        self._add_to_classes(records)
        self._add_to_transitions(records)

    def _height(self, record: Record, name: str) -> float:
        key = (record["line"], record["track"])
        if key not in self._heights:
            here = self._traffic.on(*key)
            self._heights[key] = {
                n: np.nan if row.centre_of_gravity_m is None else row.centre_of_gravity_m
                for n, row in here.items()
            }
        return self._heights[key].get(name, np.nan)

    def _add_to_classes(self, records: Sequence[Record]) -> None:
        entries, given = [], []
        for record in records:
            for cant_mm, classes in (
                (record["recommended_cant_mm"], record["classes"]),
                (record["existing_cant_mm"], record["today"]["classes"]),
            ):
                for entry in classes:
                    limit = entry.get("deficiency_limit_mm")
                    entries.append(entry)
                    given.append(
                        (
                            entry["run_speed_kmh"],
                            record["radius_m"],
                            cant_mm,
                            self._height(record, entry["class"]),
                            limit,
                        )
                    )
        if not entries:
            return
        speed, radius, cant_mm, height, limit = np.array(given, dtype=np.float64).T
        spacing = self._settings.spacing_mm
        unbalanced = np.array([_unbalanced(entry) for entry in entries], dtype=np.float64)
        _put(entries, "equilibrium_cant_exact_mm", equilibrium_cant_exact(speed, radius, spacing))
        _put(entries, "centripetal_acceleration_ms2", centripetal_acceleration(speed, radius))
        _put(
            entries,
            "unbalanced_acceleration_exact_ms2",
            unbalanced_acceleration_exact(speed, radius, cant_mm, spacing),
        )
        _put(entries, "wheel_load_shift", wheel_load_shift(unbalanced, height, spacing))
        _put(entries, "wheel_load_shift_at_rest", wheel_load_shift_at_rest(cant_mm, height, spacing))
        _put(
            entries,
            "smallest_radius_m",
            smallest_radius(speed, cant_mm, limit, self._settings.constant),
        )

    def _add_to_transitions(self, records: Sequence[Record]) -> None:
        entries = [
            entry
            for record in records
            for end in record.get("transitions", {}).values()
            if end is not None
            for entry in end.get("classes", [])
        ]
        if not entries:
            return
        spacing = self._settings.spacing_mm
        of_deficiency = _take(entries, "rate_of_change_of_unbalance_mm_s")
        of_cant = _take(entries, "rate_of_change_of_cant_mm_s")
        _put(entries, "jerk_ms3", jerk(of_deficiency, spacing))
        _put(entries, "roll_rate_deg_s", np.degrees(roll_rate(of_cant, spacing)))


def _unbalanced(entry: Record) -> float | None:
    deficiency, excess = entry["deficiency_mm"], entry["excess_mm"]
    return None if deficiency is None else deficiency - excess


def _take(entries: Iterable[Record], key: str) -> FloatArray:
    return np.array([entry.get(key) for entry in entries], dtype=np.float64)


def _put(entries: Sequence[Record], key: str, values: FloatArray) -> None:
    for entry, value in zip(entries, values, strict=True):
        entry[key] = none_if_nan(value)
