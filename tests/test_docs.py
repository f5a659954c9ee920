"""The documents say what the program does: commands, options, columns, quantities, settings, statuses."""

from __future__ import annotations

import re
from pathlib import Path

import click
import pytest

from cant.cli import cant
from cant.limit_sets import headers, names
from cant.model.curves import SHAPES
from cant.model.limits import QUANTITIES, LimitSet
from cant.model.plan import STATUSES
from cant.model.settings import METHODS
from cant.reading.columns import TABLES, columns_of
from cant.reading.words import lexicon

ROOT = Path(__file__).resolve().parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"^```(\w*)\n(.*?)^```$", README, flags=re.MULTILINE | re.DOTALL)
COMMANDS = sorted(cant.commands)


@pytest.mark.parametrize("name", COMMANDS)
def test_a_command_has_help_and_a_row_in_the_readme(name: str) -> None:
    command = cant.commands[name]
    assert command.help
    row = next((line for line in README.splitlines() if line.startswith(f"| `cant {name}")), None)
    assert row is not None
    for option in command.params:
        if isinstance(option, click.Option):
            assert option.help, f"--{option.name} has no help"
            assert any(f"`{word}" in row or f"{word} " in row for word in option.opts), option.opts


@pytest.mark.parametrize("name", COMMANDS)
def test_help_names_each_option(name: str) -> None:
    command = cant.commands[name]
    text = command.get_help(click.Context(command, info_name=f"cant {name}"))
    for option in command.params:
        assert any(word in text for word in (*option.opts, (option.name or "").upper()))


@pytest.mark.parametrize("table", [t for t in TABLES if t != "settings"])
def test_every_canonical_column_is_documented(table: str) -> None:
    for info in columns_of(table):
        assert f"`{info.name}`" in README, f"{table}: {info.name}"


def test_every_header_of_a_limit_table_is_documented() -> None:
    for title in headers(LimitSet(name="none")):
        assert f"`{title}`" in README


@pytest.mark.parametrize("quantity", list(QUANTITIES))
def test_every_quantity_is_documented_with_its_unit(quantity: str) -> None:
    row = next(line for line in README.splitlines() if line.startswith(f"| `{quantity}` |"))
    assert QUANTITIES[quantity].canonical in row


@pytest.mark.parametrize("setting", sorted(set(lexicon("settings").values())))
def test_every_setting_is_documented(setting: str) -> None:
    assert f"| `{setting}` |" in README


def test_statuses_shapes_and_methods_are_documented() -> None:
    for word in (*STATUSES, *SHAPES, *METHODS):
        assert f"`{word}`" in README


def test_the_readme_opens_with_the_job_and_the_cautions() -> None:
    paragraphs = README.split("\n\n")
    assert paragraphs[0].startswith("# ")
    assert "cant" in paragraphs[1]
    assert paragraphs[2].startswith("**Cautions.**")
    assert README.index("**Cautions.**") < README.index("```")


def test_the_first_two_code_blocks_are_one_line_commands() -> None:
    first, second = (block[1].strip() for block in BLOCKS[:2])
    for command in (first, second):
        assert "\n" not in command
        assert command.startswith("python3 -m venv .venv && ")
    assert "cant plan sample_data/" in first
    assert "[test]" in second
    assert "pytest" in second
    sample = first.split("cant plan ")[1]
    assert (ROOT / sample).is_file()
    stem = Path(sample).stem
    assert f"`{stem}-plan.xlsx`" in README
    assert f"`{stem}-plan.json`" in README


def test_ci_runs_the_readme_s_own_test_command() -> None:
    text = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    script = re.search(r"awk '(.*?)' README\.md", text)
    assert script is not None
    import subprocess

    found = subprocess.run(
        ["awk", script.group(1), "README.md"], cwd=ROOT, capture_output=True, text=True, check=True
    )
    assert found.stdout == BLOCKS[1][1]
    assert "CANT_TESTS_ALL=1" in text


def test_limit_sets_named_in_the_readme_exist() -> None:
    assert "typical" in names()


def test_python_in_the_readme_runs(monkeypatch: pytest.MonkeyPatch) -> None:
    code = next(text for language, text in BLOCKS if language == "python")
    monkeypatch.chdir(ROOT)
    exec(compile(code, "README.md", "exec"), {})  # noqa: S102
