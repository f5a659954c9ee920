"""Hostile files are refused in one clear sentence, or read within bounds: no crash, no hang, no flood."""

import json
import re
import subprocess
import sys
from pathlib import Path

import pytest
from hostile import FILES, READ, book, book_parts, good_parts, sheet, zipped

from cant.errors import FileError
from cant.files.open import open_workbook


@pytest.fixture(scope="module")
def outcomes():
    """Open all files in one process that may take 2 GiB and two minutes."""
    child = Path(__file__).with_name("hostile_child.py")
    done = subprocess.run([sys.executable, child], capture_output=True, text=True, timeout=120, check=False)
    assert done.returncode == 0, done.stderr[-2000:]
    return {one["name"]: one for one in map(json.loads, done.stdout.splitlines())}


@pytest.mark.parametrize("name", FILES)
def test_hostile_file(outcomes, name):
    outcome, expected = outcomes[name], FILES[name].expected
    if expected == READ:
        assert "read" in outcome
        return
    message = outcome["refused"]
    assert message.startswith(name + FILES[name].suffix)
    assert expected in message
    assert "\n" not in message
    assert len(message) < 300


def test_there_are_enough_kinds():
    assert len(FILES) >= 40


def test_far_corner_is_read_as_it_is():
    rows = open_workbook(FILES["one_cell_at_the_far_corner"].make(), "a.xlsx").sheets[0].rows
    assert len(rows) == 1_048_576
    assert len(rows[-1]) == 16_384
    assert rows[-1][-1] == 1.0
    assert rows[1] == ["C1", 400.0]


def test_stale_extent_drops_nothing():
    rows = open_workbook(FILES["extent_declared_too_small"].make(), "a.xlsx").sheets[0].rows
    assert rows == [["Curve", "Radius"], ["C1", 400.0]]


def test_numbers_that_are_none_are_errors_not_numbers():
    (row,) = open_workbook(FILES["numbers_that_are_none"].make(), "a.xlsx").sheets[0].rows
    assert [type(value).__name__ for value in row] == ["CellError"] * 8


def test_rows_in_comments_and_cdata_are_text():
    sheet_read = open_workbook(FILES["cells_hidden_in_comments_and_cdata"].make(), "a.xlsx").sheets[0]
    assert sheet_read.rows == [["Curve", "Radius"], ['<c r="A9"><v>666</v></c>', 400.0]]


@pytest.mark.parametrize("suffix", [".xlsx", ".csv", ".pdf", ""])
def test_kind_is_found_by_content(suffix):
    assert open_workbook(zipped(good_parts()), "a" + suffix).kind == "xlsx"
    assert open_workbook(b"Curve,Radius\nC1,400\n", "a" + suffix).kind == "csv"


def test_message_names_file_sheet_and_cell():
    data = book('<row r="1"><c r="A1" t="s"><v>7</v></c></row>')
    with pytest.raises(FileError, match=re.escape("list.xlsx, sheet 'Curves', cell A1: ")):
        open_workbook(data, "list.xlsx")


def test_truncation_anywhere_is_refused():
    data = zipped(good_parts())
    for length in range(0, len(data), 13):
        with pytest.raises(FileError):
            open_workbook(data[:length], "cut.xlsx")


@pytest.mark.parametrize("seed", range(60))
def test_random_damage_never_escapes_as_another_error(seed):
    """Bytes of a part are changed at random before it is packed; the file is read or refused."""
    import random

    source = random.Random(seed)
    parts = book_parts({"Curves": sheet('<row r="1"><c r="A1" s="1"><f>1+1</f><v>2</v></c></row>')})
    for name, content in parts.items():
        raw = bytearray(content.encode() if isinstance(content, str) else content)
        for _ in range(source.randrange(3)):
            raw[source.randrange(len(raw))] = source.choice(b'<>"&;/ =9aA\x00\xff')
        parts[name] = bytes(raw)
    try:
        open_workbook(zipped(parts), "damaged.xlsx")
    except FileError as error:
        assert str(error).startswith("damaged.xlsx")  # noqa: PT017
