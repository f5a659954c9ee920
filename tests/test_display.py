"""Units in which people are shown a plan, against the definitions of the units (NIST SP 811, appendix B)."""

from __future__ import annotations

import pint
import pytest

from cant.model.display import Display

UREG = pint.UnitRegistry()


@pytest.mark.parametrize(
    ("kind", "value", "canonical", "shown"),
    [
        ("cant", 100.0, "mm", "inch"),
        ("speed", 160.0, "km/hour", "mile/hour"),
        ("radius", 600.0, "m", "ft"),
        ("length", 80.0, "m", "ft"),
        ("chainage", 12.5, "km", "mile"),
        ("rate", 35.0, "mm/s", "inch/s"),
        ("mass", 1200.0, "metric_ton", "ton"),
        ("height", 1.8, "m", "ft"),
    ],
)
def test_us_units_are_those_of_the_definitions(kind: str, value: float, canonical: str, shown: str) -> None:
    expected = UREG.Quantity(value, canonical).to(shown).magnitude
    assert Display("us")[kind].value(value) == pytest.approx(expected, rel=1e-12)
    assert Display("metric")[kind].value(value) == value


def test_gradient_in_inches_in_31_feet() -> None:
    """31 ft (9448.8 mm) is the chord on which 49 CFR 213.63 measures runoff."""
    assert Display("us")["gradient"].value(1.0) == pytest.approx(9.4488 / 25.4)


def test_text() -> None:
    assert Display().text("cant", 95.0) == "95 mm"
    assert Display("us").text("cant", 95.25) == "3.75 in"
    assert Display().text("speed", None) == "-"
    assert Display().text("cant exact", -0.01) == "0.0 mm"
    assert Display().text("share", 0.123) == "12.3 %"
    assert Display()["number"].text(0.25) == "0.25"
    assert Display()["cant"].number_format == "0"
    assert Display("us")["cant"].number_format == "0.00"
