"""Notices about track: what a change of cant moves, tracks beside each other, turnouts, today's cant."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from cant.explaining.notices.notice import FloatArray, Notice, Record, Scene, most, on_curves
from cant.explaining.wording import governing_words
from cant.model.limits import LimitRow
from cant.planning.branches import TURNOUT
from cant.planning.outcome import BREAKS
from cant.planning.rules import Asked
from cant.quantities.lifting import lateral_shift
from cant.quantities.turnouts import branch_cant

PLATFORM_EDGE_M = 0.915
CONTACT_WIRE_M = 5.0
"""Heights above the rail [m] at which a change of cant is told; usual values of the trade, not limits."""
WORTH_TELLING_MM = 50.0
"""Movement at contact-wire height from which on it is told: 15 mm of cant on standard gauge."""
ADJACENT_MM = 10.0
"""Difference of cant between tracks from which on it is told; own value."""


def track(scene: Scene) -> Iterator[Notice]:
    """Yield the notices about track."""
    yield from _reduction(scene)
    yield from _today(scene)
    yield from _movement(scene)
    yield from _adjacent(scene)
    yield from _turnouts(scene)
    yield from _branches(scene)
    yield from _ceiling(scene)


def _reduction(scene: Scene) -> Iterator[Notice]:
    words = scene.words
    with np.errstate(invalid="ignore"):
        found = np.flatnonzero(scene.change < -1e-3)
    if len(found):
        yield Notice(
            "cant-comes-down",
            "advice",
            found,
            lambda i, _: f"Cant comes down by {words.cant(-scene.change[i])}: speed before track.",
            f"{on_curves(found)} cant comes down, by up to {words.cant(-scene.change[found].min())}: "
            f"lower "
            "the speed, or show that today's speed keeps its limits with less cant, before the track is "
            "changed.",
            whole_severity="warning",
        )


def _today(scene: Scene) -> Iterator[Notice]:
    found = np.flatnonzero(scene.outcome.today == BREAKS)
    if not len(found):
        return

    def say(_: int, record: Record | None) -> str:
        breaks = record["today"]["breaks"] if record else []
        if not breaks:
            return "Today's cant breaks a limit."
        first, words = breaks[0], scene.words
        more = f", and {len(breaks) - 1} more" if len(breaks) > 1 else ""
        return (
            f"Today's cant breaks {governing_words({**first, 'clause': None})}: "
            f"{words.limited(first['quantity'], first['value'])} against "
            f"{words.limited(first['quantity'], first['limit'])}{more}."
        )

    yield Notice(
        "today-breaks-limits",
        "warning",
        found,
        say,
        f"{on_curves(found)} today's cant breaks a limit at the planned speeds.",
        _clause_of_today,
    )


def _clause_of_today(_: int, record: Record | None) -> str:
    breaks = record["today"]["breaks"] if record else []
    return str(breaks[0]["clause"] or "") if breaks else ""


def _movement(scene: Scene) -> Iterator[Notice]:
    outcome, words = scene.outcome, scene.words
    change = np.nan_to_num(scene.change)
    wire = np.asarray(lateral_shift(change, CONTACT_WIRE_M, outcome.line.spacing_mm))
    edge = np.asarray(lateral_shift(change, PLATFORM_EDGE_M, outcome.line.spacing_mm))
    platform = np.array(["platform" in words_ for words_ in outcome.curves.situations], dtype=np.bool_)

    def way(value: float) -> str:
        return "inwards" if value > 0 else "outwards"

    for code, shift, where, height, what in (
        ("movement-at-platform", edge, platform & (np.abs(change) > 0.5), PLATFORM_EDGE_M, "platform"),
        ("movement-at-contact-wire", wire, np.abs(wire) >= WORTH_TELLING_MM, CONTACT_WIRE_M, "contact-wire"),
    ):
        found = np.flatnonzero(where)
        if not len(found):
            continue
        worst = most(found, np.abs(shift))
        name = f"{what} height, {words.measured('height', height)}"
        yield Notice(
            code,
            "warning" if what == "platform" else "advice",
            found,
            _movement_words(scene, shift, name),
            f"{on_curves(found)} the change of cant moves vehicles sideways at {name} above the rail, "
            f"by up to "
            f"{words.movement(abs(shift[worst]))} {way(shift[worst])} on {scene.label(worst)}: clearances "
            f"to be "
            "confirmed.",
        )


def _movement_words(scene: Scene, shift: FloatArray, name: str) -> Callable[[int, Record | None], str]:
    def say(i: int, _: Record | None) -> str:
        way = "inwards" if shift[i] > 0 else "outwards"
        return f"At {name}: {scene.words.movement(abs(shift[i]))} {way}."

    return say


def _adjacent(scene: Scene) -> Iterator[Notice]:
    """Compare the cants of arcs that lie beside each other on tracks of one line, of the same hand."""
    outcome, words = scene.outcome, scene.words
    curves, cant = outcome.curves, outcome.cant_mm
    low, high = np.fmin(curves.start_km, curves.end_km), np.fmax(curves.start_km, curves.end_km)
    lines: dict[str, list[int]] = {}
    for i in np.flatnonzero(~np.isnan(low + high + cant)).tolist():
        lines.setdefault(curves.line[i], []).append(i)
    beside: dict[int, tuple[int, float]] = {}
    for members in lines.values():
        if len({curves.track[i] for i in members}) < 2:
            continue
        members.sort(key=lambda i: low[i])
        active: list[int] = []
        for i in members:
            active = [j for j in active if high[j] > low[i]]
            for j in active:
                difference = abs(cant[i] - cant[j])
                if curves.track[i] == curves.track[j] or curves.hand[i] != curves.hand[j]:
                    continue
                if difference < ADJACENT_MM:
                    continue
                for one, other in ((i, j), (j, i)):
                    if one not in beside or beside[one][1] < difference:
                        beside[one] = (other, float(difference))
            active.append(i)
    if not beside:
        return
    found = np.array(sorted(beside), dtype=np.int64)
    worst = max(beside, key=lambda i: beside[i][1])
    yield Notice(
        "cant-differs-beside",
        "advice",
        found,
        lambda i, _: f"{words.cant(beside[i][1])} different from {scene.label(beside[i][0])} beside it.",
        f"{len(found)} curves have another cant than the curve of the track beside them, by up to "
        f"{words.cant(beside[worst][1])} ({scene.label(worst)}): clearance between vehicles to be confirmed.",
    )


def _turnouts(scene: Scene) -> Iterator[Notice]:
    outcome = scene.outcome
    marked = np.array([TURNOUT in words for words in outcome.curves.situations], dtype=np.bool_)
    branches = outcome.line.branches
    known = branches.there.any(axis=-1) if branches is not None else np.zeros(len(marked), dtype=np.bool_)
    found = np.flatnonzero(marked & ~known & outcome.planned)
    if len(found):
        yield Notice(
            "branch-not-checked",
            "warning",
            found,
            lambda i, _: "A turnout lies here whose branch is not known: it is not checked.",
            f"{on_curves(found)} a turnout lies whose branch is not checked: the table Turnouts says "
            f"nothing "
            "of it.",
        )


def _branches(scene: Scene) -> Iterator[Notice]:
    """Say what the branches of turnouts have at the proposed cant."""
    outcome, words = scene.outcome, scene.words
    branches = outcome.line.branches
    if branches is None:
        return
    lies = np.asarray(branch_cant(branches.sense, np.nan_to_num(scene.cant)))
    unbalance = branches.needed_mm - lies
    limits = {
        name: branches.limit(outcome.line.table, f"cant {name}", outcome.settings.allows_exceptional)
        for name in ("deficiency", "excess")
    }

    def say(i: int, _: Record | None) -> str:
        parts = []
        for j in np.flatnonzero(branches.there[i]):
            turnout = outcome.turnouts[int(branches.number[i, j])]
            kind = "deficiency" if unbalance[i, j] >= 0 else "excess"
            limit = limits[kind].value[i, j]
            against = f" of {words.exact(limit)}" if np.isfinite(limit) else ", which nothing limits"
            negative = f"on {words.cant(-lies[i, j])} of negative cant, " if lies[i, j] < -1e-6 else ""
            parts.append(
                f"Branch of turnout {turnout.name or j + 1} at {words.speed(turnout.branch_speed_kmh)}: "
                f"{negative}"
                f"{words.exact(abs(unbalance[i, j]))} {kind}{against}."
            )
        return " ".join(parts)

    found = np.flatnonzero(branches.there.any(axis=-1) & outcome.planned)
    if len(found):
        yield Notice("branch", "advice", found, say)


def _ceiling(scene: Scene) -> Iterator[Notice]:
    outcome, words = scene.outcome, scene.words
    rows = outcome.limits.rows
    if outcome.settings.maintenance_allowance_mm is not None or not any(map(_is_ceiling, rows)):
        return
    line = outcome.line
    limit = Asked(line, line.planned_kmh, outcome.settings.allows_exceptional).limit("cant")
    row = np.broadcast_to(limit.row, line.runs.shape)
    ceilings = np.array([_is_ceiling(r) for r in rows] + [False])
    rests = (ceilings[row] & line.runs).any(axis=-1) & outcome.planned
    found = np.flatnonzero(rests)
    if len(found):
        clause = next(r.clause for r in rows if _is_ceiling(r))
        highest = float(np.nanmax(outcome.cant_mm[found]))
        yield Notice(
            "ceiling-without-allowance",
            "warning",
            found[:0],
            lambda i, _: "",
            f"{on_curves(found)} the cant rests on a value that track in service may not pass"
            f"{' (' + clause + ')' if clause else ''}, and no maintenance allowance is set: cants of up to "
            f"{words.cant(highest)} leave no room for how track moves.",
            of_plan=True,
        )


def _is_ceiling(row: LimitRow) -> bool:
    return row.quantity == "cant" and row.kind == "ceiling"
