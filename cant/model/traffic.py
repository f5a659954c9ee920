"""The traffic: one row a class of train, general or of one line and track."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Annotated

from pydantic import BaseModel, ConfigDict, Field

from cant.errors import Place

NonNegative = Annotated[float, Field(ge=0, allow_inf_nan=False)]


class TrainClass(BaseModel):
    """One class of train, everywhere or on one line or track.

    Attributes
    ----------
    name : str
        The class, as the user calls it.
    category : str
        passenger, freight, or the user's own word, lower case.
    speed_kmh : float or None
        Speed of the class [km/h], 0 for a train that stands; None where only the curves give it.
    trains_per_day : float or None
        Trains a day; None where not known.
    mass_t : float or None
        Mass of a train [t]; None where not known.
    roll_coefficient : float or None
        Roll (flexibility) coefficient s [-]; felt acceleration is (1 + s) times the track-plane one.
    centre_of_gravity_m : float or None
        Height of the centre of gravity above the rail [m].
    regular : bool
        False for an occasional train, whose excess is shown and does not bind.
    line, track : str
        Where the row holds; "" is everywhere. The most specific row of a class replaces the others.
    place : Place
        Where the row stands.
    """

    model_config = ConfigDict(frozen=True)

    name: str
    category: str
    speed_kmh: NonNegative | None = None
    trains_per_day: NonNegative | None = None
    mass_t: NonNegative | None = None
    roll_coefficient: Annotated[float, Field(ge=-1, allow_inf_nan=False)] | None = None
    centre_of_gravity_m: NonNegative | None = None
    regular: bool = True
    line: str = ""
    track: str = ""
    place: Place = Field(default=Place(), exclude=True, repr=False)


class Traffic(BaseModel):
    """All rows of the traffic table, in the user's order.

    Attributes
    ----------
    rows : tuple of TrainClass
        At least one.
    """

    model_config = ConfigDict(frozen=True)

    rows: tuple[TrainClass, ...]

    @property
    def class_names(self) -> list[str]:
        """Names of the classes, each once, in the order of their first row."""
        return list(dict.fromkeys(row.name for row in self.rows))

    def on(self, line: str, track: str) -> dict[str, TrainClass]:
        """Give the classes that run on one line and track, by name: the most specific row of each."""
        found: dict[str, TrainClass] = {}
        rank: dict[str, int] = {}
        for row in self.rows:
            if (row.line and row.line != line) or (row.track and row.track != track):
                continue
            weight = 2 * bool(row.track) + bool(row.line)
            if row.name not in found or weight >= rank[row.name]:
                found[row.name], rank[row.name] = row, weight
        return {name: found[name] for name in self.class_names if name in found}

    @classmethod
    def of(cls, rows: Iterable[TrainClass]) -> Traffic:
        """Make the table from rows."""
        return cls(rows=tuple(rows))
