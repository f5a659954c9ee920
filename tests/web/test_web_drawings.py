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
from markupsafe import Markup
from web_tools import Browser

from cant import service
from cant.model.settings import Settings
from cant.units import GRAVITY_MS2
from webapp.computing import Computed
from webapp.drawings import svg
from webapp.drawings.layout import STRIP_WIDTH, ClassSpeeds, DrawnCurve
from webapp.drawings.line import draw_line
from webapp.drawings.scale import Panel, panel_around, panel_for, step_for
from webapp.drawings.section import Acting, acting, draw_section
from webapp.drawings.speeds import speed_panel, speed_words
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


def height_of(mark: ElementTree.Element) -> float:
    """Give where a mark of any shape has its middle between its top and bottom, or its centre."""
    if "cy" in mark.attrib:
        return float(mark.attrib["cy"])
    if "points" in mark.attrib:
        ys = [float(p.split(",")[1]) for p in mark.attrib["points"].split()]
        # Of a triangle the middle lies at 1.2 of 2.2 parts below its top, of a diamond half way.
        return min(ys) + (max(ys) - min(ys)) * (1.2 / 2.2 if len(ys) == 3 else 0.5)
    if "height" in mark.attrib:
        return float(mark.attrib["y"]) + float(mark.attrib["height"]) / 2
    lines = mark.findall("s:line", NAMESPACE)
    return sum(float(stroke.attrib[k]) for stroke in lines for k in ("y1", "y2")) / (2 * len(lines))


def speed_groups(strips: list[Markup]) -> list[ElementTree.Element]:
    return [g for s in strips for g in parsed(s).findall(".//s:a/s:g[@class='speeds']", NAMESPACE)]


def marks_of(group: ElementTree.Element, kind: str) -> list[ElementTree.Element]:
    shapes = [e for e in group if e.attrib.get("class", "").split()[:1] == [kind]]
    crosses = [
        e for e in group.findall("s:g", NAMESPACE) if e[0].attrib.get("class", "").split()[:1] == [kind]
    ]
    return shapes + crosses


@pytest.mark.parametrize("system", ["metric", "us"])
def test_speed_marks_stand_at_the_numbers_of_the_plan(sample_file: Path, app: Flask, system: str) -> None:
    units = measures(system)
    reading = service.read_curves(sample_file.read_bytes(), sample_file.name)
    computed = Computed(service.make_plan(reading))
    kmh_per_unit = 1.0 if system == "metric" else 1.609344  # the international mile
    framed = 0
    with app.test_request_context():
        for track in computed.listing.tracks:
            page = page_of_line(computed, "x", {"track": track, "each": "96"}, units)
            assert page is not None
            assert page.pages == 1
            entries = [entry for _, record in page.records for entry in record["classes"]]
            groups = speed_groups(page.drawing.strips)
            assert len(groups) == len(entries) > 0
            height = {}  # the scale as the labels of the panel tell it
            root = parsed(page.drawing.strips[0])
            labels = root.findall(".//s:text[@class='grid-label']", NAMESPACE)
            bottom = max(float(p.attrib["y"]) for p in root.findall(".//s:rect[@class='panel']", NAMESPACE))
            for label in labels:
                if float(label.attrib["y"]) > bottom:
                    height[float(label.text or "")] = float(label.attrib["y"]) + 2
            (v1, y1), *_, (v2, y2) = sorted(height.items())
            for group, entry in zip(groups, entries, strict=True):
                title = group.findtext("s:title", "", NAMESPACE)
                index = page.classes.index(entry["class"])
                assert title.startswith(entry["class"] + ": permissible ")
                for kind, key in (("planned", "speed_kmh"), ("permissible", "permissible_speed_kmh")):
                    (mark,) = marks_of(group, kind)
                    assert mark.attrib["class"] == f"{kind} class-{index % 6}"
                    shown = entry[key] / kmh_per_unit
                    assert f"{kind} {shown:.1f}\u00a0" in title
                    assert height_of(mark) == pytest.approx(
                        y1 + (shown - v1) * (y2 - y1) / (v2 - v1), abs=0.05
                    )
                short = entry["permissible_speed_kmh"] < entry["speed_kmh"]
                assert bool(group.findall("s:rect[@class='below']", NAMESPACE)) == short
                assert bool(group.findall("s:polygon[@class='below-pointer']", NAMESPACE)) == short
                assert title.endswith("permissible below planned") == short
                framed += short
    assert framed > 0


