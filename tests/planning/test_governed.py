"""What governs a whole line is what its records say one by one."""

from __future__ import annotations

import pytest
from reference.cases import random_case

from cant.planning import plan_line, what_governs


@pytest.mark.parametrize("first", range(0, 60, 30))
def test_as_the_records_name_it(first: int) -> None:
    seen = set()
    for seed in range(first, first + 30):
        plan = plan_line(*random_case(seed))
        found = what_governs(plan)
        said: dict[str, set[int]] = {}
        for index, record in zip(plan.assessed.tolist(), plan.records(), strict=True):
            for by in (record["lower_by"], record["upper_by"]):
                if by:
                    said.setdefault(by["quantity"], set()).add(index)
        assert {name: set(where.nonzero()[0].tolist()) for name, where in found.items()} == said, seed
        assert list(found) == sorted(found)
        seen |= set(found)
    assert {"cant deficiency", "cant excess"} <= seen
