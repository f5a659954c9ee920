"""The catalogue: entries are whole, texts hold together, and LibreOffice computes what the code does."""

from __future__ import annotations

import inspect
import re
import shutil
import subprocess
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest

from cant.quantities.catalogue import CATALOGUE, SYMBOLS, formula
from cant.quantities.formula import Formula

CASES = 25
EXCEL_2010 = {"SQRT", "MAX", "MIN", "ABS", "IF", "INT", "SIGN", "PI", "COS", "SIN", "SUM", "SUMPRODUCT"}
RANGES = {"C": (7, 14), "D": (-20, 180), "e": (1000, 1750), "g": (9.8, 9.82), "t": (0, 1), "s": (0, 0.5)}
RANGES |= {"k": (1, 2), "k_m": (-0.004, 0.004), "k_t": (-0.005, 0.005), "k_b": (-0.006, 0.006)}
RANGES |= {"D_EQ": (0, 300), "D_m": (-160, 160), "dD": (-300, 300), "dI": (-300, 300), "turn": (0.05, 2)}
RANGES |= {"R": (150, 6000), "R_2": (150, 6000), "L": (10, 200), "L_in": (0, 200), "L_out": (0, 200)}
RANGES |= {
    "V": (5, 300),
    "V_f": (100, 300),
    "V_s": (20, 160),
    "Vs": (20, 200),
    "ws": (0.5, 90),
    "step": (5, 10),
}
RANGES |= {"I_lim": (40, 160), "E_lim": (40, 120), "U": (-150, 150), "a": (-1, 1), "a_lim": (0.5, 1.2)}
RANGES |= {
    "h": (0.5, 5.5),
    "c": (10, 20),
    "v": (5, 200),
    "rate": (-90, 90),
    "r_lim": (30, 70),
    "rI_lim": (30, 90),
}
RANGES |= {"grad_lim": (1, 3), "limit": (50, 150), "value": (0, 200)}
CLASSES = 4

entries = pytest.mark.parametrize("entry", CATALOGUE.values(), ids=CATALOGUE.keys())


@entries
def test_entry_is_whole(entry: Formula) -> None:
    assert entry.symbol
    assert entry.unit
    assert entry.words
    assert entry.source
    assert set(entry.arguments) == set(entry.parameters)
    assert set(entry.arguments) <= set(SYMBOLS)
    accepted = inspect.signature(entry.function).parameters
    assert set(entry.parameters.values()) <= set(accepted)
    used = set(re.findall(r"[A-Z][A-Z0-9]+(?=\()", entry.template))
    assert used <= EXCEL_2010


def test_every_symbol_is_used_and_every_range_known() -> None:
    used = {symbol for entry in CATALOGUE.values() for symbol in entry.arguments}
    assert used == set(SYMBOLS) == set(RANGES)


def test_text_brackets_expressions_and_leaves_references() -> None:
    entry = formula("equilibrium_cant")
    assert entry.text(C="Limits!$B$2", V="C5", R="'My sheet'!D5") == "Limits!$B$2*C5^2/'My sheet'!D5"
    assert entry.text(C=11.8, V=-5, R="A1+A2") == "11.8*(-5.0)^2/(A1+A2)"
    assert entry.text(C="constant", V="MAX(A1,B1)", R="D5") == "constant*(MAX(A1,B1))^2/D5"


def test_text_refuses_missing_and_unknown_symbols() -> None:
    with pytest.raises(KeyError, match="equilibrium_cant takes C, V, R"):
        formula("equilibrium_cant").text(C="A1", V="A2")
    with pytest.raises(KeyError, match="takes D, D_EQ"):
        formula("cant_excess").text(D="A1", D_EQ="A2", R="A3")


def draw(entry: Formula, rng: np.random.Generator) -> dict[str, Any]:
    """One set of arguments; the two range arguments get one value a class."""
    return {
        symbol: rng.uniform(*RANGES[symbol], CLASSES if symbol in ("Vs", "ws") else None)
        for symbol in entry.arguments
    }


def write_case(sheet: Any, row: int, entry: Formula, values: dict[str, Any]) -> None:
    """Put the inputs from column C on, and the formula over their cells into column B."""
    column, cells = 3, {}
    for symbol, value in values.items():
        numbers = np.atleast_1d(value)
        first = sheet.cell(row, column).coordinate
        for number in numbers:
            last = sheet.cell(row, column, float(number)).coordinate
            column += 1
        cells[symbol] = first if len(numbers) == 1 else f"{first}:{last}"
    sheet.cell(row, 1, entry.key)
    sheet.cell(row, 2, f"={entry.text(**cells)}")


@pytest.mark.office
def test_libreoffice_computes_what_the_code_does(tmp_path: Path) -> None:
    office = shutil.which("soffice") or shutil.which("libreoffice")
    if office is None:
        pytest.skip("LibreOffice is not installed: no soffice on the path")
    rng = np.random.default_rng(20)
    book = openpyxl.Workbook()
    sheet = book.active
    expected: list[tuple[str, float]] = []
    for entry in CATALOGUE.values():
        for _ in range(CASES):
            values = draw(entry, rng)
            write_case(sheet, len(expected) + 1, entry, values)
            expected.append((entry.key, float(entry.evaluate(**values))))
    book.save(tmp_path / "formulas.xlsx")
    profile = f"-env:UserInstallation=file://{tmp_path / 'profile'}"
    arguments = [office, profile, "--headless", "--convert-to", "xlsx", "--outdir", str(tmp_path / "out")]
    subprocess.run(
        [*arguments, str(tmp_path / "formulas.xlsx")], check=True, capture_output=True, timeout=180
    )
    result = openpyxl.load_workbook(tmp_path / "out" / "formulas.xlsx", data_only=True).active
    assert len(expected) == CASES * len(CATALOGUE)
    for row, (key, value) in enumerate(expected, start=1):
        assert result.cell(row, 1).value == key
        assert result.cell(row, 2).value == pytest.approx(value, rel=1e-9, abs=1e-12), key
