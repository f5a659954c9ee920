"""The turnouts that lie in curves: what the planner needs to know about the branch."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field

from cant.errors import Place

Positive = Annotated[float, Field(gt=0, allow_inf_nan=False)]


class Turnout(BaseModel):
    """One turnout.

    Attributes
    ----------
    name, line, track : str
        By which it is known; "" where not stated.
    curve : str
        Curve of that line and track in which it lies, "" where only the chainage says so.
    chainage_km : float or None
        Where it lies [km].
    radius_m : float
        Radius of the branch where the main line is straight [m]; inf for none.
    hand : str
        ``L`` or ``R``: to which side the branch leaves, in the direction of increasing chainage.
    branch_speed_kmh : float
        Speed over the branch [km/h].
    category : str
        Category of traffic over the branch, lower case, "" for the strictest limits.
    place : Place
        Where the row stands.
    """

    model_config = ConfigDict(frozen=True)

    name: str = ""
    line: str = ""
    track: str = ""
    curve: str = ""
    chainage_km: float | None = None
    radius_m: Annotated[float, Field(gt=0)]
    hand: Literal["L", "R"]
    branch_speed_kmh: Positive
    category: str = ""
    place: Place = Field(default=Place(), exclude=True, repr=False)
