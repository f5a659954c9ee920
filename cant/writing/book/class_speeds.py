"""The speeds of the sheet "Calculation by class", planned, permissible and run, and the weight of a class.

Apart from the rest of that sheet because the permissible speed is finished last, when the ends are there.
"""

from __future__ import annotations

import numpy as np

from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray
from cant.writing.book.ledger import FORMULA, BoolArray, Ledger, token
from cant.writing.book.limit_lookup import Asking
from cant.writing.book.speed_search import SpeedSearch, deficiency, felt, permissible
from cant.writing.columns import Cell, governing_text


class ClassSpeeds:
    """Builds the columns; the line speed of the curve is named ``c.V line`` in the ledger already.

    Parameters
    ----------
    basis : Basis
    build : Builder
    """

    def __init__(self, basis: Basis, build: Builder) -> None:
        self._basis = basis
        self._chosen = basis.chosen
        self._ledger = build.ledger
        self._build = build

    def make(self) -> None:
        """Add the columns."""
        chosen, build = self._chosen, self._build
        curves = chosen.plan.curves
        names = chosen.plan.traffic.class_names
        at = chosen.curves[chosen.pos]
        stated = np.full(len(at), np.nan)
        for k, name in enumerate(names):
            given = curves.class_speeds.get(name)
            if given is not None:
                here = chosen.column == k
                stated[here] = given[at[here]]
        build.number("V stated", "Speed stated for the class here", "V", stated, "speed exact")
        own, general = token("V stated"), f"MIN({token('t.speed')},{token('c.V line')})"
        text = f"IF(ISNUMBER({own}),{own},{general})"
        build.computed(
            "V planned",
            "Planned speed",
            "V",
            chosen.planned_kmh,
            "speed exact",
            text,
            "as stated here, else the lower of Traffic used and line speed",
        )
        self._search()
        lowest = (
            f'IF(ISNUMBER({token("V permissible")}),MIN({token("V planned")},{token("V permissible")}),"")'
        )
        build.computed(
            "V run",
            "Run speed",
            "V",
            chosen.run_kmh,
            "speed exact",
            lowest,
            "lower of planned and permissible",
        )
        by: list[Cell] = []
        for number, record in enumerate(chosen.records):
            entries = record["permissible_by"] if record is not None else []
            count = int(chosen.start[number + 1] - chosen.start[number])
            by += [governing_text(entry) for entry in entries] or [None] * count
        build.words("V by", "Permissible speed ends by", by, 44.0)
        self._weight()

    def _search(self) -> None:
        """Add the permissible speed by the class's rules on the curve and over its ends."""
        chosen, build, basis = self._chosen, self._build, self._basis
        build.number("step", "Speed step", "", chosen.step_kmh, "speed exact", "limits, else 5 km/h")
        line = chosen.line
        cant, radius = chosen.of_curve(chosen.cant_mm), chosen.of_curve(line.radius_m)
        cells = (basis.ref("D", "cant exact"), basis.ref("R", "radius"))
        rules = [deficiency(*cells, basis, cant, radius)]
        if basis.limits.has("felt acceleration"):
            rules.append(felt(*cells, token("roll"), basis, (cant, radius, chosen.of_class(line.roll))))
        search = SpeedSearch(basis, chosen.last_tier)
        asking = Asking(
            token("V planned"), token("R"), token("category"), token("situation"), token("last tier")
        )
        every = np.arange(len(chosen.pos))
        self._failing = np.full(len(every), np.inf)
        self._broken = np.zeros(len(every), dtype=np.bool_)
        for rule in rules:
            self._failing = np.minimum(self._failing, search.failing(rule, every, chosen.step_kmh))
            self._broken |= search.broken(rule, every, chosen.planned_kmh)
        build.computed(
            "fails",
            "First multiple of the speed step at which deficiency or felt acceleration fails",
            "V",
            search.shown(self._failing),
            "speed exact",
            f"MIN({','.join(search.failing_text(rule, asking, token('step')) for rule in rules)})",
            "last tier allowed",
        )
        build.computed(
            "broken",
            "Planned speed fails on the curve: 1 yes",
            "",
            self._broken.astype(np.float64),
            "count",
            f"MAX({','.join(search.broken_text(rule, asking) for rule in rules)})",
            "last tier allowed",
        )
        build.number(
            "V permissible", "Permissible speed", "V_max", chosen.permissible_kmh, "speed exact", "", "fixed"
        )
        build.words("V basis", "Permissible speed is", [None] * len(every), 25.0)

    def join_ends(self, ends: Ledger, rows: EndRows, failing: FloatArray, broken: BoolArray) -> None:
        """Make the permissible speed live where the rules of curve and ends alone give the plan's speed.

        Parameters
        ----------
        ends : Ledger
        rows : EndRows
        failing, broken : ndarray
            Of each row of the ends: first failing multiple [km/h], and whether the planned speed fails.
        """
        chosen = self._chosen
        first = np.searchsorted(rows.entry, np.arange(len(chosen.pos)))
        stop = np.searchsorted(rows.entry, np.arange(len(chosen.pos)), side="right")
        total, fails = self._failing.copy(), self._broken.copy()
        np.minimum.at(total, rows.entry, failing)
        np.logical_or.at(fails, rows.entry, broken)
        own = permissible(total, chosen.step_kmh, chosen.planned_kmh, fails)
        live = np.abs(own - chosen.permissible_kmh) < 1e-6
        for key in ("fails", "broken"):
            self._ledger.refer(f"e.{key} from", ends.address(key), (ends.first_row + first).tolist())
            self._ledger.refer(f"e.{key} to", f"${ends.letter(key)}$", (ends.first_row + stop - 1).tolist())
        shared = np.zeros(len(chosen.pos), dtype=np.bool_)
        shared[rows.entry[rows.shared]] = True
        shared[rows.other[rows.shared]] = True
        basis_words = np.where(
            live, np.where(shared, "live but for shared ends", "live"), "fixed by the plan"
        )
        texts: list[tuple[str, BoolArray | None]] = []
        for ended in (True, False):
            where = live & ((stop > first) == ended)
            texts.append((self._permissible_text(ended), where))
        column = next(c for c in self._ledger.columns if c.key == "V permissible")
        column.formulas, column.kind = texts, FORMULA
        column.source = (
            "first failing multiple less one step, at most 400 km/h; the planned speed where it keeps all"
        )
        column.number_format = "0.0"
        next(c for c in self._ledger.columns if c.key == "V basis").values = basis_words.tolist()

    def _permissible_text(self, ended: bool) -> str:
        fails, broken = token("fails"), token("broken")
        if ended:
            spans = {key: f"{token(f'e.{key} from')}:{token(f'e.{key} to')}" for key in ("fails", "broken")}
            fails, broken = f"MIN({fails},{spans['fails']})", f"MAX({broken},{spans['broken']})"
        step = token("step")
        fastest = self._basis.inputs.shown("400", "speed exact")
        multiple = f"MIN({fails}-{step},INT({fastest}/{step}+0.000000001)*{step})"
        return f"IF({broken}=1,{multiple},MAX({multiple},{token('V planned')}))"

    def _weight(self) -> None:
        """Add the weight in the rms speed; by which rule it is weighed is fixed for each curve."""
        chosen, line = self._chosen, self._chosen.line
        moving = line.runs & (np.nan_to_num(line.planned_kmh) > 0)
        no_mass = (moving & np.isnan(line.mass_t)).any(axis=-1)
        no_trains = (moving & np.isnan(line.trains)).any(axis=-1)
        by_mass = np.nan_to_num(np.where(moving, line.trains * line.mass_t, 0.0)).sum(axis=-1) > 0
        by_train = np.nan_to_num(np.where(moving, line.trains, 0.0)).sum(axis=-1) > 0
        alike = no_trains | np.where(no_mass, ~by_train, ~by_mass)
        rule = np.where(alike, 2, np.where(no_mass, 1, 0))[chosen.pos]
        trains, mass = (chosen.of_class(array) for array in (line.trains, line.mass_t))
        moves = chosen.planned_kmh > 0
        masses = mass * self._basis.inputs.display["mass"].factor
        weight = np.where(moves, np.select([rule == 0, rule == 1], [trains * masses, trains], 1.0), 0.0)
        there = f"IF({token('V planned')}>0,"
        self._build.computed(
            "w",
            "Weight in the rms speed",
            "n m",
            [float(w) for w in np.nan_to_num(weight)],
            "",
            [
                (f"{there}{token('t.trains')}*{token('t.mass')},0)", rule == 0),
                (f"{there}{token('t.trains')}*1,0)", rule == 1),
                (f"{there}1,0)", rule == 2),
            ],
            "trains times mass; trains alone or all alike where the table has gaps",
        )
        self._ledger.columns[-1].number_format = "0"
