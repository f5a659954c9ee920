"""The sheet "Calculation": each curve with its inputs, and what follows from its classes and its ends."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from cant.model.curves import LEFT, RIGHT, situation_text
from cant.quantities.catalogue import CATALOGUE
from cant.quantities.speeds import equilibrium_speed
from cant.writing.book.end_rows import EndRows
from cant.writing.book.frame import Basis, Builder, FloatArray
from cant.writing.book.ledger import BoolArray, Ledger, token
from cant.writing.columns import Cell, governing_text

_LIFTED = {1.0: "outer", -1.0: "inner", 0.0: "none"}
TOLERANCE_MM = 0.001


class CurveCalculation:
    """Builds the columns.

    Parameters
    ----------
    basis : Basis
    ledger : Ledger
    situation_numbers : ndarray, shape (curves,)
        Column of the limits sheet for each curve's situation, from 1.
    """

    def __init__(self, basis: Basis, ledger: Ledger, situation_numbers: FloatArray) -> None:
        self._basis = basis
        self._chosen = basis.chosen
        self._ledger = ledger
        self._build = Builder(basis, ledger)
        self._situations = situation_numbers

    def make_inputs(self) -> None:
        """Add the names and the cells that a checker may change."""
        chosen, build = self._chosen, self._build
        curves, at = chosen.plan.curves, chosen.curves.tolist()
        for key, heading, column, width in (
            ("line", "Line", curves.line, 20.0),
            ("track", "Track", curves.track, 7.0),
            ("curve", "Curve", curves.curve, 9.0),
        ):
            build.words(key, heading, [column[i] for i in at], width)
        build.words("sheet", "Sheet", [curves.sheet[i] for i in at], 12.0)
        build.number("row", "Row", "", curves.row[chosen.curves].astype(np.float64), "count", "", "fixed")
        hands = [{LEFT: "L", RIGHT: "R"}.get(int(curves.hand[i]), "") for i in at]
        build.words("hand", "Hand", hands, 6.0)
        signs = chosen.line.hand[:, 0].astype(np.float64)
        text = f'IF({token("hand")}="L",1,IF({token("hand")}="R",-1,0))'
        build.computed("h", "Sign of the hand", "", signs, "count", text, "left +, right -")
        build.number("R", "Radius", "R", chosen.line.radius_m[:, 0], "radius")
        build.number("V line", "Line speed", "V", curves.speed_kmh[chosen.curves], "speed exact")
        build.number("today", "Cant today", "D", curves.cant_mm[chosen.curves], "cant exact")
        build.number("D", "Chosen cant", "D", chosen.cant_mm, "cant exact", "the proposal: change it here")
        for key, heading, values in (
            ("most", "Cant at most", chosen.line.at_most_mm[:, 0]),
            ("least", "Cant at least", chosen.line.at_least_mm[:, 0]),
        ):
            build.number(key, heading, "D", _finite(values), "cant exact", "site")
        words = [situation_text(curves.situations[i]) or "plain" for i in at]
        build.words("situation words", "Situation", words, 12.0)
        build.number("situation", "Situation no.", "", self._situations, "count", "column in Limits used")
        build.number(
            "tier",
            "Limits: 1 normal, 2 exceptional",
            "",
            chosen.tier + 1.0,
            "count",
            "exceptional where the plan needs it",
        )
        build.number(
            "last tier",
            "Last tier allowed: 1 normal, 2 exceptional",
            "",
            chosen.last_tier + 1.0,
            "count",
            "for permissible speeds",
        )

    def make_results(self, classes: Ledger, ends: Ledger, rows: EndRows) -> None:
        """Add what follows from the other two sheets."""
        self._ranges(classes, ends, rows)
        self._speeds()
        self._bounds()
        self._change()

    def _ranges(self, classes: Ledger, ends: Ledger, rows: EndRows) -> None:
        """Name the first and the last cell of each curve in the columns of the other sheets."""
        chosen = self._chosen
        first = (classes.first_row + chosen.start[:-1]).tolist()
        last = (classes.first_row + chosen.start[1:] - 1).tolist()
        self._has_classes: BoolArray = np.asarray(chosen.start[1:] > chosen.start[:-1])
        for key in ("V planned", "w", "low I", "low a", "up D", "up E", "up a"):
            if any(column.key == key for column in classes.columns):
                self._span(key, classes, key, first, last)
        places = chosen.pos[rows.entry]
        start = np.searchsorted(places, np.arange(len(chosen)))
        stop = np.searchsorted(places, np.arange(len(chosen)), side="right")
        self._has_ends: BoolArray = np.asarray(stop > start)
        begin, end = ((ends.first_row + part).tolist() for part in (start, stop - 1))
        for key in ("up g", "up r", "low r"):
            self._span(key, ends, key, begin, end)

    def _span(self, name: str, ledger: Ledger, key: str, first: Sequence[int], last: Sequence[int]) -> None:
        self._ledger.refer(f"{name} from", ledger.address(key), first)
        self._ledger.refer(f"{name} to", f"${ledger.letter(key)}$", last)
        # The address of the first cell lacks the second dollar sign only for looks; both name one row.
        self._spans = {**getattr(self, "_spans", {}), name: f"{token(f'{name} from')}:{token(f'{name} to')}"}

    def _speeds(self) -> None:
        chosen, basis, build = self._chosen, self._basis, self._build
        rms = np.array(
            [
                np.nan if r is None or r["rms_speed_kmh"] is None else r["rms_speed_kmh"]
                for r in chosen.records
            ]
        )
        text = CATALOGUE["rms_speed"].text(ws=self._spans["w"], Vs=self._spans["V planned"])
        build.computed(
            "V rms",
            "rms speed",
            "V_rms",
            rms,
            "speed exact",
            [(f'IF(SUM({self._spans["w"]})>0,{text},"")', self._has_classes)],
            CATALOGUE["rms_speed"].source,
        )
        build.catalogued(
            "D rms",
            "equilibrium_cant",
            np.asarray(
                CATALOGUE["equilibrium_cant"].function(rms, chosen.line.radius_m[:, 0], chosen.line.constant)
            ),
            "cant exact",
            f"ISNUMBER({token('V rms')})",
            "Equilibrium cant of the rms speed",
            C=basis.C,
            V=basis.ref("V rms", "speed exact"),
            R=basis.ref("R", "radius"),
        )
        speeds = np.asarray(
            equilibrium_speed(chosen.cant_mm, chosen.line.radius_m[:, 0], chosen.line.constant)
        )
        build.catalogued(
            "V eq",
            "equilibrium_speed",
            np.where(chosen.cant_mm >= 0, speeds, np.nan),
            "speed exact",
            f"{token('D')}>=0",
            "Equilibrium speed of the chosen cant",
            C=basis.C,
            D=basis.ref("D", "cant exact"),
            R=basis.ref("R", "radius"),
        )

    def _bounds(self) -> None:
        low_fixed, high_fixed = self._fixed_bounds()
        shape = ("cant exact", "fixed")
        self._build.number(
            "low fixed", "Least cant of other rules", "D", low_fixed, shape[0], "turnouts", shape[1]
        )
        self._build.number(
            "up fixed", "Most cant of other rules", "D", high_fixed, shape[0], "turnouts", shape[1]
        )
        for key, keys, site, function, heading in (
            ("low", ("low I", "low a", "low r"), ("least", "low fixed"), "MAX", "Lower bound"),
            ("up", ("up D", "up E", "up a", "up g", "up r"), ("most", "up fixed"), "MIN", "Upper bound"),
        ):
            values = self._recorded(f"{'lower' if key == 'low' else 'upper'}_mm")
            texts: list[tuple[str, BoolArray | None]] = []
            for with_ends in (False, True):
                spans = [
                    self._spans[name]
                    for name in keys
                    if name in self._spans and (with_ends or name not in ("up g", "up r", "low r"))
                ]
                every = ",".join([*spans, *(token(name) for name in site)])
                where = self._has_classes & (self._has_ends if with_ends else ~self._has_ends)
                texts.append((f'IF(COUNT({every})=0,"",{function}({every}))', where))
            self._build.computed(
                key,
                heading,
                "D_low" if key == "low" else "D_high",
                values,
                "cant exact",
                texts,
                "strictest of the classes, ends and site",
            )
            by: list[Cell] = [
                None if r is None else governing_text(r["lower_by" if key == "low" else "upper_by"])
                for r in self._chosen.records
            ]
            self._build.words(f"{key} by", f"{heading} set by (of the plan)", by, 26.0)
        text = (
            f'IF(AND(OR({token("low")}="",{token("D")}>=N({token("low")})-0.001),'
            f'OR({token("up")}="",{token("D")}<=N({token("up")})+0.001)),"yes","no")'
        )
        self._build.computed(
            "within", "Within both bounds", "", self._within(), "", text, "at planned speeds; tolerance 0.001"
        )

    def _recorded(self, key: str) -> FloatArray:
        return np.array(
            [np.nan if r is None or r[key] is None else r[key] for r in self._chosen.records],
            dtype=np.float64,
        )

    def _within(self) -> list[Cell]:
        low, high = (
            np.nan_to_num(self._recorded(k), nan=s) for k, s in (("lower_mm", -1e9), ("upper_mm", 1e9))
        )
        factor = self._basis.inputs.display["cant"].factor
        room = TOLERANCE_MM / factor
        within = (self._chosen.cant_mm >= low - room) & (self._chosen.cant_mm <= high + room)
        return ["yes" if flag else "no" for flag in within]

    def _fixed_bounds(self) -> tuple[FloatArray, FloatArray]:
        """Give the bounds of rules that the sheet does not compute: branches of turnouts."""
        low, high = (np.full(len(self._chosen), fill) for fill in (-np.inf, np.inf))
        branches = self._chosen.line.branches
        if branches is None or not branches.there.any():
            return _finite(low), _finite(high)
        table, tier = self._chosen.line.table, self._chosen.tier[:, None]
        deficiency, excess = (
            np.where(
                tier,
                branches.limit(table, quantity, True).value,
                branches.limit(table, quantity, False).value,
            )
            for quantity in ("cant deficiency", "cant excess")
        )
        there, needed, along = branches.there, branches.needed_mm, branches.sense
        low = np.where(there & (along > 0), needed - deficiency, -np.inf).max(axis=-1)
        against = np.where(there & (along <= 0), deficiency - needed, np.inf).min(axis=-1)
        above = np.where(there & (along >= 0), needed + excess, np.inf).min(axis=-1)
        return _finite(low), _finite(np.minimum(against, above))

    def _change(self) -> None:
        chosen, build = self._chosen, self._build
        change = chosen.cant_mm - chosen.plan.curves.cant_mm[chosen.curves]
        text = f'IF(ISNUMBER({token("today")}),{token("D")}-{token("today")},"")'
        build.computed("change", "Change of cant", "dD", change, "cant exact", text, "chosen less today's")
        lifted: list[Cell] = ["" if np.isnan(c) else _LIFTED[float(np.sign(c))] for c in change]
        text = (
            f'IF(ISNUMBER({token("change")}),IF({token("change")}>0,"outer",'
            f'IF({token("change")}<0,"inner","none")),"")'
        )
        build.computed("rail", "Rail to lift", "", lifted, "", text, "a tamper lifts only")
        status: list[Cell] = [None if r is None else r["status"] for r in chosen.records]
        build.words("status", "Status in the plan", status, 13.0)


def _finite(values: FloatArray) -> FloatArray:
    return np.where(np.isfinite(values), values, np.nan)
