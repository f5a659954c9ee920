"""Every public quantity says its unit, its shape and its source."""

from __future__ import annotations

import importlib
import inspect
import pkgutil
import re
from types import FunctionType

import pytest

import cant.quantities


def public_functions() -> list[tuple[str, FunctionType]]:
    found = []
    for info in pkgutil.iter_modules(cant.quantities.__path__):
        module = importlib.import_module(f"cant.quantities.{info.name}")
        for name, value in vars(module).items():
            if isinstance(value, FunctionType) and value.__module__ == module.__name__ and name[0] != "_":
                found.append((f"{info.name}.{name}", value))
    return found


FUNCTIONS = public_functions()


def test_there_are_functions_to_look_at() -> None:
    assert len(FUNCTIONS) > 45


@pytest.mark.parametrize("function", [f for _, f in FUNCTIONS], ids=[name for name, _ in FUNCTIONS])
def test_docstring_names_units_shape_and_source(function: FunctionType) -> None:
    text = inspect.getdoc(function) or ""
    sections = re.split(r"\n(?=[A-Z][A-Za-z]+\n-{3,})", text)
    by_name = {section.split("\n", 1)[0]: section for section in sections[1:]}
    assert {"Parameters", "Returns", "References"} <= set(by_name)
    assert re.search(r"\[[^\]]+\]", by_name["Parameters"]), "no unit among the parameters"
    assert re.search(r"\[[^\]]+\]|Formula", by_name["Returns"]), "no unit of the result"
    assert "shape" in by_name["Returns"], "no shape of the result"
    assert re.search(r"\.\. \[1\] \S+", by_name["References"]), "no source"
    for parameter in inspect.signature(function).parameters:
        assert re.search(rf"(^|[ ,]){parameter}\b", by_name["Parameters"], re.M), f"{parameter} is not told"
