"""The catalogue's formulas of ramps, bounds, loads, setting out, turnouts and shapes."""

from __future__ import annotations

from functools import partial

from cant.quantities import bounds, geometry, lengths, lifting, loads, shapes, transitions, turnouts
from cant.quantities.formula import CONSTANT, PEAK, SPACING, Formula, entry

_RAMP = {"V": "speed_kmh", "L": "length_m"} | PEAK
TRANSITIONS: tuple[Formula, ...] = (
    entry(
        "cant_gradient",
        ("dD/ds", "mm/m", "steepest cant gradient"),
        "{k}*{dD}/{L}",
        transitions.cant_gradient,
        {"dD": "cant_change_mm", "L": "length_m"} | PEAK,
        "German EBO par. 6(4)",
    ),
    entry(
        "rate_of_change_of_cant",
        ("dD/dt", "mm/s", "largest rate of change of cant"),
        "{k}*{dD}*{V}/(3.6*{L})",
        transitions.rate_of_change_of_cant,
        {"dD": "cant_change_mm"} | _RAMP,
    ),
    entry(
        "rate_of_change_of_deficiency",
        ("dI/dt", "mm/s", "largest rate of change of cant deficiency"),
        "{k}*{dI}*{V}/(3.6*{L})",
        transitions.rate_of_change_of_deficiency,
        {"dI": "deficiency_change_mm"} | _RAMP,
        "IRICEN notes, example 3.7",
    ),
    entry(
        "jerk",
        ("da/dt", "m/s3", "change of lateral acceleration with time"),
        "{g}*{rate}/{e}",
        transitions.jerk,
        {"rate": "unbalanced_change_rate_mm_s"} | SPACING,
    ),
    entry(
        "roll_rate",
        ("dphi/dt", "rad/s", "angular speed of the track about its long axis"),
        "{rate}/{e}",
        transitions.roll_rate,
        {"rate": "cant_change_rate_mm_s", "e": "rail_spacing_mm"},
    ),
    entry(
        "length_for_gradient",
        ("L", "m", "length that the gradient needs"),
        "{k}*ABS({dD})/{grad_lim}",
        lengths.length_for_gradient,
        {"dD": "cant_change_mm", "grad_lim": "gradient_limit_mm_per_m"} | PEAK,
    ),
    entry(
        "length_for_rate",
        ("L", "m", "length that a rate of change needs"),
        "{k}*ABS({dD})*{V}/(3.6*{r_lim})",
        lengths.length_for_rate,
        {"dD": "change_mm", "V": "speed_kmh", "r_lim": "rate_limit_mm_s"} | PEAK,
    ),
    entry(
        "needed_length",
        ("L", "m", "length that gradient and both rates need"),
        "{k}*MAX(ABS({dD})/{grad_lim},ABS({dD})*{V}/(3.6*{r_lim}),ABS({dI})*{V}/(3.6*{rI_lim}))",
        lengths.needed_length,
        {
            "dD": "cant_change_mm",
            "dI": "deficiency_change_mm",
            "V": "speed_kmh",
            "grad_lim": "gradient_limit_mm_per_m",
            "r_lim": "cant_rate_limit_mm_s",
            "rI_lim": "deficiency_rate_limit_mm_s",
        }
        | PEAK,
    ),
)

BOUNDS: tuple[Formula, ...] = (
    entry(
        "least_cant_for_deficiency",
        ("D_low", "mm", "least cant by the deficiency"),
        "{D_EQ}-{I_lim}",
        bounds.least_cant_for_deficiency,
        {"D_EQ": "equilibrium_cant_mm", "I_lim": "deficiency_limit_mm"},
    ),
    entry(
        "most_cant_for_excess",
        ("D_high", "mm", "most cant by the excess"),
        "{D_EQ}+{E_lim}",
        bounds.most_cant_for_excess,
        {"D_EQ": "equilibrium_cant_mm", "E_lim": "excess_limit_mm"},
    ),
    entry(
        "unbalance_for_felt_acceleration",
        ("|D_EQ-D|", "mm", "deficiency or excess at which the felt acceleration reaches its limit"),
        "{a_lim}/(1+{s})*{e}/{g}",
        bounds.unbalance_for_felt_acceleration,
        {"a_lim": "acceleration_limit_ms2", "s": "roll_coefficient"} | SPACING,
    ),
    entry(
        "most_cant_for_gradient",
        ("D_high", "mm", "most cant by the gradient"),
        "{grad_lim}*{L}/{k}",
        bounds.most_cant_for_gradient,
        {"grad_lim": "gradient_limit_mm_per_m", "L": "length_m"} | PEAK,
    ),
    entry(
        "most_change_for_rate",
        ("dD_max", "mm", "most change of cant, or of deficiency, by its rate"),
        "3.6*{r_lim}*{L}/({k}*{V})",
        bounds.most_change_for_rate,
        {"r_lim": "rate_limit_mm_s"} | _RAMP,
    ),
    entry(
        "utilisation",
        ("u", "-", "share of a limit that a value uses"),
        "{value}/{limit}",
        bounds.utilisation,
        {"value": "value", "limit": "limit"},
    ),
)

