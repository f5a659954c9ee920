"""Notices about trains: tonnes in excess, trains that stand, restricted trains, time on the arc."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from cant.explaining.notices.notice import Notice, Record, Scene, most, on_curves, worst_class
from cant.planning.rules import Asked
from cant.planning.targets import traffic_weights
from cant.units import INCH_MM, KMH_PER_MS

COUNTS_AS_EXCESS_MM = {"metric": 10.0, "us": INCH_MM / 2}
"""Excess below this is within what cant in service varies by; own values."""
HIGH_CANT_MM = 100.0
"""From here on a train that stands is worth a word; own value, below the usual largest cant at platforms."""


def trains(scene: Scene) -> Iterator[Notice]:
    """Yield the notices about trains."""
    yield from _tonnes_in_excess(scene)
    yield from _standing(scene)
    yield from _restricted_in_excess(scene)
    yield from _time_on_arc(scene)


def _tonnes_in_excess(scene: Scene) -> Iterator[Notice]:
    line = scene.outcome.line
    counts = COUNTS_AS_EXCESS_MM["us" if scene.words.us else "metric"]
    moving = line.runs & (np.nan_to_num(scene.run) > 0)
    weight = traffic_weights(line, moving)
    total = weight.sum(axis=-1)
    with np.errstate(invalid="ignore"):
        over = scene.unbalance < -counts
    part = np.where(over, weight, 0.0).sum(axis=-1)
    share = np.divide(part, total, out=np.zeros_like(total), where=total > 0)
    column, excess = worst_class(-scene.unbalance, over & (weight > 0))
    found = np.flatnonzero(share > 0.5)
    if not len(found):
        return
    weighed = not (np.isnan(line.mass_t) & line.runs).any()
    what = "tonnes" if weighed else "trains"
    words = scene.words
    worst = most(found, share)
    yield Notice(
        "most-tonnes-in-excess",
        "advice",
        found,
        lambda i, _: (
            f"{words.share(share[i])} of the {what} run with more than {words.exact(counts)} "
            f"excess, "
            f"{scene.names[column[i]]} with {words.exact(excess[i])}."
        ),
        f"{on_curves(found)} most {what} run with more than {words.exact(counts)} cant "
        f"excess "
        f"({words.share(share[worst])} on {scene.label(worst)}): more cant would load the low rail further.",
    )


def _standing(scene: Scene) -> Iterator[Notice]:
    line, words = scene.outcome.line, scene.words
    standing = line.runs & (line.planned_kmh == 0)
    cant = np.nan_to_num(scene.outcome.cant_mm)
    found = np.flatnonzero(standing.any(axis=-1) & (cant >= HIGH_CANT_MM))
    if not len(found):
        return
    limit = Asked(line, np.nan_to_num(line.planned_kmh), True).limit("cant excess")
    column = standing.argmax(axis=-1)
    worst = most(found, cant)
    row = np.broadcast_to(limit.row, line.runs.shape)
    yield Notice(
        "stands-on-high-cant",
        "warning",
        found,
        lambda i, _: f"{scene.names[column[i]]} stands on {words.cant(cant[i])} of cant, all of it excess.",
        f"{on_curves(found)} trains stand on {words.cant(HIGH_CANT_MM)} of cant or more "
        f"({words.cant(cant[worst])} on {scene.label(worst)}).",
        lambda i, _: scene.clause(int(row[i, column[i]])),
    )


def _restricted_in_excess(scene: Scene) -> Iterator[Notice]:
    line, words = scene.outcome.line, scene.words
    with np.errstate(invalid="ignore"):
        slow = line.runs & (scene.run < line.planned_kmh - 1e-6) & (scene.unbalance < -1.0)
    column, excess = worst_class(-scene.unbalance, slow)
    found = np.flatnonzero(slow.any(axis=-1))
    if not len(found):
        return
    limit = Asked(line, np.nan_to_num(scene.run), False).limit("cant excess")
    value = np.broadcast_to(limit.value, line.runs.shape)
    row = np.broadcast_to(limit.row, line.runs.shape)
    at = np.arange(len(column))
    over = excess > value[at, column] + 1e-3

    def say(i: int, _: Record | None) -> str:
        k = column[i]
        against = f" against {words.exact(value[i, k])}" if np.isfinite(value[i, k]) else ""
        return (
            f"{scene.names[k]}, restricted to {words.speed(scene.run[i, k])}, has "
            f"{words.exact(excess[i])} excess{against}."
        )

    for part, severity in ((found[over[found]], "warning"), (found[~over[found]], "advice")):
        if len(part):
            kind = "over its limit" if severity == "warning" else "within its limit"
            yield Notice(
                "restricted-train-in-excess",
                "warning" if severity == "warning" else "advice",
                part,
                say,
                f"On {len(part)} curves a class that is restricted has cant excess there, {kind} "
                f"({words.exact(excess[most(part, excess)])} on {scene.label(most(part, excess))}).",
                lambda i, _: scene.clause(int(row[i, column[i]])),
            )


def _time_on_arc(scene: Scene) -> Iterator[Notice]:
    line, words = scene.outcome.line, scene.words
    if not line.table.has("curve length"):
        return
    run = np.nan_to_num(scene.run)
    limit = Asked(line, run, False).limit("curve length")
    wanted = np.broadcast_to(limit.value, line.runs.shape)
    with np.errstate(divide="ignore", invalid="ignore"):
        time = line.weight_length_m * KMH_PER_MS / run
        short = line.runs & (run > 0) & (time < wanted - 1e-3)
    column, _ = worst_class(-time, short)
    found = np.flatnonzero(short.any(axis=-1))
    if not len(found):
        return
    row = np.broadcast_to(limit.row, line.runs.shape)
    yield Notice(
        "curve-short-in-time",
        "advice",
        found,
        lambda i, _: (
            f"{scene.names[column[i]]} passes the arc of {words.length(line.weight_length_m[i, 0])} in "
            f"{time[i, column[i]]:.2f} s, less than {wanted[i, column[i]]:.2f} s."
        ),
        f"{len(found)} curves are passed in less time than the limits ask for.",
        lambda i, _: scene.clause(int(row[i, column[i]])),
    )