def test_speeds_of_any_class_are_drawn_in_its_shape() -> None:
    names = "ABCDEFG"
    speeds = [ClassSpeeds(n, 100.0 + 7 * i, 90.0 + 9 * i) for i, n in enumerate(names)]
    curves = [curve(speeds=[*speeds, None, ClassSpeeds("I", 60.0, None)])]
    groups = speed_groups(draw_line(curves, METRIC).strips)
    assert len(groups) == 8
    panel = speed_panel(0.0, 110.0, curves, METRIC)
    first = height_of(marks_of(groups[0], "planned")[0])
    for group, one in zip(groups, speeds, strict=False):
        (planned,), (permissible,) = marks_of(group, "planned"), marks_of(group, "permissible")
        assert height_of(planned) - first == pytest.approx(
            panel.y(one.planned_kmh) - panel.y(100.0), abs=0.05
        )
        assert height_of(permissible) - first == pytest.approx(
            panel.y(one.permissible_kmh or 0.0) - panel.y(100.0), abs=0.05
        )
    below = [bool(g.findall("s:rect[@class='below']", NAMESPACE)) for g in groups]
    assert below == [True] * 5 + [False] * 3  # 90 + 9 i < 100 + 7 i up to i = 4; equal at 5
    assert marks_of(groups[-1], "permissible") == []
    assert speed_words(ClassSpeeds("I", 60.0, None), METRIC).endswith("planned 60.0\u00a0km/h")
    assert not draw_line([curve()], METRIC).strips[0].count("speeds")


@given(st.lists(st.floats(min_value=0, max_value=400), max_size=5), st.sampled_from(["metric", "us"]))
def test_speed_panel_takes_in_every_speed(values: list[float], system: str) -> None:
    panel = panel_around(10, 100, values, measures(system), "speed", 30.0)
    assert all(panel.low <= v <= panel.high for v in values)
    assert panel.low >= 0
    assert panel.high - panel.low >= 30
    assert len(panel.ticks) >= 2
    assert all(panel.low < v < panel.high for v, _ in panel.ticks)


def test_table_beside_the_picture_holds_its_speeds(browser: Browser) -> None:
    plan = browser.sample()
    page = browser.get(f"{plan}/line?each=96").text
    table = page[page.index("<tbody>") : page.index("</tbody>")]
    rows = re.findall(r"<tr>(.*?)</tr>", table, re.DOTALL)
    titles = re.findall(r"<title>(\w[^<]*: (?:no )?permissible [^<]*)</title>", page)
    said = []
    for row in rows:
        cells = [re.sub(r"<[^>]+>", "", c) for c in re.findall(r"<td[^>]*>(.*?)</td>", row, re.DOTALL)]
        for at in range(5, len(cells) - 1, 3):
            if cells[at] != "–":
                said.append((cells[at + 1], cells[at + 2]))
    assert len(said) == len(titles) > 0
    for (permissible, planned), title in zip(said, titles, strict=True):
        number = permissible.removeprefix("▼ below planned: ")
        assert f"permissible {number}\u00a0km/h, planned {planned}\u00a0km/h" in title
        assert (number != permissible) == title.endswith("permissible below planned")


def test_style_for_paper_turns_the_line_picture(browser: Browser) -> None:
    style = browser.get("/static/style.css").text
    paper = style[style.index("@media print") :]
    assert re.search(r"@page wide \{[^}]*size: A4 landscape", paper)
    assert re.search(r"\.along \{[^}]*page: wide", paper)
    assert re.search(r"\.strip,[^{]*\{ break-inside: avoid", paper)
    for name in ("filters", "pager", "top", "steps"):
        assert re.search(rf"\.{name}\b[^{{}}]*\{{ display: none", paper)
    for mark in re.findall(r"--mark-\d: #(\w{6})", paper):
        assert sum(int(mark[i : i + 2], 16) for i in (0, 2, 4)) < 300, "dark ink"
    assert '<div class="along">' in browser.get(f"{browser.sample()}/line").text
