"""Findings by page: the same as those of every curve, in their order, counted and filtered."""

from __future__ import annotations

from pathlib import Path

import pytest

from cant import service
from cant.model.plan import Finding
from webapp import findings_view
from webapp.computing import Computed
from webapp.findings_view import page_of_findings


@pytest.fixture(scope="module")
def computed(sample_file: Path) -> Computed:
    reading = service.read_curves(sample_file.read_bytes(), sample_file.name)
    return Computed(service.make_plan(reading))


def everything(computed: Computed, system: str) -> list[Finding]:
    explanation = computed.shown_in(system).explanation
    of_curves = [f for i in computed.planned.plan.assessed for f in explanation.findings(int(i))]
    return [*explanation.plan_findings, *of_curves]


@pytest.mark.parametrize("system", ["metric", "us"])
def test_pages_hold_every_finding_once(
    computed: Computed, system: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(findings_view, "PAGE", 7)
    wanted = everything(computed, system)
    first = page_of_findings(computed, system, "", "", 1)
    assert first.total == len(wanted) > 7
    seen = [f for n in range(1, first.pages + 1) for f in page_of_findings(computed, system, "", "", n).found]
    assert seen == wanted
    assert page_of_findings(computed, system, "", "", 999).number == first.pages


def test_filters_and_counts_agree(computed: Computed) -> None:
    wanted = everything(computed, "metric")
    first = page_of_findings(computed, "metric", "", "", 1)
    assert sum(first.kinds.values()) == sum(first.severities.values()) == len(wanted)
    for severity, count in first.severities.items():
        page = page_of_findings(computed, "metric", severity, "", 1)
        assert page.total == count
        assert page.found == [f for f in wanted if f.severity == severity][: findings_view.PAGE]
    for kind, count in first.kinds.items():
        assert page_of_findings(computed, "metric", "", kind, 1).total == count
    assert page_of_findings(computed, "metric", "stop", "no-such-kind", 1).found == []
