"""What every test may use: where the repository lies, and heavy tests that skip themselves with a reason.

With CANT_TESTS_ALL=1 nothing may be left out: a missing program, or any skipped test, fails the run.
"""

from __future__ import annotations

import importlib.util
import os
import shutil
from collections.abc import Callable
from pathlib import Path
from types import ModuleType

import pytest
from hypothesis import settings

ROOT = Path(__file__).resolve().parents[1]
ALL = os.environ.get("CANT_TESTS_ALL") == "1"

# Where all must hold the same examples are drawn every time; elsewhere each run looks at new ones.
settings.register_profile("cant", deadline=None, print_blob=True, derandomize=ALL)
settings.load_profile("cant")


def _program(name: str) -> Callable[[], str | None]:
    return lambda: None if shutil.which(name) else f"needs {name}, which this machine does not have"


def _postgresql() -> str | None:
    found = shutil.which("initdb") or any(Path("/usr/lib/postgresql").glob("*/bin/initdb"))
    return None if found else "needs the programs of a PostgreSQL server, which this machine does not have"


NEEDS: dict[str, Callable[[], str | None]] = {
    "browser": _program("chromium"),
    "office": _program("soffice"),
    "postgresql": _postgresql,
}


def pytest_runtest_setup(item: pytest.Item) -> None:
    for marker, lacking in NEEDS.items():
        if item.get_closest_marker(marker) is None:
            continue
        reason = lacking()
        if reason is None:
            continue
        if ALL:
            pytest.fail(f"nothing may be left out here: {reason}", pytrace=False)
        pytest.skip(reason)


def pytest_sessionfinish(session: pytest.Session) -> None:
    reporter = session.config.pluginmanager.get_plugin("terminalreporter")
    if ALL and reporter is not None and reporter.stats.get("skipped"):
        reporter.write_line(
            f"{len(reporter.stats['skipped'])} tests were left out, and none may be", red=True
        )
        session.exitstatus = pytest.ExitCode.TESTS_FAILED


@pytest.fixture(scope="session")
def root() -> Path:
    """Give the folder of the repository."""
    return ROOT


@pytest.fixture(scope="session")
def sample_file() -> Path:
    """Give the workbook of the sample line."""
    return ROOT / "sample_data" / "dunmarrow_keldrith.xlsx"


@pytest.fixture(scope="session")
def make_sample() -> ModuleType:
    """Give the script that makes the samples, as a module."""
    spec = importlib.util.spec_from_file_location("make_sample", ROOT / "sample_data" / "make_sample.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
