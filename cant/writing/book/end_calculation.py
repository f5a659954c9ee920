"""The sheet "Calculation of ends": gradient, rates and lengths over every transition, for each class.

A transition to a straight has a row for each class of its curve; a shared one stands once, at the curve of
the smaller chainage, with both curves' cells in its formulas.
"""

from __future__ import annotations

import numpy as np

from cant.planning.limit_table import LimitAt
from cant.planning.neighbours import BEFORE
from cant.quantities.catalogue import CATALOGUE
from cant.quantities.lengths import length_for_gradient, length_for_rate
from cant.units import KMH_PER_MS
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray, share, share_text
from cant.writing.book.ledger import FORMULA, BoolArray, Ledger, LedgerColumn, token
from cant.writing.book.limits_sheet import Asking, kind_of
from cant.writing.book.speed_search import NEVER, SpeedSearch, cant_rate, deficiency_rate, jump

_OF_CURVE = ("R", "D", "h", "situation", "tier", "last tier")
_OF_CLASS = ("category", "step")
_GRADIENT, _CANT_RATE = "cant gradient", "rate of change of cant"
_DEFICIENCY_RATE, _ABRUPT = "rate of change of cant deficiency", "abrupt change of cant deficiency"


class EndCalculation:
    """Builds the columns.

    Parameters
    ----------
    basis : Basis
    ledger : Ledger
    rows : EndRows
    curves, classes : Ledger
        The other two sheets.
    """

    def __init__(self, basis: Basis, ledger: Ledger, rows: EndRows, curves: Ledger, classes: Ledger) -> None:
        self._basis = basis
        self._rows = rows
        self._chosen = basis.chosen
        self._ledger = ledger
        self._build = Builder(basis, ledger)
        pos = self._chosen.pos
        self._first = pos[rows.entry]
        # Where there is no other curve the reference points to the curve itself and is not used.
        self._other_entry = np.where(rows.shared, rows.other, rows.entry)
        self._second = pos[self._other_entry]
        for side, places, entries in (("1", self._first, rows.entry), ("2", self._second, self._other_entry)):
            of_curve = (curves.first_row + places).tolist()
            of_class = (classes.first_row + entries).tolist()
            # What belongs to the row's own curve gets a column here, so that long formulas stay in their row.
            mark = "from " if side == "1" else ""
            for key in _OF_CURVE:
                ledger.refer(f"{mark}{key} {side}", curves.address(key), of_curve)
            for key in _OF_CLASS:
                ledger.refer(f"{mark}{key} {side}", classes.address(key), of_class)
            for key in ("V run", "V planned"):
                ledger.refer(f"{key} {side}", classes.address(key), of_class)
        self._sources = (curves, classes)

    def make(self) -> None:
        """Add every column."""
        self._names()
        self._motion()
        self._changes()
        self._limited()
        self._at_planned_speed()
        self._failing()

    def _names(self) -> None:
        chosen, rows, build = self._chosen, self._rows, self._build
        curves, names = chosen.plan.curves, chosen.plan.traffic.class_names
        turned = chosen.plan.outcome.neighbourhood.descending
        at = chosen.curves[self._first].tolist()
        for key, heading, column, width in (
            ("line", "Line", curves.line, 20.0),
            ("track", "Track", curves.track, 7.0),
            ("curve", "Curve", curves.curve, 9.0),
        ):
            build.words(key, heading, [column[i] for i in at], width)
        sides = [
            "in" if (end == BEFORE) != bool(turned[i]) else "out"
            for end, i in zip(rows.end.tolist(), at, strict=True)
        ]
        build.words("end", "End", sides, 6.0)
        others = chosen.curves[self._second].tolist()
        build.words(
            "other",
            "Shared with",
            [curves.curve[i] if s else None for i, s in zip(others, rows.shared.tolist(), strict=True)],
            9.0,
        )
        classes = [names[k] for k in chosen.column[rows.entry].tolist()]
        build.words("class", "Class", classes, 14.0)
        self._repeated()
        build.number("k", "Peak over mean of the shape", "k", rows.factor, "number", "shape")
        build.number("L", "Transition", "L", rows.length_m, "length")
        build.number("Lr", "Cant ramp", "L", rows.ramp_m, "length", "ramp as stated, else transition or room")

    def _repeated(self) -> None:
        """Repeat the cells of the row's curve and class on which the limits depend."""
        for keys, ledger, at in (
            (_OF_CURVE, self._sources[0], self._first),
            (_OF_CLASS, self._sources[1], self._rows.entry),
        ):
            for key in keys:
                source = next(column for column in ledger.columns if column.key == key)
                values = source.values.tolist() if isinstance(source.values, np.ndarray) else source.values
                self._ledger.add(
                    LedgerColumn(
                        f"{key} 1",
                        source.heading,
                        source.symbol,
                        "from its sheet",
                        [values[i] for i in at.tolist()],
                        source.number_format,
                        FORMULA,
                        [(token(f"from {key} 1"), None)],
                        9.0,
                    )
                )

    def _both(self, key: str) -> list[tuple[str, BoolArray | None]]:
        shared = self._rows.shared
        one, two = token(f"{key} 1"), token(f"{key} 2")
        return [(one, ~shared), (f'IF(COUNT({one},{two})=2,MIN({one},{two}),"")', shared)]

    def _motion(self) -> None:
        chosen, rows, build = self._chosen, self._rows, self._build
        entry, other = rows.entry, self._other_entry
        self._run = np.minimum(chosen.run_kmh[entry], chosen.run_kmh[other])
        self._planned = np.minimum(chosen.planned_kmh[entry], chosen.planned_kmh[other])
        words = "by class; shared: the lower of the two"
        build.computed("V", "Run speed", "V", self._run, "speed exact", self._both("V run"), words)
        build.computed(
            "Vp", "Planned speed", "V", self._planned, "speed exact", self._both("V planned"), words
        )

    def _balance(self, side: str, speed: str) -> str:
        basis = self._basis
        text = CATALOGUE["equilibrium_cant"].text(
            C=basis.C, V=basis.ref(speed, "speed exact"), R=basis.ref(f"R {side}", "radius")
        )
        return basis.inputs.shown(text, "cant exact")

    def _deficiency_change(self, speed: str) -> list[tuple[str, BoolArray | None]]:
        parts = [f"MAX({self._balance(side, speed)}-{token(f'D {side}')},0)" for side in "12"]
        shared = self._rows.shared
        there = f"ISNUMBER({token(speed)})"
        signed = f"ABS({token('h 1')}*{parts[0]}-{token('h 2')}*{parts[1]})"
        return [(f'IF({there},{parts[0]},"")', ~shared), (f'IF({there},{signed},"")', shared)]

    def _changes(self) -> None:
        chosen, rows, build = self._chosen, self._rows, self._build
        shared = rows.shared
        line = chosen.line
        hands = [line.hand[part, 0].astype(np.float64) for part in (self._first, self._second)]
        cants = [chosen.cant_mm[part] for part in (self._first, self._second)]
        self._cant_change = np.where(
            shared, np.abs(hands[0] * cants[0] - hands[1] * cants[1]), np.abs(cants[0])
        )
        signed = f"ABS({token('h 1')}*{token('D 1')}-{token('h 2')}*{token('D 2')})"
        texts: list[tuple[str, BoolArray | None]] = [(f"ABS({token('D 1')})", ~shared), (signed, shared)]
        build.computed(
            "dD", "Change of cant", "dD", self._cant_change, "cant exact", texts, "signed: left +, right -"
        )
        changes, jumps = [], []
        for speed in (self._run, self._planned):
            balances = [chosen.balance(speed, part) for part in (rows.entry, self._other_entry)]
            parts = [np.maximum(b - d, 0.0) for b, d in zip(balances, cants, strict=True)]
            changes.append(np.where(shared, np.abs(hands[0] * parts[0] - hands[1] * parts[1]), parts[0]))
            jumps.append(
                np.where(shared, np.abs(hands[0] * balances[0] - hands[1] * balances[1]), balances[0])
            )
        self._run_change, self._planned_change = changes
        self._jump = np.where(rows.length_m == 0, jumps[0], np.nan)
        build.computed(
            "dI",
            "Change of cant deficiency",
            "dI",
            self._run_change,
            "cant exact",
            self._deficiency_change("V"),
            "at run speed; excess counts as 0",
        )
        build.computed(
            "dIp",
            "Change of cant deficiency, planned speed",
            "dI",
            self._planned_change,
            "cant exact",
            self._deficiency_change("Vp"),
            "excess counts as 0",
        )
        one, two = (self._balance(side, "V") for side in "12")
        there = f"AND({token('L')}=0,ISNUMBER({token('L')}),ISNUMBER({token('V')}))"
        jump = f"ABS({token('h 1')}*{one}-{token('h 2')}*{two})"
        build.computed(
            "jump",
            "Abrupt change of cant deficiency",
            "dI",
            self._jump,
            "cant exact",
            [(f'IF({there},{one},"")', ~shared), (f'IF({there},{jump},"")', shared)],
            "where there is no transition",
        )

    def _asked(self, quantity: str, speed: FloatArray, tier: bool) -> LimitAt:
        """Ask the limit of each row: over a shared transition the stricter of the two curves'."""
        chosen = self._chosen
        one, two = (
            chosen.tier_limit(quantity, speed, at) if tier else chosen.limit(quantity, speed, False, at)
            for at in (self._rows.entry, self._other_entry)
        )
        first = one.value <= two.value
        return LimitAt(
            np.where(first, one.value, two.value),
            np.where(first, one.tolerance, two.tolerance),
            np.where(first, one.row, two.row),
            one.gap,
        )

    def _asking(self, side: str, speed: str, tier: bool) -> Asking:
        return Asking(
            token(speed),
            token(f"R {side}"),
            token(f"category {side}"),
            token(f"situation {side}"),
            token(f"tier {side}") if tier else "1",
        )

    def _limit_texts(self, quantity: str, speed: str, tier: bool) -> list[tuple[str, BoolArray | None]]:
        limits, shared = self._basis.limits, self._rows.shared
        one, two = (limits.value(quantity, self._asking(side, speed, tier)) for side in "12")
        if not limits.has(quantity):
            return [('"none"', None)]
        both = f'IF(COUNT({one},{two})=0,"none",MIN({one},{two}))'
        return [(one, ~shared), (both, shared)]

    def _limit(self, quantity: str, key: str, speed: str, tier: bool) -> FloatArray:
        values = self._asked(quantity, self._planned if speed == "Vp" else self._run, tier).value
        words = "at planned speed, in the tier of the curve" if tier else "normal, at run speed"
        self._build.computed(
            key,
            f"Limit of {quantity}, {words}",
            "lim",
            self._build.shown(values, kind_of(quantity)),
            kind_of(quantity),
            self._limit_texts(quantity, speed, tier),
            "Limits used: strictest row that holds",
        )
        return values

    def _limited(self) -> None:
        """Add what is limited, each with its limit and the share used."""
        rows, basis, build = self._rows, self._basis, self._build
        with np.errstate(divide="ignore", invalid="ignore"):
            gradient = np.where(rows.ramp_m > 0, rows.factor * self._cant_change / rows.ramp_m, np.nan)
            cant_rate = gradient * self._run / KMH_PER_MS
            rate = rows.factor * self._run_change * self._run / (KMH_PER_MS * rows.length_m)
            rate = np.where(rows.length_m > 0, rate, np.nan)
        ramp, length = (f"N({token(key)})>0" for key in ("Lr", "L"))
        there = f"ISNUMBER({token('V')})"
        k, speed = token("k"), basis.ref("V", "speed exact")
        dD, dI = (basis.ref(key, "cant exact") for key in ("dD", "dI"))
        build.catalogued(
            "g", "cant_gradient", gradient, "gradient", ramp, k=k, dD=dD, L=basis.ref("Lr", "length")
        )
        self._share(_GRADIENT, "g", gradient)
        build.catalogued(
            "rD",
            "rate_of_change_of_cant",
            cant_rate,
            "rate",
            f"AND({ramp},{there})",
            k=k,
            dD=dD,
            V=speed,
            L=basis.ref("Lr", "length"),
        )
        self._share(_CANT_RATE, "rD", cant_rate)
        build.catalogued(
            "rI",
            "rate_of_change_of_deficiency",
            rate,
            "rate",
            f"AND({length},{there})",
            k=k,
            dI=dI,
            V=speed,
            L=basis.ref("L", "length"),
        )
        self._share(_DEFICIENCY_RATE, "rI", rate)
        self._share(_ABRUPT, "jump", self._jump)

    def _share(self, quantity: str, key: str, value: FloatArray) -> None:
        limit = self._limit(quantity, f"{key} lim", "V", False)
        used = share(value, limit) * 100
        text = f'IFERROR(({share_text(token(key), token(f"{key} lim"))})*100,"")'
        self._build.computed(f"u {key}", "Share of this limit", "u", used, "", text, "")
        self._ledger.columns[-1].number_format = '0.0"%"'

    def _at_planned_speed(self) -> None:
        """Add the bounds to a straight, and the lengths needed."""
        gradient = self._limit(_GRADIENT, "g limp", "Vp", True)
        cant_rate = self._limit(_CANT_RATE, "rD limp", "Vp", True)
        deficiency_rate = self._limit(_DEFICIENCY_RATE, "rI limp", "Vp", True)
        self._bounds(gradient, cant_rate, deficiency_rate)
        self._needed()

    def _bounds(self, gradient: FloatArray, cant_rate: FloatArray, deficiency_rate: FloatArray) -> None:
        rows, basis, build = self._rows, self._basis, self._build
        alone, planned = ~rows.shared, self._planned
        k, speed = token("k"), basis.ref("Vp", "speed exact")
        ramp, length = basis.ref("Lr", "length"), basis.ref("L", "length")
        inputs = basis.inputs
        with np.errstate(divide="ignore", invalid="ignore"):
            by_gradient = gradient * rows.ramp_m / rows.factor
            by_rate = KMH_PER_MS * cant_rate * rows.ramp_m / (rows.factor * planned)
            room = KMH_PER_MS * deficiency_rate * rows.length_m / (rows.factor * planned)
        balance = self._chosen.balance(planned, rows.entry)
        ramped, long = rows.ramp_m > 0, rows.length_m > 0
        text = inputs.shown(
            CATALOGUE["most_cant_for_gradient"].text(
                grad_lim=inputs.canonical(token("g limp"), "gradient"), L=ramp, k=k
            ),
            "cant exact",
        )
        usable = f"AND(N({token('Lr')})>0,ISNUMBER({token('g limp')}))"
        build.computed(
            "up g",
            "Most cant by the gradient",
            "D_high",
            _where(alone & ramped & np.isfinite(gradient), by_gradient),
            "cant exact",
            [(f'IF({usable},{text},"")', alone)],
            "to a straight",
        )
        for key, limit, span, where, values, heading in (
            ("rD limp", cant_rate, ("Lr", ramp), ramped, by_rate, "Most cant by its rate of change"),
            (
                "rI limp",
                deficiency_rate,
                ("L", length),
                long,
                balance - room,
                "Least cant by rate of deficiency",
            ),
        ):
            text = inputs.shown(
                CATALOGUE["most_change_for_rate"].text(
                    r_lim=inputs.canonical(token(key), "rate"), L=span[1], k=k, V=speed
                ),
                "cant exact",
            )
            usable = f"AND(N({token(span[0])})>0,ISNUMBER({token(key)}),{token('Vp')}>0)"
            if key == "rI limp":
                text = f"{self._balance('1', 'Vp')}-{text}"
            build.computed(
                "up r" if key == "rD limp" else "low r",
                heading,
                "D_high" if key == "rD limp" else "D_low",
                _where(alone & where & np.isfinite(limit) & (planned > 0), values),
                "cant exact",
                [(f'IF({usable},{text},"")', alone)],
                "to a straight",
            )

    def _needed(self) -> None:
        """Add the lengths that the normal limits need at planned speeds."""
        rows, basis, build = self._rows, self._basis, self._build
        # Where a checker may switch the tier of a curve, the cell of its limit is not the normal one.
        normal = np.full(len(rows), not self._chosen.plan.settings.allows_exceptional)
        inputs = basis.inputs
        for key, heading, quantity, change, words in (
            ("needed g", "Ramp needed by the gradient", _GRADIENT, "dD", "gradient"),
            ("needed r", "Ramp needed by the rate of cant", _CANT_RATE, "dD", "rate"),
            ("needed I", "Transition needed by the rate of deficiency", _DEFICIENCY_RATE, "dIp", "rate"),
        ):
            limit = self._asked(quantity, self._planned, False).value
            size = self._cant_change if change == "dD" else self._planned_change
            reference = inputs.canonical(token(change), "cant exact")
            if words == "gradient":
                values = np.asarray(length_for_gradient(size, limit, rows.factor))
            else:
                values = np.asarray(length_for_rate(size, self._planned, limit, rows.factor))
            cell = {"needed g": "g limp", "needed r": "rD limp", "needed I": "rI limp"}[key]
            texts: list[tuple[str, BoolArray | None]] = []
            for limit_text, limit_kind_where in self._needed_limits(quantity, cell, normal):
                used = inputs.canonical(limit_text, words)
                if words == "gradient":
                    text = CATALOGUE["length_for_gradient"].text(k=token("k"), dD=reference, grad_lim=used)
                else:
                    text = CATALOGUE["length_for_rate"].text(
                        k=token("k"), dD=reference, r_lim=used, V=basis.ref("Vp", "speed exact")
                    )
                texts.append((f'IFERROR({inputs.shown(text, "length")},"")', limit_kind_where))
            known = np.isfinite(limit) & np.isfinite(values)
            build.computed(
                key, heading, "L", _where(known, values), "length", texts, "normal limits, planned speed"
            )

    def _failing(self) -> None:
        """Add where the curve's own rules over the end fail: the first multiple, and the planned speed."""
        rows, chosen, basis = self._rows, self._chosen, self._basis
        search = SpeedSearch(basis, chosen.last_tier)
        radius = chosen.line.radius_m[self._first, 0]
        cant = chosen.cant_mm[self._first]
        cells = (basis.ref("D 1", "cant exact"), basis.ref("R 1", "radius"), basis.ref("L", "length"))
        ramped, long, none = rows.ramp_m > 0, rows.length_m > 0, rows.length_m == 0
        alone = ~rows.shared
        asking = Asking(
            token("Vp"), token("R 1"), token("category 1"), token("situation 1"), token("last tier 1")
        )
        rules = (
            (
                cant_rate(
                    f"ABS({cells[0]})", basis.ref("Lr", "length"), np.abs(cant), rows.ramp_m, rows.factor
                ),
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
        self.failing = np.full(len(rows), np.inf)
        self.broken = np.zeros(len(rows), dtype=np.bool_)
        failing_texts, broken_texts = [], []
        for critical, there, condition in rules:
            here = there & alone
            self.failing = np.minimum(self.failing, search.failing(critical, rows.entry, step, here))
            self.broken |= search.broken(critical, rows.entry, self._planned, here)
            text = search.failing_text(critical, asking, token("step 1"))
            failing_texts.append(f"IF({condition},{text},{NEVER:.0f})")
            broken_texts.append(f"IF({condition},{search.broken_text(critical, asking)},0)")
        self._build.computed(
            "fails",
            "First multiple of the speed step at which a rate fails",
            "V",
            np.where(alone, search.shown(self.failing), np.nan),
            "speed exact",
            [(f"MIN({','.join(failing_texts)})", alone)],
            "last tier allowed; to a straight",
        )
        self._build.computed(
            "broken",
            "Planned speed fails here: 1 yes",
            "",
            np.where(alone, self.broken.astype(np.float64), np.nan),
            "count",
            [(f"MAX({','.join(broken_texts)})", alone)],
            "last tier allowed; to a straight",
        )

    def _needed_limits(
        self, quantity: str, cell: str, normal: BoolArray
    ) -> list[tuple[str, BoolArray | None]]:
        """Give the normal limit as a cell where it stands in one, else as its own lookup."""
        texts: list[tuple[str, BoolArray | None]] = [(token(cell), normal)]
        for text, where in self._limit_texts(quantity, "Vp", False):
            here = ~normal if where is None else ~normal & where
            texts.append((f"({text})", here))
        return texts


def _where(condition: BoolArray, values: FloatArray) -> FloatArray:
    return np.where(condition, values, np.nan)
