"""A small builder of SVG.

Every text is escaped, every number short. No style attribute is written (the page's policy forbids it):
colours and strokes come from the style sheet by class.
"""

from __future__ import annotations

from collections.abc import Iterable

from markupsafe import Markup, escape

Point = tuple[float, float]
Attribute = str | float | int | None


def number(value: float) -> str:
    """Give a coordinate with at most two decimals."""
    text = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if text in ("-0", "") else text


def points(path: Iterable[Point]) -> str:
    """Give the points of a polyline."""
    return " ".join(f"{number(x)},{number(y)}" for x, y in path)


def element(name: str, *content: str, **attributes: Attribute) -> Markup:
    """Give an element; ``class_`` is the class, ``_`` in other names is ``-``, None leaves an attribute out.

    Content that is not :class:`markupsafe.Markup` is escaped.
    """
    shown = []
    for key, value in attributes.items():
        if value is None:
            continue
        attribute = "class" if key == "class_" else key.replace("_", "-")
        text = number(value) if isinstance(value, float) else str(value)
        shown.append(f' {attribute}="{escape(text)}"')
    inside = "".join(str(escape(part)) for part in content)
    start = f"<{name}{''.join(shown)}"
    return Markup(f"{start}>{inside}</{name}>" if inside else f"{start}/>")  # noqa: S704 - escaped above


def group(*content: str, **attributes: Attribute) -> Markup:
    """Give a group of elements."""
    return element("g", *content, **attributes)


def line(start: Point, end: Point, class_: str, **attributes: Attribute) -> Markup:
    """Give a straight line."""
    return element(
        "line",
        x1=float(start[0]),
        y1=float(start[1]),
        x2=float(end[0]),
        y2=float(end[1]),
        class_=class_,
        **attributes,
    )


def polyline(path: Iterable[Point], class_: str) -> Markup:
    """Give an open polyline."""
    return element("polyline", points=points(path), class_=class_)


def polygon(path: Iterable[Point], class_: str) -> Markup:
    """Give a closed polygon."""
    return element("polygon", points=points(path), class_=class_)


def rectangle(x: float, y: float, width: float, height: float, class_: str, *content: str) -> Markup:
    """Give a rectangle."""
    return element(
        "rect", *content, x=float(x), y=float(y), width=float(width), height=float(height), class_=class_
    )


def words(x: float, y: float, text: str, class_: str = "", anchor: str = "start") -> Markup:
    """Give a line of text."""
    return element("text", text, x=float(x), y=float(y), class_=class_ or None, text_anchor=anchor)


MARKERS: tuple[str, ...] = ("circle", "square", "diamond", "triangle", "cross", "plus")


def marker(kind: int, at: Point, size: float, class_: str) -> Markup:
    """Give the marker of the n-th class: shapes differ, so that colour alone tells nothing."""
    x, y = at
    shape = MARKERS[kind % len(MARKERS)]
    if shape == "circle":
        return element("circle", cx=float(x), cy=float(y), r=float(size), class_=class_)
    if shape == "square":
        return rectangle(x - size, y - size, 2 * size, 2 * size, class_)
    if shape == "diamond":
        reach = 1.3 * size
        return polygon([(x, y - reach), (x + reach, y), (x, y + reach), (x - reach, y)], class_)
    if shape == "triangle":
        return polygon([(x, y - 1.2 * size), (x + 1.2 * size, y + size), (x - 1.2 * size, y + size)], class_)
    turned = ((-1, -1, 1, 1), (-1, 1, 1, -1)) if shape == "cross" else ((0, -1, 0, 1), (-1, 0, 1, 0))
    strokes = [
        line((x + a * size, y + b * size), (x + c * size, y + d * size), class_) for a, b, c, d in turned
    ]
    return group(*strokes)
