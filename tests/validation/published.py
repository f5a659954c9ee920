"""The published values that these tests check against, one row a value, each with document and clause.

``kind`` says what a row is worth: a ``table cell`` or ``worked example`` is a printed result, a ``limit`` a
printed limit; ``from the printed formula`` was worked out by hand from a printed formula and shows only that
formula and constant are the right ones. Figures known to be their source's own error are not among them, and
nothing is from memory.
"""

from __future__ import annotations

import csv
import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from cant.quantities.arrays import FloatArray
from cant.quantities.constants import constant_from_rail_spacing
from cant.quantities.kinematics import equilibrium_cant

FILE = Path(__file__).resolve().parents[1] / "data" / "published_values.csv"
ROUNDING = 1e-9


@dataclass(frozen=True)
class Row:
    """One published value: what is given, what is printed, and how far the source's own rounding goes."""

    id: str
    source: str
    clause: str
    kind: str
    given: dict[str, Any]
    printed: dict[str, float]
    tolerance: float | dict[str, float]

    def check(self, **computed: float | FloatArray) -> None:
        """Compare every printed figure that the test computes, and refuse one that is not printed."""
        for key, value in computed.items():
            allowed = self.tolerance[key] if isinstance(self.tolerance, dict) else self.tolerance
            where = f"{self.source}, {self.clause} ({self.id}): {key}"
            assert float(value) == pytest.approx(self.printed[key], rel=0, abs=allowed + ROUNDING), where


@cache
def _all() -> tuple[Row, ...]:
    with FILE.open(encoding="utf-8", newline="") as stream:
        return tuple(
            Row(
                line["id"],
                line["source"],
                line["clause"],
                line["kind"],
                json.loads(line["inputs"]),
                json.loads(line["expected"]),
                json.loads(line["tolerance"]),
            )
            for line in csv.DictReader(stream)
        )


def rows(prefix: str) -> Any:
    """Give a parametrisation over the rows whose id starts with a prefix; at least one."""
    found = [row for row in _all() if row.id.startswith(prefix)]
    assert found, f"no published value with the id {prefix}..."
    return pytest.mark.parametrize("row", found, ids=[row.id for row in found])


def one(identity: str) -> Row:
    """Give the row of an id."""
    (row,) = (row for row in _all() if row.id == identity)
    return row


def equilibrium(row: Row, gravity: float = 9.81) -> FloatArray:
    """Compute the equilibrium cant of a row from its constant, or its rail spacing."""
    given = row.given
    constant = given.get("constant") or constant_from_rail_spacing(given["rail_spacing_mm"], gravity)
    speed = given.get("speed_kmh", given.get("mean_speed_kmh", given.get("speed_max_kmh")))
    return equilibrium_cant(speed, given["radius_m"], constant)
