"""Where the rules over an end to a straight fail: what the live permissible speed takes from the ends."""

from __future__ import annotations

import numpy as np

from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray
from cant.writing.book.ledger import BoolArray, token
from cant.writing.book.limit_lookup import Asking
from cant.writing.book.speed_search import NEVER, SpeedSearch, cant_rate, deficiency_rate, jump


def add_failing(
    basis: Basis, build: Builder, rows: EndRows, planned_kmh: FloatArray
) -> tuple[FloatArray, BoolArray]:
    """Add where the curve's own rules over the end fail: the first multiple, and the planned speed.

    Parameters
    ----------
    basis : Basis
    build : Builder
    rows : EndRows
    planned_kmh : ndarray
        Of each row.

    Returns
    -------
    tuple of ndarray
        First multiple of the speed step that fails [km/h], inf where none does, and whether the planned speed
        fails.
    """
    chosen = basis.chosen
    first = chosen.pos[rows.entry]
    search = SpeedSearch(basis, chosen.last_tier)
    radius = chosen.line.radius_m[first, 0]
    cant = chosen.cant_mm[first]
    cells = (basis.ref("D 1", "cant exact"), basis.ref("R 1", "radius"), basis.ref("L", "length"))
    ramped, long, none = rows.ramp_m > 0, rows.length_m > 0, rows.length_m == 0
    alone = ~rows.shared
    asking = Asking(
        token("Vp"), token("R 1"), token("category 1"), token("situation 1"), token("last tier 1")
    )
    rules = (
        (
            cant_rate(f"ABS({cells[0]})", basis.ref("Lr", "length"), np.abs(cant), rows.ramp_m, rows.factor),
            ramped,
            f"N({token('Lr')})>0",
        ),
        (
            deficiency_rate(cells, basis, (cant, radius, rows.length_m, rows.factor)),
            long,
            f"N({token('L')})>0",
        ),
        (jump(cells[1], basis, radius), none, f"AND(ISNUMBER({token('L')}),{token('L')}=0)"),
    )
    step = chosen.step_kmh[rows.entry]
    failing = np.full(len(rows), np.inf)
    broken = np.zeros(len(rows), dtype=np.bool_)
    failing_texts, broken_texts = [], []
    for critical, there, condition in rules:
        here = there & alone
        failing = np.minimum(failing, search.failing(critical, rows.entry, step, here))
        broken |= search.broken(critical, rows.entry, planned_kmh, here)
        text = search.failing_text(critical, asking, token("step 1"))
        failing_texts.append(f"IF({condition},{text},{NEVER:.0f})")
        broken_texts.append(f"IF({condition},{search.broken_text(critical, asking)},0)")
    build.computed(
        "fails",
        "First multiple of the speed step at which a rate fails",
        "V",
        np.where(alone, search.shown(failing), np.nan),
        "speed exact",
        [(f"MIN({','.join(failing_texts)})", alone)],
        "last tier allowed; to a straight",
    )
    build.computed(
        "broken",
        "Planned speed fails here: 1 yes",
        "",
        np.where(alone, broken.astype(np.float64), np.nan),
        "count",
        [(f"MAX({','.join(broken_texts)})", alone)],
        "last tier allowed; to a straight",
    )
    return failing, broken
