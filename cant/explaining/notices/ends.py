"""Notices about the ends of curves: transitions not known or too short, ramps, jerk that excess makes."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from cant.explaining.notices.notice import (
    BoolArray,
    FloatArray,
    Notice,
    Record,
    Scene,
    most,
    on_curves,
    worst_class,
)
from cant.planning.needed import end_figures
from cant.planning.neighbours import AFTER, BEFORE
from cant.planning.rules import Asked
from cant.planning.shared import Meeting, SharedAsked
from cant.quantities.kinematics import equilibrium_cant
from cant.units import KMH_PER_MS

_SLACK_M = 0.05


def ends(scene: Scene) -> Iterator[Notice]:
    """Yield the notices about the ends of curves."""
    yield from _unknown(scene)
    yield from _lengths(scene)
    yield from _excess_on_straight(scene)
    yield from _jerk(scene)


def _either(scene: Scene, where: BoolArray, curve: int) -> str:
    """Say which ends, of a mask (2, n)."""
    return " and ".join(sorted(scene.side(end, curve) for end in (BEFORE, AFTER) if where[end, curve]))


def _unknown(scene: Scene) -> Iterator[Notice]:
    outcome = scene.outcome
    beyond = outcome.neighbourhood
    where = np.stack([np.isnan(outcome.line.transition_m[end][:, 0]) for end in (BEFORE, AFTER)])
    where = where & ~beyond.shared & outcome.planned
    found = np.flatnonzero(where.any(axis=0))
    if len(found):
        yield Notice(
            "transition-not-known",
            "advice",
            found,
            lambda i, _: f"Transition {_either(scene, where, i)} not known: its rates are not checked.",
            f"{on_curves(found)} a transition is not known: neither its rates nor its gradient are "
            f"checked; "
            "each reason says what length the proposed cant needs.",
            whole_severity="warning",
        )


def _lengths(scene: Scene) -> Iterator[Notice]:
    outcome, words = scene.outcome, scene.words
    figures = end_figures(outcome.line, outcome.pairs, outcome.cant_mm, np.nan_to_num(scene.run))
    length = np.stack([f.length_m for f in figures])
    needed = np.stack([np.fmax(f.ramp_needed_m, f.transition_needed_m) for f in figures])
    stated = np.stack([f.ramp_m for f in figures])
    beyond = outcome.neighbourhood
    with np.errstate(invalid="ignore"):
        # A ramp of its own is measured by the ramp that it has.
        own = np.stack([f.ramp_needed_m > f.ramp_m + _SLACK_M for f in figures])
        own |= np.stack([f.transition_needed_m > f.length_m + _SLACK_M for f in figures])
        short = (length > 0) & own & outcome.planned
        room = beyond.ramp_room_m
        ramp = np.stack([f.ramp_needed_m for f in figures])
        has = np.where(np.isnan(stated), room, stated)
        cramped = beyond.on_straight & (ramp > has + _SLACK_M) & outcome.planned
    yield from _short(scene, "transition-short", short, needed, length, "Transition", "the transition")
    yield from _short(
        scene, "ramp-room-short", cramped, ramp, has, "Cant ramp on the straight", "the cant ramp"
    )
    no_room = beyond.on_straight & np.isnan(has) & (np.nan_to_num(ramp) > 0) & outcome.planned
    found = np.flatnonzero(no_room.any(axis=0))
    if len(found):

        def say(i: int, _: Record | None) -> str:
            longest = float(np.nanmax(np.where(no_room[:, i], ramp[:, i], np.nan)))
            return (
                f"No transition {_either(scene, no_room, i)}: the cant ramp lies on the straight and needs "
                f"{words.length(longest)}; how much straight there is, is not known."
            )

        yield Notice("ramp-room-not-known", "advice", found, say)


def _short(
    scene: Scene,
    code: str,
    where: BoolArray,
    needed: FloatArray,
    has: FloatArray,
    name: str,
    thing: str,
) -> Iterator[Notice]:
    words = scene.words
    found = np.flatnonzero(where.any(axis=0))
    if not len(found):
        return
    lacking = np.where(where, needed - has, 0.0).max(axis=0)
    worst = most(found, lacking)

    def say(i: int, _: Record | None) -> str:
        parts = [
            f"{name} {scene.side(end, i)}: {words.length(has[end, i])}, at planned speeds "
            f"{words.length(needed[end, i])} needed."
            for end in (BEFORE, AFTER)
            if where[end, i]
        ]
        return " ".join(parts)

    yield Notice(
        code,
        "advice" if code == "transition-short" else "warning",
        found,
        say,
        f"{on_curves(found)} {thing} is shorter than planned speeds need with the proposed cant, by up "
        f"to "
        f"{words.length(lacking[worst])} on {scene.label(worst)}.",
    )


def _excess_on_straight(scene: Scene) -> Iterator[Notice]:
    """Where the ramp lies on the straight, its whole cant is excess there."""
    outcome, words = scene.outcome, scene.words
    line = outcome.line
    limit = Asked(line, np.nan_to_num(scene.run), False).limit("cant excess")
    value = np.broadcast_to(limit.value, line.runs.shape)
    cant = np.nan_to_num(scene.cant)
    over = line.regular & (cant > value + 1e-3)
    ramp = outcome.neighbourhood.on_straight & outcome.planned
    column, _ = worst_class(cant - value, over)
    found = np.flatnonzero(over.any(axis=-1) & ramp.any(axis=0))
    if len(found):
        row = np.broadcast_to(limit.row, line.runs.shape)
        yield Notice(
            "excess-on-straight",
            "warning",
            found,
            lambda i, _: (
                f"No transition {_either(scene, ramp, i)}: the ramp lies on the straight, where its "
                f"{words.cant(cant[i, 0])} are excess, over the {words.exact(value[i, column[i]])} of "
                f"{scene.names[column[i]]}."
            ),
            f"{on_curves(found)} the cant ramp lies on the straight with more cant than the excess "
            f"limit, up "
            f"to {words.cant(cant[most(found, cant[:, 0]), 0])}.",
            lambda i, _: scene.clause(int(row[i, column[i]])),
        )


def _jerk(scene: Scene) -> Iterator[Notice]:
    """Rates of change of what is unbalanced, excess counted, over the limit of the rate of deficiency."""
    line, words = scene.outcome.line, scene.words
    run = np.nan_to_num(scene.run)
    limit = np.broadcast_to(
        Asked(line, run, False).limit("rate of change of cant deficiency").value, line.runs.shape
    ).copy()
    rate = np.zeros(line.runs.shape)
    excess = np.nan_to_num(np.maximum(-scene.unbalance, 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        for end in (BEFORE, AFTER):
            length = line.transition_m[end]
            here = line.factor * excess * run / (KMH_PER_MS * length)
            rate = np.maximum(rate, np.where(length > 0, here, 0.0))
    over = line.runs & (rate > limit + 1e-3)
    _put_shared(scene, over, rate, limit)
    column, _ = worst_class(rate, over)
    found = np.flatnonzero(over.any(axis=-1) & scene.outcome.planned)
    if len(found):
        at = np.arange(len(column))
        yield Notice(
            "jerk-of-excess",
            "advice",
            found,
            lambda i, _: (
                f"Excess of {scene.names[column[i]]} builds up at "
                f"{words.measured('rate', rate[i, column[i]])}, faster than the "
                f"{words.measured('rate', limit[i, column[i]])} that deficiency may."
            ),
            f"{on_curves(found)} excess builds up faster than deficiency may, up to "
            f"{words.measured('rate', float(rate[at, column][found].max()))}: felt as jerk, and bound by "
            f"no limit.",
        )


def _put_shared(scene: Scene, over: BoolArray, rate: FloatArray, limit: FloatArray) -> None:
    """Add shared transitions: the signed change of all that is unbalanced, where excess has a part in it."""
    pairs = scene.outcome.pairs
    if not len(pairs):
        return
    meeting = Meeting.of(scene.outcome.line, pairs)
    run = np.nan_to_num(np.minimum(scene.run[pairs.first], scene.run[pairs.second]))
    parts = [
        side.hand * (equilibrium_cant(run, side.radius_m, side.constant) - scene.cant[own])
        for side, own in ((meeting.before, pairs.first), (meeting.after, pairs.second))
    ]
    counted = [
        side.hand * np.maximum(side.hand * part, 0.0)
        for side, part in zip((meeting.before, meeting.after), parts, strict=True)
    ]
    with np.errstate(divide="ignore", invalid="ignore"):
        scale = meeting.factor * run / (KMH_PER_MS * meeting.length_m)
        whole, known = np.abs(parts[0] - parts[1]) * scale, np.abs(counted[0] - counted[1]) * scale
        allowed = np.broadcast_to(
            SharedAsked(meeting, run, False).limit("rate of change of cant deficiency").value, run.shape
        )
        worse = meeting.both & (meeting.length_m > 0) & (whole > allowed + 1e-3) & (whole > known + 1e-3)
    for own in (pairs.first, pairs.second):
        stronger = worse & (whole > rate[own])
        rate[own] = np.where(stronger, whole, rate[own])
        limit[own] = np.where(stronger, allowed, limit[own])
        over[own] |= worse
