"""The line in pictures: native charts of each line and track, with their data stored in them.

Curves stand in the order of chainage. Charts of a long line are cut into stretches by a rule that the sheet
states: a chart of a thousand curves shows nothing.
"""

from __future__ import annotations

from typing import Any

from cant.model.display import Display
from cant.writing.book.ledger import quoted
from cant.writing.columns import Cell, Record
from cant.writing.looks import Heading
from cant.writing.sheets import NewSheets

STRETCH = 60
"""Curves in one chart."""

MOST_STRETCHES = 24
"""Stretches shown."""

_ROWS_OF_CHART = 20
_COLOURS = ("#1B6CA8", "#C25B12", "#3B7D3A", "#7A3E9D", "#8A6D1D", "#A8324A", "#2F7F86", "#555555")
_FIXED = ("Curve", "Chainage", "Cant today", "Proposed cant", "Lower bound", "Upper bound", "Curvature")
_KINDS = ("", "chainage", "cant exact", "cant exact", "cant exact", "cant exact", "")


class Pictures:
    """Charts on one sheet, their data on another.

    Parameters
    ----------
    book : NewSheets
    names : tuple of str
        Names of the sheet of charts and of that of the data.
    display : Display
    classes : list of str
        Classes of train.
    """

    def __init__(self, book: NewSheets, names: tuple[str, str], display: Display, classes: list[str]) -> None:
        self._book = book
        self._display = display
        self._classes = classes
        self._names = names
        self._sheet = book.table(names[0])
        self._groups: dict[tuple[str, str], list[tuple[float, list[Cell]]]] = {}
        self._counted: dict[tuple[str, str], int] = {}

    def add(self, record: Record) -> None:
        """Take a curve."""
        if record["recommended_cant_mm"] is None:
            return
        key = (record["line"], record["track"])
        if key not in self._groups and (key in self._counted or self._is_full()):
            # Nothing of this track will be shown: its curves are counted as those of others are.
            self._counted[key] = min(self._counted.get(key, 0) + 1, STRETCH * MOST_STRETCHES)
            return
        group = self._groups.setdefault(key, [])
        if len(group) >= STRETCH * MOST_STRETCHES:
            return
        start, end = record["as_read"]["start_km"], record["as_read"]["end_km"]
        middle = (start + end) / 2 if start is not None and end is not None else None
        cant = self._display["cant exact"]
        values = [
            cant.value(record[key])
            for key in ("existing_cant_mm", "recommended_cant_mm", "lower_mm", "upper_mm")
        ]
        radius = record["radius_m"]
        sign = -1.0 if record["hand"] == "R" else 1.0
        curvature = None if not radius else sign * 1000.0 / radius / self._display["radius"].factor
        of_class = {entry["class"]: entry for entry in record["classes"]}
        unbalanced = [
            None if name not in of_class else self._unbalanced(of_class[name]) for name in self._classes
        ]
        row: list[Cell] = [record["curve"], self._display["chainage"].value(middle), *values]
        group.append((float("inf") if middle is None else middle, [*row, curvature, *unbalanced]))

    def _is_full(self) -> bool:
        """Tell whether the tracks so far have as many stretches as are shown."""
        return sum(-(-len(group) // STRETCH) for group in self._groups.values()) >= MOST_STRETCHES

    def _unbalanced(self, entry: Record) -> float | None:
        if entry["deficiency_mm"] is None:
            return None
        return self._display["cant exact"].value(entry["deficiency_mm"] - entry["excess_mm"])

    def write(self) -> None:
        """Write the charts."""
        data = self._book.table(self._names[1])
        data.header(self._heads(), keep=3)
        shown = 0
        left = sum(self._counted.values())
        for (line, track), group in self._groups.items():
            group.sort(key=lambda entry: entry[0])
            for begin in range(0, len(group), STRETCH):
                part = [row for _, row in group[begin : begin + STRETCH]]
                if shown >= MOST_STRETCHES:
                    left += len(part)
                    continue
                first = data.next_row
                for row in part:
                    data.row([line, track, *row])
                title = " ".join(word for word in (line, f"track {track}" if track else "") if word)
                if len(group) > STRETCH:
                    title += f", curves {part[0][0]} to {part[-1][0]}"
                self._charts(shown, title or "Line", first, part)
                shown += 1
        self._explain(shown, left)

    def _explain(self, shown: int, left: int) -> None:
        raw = self._sheet.raw
        text = (
            "Curves in the order of chainage. Permitted range: the curve's own bounds at planned speeds, "
            "shared "
            "transitions left out; where the lower bound lies above the upper one no cant serves all "
            "classes. "
            "Curvature: left positive. Deficiency at run speeds: excess is negative."
        )
        if left:
            text += (
                f" {shown} stretches of up to {STRETCH} curves are shown, the first of the list; {left} "
                "further "
                "curves are on the sheet 'Plan' alone."
            )
        raw.merge_range(0, 0, 0, 15, text, self._book.looks.wrapped)
        raw.set_row(0, 32)
        raw.set_portrait()
        raw.fit_to_pages(1, 0)
        if shown > 1:
            raw.set_h_pagebreaks([1 + _ROWS_OF_CHART * 3 * n for n in range(1, shown)])

    def _heads(self) -> list[Heading]:
        heads = [Heading("Line", 16.0), Heading("Track", 7.0)]
        for title, kind in zip(_FIXED, _KINDS, strict=True):
            if not kind:
                unit = f" (1/1000 {self._display['radius'].unit})" if title == "Curvature" else ""
                heads.append(Heading(title + unit, 11.0, "0.000" if unit else None))
            else:
                shown = self._display[kind]
                heads.append(Heading(f"{title} ({shown.unit})", 11.0, shown.number_format))
        shown = self._display["cant exact"]
        return heads + [
            Heading(f"{name}: deficiency, excess negative ({shown.unit})", 12.0, shown.number_format)
            for name in self._classes
        ]

    def _charts(self, number: int, title: str, first: int, rows: list[list[Cell]]) -> None:
        cant = self._display["cant exact"].unit
        radius = self._display["radius"].unit
        top = 1 + number * _ROWS_OF_CHART * 3
        charts: list[tuple[str, str, list[tuple[str, int]]]] = [
            (
                f"{title}: cant today and proposed, permitted range",
                f"cant ({cant})",
                [("Cant today", 2), ("Proposed cant", 3), ("Lower bound", 4), ("Upper bound", 5)],
            ),
            (f"{title}: curvature", f"1/1000 {radius}", [("Curvature, left positive", 6)]),
            (
                f"{title}: deficiency of each class",
                f"deficiency ({cant})",
                [(name, 7 + i) for i, name in enumerate(self._classes)],
            ),
        ]
        for place, (words, axis, series) in enumerate(charts):
            chart = self._chart("column" if place == 1 else "line", first, rows, series, place == 0)
            self._look(chart, words, axis)
            self._sheet.raw.insert_chart(top + place * _ROWS_OF_CHART, 0, chart, {"object_position": 2})

    def _chart(
        self, kind: str, first: int, rows: list[list[Cell]], series: list[tuple[str, int]], is_cant: bool
    ) -> Any:
        chart = self._book.workbook.add_chart({"type": kind})
        if kind == "line":
            # Where it is not said, some programs draw a curve through the points.
            chart._write_c_smooth = lambda smooth: chart._xml_empty_tag(
                "c:smooth", [("val", int(bool(smooth)))]
            )
        sheet = quoted(self._names[1])
        last = first + len(rows) - 1
        for number, (name, column) in enumerate(series):
            letter = chr(ord("A") + column + 2) if column + 2 < 26 else f"A{chr(ord('A') + column - 24)}"
            colour = _COLOURS[number % len(_COLOURS)]
            options: dict[str, Any] = {
                "name": name,
                "categories": f"={sheet}!$C${first}:$C${last}",
                "values": f"={sheet}!${letter}${first}:${letter}${last}",
                "categories_data": [row[0] for row in rows],
                "values_data": ["" if row[column] is None else row[column] for row in rows],
                "gap": 60,
            }
            if kind == "line":
                options |= _line_look(number, colour, is_cant)
            else:
                options["fill"] = {"color": colour}
            chart.add_series(options)
        return chart

    def _look(self, chart: Any, title: str, axis: str) -> None:
        chart.set_title({"name": title, "name_font": {"size": 12}})
        chart.set_size({"width": 1060, "height": 385})
        chart.set_legend({"position": "bottom"})
        chart.set_x_axis({"num_font": {"rotation": -90, "size": 8}, "label_position": "low", "name": "curve"})
        chart.set_y_axis({"name": axis, "major_gridlines": {"visible": True, "line": {"color": "#D9D9D9"}}})
        chart.show_blanks_as("gap")


def _line_look(number: int, colour: str, is_cant: bool) -> dict[str, Any]:
    """Give the look of a series: of the cants the bounds are marks without a line."""
    if is_cant and number >= 2:
        return {
            "line": {"none": True},
            "marker": {
                "type": "long_dash",
                "size": 9,
                "border": {"color": colour},
                "fill": {"color": colour},
            },
        }
    if is_cant and number == 0:
        return {
            "line": {"color": "#7A7A7A", "width": 1.0, "dash_type": "dash"},
            "marker": {
                "type": "circle",
                "size": 5,
                "border": {"color": "#7A7A7A"},
                "fill": {"color": "white"},
            },
        }
    return {
        "line": {"color": colour, "width": 1.75},
        "marker": {"type": "circle", "size": 5, "border": {"color": colour}, "fill": {"color": colour}},
    }
