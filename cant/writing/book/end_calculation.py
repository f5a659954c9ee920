"""The sheet "Calculation of ends": gradient, rates and lengths over every transition, for each class.

A transition to a straight has a row for each class of its curve; a shared one stands once, at the curve of
the smaller chainage, with both curves' cells in its formulas.
"""

from __future__ import annotations

import numpy as np

from cant.planning.neighbours import BEFORE
from cant.units import KMH_PER_MS
from cant.writing.book.end_lengths import EndLengths
from cant.writing.book.end_limits import ABRUPT, CANT_RATE, DEFICIENCY_RATE, GRADIENT, EndLimits
from cant.writing.book.end_rows import EndRows
from cant.writing.book.end_speeds import add_failing
from cant.writing.book.frame import Basis, Builder, FloatArray, share, share_text
from cant.writing.book.ledger import FORMULA, BoolArray, Ledger, LedgerColumn, token

_OF_CURVE = ("R", "D", "h", "situation", "tier", "last tier")
_OF_CLASS = ("category", "step")


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
        self._limits = EndLimits(basis, self._build, rows)
        # Where there is no other curve the reference points to the curve itself and is not used.
        self._other_entry = self._limits.other_entry
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
        changes = (self._cant_change, self._planned_change)
        EndLengths(self._basis, self._build, self._rows, self._limits, changes).make()
        planned = self._limits.planned_kmh
        self.failing, self.broken = add_failing(self._basis, self._build, self._rows, planned)

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
        build = self._build
        self._run, self._planned = self._limits.run_kmh, self._limits.planned_kmh
        words = "by class; shared: the lower of the two"
        build.computed("V", "Run speed", "V", self._run, "speed exact", self._both("V run"), words)
        build.computed(
            "Vp", "Planned speed", "V", self._planned, "speed exact", self._both("V planned"), words
        )

    def _deficiency_change(self, speed: str) -> list[tuple[str, BoolArray | None]]:
        parts = [f"MAX({self._limits.balance(side, speed)}-{token(f'D {side}')},0)" for side in "12"]
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
        one, two = (self._limits.balance(side, "V") for side in "12")
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
        self._share(GRADIENT, "g", gradient)
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
        self._share(CANT_RATE, "rD", cant_rate)
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
        self._share(DEFICIENCY_RATE, "rI", rate)
        self._share(ABRUPT, "jump", self._jump)

    def _share(self, quantity: str, key: str, value: FloatArray) -> None:
        limit = self._limits.add(quantity, f"{key} lim", "V", False)
        used = share(value, limit) * 100
        text = f'IFERROR(({share_text(token(key), token(f"{key} lim"))})*100,"")'
        self._build.computed(f"u {key}", "Share of this limit", "u", used, "", text, "")
        self._ledger.columns[-1].number_format = '0.0"%"'
