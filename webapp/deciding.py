"""Whether what is decided makes sense by itself; whether the list can be read with it, reading it tells."""

from __future__ import annotations

from cant.errors import InputError
from cant.model.limits import QUANTITIES, LimitSet
from cant.units import UNITS


def checked_units(limits: LimitSet) -> LimitSet:
    """Give limits back where each is stated in a unit that fits its quantity; InputError where one is not."""
    for row in limits.rows:
        fits = QUANTITIES[row.quantity].dimensions
        if UNITS[row.unit].dimension not in fits:
            symbols = [symbol for symbol, unit in UNITS.items() if unit.dimension in fits]
            message = f"{row.quantity} cannot be stated in {row.unit}; use one of {', '.join(symbols)}"
            raise InputError(message)
    return limits
