"""A plan can go into another process and come back: the service lets long lists be planned elsewhere."""

from __future__ import annotations

import pickle
from pathlib import Path

from cant.explaining import explain
from cant.service import PlannedLine, make_plan, read_curves


def test_a_plan_comes_back_from_another_process_as_it_was(sample_file: Path) -> None:
    planned = make_plan(read_curves(sample_file.read_bytes(), sample_file.name))
    reading, plan = pickle.loads(pickle.dumps((planned.reading, planned.plan)))  # noqa: S301 - made here
    again = PlannedLine(reading, plan, explain(plan))
    assert again.document() == planned.document()
    assert plan.findings == planned.plan.findings
