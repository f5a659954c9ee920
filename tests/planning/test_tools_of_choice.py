"""The small tools on which the choice of cants rests: chains, distinct rows, gaps, work side by side."""

from __future__ import annotations

import numpy as np
import pytest

import cant.planning.lexicographic as comparing
from cant.model.limits import LimitRow, LimitSet
from cant.model.settings import Settings
from cant.planning.lexicographic import distinct_rows
from cant.planning.limit_table import LimitTable
from cant.planning.neighbours import Chains, Pairs, chains_of


def pairs_of(*links: tuple[int, int]) -> Pairs:
    first, second = np.array(links, dtype=np.int64).reshape(-1, 2).T
    return Pairs(first, second, *(np.full(len(links), 50.0) for _ in range(3)))


def test_chains_are_cut_where_a_transition_is_not_shared() -> None:
    pairs = pairs_of((4, 2), (2, 7), (1, 5), (6, 8), (8, 0), (0, 3))
    assert [chain.tolist() for chain in chains_of(pairs)] == [[4, 2, 7], [1, 5], [6, 8, 0, 3]]
    marked = np.zeros(9, dtype=bool)
    marked[[5, 3]] = True
    assert Chains.of(pairs).any(marked).tolist() == [False, True, True]
    assert chains_of(pairs_of()) == []
    assert Chains.of(pairs_of()).any(marked).tolist() == []


@pytest.mark.parametrize("mixer", [comparing._MIXER, 0], ids=["mixed", "all-mixed-alike"])
def test_distinct_rows_are_those_of_a_plain_comparison(mixer: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Also where different rows are mixed into one number, as a factor of 0 does with all of them."""
    monkeypatch.setattr(comparing, "_MIXER", mixer)
    rng = np.random.default_rng(3)
    rows = rng.integers(0, 4, (500, 3)) * 5.0
    rows[rng.random(rows.shape) < 0.1] = np.nan
    rows[rows == 0] *= rng.choice([1.0, -1.0], (rows == 0).sum())
    first, place = distinct_rows(rows)
    plain = [tuple(None if np.isnan(value) else value for value in row) for row in rows.tolist()]
    assert len(first) == len(set(plain))
    assert [plain[first[number]] for number in place] == plain
    assert all(plain.index(plain[at]) == at for at in first)


@pytest.mark.parametrize(
    ("rows", "gap"),
    [
        ([{"speed_up_to_kmh": 100.0}, {"speed_over_kmh": 100.0}], False),
        ([{"speed_up_to_kmh": 100.0}, {"speed_over_kmh": 120.0}], True),
        ([{"speed_up_to_kmh": 100.0}], True),
        ([{}, {"speed_up_to_kmh": 100.0, "category": "freight"}], False),
        ([{"category": "freight"}], False),
        ([{"category": "freight", "speed_over_kmh": 50.0}], True),
        ([{"situation": "platform", "speed_up_to_kmh": 60.0}, {"situation": "platform"}], False),
        ([{"situation": "platform", "speed_up_to_kmh": 60.0}, {"category": "freight"}], True),
        ([{"radius_over_m": 300.0}], True),
        ([], False),
    ],
)
def test_a_gap_is_where_a_kind_of_train_has_rows_for_some_speeds_only(
    rows: list[dict[str, object]], gap: bool
) -> None:
    limits = LimitSet.model_validate(
        {
            "name": "set",
            "rows": [{"quantity": "cant deficiency", "normal": 100, "unit": "mm", **r} for r in rows],
        }
    )
    assert all(isinstance(row, LimitRow) for row in limits.rows)
    kinds = [frozenset({"plain"}), frozenset({"platform"})]
    table = LimitTable(limits, Settings(), ["passenger", "freight"], kinds)
    assert table.may_have_gap("cant deficiency") == gap
