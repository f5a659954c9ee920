"""The sheet "Calculation by class": what each class has on each curve, and the bounds that it sets there."""

from __future__ import annotations

import numpy as np

from cant.quantities import bounds, kinematics
from cant.quantities.catalogue import CATALOGUE
from cant.quantities.loads import wheel_load_shift
from cant.writing.book.class_speeds import ClassSpeeds
from cant.writing.book.frame import Basis, Builder, FloatArray, share, share_text
from cant.writing.book.ledger import Ledger, token
from cant.writing.book.limit_lookup import Asking, kind_of

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
        self.speeds = ClassSpeeds(basis, self._build)

    def make(self) -> None:
        """Add every column."""
        self._names()
        self._inputs()
        self._ledger.refer("c.V line", self._curve_sheet("V line"), self._curve_rows)
        self.speeds.make()
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
