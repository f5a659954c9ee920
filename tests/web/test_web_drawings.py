"""Drawings: well-formed, to scale where they say so, and showing what the plan has."""

from __future__ import annotations

import json
import re
from pathlib import Path
from xml.etree import ElementTree

import pytest
from flask import Flask
from hypothesis import given
from hypothesis import strategies as st
from web_tools import Browser

from cant import service
from cant.model.settings import Settings
from cant.units import GRAVITY_MS2
from webapp.computing import Computed
from webapp.drawings import svg
from webapp.drawings.layout import STRIP_WIDTH, DrawnCurve
from webapp.drawings.line import draw_line
from webapp.drawings.scale import Panel, panel_for, step_for
from webapp.drawings.section import Acting, acting, draw_section
from webapp.line_view import CURVES_A_PAGE, page_of_line
from webapp.measures import measures
from webapp.words import heading, value

METRIC = measures("metric")
SPACING = 1500.0
NAMESPACE = {"s": "http://www.w3.org/2000/svg"}


def parsed(text: str) -> ElementTree.Element:
    return ElementTree.fromstring(text)  # noqa: S314 - our own output


def curve(**changed: object) -> DrawnCurve:
    values: dict[str, object] = {
        "name": "7",
        "address": "/curve/7",
        "words": "Curve 7",
        "hand": 1,
        "start_m": 1000.0,
        "end_m": 1300.0,
        "length_m": None,
        "transition_in_m": 80.0,
        "transition_out_m": 80.0,
        "radius_m": 800.0,
        "today_mm": 60.0,
        "proposed_mm": 90.0,
        "lower_mm": 40.0,
        "upper_mm": 120.0,
        "status": "change",
        "shares_with_next": False,
        "deficiency_mm": (50.0, -30.0),
    }
    return DrawnCurve(**{**values, **changed})


def test_text_is_escaped_and_numbers_are_short() -> None:
    drawn = svg.words(1.23456, 2.0, "<b>&")
    assert str(drawn) == '<text x="1.23" y="2" text-anchor="start">&lt;b&gt;&amp;</text>'
    assert 'href="&#34;&gt;"' in svg.element("a", href='">')


@given(st.floats(min_value=1e-6, max_value=1e6))
def test_steps_are_round_and_part_the_span(span: float) -> None:
    step = step_for(span)
    assert span / step >= 3 * (1 - 1e-9)
    mantissa = float(f"{step:e}".split("e")[0])
    assert min(abs(mantissa - m) for m in (1, 2, 5)) < 1e-6


def test_panel_puts_zero_and_values_where_they_belong() -> None:
    panel = panel_for(10, 100, [-40.0, 130.0], METRIC, "cant")
    assert panel.low <= -40
    assert panel.high >= 130
    assert panel.y(panel.high) == pytest.approx(10)
    assert panel.y(panel.low) == pytest.approx(110)
    half = (panel.low + panel.high) / 2
    assert panel.y(half) == pytest.approx(60)
    assert Panel(0, 10, 0, 1, ()).y(5) == 0
    assert panel_for(10, 100, [149.0], METRIC, "cant").y(149.0) > 12


@pytest.mark.parametrize(
    "curves",
    [
        [curve()],
        [curve(hand=-1, lower_mm=None), curve(upper_mm=None), curve(lower_mm=None, upper_mm=None)],
        [curve(status="not assessed", proposed_mm=None, today_mm=None, deficiency_mm=(None, None))],
        [curve(start_m=None, end_m=None, transition_in_m=None, transition_out_m=None, radius_m=None)],
        [curve(lower_mm=130.0, upper_mm=90.0, status="not compliant")],
        [curve(name="<&>" * 9, words="<&>", shares_with_next=True), curve(hand=-1)],
        [curve(start_m=1000.0 * i, end_m=1000.0 * i + 300) for i in range(40)],
    ],
)
def test_any_line_is_drawn_well_formed(curves: list[DrawnCurve]) -> None:
    drawing = draw_line(curves, METRIC)
    links = 0
    for strip in drawing.strips:
        root = parsed(strip)
        links += len(root.findall(".//s:a", NAMESPACE))
        assert float(root.attrib["width"]) <= STRIP_WIDTH + 200
        assert "nan" not in strip
        assert "style=" not in strip
        for target in root.findall(".//s:rect[@class='target']", NAMESPACE):
            assert float(target.attrib["width"]) >= 24  # WCAG 2.2, 2.5.8 target size
    assert links == len(curves)


