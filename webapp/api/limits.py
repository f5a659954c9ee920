"""Operations on the limit sets that come with the program."""

from __future__ import annotations

from typing import Any

from cant import limit_sets, service
from cant.model.limits import LimitSet
from webapp.api.models import LimitSetAnswer, LimitSetEntry, LimitSetList
from webapp.api.operations import operation
from webapp.keeping.access import NotThereError


@operation("GET", "/limits", answer=LimitSetList, open=True)
def list_limit_sets() -> LimitSetList:
    """List the limit sets."""
    return LimitSetList(sets=[LimitSetEntry(**_head(limit_sets.load(n))) for n in service.limit_set_names()])


@operation("GET", "/limits/{name}", answer=LimitSetAnswer, open=True)
def get_limit_set(name: str) -> LimitSetAnswer:
    """Give one limit set with its rules."""
    found = service.limits_named(name)
    if found is None:
        message = f"there is no limit set named '{name}'"
        raise NotThereError(message)
    return LimitSetAnswer(**_head(found), rows=[dict(row) for row in limit_sets.as_table(found)])


def _head(limits: LimitSet) -> dict[str, Any]:
    return limits.model_dump(include={"name", "title", "edition", "verified", "completeness"})
