"""In which units people are shown a plan: metric, or the inches, feet, miles and mph of the American trade.

On the ground floor because the words of a reason, a terminal line, a column of a workbook and a page must not
each choose their own. The JSON of a plan does not use it: that is metric always.
"""

from __future__ import annotations

from dataclasses import dataclass

from cant.units import ratio


@dataclass(frozen=True, slots=True)
class Shown:
    """How one kind of number is shown.

    Attributes
    ----------
    unit : str
        Symbol of the unit shown, "" for a bare number.
    factor : float
        Shown value = canonical value x factor.
    decimals : int
        Digits after the point.
    """

    unit: str
    factor: float
    decimals: int

    @property
    def number_format(self) -> str:
        """Number format of a spreadsheet cell."""
        return "0." + "0" * self.decimals if self.decimals else "0"

    def value(self, canonical: float | None) -> float | None:
        """Turn a canonical value into the shown one; None stays None."""
        return None if canonical is None else canonical * self.factor

    def text(self, canonical: float | None, *, with_unit: bool = True) -> str:
        """Write a canonical value for people, "-" where there is none."""
        if canonical is None:
            return "-"
        number = f"{canonical * self.factor:.{self.decimals}f}"
        if float(number) == 0:
            number = number.lstrip("-")
        return f"{number} {self.unit}" if with_unit and self.unit else number


_METRIC: dict[str, Shown] = {
    "cant": Shown("mm", 1.0, 0),
    "cant exact": Shown("mm", 1.0, 1),
    "speed": Shown("km/h", 1.0, 0),
    "speed exact": Shown("km/h", 1.0, 1),
    "radius": Shown("m", 1.0, 0),
    "length": Shown("m", 1.0, 1),
    "chainage": Shown("km", 1.0, 3),
    "acceleration": Shown("m/s2", 1.0, 2),
    "jerk": Shown("m/s3", 1.0, 2),
    "gradient": Shown("mm/m", 1.0, 2),
    "rate": Shown("mm/s", 1.0, 1),
    "angular rate": Shown("deg/s", 1.0, 2),
    "share": Shown("%", 100.0, 1),
    "mass": Shown("t", 1.0, 0),
    "height": Shown("m", 1.0, 2),
    "number": Shown("", 1.0, 2),
    "count": Shown("", 1.0, 0),
}
_US: dict[str, Shown] = {
    **_METRIC,
    "cant": Shown("in", ratio("mm", "in"), 2),
    "cant exact": Shown("in", ratio("mm", "in"), 2),
    "speed": Shown("mph", ratio("km/h", "mph"), 0),
    "speed exact": Shown("mph", ratio("km/h", "mph"), 1),
    "radius": Shown("ft", ratio("m", "ft"), 0),
    "length": Shown("ft", ratio("m", "ft"), 0),
    "chainage": Shown("mi", ratio("km", "mi"), 3),
    "gradient": Shown("in/31 ft", ratio("mm/m", "in/31 ft"), 3),
    "rate": Shown("in/s", ratio("mm/s", "in/s"), 2),
    "mass": Shown("short ton", ratio("t", "short ton"), 0),
    "height": Shown("ft", ratio("m", "ft"), 1),
}
_SYSTEMS = {"metric": _METRIC, "us": _US}


@dataclass(frozen=True, slots=True)
class Display:
    """The units in which a plan is shown.

    Attributes
    ----------
    units : str
        ``metric`` or ``us``.
    """

    units: str = "metric"

    def __getitem__(self, kind: str) -> Shown:
        """Give how a kind of number is shown: ``cant``, ``speed``, ``radius``, ``length`` ..."""
        return _SYSTEMS[self.units][kind]

    def text(self, kind: str, canonical: float | None) -> str:
        """Write a canonical value with its unit."""
        return self[kind].text(canonical)