def test_proposed_cant_is_drawn_at_its_height_on_its_side() -> None:
    def level(hand: int) -> float:
        root = parsed(draw_line([curve(hand=hand, today_mm=None)], METRIC).strips[0])
        path = root.find(".//s:polyline[@class='proposed']", NAMESPACE)
        assert path is not None
        zero, _, arc = (float(p.split(",")[1]) for p in path.attrib["points"].split()[:3])
        return zero - arc

    assert level(1) > 0
    root = parsed(draw_line([curve()], METRIC).strips[0])
    heights = {}
    for name in ("today", "proposed"):
        path = root.find(f".//s:polyline[@class='{name}']", NAMESPACE)
        assert path is not None
        ys = [float(p.split(",")[1]) for p in path.attrib["points"].split()]
        heights[name] = ys[0] - ys[2]
    assert heights["proposed"] / heights["today"] == pytest.approx(90 / 60, rel=1e-3)
    assert level(-1) < 0


def test_shared_transition_runs_from_cant_to_cant() -> None:
    first = curve(shares_with_next=True, end_m=1300.0)
    second = curve(hand=-1, start_m=1380.0, end_m=1600.0)
    root = parsed(draw_line([first, second], METRIC).strips[0])
    path = root.find(".//s:polyline[@class='proposed']", NAMESPACE)
    assert path is not None
    ys = [float(p.split(",")[1]) for p in path.attrib["points"].split()]
    zero = ys[0]
    assert ys[2] < zero < ys[4]
    assert ys[3] == ys[2] or ys[3] == ys[4]


def test_long_straight_is_marked_as_shortened() -> None:
    near, far = curve(), curve(start_m=1500.0, end_m=1700.0)
    assert not draw_line([near, far], METRIC).shortened
    drawing = draw_line([near, curve(start_m=9000.0, end_m=9300.0)], METRIC)
    assert drawing.shortened
    assert any("//" in strip for strip in drawing.strips)


@pytest.mark.parametrize("cant", [0.0, 60.0, 150.0, -40.0])
def test_foot_of_the_resultant_lies_in_the_middle_at_equilibrium(cant: float) -> None:
    slope = cant / SPACING
    if cant <= 0:
        standing = acting("A", 0.0, 1.8, 500.0, cant, SPACING)
        assert standing.offset_mm == pytest.approx(-1800 * slope / (1 - slope**2) ** 0.5, abs=1e-6)
        return
    speed = (GRAVITY_MS2 * slope / (1 - slope**2) ** 0.5 * 500.0) ** 0.5 * 3.6
    assert acting("A", speed, 1.8, 500.0, cant, SPACING).offset_mm == pytest.approx(0, abs=1e-6)


def test_foot_of_the_resultant_shares_the_load_as_the_deficiency_says() -> None:
    """Rigid body: the load shift 2 I h / e^2 is the foot's offset over half the rail spacing.

    Statics of the wheel set on two rails; small angles, so to 2 %.
    """
    radius, cant, height = 1000.0, 100.0, 1.5
    speed = 130.0
    deficiency = Settings().constant * speed**2 / radius - cant
    found = acting("A", speed, height, radius, cant, SPACING)
    assert found.offset_mm / (SPACING / 2) == pytest.approx(
        2 * deficiency * height * 1000 / SPACING**2, rel=0.02
    )


