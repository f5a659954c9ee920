"""The formulas that find the strictest limit at a speed among the rows of the sheet "Limits used".

A lookup weighs only the conditions that some row of its quantity states, so that it stays short enough to be
checked; which rule governs therefore follows a changed speed, radius, situation or value. Apart from the
sheet because the sheets of calculation need where its cells lie and not how they are written.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from cant.errors import column_letter
from cant.model.limits import QUANTITIES, LimitSet
from cant.writing.book.inputs import Inputs
from cant.writing.book.ledger import quoted

KIND_OF: dict[str, str] = {
    "cant gradient": "gradient",
    "rate of change of cant": "rate",
    "rate of change of cant deficiency": "rate",
    "felt acceleration": "acceleration",
    "speed step": "speed",
    "curve length": "number",
}
"""Kind of number in which a quantity's limit is shown; all others are cants."""

FIRST_ROW = 5
_EDGE = "1E-09"


def kind_of(quantity: str) -> str:
    """Give the kind of number in which a quantity is shown."""
    return KIND_OF.get(quantity, "cant exact")


@dataclass(frozen=True)
class Asking:
    """What a lookup is asked with: references to cells, as shown.

    Attributes
    ----------
    speed, radius, category, situation, tier : str
        Speed, radius, category of the class, number of the situation's column, and 1 for normal or 2 for
        exceptional values.
    """

    speed: str
    radius: str
    category: str
    situation: str
    tier: str


class LimitLookup:
    """Where the rows lie, and the formulas over them.

    Parameters
    ----------
    limits : LimitSet
    situations : sequence of frozenset of str
        The distinct sets of situation words of the curves; each has a column.
    inputs : Inputs
    name : str
        Name of the sheet.
    """

    def __init__(
        self, limits: LimitSet, situations: Sequence[frozenset[str]], inputs: Inputs, name: str
    ) -> None:
        order = list(QUANTITIES)
        self.limits = limits
        self.name = name
        self._inputs = inputs
        self._situations = situations
        self._at = sorted(range(len(limits.rows)), key=lambda i: (order.index(limits.rows[i].quantity), i))
        self._rows = [limits.rows[i] for i in self._at]
        self._letters = {key: column_letter(i) for i, key in enumerate(_KEYS)}
        first, last = len(_KEYS), len(_KEYS) + max(len(situations), 1) - 1
        self._matrix = (column_letter(first), column_letter(last))

    def has(self, quantity: str) -> bool:
        """Tell whether any rule limits a quantity."""
        return any(row.quantity == quantity for row in self._rows)

    def value(self, quantity: str, asking: Asking) -> str:
        """Give the formula of a quantity's strictest limit, ``"none"`` where nothing limits."""
        if not self.has(quantity):
            return '"none"'
        conditions = self.conditions(quantity, asking)
        return f'IFERROR(_xlfn.AGGREGATE(15,6,{self.values(quantity, asking)}/{conditions},1),"none")'

    def clause(self, quantity: str, asking: Asking, limit: str) -> str:
        """Give the formula of the clause of the row that makes a limit."""
        if not self.has(quantity):
            return '""'
        same = f"(ABS({self.values(quantity, asking)}-{limit})<{_EDGE})"
        rows = f"ROW({self.band(quantity, 'normal used')})"
        conditions = self.conditions(quantity, asking)
        found = f"_xlfn.AGGREGATE(15,6,{rows}/({conditions}*{same}),1)"
        clauses = f"{quoted(self.name)}!${self._letters['clause']}$1:${self._letters['clause']}${self._last}"
        return f'IFERROR(INDEX({clauses},{found})&"","")'

    def speed_edges(self, quantity: str) -> tuple[str, str]:
        """Give the cells of the lower and the upper edges of speed; "" where no row states any."""
        rows = [row for row in self._rows if row.quantity == quantity]
        return (
            self.band(quantity, "speed_over_kmh") if any(r.speed_over_kmh is not None for r in rows) else "",
            self.band(quantity, "speed_up_to_kmh")
            if any(r.speed_up_to_kmh is not None for r in rows)
            else "",
        )

    @staticmethod
    def kind(quantity: str) -> str:
        """Give the kind of number in which a quantity is shown."""
        return kind_of(quantity)

    @property
    def _last(self) -> int:
        return FIRST_ROW + len(self._rows) - 1

    def band(self, quantity: str, key: str, to: str | None = None) -> str:
        """Give the cells of one column, or of the columns up to another, over the rows of a quantity."""
        at = [i for i, row in enumerate(self._rows) if row.quantity == quantity]
        first, last = FIRST_ROW + at[0], FIRST_ROW + at[-1]
        left = self._letters.get(key, key)
        right = self._letters.get(to, to) if to is not None else left
        return f"{quoted(self.name)}!${left}${first}:${right}${last}"

    def values(self, quantity: str, asking: Asking) -> str:
        """Give the formula of the limits of all rows of a quantity."""
        both = self.band(quantity, "normal used", "exceptional used")
        value = f"INDEX({both},0,{asking.tier})"
        if any(row.quantity == quantity and row.per_metre_of_radius for row in self._rows):
            return f"({value}+{self.band(quantity, 'slope used')}*{asking.radius})"
        return value

    def conditions(self, quantity: str, asking: Asking, speed: bool = True) -> str:
        """Give the formula that is 1 in the rows that hold, without their bands of speed where told so."""
        rows = [row for row in self._rows if row.quantity == quantity]
        parts = []
        if any(row.category for row in rows):
            block = self.band(quantity, "category")
            parts.append(f'(({block}="")+({block}={asking.category})>0)')
        if any(row.situation for row in rows):
            parts.append(f"(INDEX({self.band(quantity, *self._matrix)},0,{asking.situation})=1)")
        for key, reference, form in (
            ("speed_over_kmh", asking.speed, "{0}>{1}+" + _EDGE),
            ("speed_up_to_kmh", asking.speed, "{0}<={1}+" + _EDGE),
            ("radius_over_m", asking.radius, "{0}>{1}+" + _EDGE),
            ("radius_up_to_m", asking.radius, "{0}<={1}+" + _EDGE),
        ):
            if not speed and key.startswith("speed"):
                continue
            if any(getattr(row, key) is not None for row in rows):
                block = self.band(quantity, key)
                # A blank condition holds always; the sum keeps a blank from counting as the number 0.
                parts.append(f'(({block}="")+({form.format(reference, block)})>0)')
        return f"({'*'.join(parts)})" if parts else "1"


_KEYS = (
    "number",
    "quantity",
    "category",
    "situation",
    "speed_over_kmh",
    "speed_up_to_kmh",
    "radius_over_m",
    "radius_up_to_m",
    "normal",
    "exceptional",
    "unit",
    "slope",
    "kind",
    "normal used",
    "exceptional used",
    "slope used",
    "tolerance",
    "unit used",
    "clause",
    "note",
)
