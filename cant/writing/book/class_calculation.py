"""The sheet "Calculation by class": what each class has on each curve, and the bounds that it sets there."""

from __future__ import annotations

import numpy as np

from cant.quantities import bounds, kinematics
from cant.quantities.catalogue import CATALOGUE
from cant.quantities.loads import wheel_load_shift
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray, share, share_text
from cant.writing.book.ledger import FORMULA, BoolArray, Ledger, token
from cant.writing.book.limits_sheet import Asking, kind_of
from cant.writing.book.speed_search import SpeedSearch, deficiency, felt, permissible
from cant.writing.columns import Cell, governing_text

_RUN = Asking(token("V run"), token("R"), token("category"), token("situation"), "1")
_PLANNED = Asking(token("V planned"), token("R"), token("category"), token("situation"), token("tier"))
_LIMITS = (("cant deficiency", "I"), ("cant excess", "E"), ("felt acceleration", "a_felt"))


class ClassCalculation:
    """Builds the columns; the curve's own cells are named ``c.KEY`` in the ledger already.

    Parameters
    ----------
    basis : Basis
    ledger : Ledger
    """

    def __init__(self, basis: Basis, ledger: Ledger) -> None:
        self._basis = basis
        self._chosen = basis.chosen
        self._ledger = ledger
        self._build = Builder(basis, ledger)

    def make(self) -> None:
        """Add every column."""
        self._names()
        self._inputs()
        self._speeds()
        self._bounds()
        self._at_run_speed()

    def _names(self) -> None:
        chosen, curves, names = self._chosen, self._chosen.plan.curves, self._chosen.plan.traffic.class_names
        at = chosen.curves[chosen.pos].tolist()
        for key, heading, column, width in (
            ("line", "Line", curves.line, 20.0),
            ("track", "Track", curves.track, 7.0),
            ("curve", "Curve", curves.curve, 9.0),
        ):
            self._build.words(key, heading, [column[i] for i in at], width)
        self._build.words("class", "Class", [names[k] for k in chosen.column.tolist()], 14.0)
        rows = self._traffic_rows(at)
        for key in ("category", "speed", "trains", "mass", "roll", "height"):
            self._ledger.refer(f"t.{key}", self._basis.traffic.column(key), rows)

    def _traffic_rows(self, at: list[int]) -> list[int]:
        curves, sheet = self._chosen.plan.curves, self._basis.traffic
        names = self._chosen.plan.traffic.class_names
        self._trains = [
            sheet.train(curves.line[i], curves.track[i], names[k])
            for i, k in zip(at, self._chosen.column.tolist(), strict=True)
        ]
        return [sheet.row_of(train) for train in self._trains]

    def _inputs(self) -> None:
        chosen, build, line = self._chosen, self._build, self._chosen.line
        build.computed(
            "category",
            "Category",
            "",
            [train.category for train in self._trains],
            "",
            token("t.category"),
            "Traffic used",
        )
        for key, heading, symbol, values, kind in (
            ("R", "Radius", "R", line.radius_m, "radius"),
            ("D", "Chosen cant", "D", chosen.cant_mm, "cant exact"),
        ):
            self._ledger.refer(f"from {key}", f"{self._curve_sheet(key)}", self._curve_rows)
            build.refer(key, heading, symbol, chosen.of_curve(values), kind)
        for key, heading, numbers in (
            ("situation", "Situation no.", self.situation_numbers),
            ("tier", "Limits: 1 normal, 2 exceptional", chosen.tier + 1.0),
            ("last tier", "Last tier allowed: 1 normal, 2 exceptional", chosen.last_tier + 1.0),
        ):
            self._ledger.refer(f"from {key}", f"{self._curve_sheet(key)}", self._curve_rows)
            build.refer(key, heading, "", chosen.of_curve(np.asarray(numbers, dtype=np.float64)), "count")
        build.computed(
            "roll",
            "Roll coefficient",
            "s",
            chosen.of_class(line.roll),
            "number",
            f'IF(ISNUMBER({token("t.roll")}),{token("t.roll")},"")',
            "Traffic used",
        )
        binds = ["yes" if flag else "no" for flag in chosen.of_class(line.regular)]
        build.words("regular", "Excess binds", binds, 8.0)

    def set_curve_sheet(self, curves: Ledger, situation_numbers: FloatArray) -> None:
        """Tell where the curves stand."""
        self._curves = curves
        self.situation_numbers = situation_numbers
        first = curves.first_row
        self._curve_rows = [first + int(p) for p in self._chosen.pos]

    def _curve_sheet(self, key: str) -> str:
        return self._curves.address(key)

    def _speeds(self) -> None:
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
        self._ledger.refer("c.V line", self._curve_sheet("V line"), self._curve_rows)
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

    def _limit(self, quantity: str, key: str, planned: bool) -> FloatArray:
        """Add the strictest limit of a quantity, and give it [canonical]."""
        chosen, kind = self._chosen, kind_of(quantity)
        limit = (
            chosen.tier_limit(quantity, chosen.planned_kmh)
            if planned
            else chosen.limit(quantity, chosen.run_kmh, False)
        )
        asking = _PLANNED if planned else _RUN
        words = "at planned speed, in the tier of the curve" if planned else "normal, at run speed"
        self._build.computed(
            key,
            f"Limit of {quantity}, {words}",
            "lim",
            self._build.shown(limit.value, kind),
            kind,
            self._basis.limits.value(quantity, asking),
            "Limits used: strictest row that holds",
        )
        if not planned:
            self._build.computed(
                f"clause {key}",
                "Clause",
                "",
                self._chosen.clauses(limit),
                "",
                self._basis.limits.clause(quantity, asking, token(key)),
                "of that row",
                16.0,
            )
        return limit.value

    def _bounds(self) -> None:
        chosen, build, basis = self._chosen, self._build, self._basis
        balance = chosen.balance(chosen.planned_kmh)
        build.catalogued(
            "DEQ planned",
            "equilibrium_cant",
            balance,
            "cant exact",
            heading="Equilibrium cant at planned speed",
            C=basis.C,
            V=basis.ref("V planned", "speed exact"),
            R=basis.ref("R", "radius"),
        )
        self._limit("cant", "up D", True)
        deficiency = self._limit("cant deficiency", "I lim", True)
        self._bound("low I", "least_cant_for_deficiency", balance, deficiency, "I_lim", "I lim")
        excess = self._limit("cant excess", "E lim", True)
        self._bound("up E", "most_cant_for_excess", balance, excess, "E_lim", "E lim", regular=True)
        felt = self._limit("felt acceleration", "a lim", True)
        if not basis.limits.has("felt acceleration"):
            return
        roll = chosen.of_class(chosen.line.roll)
        room = bounds.unbalance_for_felt_acceleration(felt, roll, chosen.line.spacing_mm)
        text = CATALOGUE["unbalance_for_felt_acceleration"].text(
            a_lim=token("a lim"), s=token("roll"), e=basis.e, g=basis.g
        )
        room_shown = basis.inputs.shown(text, "cant exact")
        finite = np.isfinite(room)
        for key, sign, heading in (
            ("low a", -1.0, "Least cant by felt acceleration"),
            ("up a", 1.0, "Most cant by felt acceleration inwards"),
        ):
            there = f"ISNUMBER({token('a lim')})"
            values = np.where(finite, balance + sign * room, np.nan)
            if sign > 0:
                there = f'AND({there},{token("regular")}="yes")'
                values = np.where(chosen.of_class(chosen.line.regular), values, np.nan)
            operator = "+" if sign > 0 else "-"
            formula = f'IF({there},{token("DEQ planned")}{operator}{room_shown},"")'
            build.computed(key, heading, "D_EQ -/+ room", values, "cant exact", formula, "geometry")

    def _bound(
        self,
        key: str,
        name: str,
        balance: FloatArray,
        limit: FloatArray,
        symbol: str,
        cell: str,
        regular: bool = False,
    ) -> None:
        there = f"ISNUMBER({token(cell)})"
        values = np.asarray(CATALOGUE[name].function(balance, limit))
        values = np.where(np.isfinite(limit), values, np.nan)
        if regular:
            there = f'AND({there},{token("regular")}="yes")'
            values = np.where(self._chosen.of_class(self._chosen.line.regular), values, np.nan)
        # Both terms are cants in the unit shown, so nothing is converted here.
        text = CATALOGUE[name].text(D_EQ=token("DEQ planned"), **{symbol: token(cell)})
        entry = CATALOGUE[name]
        self._build.computed(
            key,
            entry.words[0].upper() + entry.words[1:],
            entry.symbol,
            values,
            "cant exact",
            f'IF({there},{text},"")',
            entry.source,
        )

    def _at_run_speed(self) -> None:
        chosen, build, basis = self._chosen, self._build, self._basis
        line, there = chosen.line, f"ISNUMBER({token('V run')})"
        cant = chosen.of_curve(chosen.cant_mm)
        balance = chosen.balance(chosen.run_kmh)
        build.catalogued(
            "DEQ",
            "equilibrium_cant",
            balance,
            "cant exact",
            there,
            "Equilibrium cant at run speed",
            C=basis.C,
            V=basis.ref("V run", "speed exact"),
            R=basis.ref("R", "radius"),
        )
        known = f"ISNUMBER({token('DEQ')})"
        unbalanced = kinematics.unbalanced_acceleration(balance, cant, line.spacing_mm)
        roll = chosen.of_class(line.roll)
        felt = kinematics.felt_acceleration(unbalanced, roll)
        # Differences of cants in the unit shown need no conversion.
        for key, name, values in (
            ("I", "cant_deficiency", kinematics.cant_deficiency(balance, cant)),
            ("E", "cant_excess", kinematics.cant_excess(balance, cant)),
        ):
            entry = CATALOGUE[name]
            text = f'IF({known},{entry.text(D_EQ=token("DEQ"), D=token("D"))},"")'
            build.computed(
                key, entry.words.capitalize(), entry.symbol, values, "cant exact", text, entry.source
            )
        build.catalogued(
            "a_q",
            "unbalanced_acceleration",
            unbalanced,
            "acceleration",
            known,
            "Unbalanced acceleration in the track plane",
            g=basis.g,
            D_EQ=basis.ref("DEQ", "cant exact"),
            D=basis.ref("D", "cant exact"),
            e=basis.e,
        )
        build.catalogued(
            "a_felt",
            "felt_acceleration",
            felt,
            "acceleration",
            f"AND(ISNUMBER({token('a_q')}),ISNUMBER({token('roll')}))",
            "Felt acceleration",
            s=token("roll"),
            a=token("a_q"),
        )
        limited = {
            "I": kinematics.cant_deficiency(balance, cant),
            "E": kinematics.cant_excess(balance, cant),
            "a_felt": np.abs(felt),
        }
        for quantity, key in _LIMITS:
            limit = self._limit(quantity, f"{key} normal", False)
            cell = f"ABS({token(key)})" if key == "a_felt" else token(key)
            text = share_text(cell, token(f"{key} normal"))
            if key == "a_felt":
                text = f'IF(ISNUMBER({token(key)}),{text},"")'
            used = share(limited[key], limit)
            build.computed(
                f"u {key}", "Share of this limit", "u", used * 100, "", f'IFERROR(({text})*100,"")', ""
            )
            self._ledger.columns[-1].number_format = '0.0"%"'
        height = chosen.of_class(line.gravity_height_m)
        build.catalogued(
            "dQ",
            "wheel_load_shift",
            wheel_load_shift(balance - cant, height, line.spacing_mm),
            "share",
            f"AND({known},ISNUMBER({token('t.height')}))",
            "Wheel load shift to the outer rail (rigid body)",
            h=basis.ref("t.height", "height"),
            U=f"({basis.ref('DEQ', 'cant exact')}-{basis.ref('D', 'cant exact')})",
            e=basis.e,
        )
