"""The samples in the repository are what the script makes, and hold what their table of contents says."""

from __future__ import annotations

from pathlib import Path
from types import ModuleType

import pytest
from openpyxl import load_workbook


def values(path: Path) -> dict[str, list[tuple[object, ...]]]:
    book = load_workbook(path)
    return {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in book.worksheets}


@pytest.fixture(scope="module")
def remade(make_sample: ModuleType, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("samples")
    make_sample.main(folder)
    return folder


@pytest.mark.parametrize("name", ["dunmarrow_keldrith.xlsx", "tarrow_us_units.xlsx"])
def test_workbooks_are_what_the_script_makes(name: str, remade: Path, root: Path) -> None:
    assert values(remade / name) == values(root / "sample_data" / name)


@pytest.mark.parametrize("name", ["ostwell_branch.csv", "ostwell_traffic.csv"])
def test_csv_files_are_what_the_script_makes(name: str, remade: Path, root: Path) -> None:
    assert (remade / name).read_bytes() == (root / "sample_data" / name).read_bytes()


def test_every_sample_is_described(root: Path) -> None:
    text = (root / "sample_data" / "README.md").read_text(encoding="utf-8")
    for path in (root / "sample_data").iterdir():
        if path.suffix in (".xlsx", ".csv"):
            assert f"`{path.name}`" in text


def test_the_line_is_as_rich_as_promised(sample_file: Path) -> None:
    rows = values(sample_file)["Curves"]
    head, body = rows[0], rows[1:]
    assert len(body) == 41
    at = {name: head.index(name) for name in head}
    assert {row[at["Track"]] for row in body} == {"1", "2"}
    situations = {row[at["Situation"]] for row in body}
    assert {"platform", "level crossing", "bridge"} <= situations
    assert any(row[at["Cant fixed"]] == "yes" for row in body)
    assert any(row[at["Radius (m)"]] is None for row in body)
    classes = {row[0] for row in values(sample_file)["Traffic"][1:]}
    assert len(classes) == 4
