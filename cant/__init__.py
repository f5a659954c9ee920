"""Sets the cant of railway curves for mixed traffic.

For notebooks three names are enough: :func:`plan` takes data frames (curves, traffic) and limits and gives a
planned line, whose ``to_frames`` gives data frames again; :func:`read` shows how a file is understood;
:class:`LimitSet` is a railway's limits as data. They are imported when first used, so that a lower room never
waits for a higher one.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from cant.version import __version__

if TYPE_CHECKING:
    from cant.model.limits import LimitSet
    from cant.service import plan_frames as plan
    from cant.service import read_curves as read

__all__ = ["LimitSet", "__version__", "plan", "read"]

_WHERE = {
    "LimitSet": ("cant.model.limits", "LimitSet"),
    "plan": ("cant.service", "plan_frames"),
    "read": ("cant.service", "read_curves"),
}


def __getattr__(name: str) -> Any:
    if name not in _WHERE:
        message = f"module 'cant' has no attribute {name!r}"
        raise AttributeError(message)
    from importlib import import_module

    module, attribute = _WHERE[name]
    return getattr(import_module(module), attribute)