REST: tuple[Formula, ...] = (
    entry(
        "wheel_load_shift",
        ("dQ/Q0", "-", "share of the mean wheel load that moves to the outer rail (rigid body)"),
        "2000*{h}*{U}/{e}^2",
        loads.wheel_load_shift,
        {"U": "unbalanced_cant_mm", "h": "centre_of_gravity_m", "e": "rail_spacing_mm"},
        "statics of a rigid body",
    ),
    entry(
        "wheel_load_shift_at_rest",
        ("dQ/Q0", "-", "the same while the train stands; negative: to the inner rail (rigid body)"),
        "-2000*{h}*{D}/{e}^2",
        loads.wheel_load_shift_at_rest,
        {"D": "cant_mm", "h": "centre_of_gravity_m", "e": "rail_spacing_mm"},
        "statics of a rigid body",
    ),
    entry(
        "lateral_shift",
        ("s", "mm", "sideways movement of a point above the rails"),
        "1000*{h}*{dD}/{e}",
        lifting.lateral_shift,
        {"dD": "cant_change_mm", "h": "height_m", "e": "rail_spacing_mm"},
        "small rotation",
    ),
    entry(
        "rise_of_centre",
        ("z", "mm", "rise of the track's centre line"),
        "ABS({dD})/2",
        lifting.rise_of_centre,
        {"dD": "cant_change_mm"},
        "small rotation",
    ),
    entry(
        "radius_from_versine",
        ("R", "m", "radius from versine and chord"),
        "125*{c}^2/{v}",
        geometry.radius_from_versine,
        {"v": "versine_mm", "c": "chord_m"},
        "Indian Railways Permanent Way Manual, para 401",
    ),
    entry(
        "turn_of_curve",
        ("turn", "rad", "whole turn of the curve"),
        "({L}+({L_in}+{L_out})/2)/{R}",
        geometry.turn_of_curve,
        {"L": "arc_m", "R": "radius_m", "L_in": "transition_in_m", "L_out": "transition_out_m"},
        "integral of the curvature",
    ),
    entry(
        "apex_offset",
        ("s", "m", "movement of the curve's middle with a flatter radius"),
        "({R_2}-{R})*(1/COS({turn}/2)-1)",
        geometry.apex_offset,
        {"R": "radius_m", "R_2": "flatter_radius_m", "turn": "turn_rad"},
        "plane geometry",
    ),
    entry(
        "branch_curvature",
        ("k_b", "1/m", "signed curvature of the branch of a turnout in a curve"),
        "{k_m}+{k_t}",
        turnouts.branch_curvature,
        {"k_m": "main_curvature_per_m", "k_t": "turnout_curvature_per_m"},
        "signed curvature",
    ),
    entry(
        "branch_deficiency",
        ("U", "mm", "unbalanced cant on the branch: deficiency positive, excess negative"),
        "{C}*{V}^2*ABS({k_b})-IF({k_b}=0,ABS({D_m}),SIGN({k_b})*{D_m})",
        turnouts.branch_deficiency,
        {"V": "speed_kmh", "k_b": "branch_curvature_per_m", "D_m": "main_cant_mm"} | CONSTANT,
        "signed curvature",
    ),
)

_PROFILE_TEXTS = {
    "linear": ("{t}", "{L}^2/(24*{R})"),
    "bloss": ("{t}^2*(3-2*{t})", "{L}^2/(40*{R})"),
    "cosine": ("(1-COS(PI()*{t}))/2", "(1/8-1/PI()^2)*{L}^2/{R}"),
    "helmert": ("IF({t}<=0.5,2*{t}^2,1-2*(1-{t})^2)", "{L}^2/(48*{R})"),
    "sine": ("{t}-SIN(2*PI()*{t})/(2*PI())", "(1/24-1/(4*PI()^2))*{L}^2/{R}"),
}
SHAPES: tuple[Formula, ...] = tuple(
    entry(
        f"profile_{shape}",
        ("f", "-", f"share of the cant reached along a ramp of {shape} shape"),
        profile,
        partial(shapes.profile, shape=shape),
        {"t": "share"},
        "definition of the shape",
    )
    for shape, (profile, _) in _PROFILE_TEXTS.items()
) + tuple(
    entry(
        f"shift_{shape}",
        ("p", "m", f"shift of the arc that a transition of {shape} shape makes"),
        shift,
        partial(shapes.shift_of_arc, shape=shape),
        {"L": "length_m", "R": "radius_m"},
        "integral of the curvature, first order",
    )
    for shape, (_, shift) in _PROFILE_TEXTS.items()
)
