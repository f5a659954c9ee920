"""The catalogue's formulas of speed, radius and cant: equilibrium, accelerations, speeds."""

from __future__ import annotations

from cant.quantities import constants, inclined_plane, kinematics, speeds
from cant.quantities.formula import CONSTANT, CURVE, SPACING, Formula, entry

_STATICS = "mechanics of the inclined plane"

KINEMATICS: tuple[Formula, ...] = (
    entry(
        "equilibrium_cant",
        ("D_EQ", "mm", "cant at which neither deficiency nor excess exists"),
        "{C}*{V}^2/{R}",
        kinematics.equilibrium_cant,
        CURVE | CONSTANT,
        "German EBO par. 40(7); 49 CFR 213.57(b)",
    ),
    entry(
        "equilibrium_cant_exact",
        ("D_EQ", "mm", "equilibrium cant of the inclined plane without the small-angle form"),
        "{e}*{V}^2/(12.96*{R})/SQRT(({V}^2/(12.96*{R}))^2+{g}^2)",
        inclined_plane.equilibrium_cant_exact,
        CURVE | SPACING,
        _STATICS,
    ),
    entry(
        "centripetal_acceleration",
        ("a_c", "m/s2", "horizontal acceleration towards the centre"),
        "{V}^2/(12.96*{R})",
        kinematics.centripetal_acceleration,
        CURVE,
        "uniform circular motion",
    ),
    entry(
        "cant_deficiency",
        ("I", "mm", "cant deficiency"),
        "MAX({D_EQ}-{D},0)",
        kinematics.cant_deficiency,
        {"D_EQ": "equilibrium_cant_mm", "D": "cant_mm"},
        "Regulation (EU) 1299/2014, 4.2.4.3",
    ),
    entry(
        "cant_excess",
        ("E", "mm", "cant excess"),
        "MAX({D}-{D_EQ},0)",
        kinematics.cant_excess,
        {"D_EQ": "equilibrium_cant_mm", "D": "cant_mm"},
    ),
    entry(
        "unbalanced_acceleration",
        ("a_q", "m/s2", "lateral acceleration in the track plane, outwards positive"),
        "{g}*({D_EQ}-{D})/{e}",
        kinematics.unbalanced_acceleration,
        {"D_EQ": "equilibrium_cant_mm", "D": "cant_mm"} | SPACING,
        "Polish regulation of 1998, par. 33",
    ),
    entry(
        "unbalanced_acceleration_exact",
        ("a_q", "m/s2", "lateral acceleration in the inclined plane without the small-angle form"),
        "{V}^2/(12.96*{R})*SQRT(1-({D}/{e})^2)-{g}*{D}/{e}",
        inclined_plane.unbalanced_acceleration_exact,
        CURVE | {"D": "cant_mm"} | SPACING,
        _STATICS,
    ),
    entry(
        "felt_acceleration",
        ("a_felt", "m/s2", "lateral acceleration felt on the vehicle floor"),
        "(1+{s})*{a}",
        kinematics.felt_acceleration,
        {"a": "unbalanced_acceleration_ms2", "s": "roll_coefficient"},
    ),
    entry(
        "cant_from_acceleration",
        ("I", "mm", "cant deficiency that an acceleration in the track plane is"),
        "{a}*{e}/{g}",
        kinematics.cant_from_acceleration,
        {"a": "acceleration_ms2"} | SPACING,
        "Polish regulation of 1998, par. 33",
    ),
    entry(
        "constant_from_rail_spacing",
        ("C", "mm m/(km/h)2", "equilibrium constant of a rail spacing"),
        "{e}/(12.96*{g})",
        constants.constant_from_rail_spacing,
        SPACING,
    ),
    entry(
        "rail_spacing_from_constant",
        ("e", "mm", "rail spacing that a printed constant implies"),
        "12.96*{g}*{C}",
        constants.rail_spacing_from_constant,
        {"g": "gravity_ms2"} | CONSTANT,
    ),
)

SPEEDS: tuple[Formula, ...] = (
    entry(
        "equilibrium_speed",
        ("V_EQ", "km/h", "speed at which neither deficiency nor excess exists"),
        "SQRT(MAX({D},0)*{R}/{C})",
        speeds.equilibrium_speed,
        {"D": "cant_mm", "R": "radius_m"} | CONSTANT,
    ),
    entry(
        "permissible_speed",
        ("V_max", "km/h", "highest speed that the deficiency allows"),
        "SQRT(MAX({D}+{I_lim},0)*{R}/{C})",
        speeds.permissible_speed,
        {"D": "cant_mm", "I_lim": "deficiency_limit_mm", "R": "radius_m"} | CONSTANT,
        "German EBO par. 40(7); 49 CFR 213.57(b)",
    ),
    entry(
        "lowest_speed",
        ("V_min", "km/h", "speed below which the excess goes over its limit"),
        "SQRT(MAX({D}-{E_lim},0)*{R}/{C})",
        speeds.lowest_speed,
        {"D": "cant_mm", "E_lim": "excess_limit_mm", "R": "radius_m"} | CONSTANT,
    ),
    entry(
        "smallest_radius",
        ("R_min", "m", "sharpest radius that a speed allows with a cant"),
        "{C}*{V}^2/({D}+{I_lim})",
        speeds.smallest_radius,
        {"V": "speed_kmh", "D": "cant_mm", "I_lim": "deficiency_limit_mm"} | CONSTANT,
    ),
    entry(
        "smallest_radius_for_mix",
        ("R_mix", "m", "radius below which no cant serves both classes"),
        "{C}*MAX({V_f}^2-{V_s}^2,0)/({I_lim}+{E_lim})",
        speeds.smallest_radius_for_mix,
        {"V_f": "fastest_kmh", "V_s": "slowest_kmh", "I_lim": "deficiency_limit_mm"}
        | {"E_lim": "excess_limit_mm"}
        | CONSTANT,
        "follows from deficiency and excess",
    ),
    entry(
        "rms_speed",
        ("V_rms", "km/h", "weighted root-mean-square speed"),
        "SQRT(SUMPRODUCT({ws},{Vs},{Vs})/SUM({ws}))",
        speeds.rms_speed,
        {"Vs": "speed_kmh", "ws": "weight"},
        "permanent-way practice in Japan and China",
    ),
    entry(
        "speed_on_step",
        ("V_step", "km/h", "highest multiple of the speed step"),
        "INT({V}/{step}+0.000000001)*{step}",
        speeds.speed_on_step,
        {"V": "speed_kmh", "step": "step_kmh"},
        "South Central Railway curve note",
    ),
    entry(
        "time_over",
        ("t", "s", "time over a length at constant speed"),
        "3.6*{L}/{V}",
        speeds.time_over,
        {"L": "length_m", "V": "speed_kmh"},
    ),
)
