"""The settings of a plan: rail spacing or printed constant, method, tiers, tolerances of choice."""

from __future__ import annotations

from typing import Annotated

from pydantic import BaseModel, ConfigDict, Field

from cant.units import GRAVITY_MS2, KMH_PER_MS

KMH2_G = KMH_PER_MS**2 * GRAVITY_MS2
"""12.96 g: turns mm, km/h, m into an equilibrium cant [(km/h)2 / (m/s)2 . m/s2]."""

STANDARD_RAIL_SPACING_MM = 1500.0
NORMAL_TIER = "normal"
EXCEPTIONAL_TIER = "exceptional"
METHODS: tuple[str, ...] = ("rms", "fraction", "balanced", "least", "underbalance", "today")
"""Names of the methods that give a curve its target cant (:mod:`cant.planning.targets`)."""

LARGEST_TOLERANCE_MM = 1000.0
RailSpacing = Annotated[float, Field(ge=300, le=3000, allow_inf_nan=False)]
Constant = Annotated[float, Field(ge=1, le=40, allow_inf_nan=False)]
Tolerance = Annotated[float, Field(ge=0, le=LARGEST_TOLERANCE_MM, allow_inf_nan=False)]
Share = Annotated[float, Field(gt=0, le=1, allow_inf_nan=False)]


class Settings(BaseModel):
    """What holds for a whole plan.

    Attributes
    ----------
    rail_spacing_mm : float or None
        Distance e of the two wheel-rail contact points [mm]; None where not stated.
    equilibrium_constant : float or None
        Printed constant C of D_EQ = C V^2 / R [mm, km/h, m]; where given it rules e too.
    method : str
        Name of the method that gives each curve its target cant.
    tiers : tuple of str
        ``("normal",)`` or ``("normal", "exceptional")``.
    keep_within_mm : float
        Today's cant stays where it lies no further than this from the best [mm]; 0 keeps only what is best.
    maintenance_allowance_mm : float or None
        Taken off a ceiling on cant [mm]; None where not stated.
    fraction_of_fastest : float
        Method ``fraction``: target as a share of the fastest class's equilibrium cant [-], above 0 and up to
        1. 0.65 lies amid the 0.60 to 0.70 of published rules of thumb (common practice, no standard's value).
    underbalance_mm : float
        Method ``underbalance``: how far the target lies under the equilibrium cant of the class with most
        tonnes [mm]. 25 lies amid the 10 to 50 mm of practice.
    today_within_mm : float
        Method ``today``: today's cant is the target where it lies no further than this from that of ``rms``
        [mm].
    units : str
        ``metric`` or ``us``: in which units people are shown the plan.
    """

    model_config = ConfigDict(frozen=True)

    rail_spacing_mm: RailSpacing | None = None
    equilibrium_constant: Constant | None = None
    method: str = "rms"
    tiers: tuple[str, ...] = (NORMAL_TIER,)
    keep_within_mm: Tolerance = 0.0
    maintenance_allowance_mm: Tolerance | None = None
    fraction_of_fastest: Share = 0.65
    underbalance_mm: Tolerance = 25.0
    today_within_mm: Tolerance = 20.0
    units: str = "metric"

    def with_standard(self, rail_spacing_mm: float | None, equilibrium_constant: float | None) -> Settings:
        """Take over what a standard lays down, where these settings say neither."""
        if self.rail_spacing_mm is not None or self.equilibrium_constant is not None:
            return self
        return self.model_copy(
            update={"rail_spacing_mm": rail_spacing_mm, "equilibrium_constant": equilibrium_constant}
        )

    @property
    def constant(self) -> float:
        """C of D_EQ = C V^2 / R [mm, km/h, m]: as printed, else e / (12.96 g)."""
        if self.equilibrium_constant is not None:
            return self.equilibrium_constant
        return (self.rail_spacing_mm or STANDARD_RAIL_SPACING_MM) / KMH2_G

    @property
    def spacing_mm(self) -> float:
        """Rail spacing e [mm]: 12.96 g C where a constant is given, else as stated, else 1500."""
        return self.constant * KMH2_G

    @property
    def allows_exceptional(self) -> bool:
        """Whether the last tier allowed is the exceptional one."""
        return EXCEPTIONAL_TIER in self.tiers
