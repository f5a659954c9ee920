"""Columns of the sheets of figures: one row a curve and class, one row an end of a curve.

Apart from the columns of the curve sheet because their records are others: a class of a curve, and a
transition.
"""

from __future__ import annotations

from cant.writing.columns import Column, governing, path


def _over_end(side: str) -> tuple[Column, ...]:
    """Give what a class has over one end of a curve."""
    return (
        Column(
            f"Rate of change of cant, {side}",
            "rate",
            path(side, "rate_of_change_of_cant_mm_per_s"),
            10,
            "Steepest, at the run speed.",
        ),
        Column(
            f"Rate of change of deficiency, {side}",
            "rate",
            path(side, "rate_of_change_of_cant_deficiency_mm_per_s"),
            10,
            "Steepest, at the run speed; excess counts as deficiency 0.",
        ),
        Column(
            f"Jump of deficiency, {side}",
            "cant exact",
            path(side, "abrupt_change_of_cant_deficiency_mm"),
            10,
            "Where there is no transition.",
        ),
        Column(f"Jerk, {side}", "jerk", path(side, "jerk_ms3"), 8, "From the change of deficiency."),
        Column(
            f"Roll rate, {side}",
            "angular rate",
            path(side, "roll_rate_deg_s"),
            8,
            "Speed at which the track tilts the train.",
        ),
    )


FIGURES: tuple[Column, ...] = (
    Column("Cant", "", path("cant"), 10, "Whether the proposed cant or today's is meant."),
    Column("Class", "", path("class"), 16, "Class of train."),
    Column("Planned speed", "speed", path("speed_kmh"), 9, "Speed that the class is to run here."),
    Column("Run speed", "speed", path("run_speed_kmh"), 9, "The lower of planned and permissible speed."),
    Column("Equilibrium cant", "cant exact", path("equilibrium_cant_mm"), 11, "Cant without deficiency."),
    Column(
        "Equilibrium cant, exact",
        "cant exact",
        path("equilibrium_cant_exact_mm"),
        11,
        "The same on the inclined plane; the limits are made for the linear form.",
    ),
    Column("Deficiency", "cant exact", path("deficiency_mm"), 10, "Cant lacking to equilibrium."),
    Column("Excess", "cant exact", path("excess_mm"), 10, "Cant above equilibrium."),
    Column(
        "Acceleration towards the centre",
        "acceleration",
        path("centripetal_acceleration_ms2"),
        12,
        "Horizontal acceleration v2/R.",
    ),
    Column(
        "Unbalanced acceleration",
        "acceleration",
        path("unbalanced_acceleration_ms2"),
        12,
        "Lateral acceleration in the track plane; negative towards the inside.",
    ),
    Column(
        "Felt acceleration",
        "acceleration",
        path("felt_acceleration_ms2"),
        12,
        "The same on the vehicle floor, with the roll of the body.",
    ),
    Column(
        "Wheel load shift",
        "share",
        path("wheel_load_shift"),
        10,
        "Share of the wheel load that moves to the outer rail (rigid body); negative to the inner.",
    ),
    Column(
        "Wheel load shift at rest",
        "share",
        path("wheel_load_shift_at_rest"),
        10,
        "The same for a train that stands on the curve.",
    ),
    Column("Permissible speed", "speed", path("permissible_speed_kmh"), 11, "In the last tier allowed."),
    Column("Permissible from", "", governing("permissible_by"), 30, "Limit that ends the permissible speed."),
    Column(
        "Permissible at normal limits",
        "speed",
        path("permissible_speed_normal_kmh"),
        11,
        "The same at normal values.",
    ),
    Column("Lowest speed", "speed exact", path("lowest_speed_kmh"), 9, "Below it excess is over its limit."),
    Column(
        "Smallest radius",
        "radius",
        path("smallest_radius_m"),
        10,
        "Radius at which the class would just keep its deficiency limit at this cant and the run speed.",
    ),
    *_over_end("in"),
    *_over_end("out"),
)
"""One row a curve and class; the record is a class of a curve with ``cant`` put to it, and what the class has
over each end as ``in`` and ``out``."""

END: tuple[Column, ...] = (
    Column("End", "", path("side"), 8, "in or out: the end at the smaller or the greater chainage."),
    Column("Kind", "", path("kind"), 12, "to straight, shared with the next curve, none, or not known."),
    Column("Length", "length", path("length_m"), 9, "Length of the transition; blank: not known."),
    Column("Cant ramp", "length", path("ramp_m"), 9, "Length of the cant ramp."),
    Column(
        "Room for a ramp", "length", path("ramp_room_m"), 9, "On the straight, where there is no transition."
    ),
    Column("Change of cant", "cant", path("change_of_cant_mm"), 9, "Over the ramp, with the proposed cants."),
    Column("Cant gradient", "gradient", path("cant_gradient_mm_per_m"), 10, "Steepest, with the shape."),
    Column(
        "Ramp needed", "length", path("ramp_needed_m"), 9, "Cant ramp that the proposed cant needs at least."
    ),
    Column("Ramp needed for", "", path("ramp_needed_by"), 14, "Class that needs it; blank: its gradient."),
    Column("Transition needed", "length", path("transition_needed_m"), 10, "For the change of deficiency."),
    Column("Transition needed for", "", path("transition_needed_by"), 14, "Class that needs it."),
)
"""One row an end of a curve; the record is a transition with ``side`` put to it."""
