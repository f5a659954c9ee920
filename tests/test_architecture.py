"""The rooms and the arrows between them, read from the imports themselves."""

from __future__ import annotations

import ast
from collections import Counter
from collections.abc import Iterator
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]
FLOORS: tuple[tuple[str, ...], ...] = (
    ("cant.errors", "cant.units", "cant.version", "cant.progress"),
    ("cant.model",),
    ("cant.quantities", "cant.files"),
    ("cant.limit_sets",),
    ("cant.reading", "cant.planning"),
    ("cant.explaining",),
    ("cant.writing",),
    ("cant.service",),
    ("cant.cli", "cant"),
    ("cant.__main__",),
)
FLOOR = {room: number for number, rooms in enumerate(FLOORS) for room in rooms}
WEB = ("webapp", "flask", "werkzeug", "jinja2", "sqlalchemy", "alembic", "waitress")


def module_name(path: Path) -> str:
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


MODULES = {module_name(path): path for folder in ("cant", "webapp") for path in (ROOT / folder).rglob("*.py")}


def imports(path: Path, *, at_run_time: bool) -> Iterator[str]:
    """Yield the modules that a file imports; for the program's own, the module and not the name in it."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    skipped: set[ast.AST] = set()
    for node in ast.walk(tree):
        if at_run_time and isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING"):
            skipped |= {inner for part in node.body for inner in ast.walk(part)}
    for node in ast.walk(tree):
        if node in skipped:
            continue
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path} imports relatively"
            assert node.module is not None
            for alias in node.names:
                full = f"{node.module}.{alias.name}"
                yield full if full in MODULES else node.module


def room(module: str) -> str:
    """Give the room of a module of cant."""
    parts = module.split(".")
    return ".".join(parts[:2]) if len(parts) > 1 else module


def test_every_room_has_its_floor() -> None:
    rooms = {room(name) for name in MODULES if name.split(".")[0] == "cant"}
    assert rooms == set(FLOOR)


def test_cant_knows_nothing_of_the_web() -> None:
    found = [
        (name, target)
        for name, path in MODULES.items()
        if name.split(".")[0] == "cant"
        for target in imports(path, at_run_time=False)
        if target.split(".")[0] in WEB
    ]
    assert found == []


def test_the_web_service_enters_by_the_doors() -> None:
    """Pages use the service, the ground floor and words; never the planner's arrays or the file's innards."""
    inner = {name for name in MODULES if name.startswith(("cant.planning.", "cant.explaining."))}
    found = [
        (name, target)
        for name, path in MODULES.items()
        if name.split(".")[0] == "webapp"
        for target in imports(path, at_run_time=True)
        if target in inner or room(target) == "cant.cli"
    ]
    assert found == []


@pytest.mark.parametrize("name", sorted(n for n in MODULES if n.split(".")[0] == "cant"))
def test_a_module_imports_only_lower_rooms(name: str) -> None:
    own = room(name)
    for target in imports(MODULES[name], at_run_time=False):
        if target.split(".")[0] != "cant" or room(target) == own:
            continue
        assert FLOOR[room(target)] < FLOOR[own], f"{name} imports {target}, which is not below it"


@pytest.mark.parametrize("package", ["cant", "webapp"])
def test_no_imports_in_a_circle(package: str) -> None:
    arrows = {
        name: {t for t in imports(path, at_run_time=True) if t in MODULES and t != name}
        for name, path in MODULES.items()
        if name.split(".")[0] == package
    }
    assert circle(arrows) is None


def circle(arrows: dict[str, set[str]]) -> list[str] | None:
    """Find a circle of imports, None where there is none."""
    done: set[str] = set()

    def walk(name: str, trail: list[str]) -> list[str] | None:
        if name in trail:
            return [*trail[trail.index(name) :], name]
        if name in done or name not in arrows:
            return None
        for target in sorted(arrows[name]):
            found = walk(target, [*trail, name])
            if found:
                return found
        done.add(name)
        return None

    for name in arrows:
        found = walk(name, [])
        if found:
            return found
    return None


def test_the_check_for_circles_finds_one() -> None:
    assert circle({"a": {"b"}, "b": {"c"}, "c": {"a"}}) == ["a", "b", "c", "a"]
    assert circle({"a": {"b", "c"}, "b": {"c"}, "c": set()}) is None


def test_no_two_test_files_bear_the_same_name() -> None:
    """They are modules without a package, found by name: of two alike one would not run."""
    names = Counter(path.name for path in (ROOT / "tests").rglob("*.py") if path.name != "conftest.py")
    assert [name for name, count in names.items() if count > 1 and name != "__init__.py"] == []


def test_the_top_of_the_repository_holds_what_it_should() -> None:
    """Only what git knows counts."""
    import subprocess

    listed = subprocess.run(
        ["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False
    ).stdout.split()
    if not listed:  # a copy without its history holds the same files
        listed = [p.name for p in ROOT.iterdir() if p.is_file() and not p.name.startswith(".")]
    top = {name.split("/")[0] for name in listed if not name.startswith(".")}
    allowed = {
        "pyproject.toml",
        "README.md",
        "DEVELOPERS.md",
        "cant",
        "webapp",
        "tests",
        "sample_data",
    }
    assert top <= allowed