def test_section_is_drawn_to_scale_and_outward() -> None:
    classes = [Acting("A", 100.0, None, 1.0, 50.0), Acting("B", 0.0, 1.4, 0.0, -100.0)]
    for hand in (1, -1):
        root = parsed(draw_section(120.0, SPACING, hand, classes, METRIC))
        plane = root.find(".//s:line[@class='plane']", NAMESPACE)
        assert plane is not None
        x1, y1, x2, y2 = (float(plane.attrib[k]) for k in ("x1", "y1", "x2", "y2"))
        assert (y1 - y2) / ((x2 - x1) ** 2 + (y2 - y1) ** 2) ** 0.5 == pytest.approx(120 / SPACING, rel=2e-3)
        assert (x2 > x1) == (hand == 1)


def test_line_pages_hold_every_curve_once(sample_file: Path, app: Flask) -> None:
    reading = service.read_curves(sample_file.read_bytes(), sample_file.name)
    computed = Computed(service.make_plan(reading))
    with app.test_request_context():
        for track in computed.listing.tracks:
            seen: list[int] = []
            number, pages = 1, 1
            while number <= pages:
                page = page_of_line(computed, "x", {"track": track, "page": str(number)}, METRIC)
                assert page is not None
                assert len(page.records) <= CURVES_A_PAGE
                drawn = "".join(page.drawing.strips)
                linked = [int(n) - 1 for n in re.findall(r"/curves/(\d+)", drawn)]
                assert linked == [i for i, _ in page.records]
                seen += linked
                number, pages = number + 1, page.pages
            assert seen == [int(i) for i in computed.listing.along[track]]


def test_keys_become_headings_without_their_units() -> None:
    assert heading("rate_of_change_of_cant_mm_per_s") == "Rate of change of cant"
    assert heading("roll_rate_deg_s") == "Roll rate"
    assert heading("running_time_lost_s") == "Running time lost"
    assert heading("class") == "Class"
    assert value("running_time_lost_s", 13.92, METRIC) == "13.9 s"
    assert value("ramp_needed_m", 93.333, METRIC) == "93.3\u00a0m"
    assert value("wheel_load_shift", 0.2049, METRIC) == "20.5\u00a0%"
    assert value("regular", False, METRIC) == "no"
    assert value("anything", None, METRIC) == "–"


def test_line_picture_is_seen_closer_and_further(browser: Browser) -> None:
    plan = browser.sample()
    drawn = {
        each: browser.get(f"{plan}/line?each={each}").text.count('<tr><th scope="row"') for each in (6, 12)
    }
    assert drawn == {6: 6, 12: 12}
    close = browser.get(f"{plan}/line?each=6&page=3").text
    assert 'aria-current="true">6' in close
    assert "each=12&amp;page=2" in close, "the same stretch of line from further away"
    assert "each=6&amp;page=2" in close
    assert 'aria-current="true">24' in browser.get(f"{plan}/line?each=7&page=x").text


def test_line_picture_shows_what_a_quantity_bounds(browser: Browser) -> None:
    plan = browser.sample()
    curves = json.loads(browser.get(f"{plan}/plan.json").data)["curves"]
    bound = {
        (c["line"], c["track"], c["curve"])
        for c in curves
        if "cant excess" in ((c["lower_by"] or {}).get("quantity"), (c["upper_by"] or {}).get("quantity"))
    }
    assert bound
    shown = set()
    for line, track in {(c["line"], c["track"]) for c in curves}:
        asked = {"track": f"{line} / {track}", "governed": "cant excess", "each": "96"}
        page = browser.get(f"{plan}/line", query_string=asked).text
        assert "<option selected>cant excess" in page
        shown |= {(line, track, name) for name in re.findall(r'<th scope="row"><a[^>]*>([^<]*)</a>', page)}
    assert shown == bound
