"""Every formula that a plan shows, once: code, workbook and help page take it from here and so cannot differ.

A template is written for positive lengths and speeds and a finite radius: what a straight or a standing train
means is the business of whoever writes the cell.
"""

from __future__ import annotations

from cant.quantities.formula import Formula, Symbol
from cant.quantities.formulas_of_motion import KINEMATICS, SPEEDS
from cant.quantities.formulas_of_track import BOUNDS, REST, SHAPES, TRANSITIONS

SYMBOLS: dict[str, Symbol] = {
    "C": Symbol("mm m/(km/h)2", "equilibrium constant"),
    "D": Symbol("mm", "cant"),
    "D_EQ": Symbol("mm", "equilibrium cant"),
    "D_m": Symbol("mm", "signed cant of the main line"),
    "E_lim": Symbol("mm", "limit of the cant excess"),
    "I_lim": Symbol("mm", "limit of the cant deficiency"),
    "L": Symbol("m", "length"),
    "L_in": Symbol("m", "length of the transition in"),
    "L_out": Symbol("m", "length of the transition out"),
    "R": Symbol("m", "radius"),
    "R_2": Symbol("m", "flatter radius"),
    "U": Symbol("mm", "equilibrium cant less cant"),
    "V": Symbol("km/h", "speed"),
    "V_f": Symbol("km/h", "speed of the fast class"),
    "V_s": Symbol("km/h", "speed of the slow class"),
    "Vs": Symbol("km/h", "speeds of the classes (a range)"),
    "ws": Symbol("-", "weights of the classes (a range)"),
    "a": Symbol("m/s2", "acceleration in the track plane"),
    "a_lim": Symbol("m/s2", "limit of the felt acceleration"),
    "c": Symbol("m", "chord"),
    "dD": Symbol("mm", "change of cant"),
    "dI": Symbol("mm", "change of cant deficiency"),
    "e": Symbol("mm", "rail spacing"),
    "g": Symbol("m/s2", "gravity"),
    "h": Symbol("m", "height above the rails"),
    "k": Symbol("-", "peak factor of the shape"),
    "k_b": Symbol("1/m", "signed curvature of the branch"),
    "k_m": Symbol("1/m", "signed curvature of the main line"),
    "k_t": Symbol("1/m", "signed curvature of the turnout on straight track"),
    "limit": Symbol("as the value", "limit"),
    "rate": Symbol("mm/s", "rate of change"),
    "r_lim": Symbol("mm/s", "limit of a rate of change"),
    "rI_lim": Symbol("mm/s", "limit of the rate of change of cant deficiency"),
    "s": Symbol("-", "roll coefficient"),
    "step": Symbol("km/h", "speed step"),
    "t": Symbol("-", "share of the way along the ramp, 0 to 1"),
    "turn": Symbol("rad", "whole turn of the curve"),
    "grad_lim": Symbol("mm/m", "limit of the cant gradient"),
    "v": Symbol("mm", "versine"),
    "value": Symbol("as the limit", "value"),
}
"""What the arguments of the templates are."""

CATALOGUE: dict[str, Formula] = {
    each.key: each for each in (*KINEMATICS, *SPEEDS, *TRANSITIONS, *BOUNDS, *REST, *SHAPES)
}
"""Every formula by its key, in the order of a help page."""


def formula(key: str) -> Formula:
    """Give a formula by its key.

    Parameters
    ----------
    key : str
        Key of :data:`CATALOGUE` [-].

    Returns
    -------
    Formula
        The entry, one (no array shape); its ``evaluate`` gives arrays of broadcast shape in the entry's unit.

    Raises
    ------
    KeyError
        Where there is no such formula.

    References
    ----------
    .. [1] Each entry names its own source.
    """
    return CATALOGUE[key]
