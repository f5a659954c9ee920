"""Several files in place together, or none."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import pytest

from cant.errors import FileError
from cant.writing.outputs import check_places, write_together


def broken() -> Iterator[bytes]:
    yield b"half"
    message = "a fault half way"
    raise RuntimeError(message)


def test_all_files_are_written(tmp_path: Path) -> None:
    a, b = tmp_path / "a.xlsx", tmp_path / "b.json"
    write_together({a: b"one", b: iter([b"t", b"wo"])})
    assert (a.read_bytes(), b.read_bytes()) == (b"one", b"two")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.xlsx", "b.json"]


def test_a_fault_half_way_leaves_everything_as_it_was(tmp_path: Path) -> None:
    a, b = tmp_path / "a.xlsx", tmp_path / "b.json"
    a.write_bytes(b"old")
    with pytest.raises(RuntimeError):
        write_together({a: b"new", b: broken()})
    assert a.read_bytes() == b"old"
    assert [p.name for p in tmp_path.iterdir()] == ["a.xlsx"]


def test_a_place_that_fails_last_brings_the_first_one_back(tmp_path: Path) -> None:
    a, b = tmp_path / "a.xlsx", tmp_path / "b.json"
    a.write_bytes(b"old")

    def occupy() -> Iterator[bytes]:
        yield b"new"
        b.mkdir()  # somebody puts a folder in the way while the file is being made
        (b / "inside").write_bytes(b"")

    with pytest.raises(FileError, match=r"b\.json: cannot be written"):
        write_together({a: b"new", b: occupy()})
    assert a.read_bytes() == b"old"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.xlsx", "b.json"]


def test_permissions_of_a_replaced_file_stay(tmp_path: Path) -> None:
    a = tmp_path / "a.json"
    a.write_bytes(b"old")
    a.chmod(0o640)
    write_together({a: b"new"})
    assert a.stat().st_mode & 0o777 == 0o640


def test_a_link_keeps_pointing(tmp_path: Path) -> None:
    real, link = tmp_path / "real.json", tmp_path / "link.json"
    real.write_bytes(b"old")
    link.symlink_to(real)
    write_together({link: b"new"})
    assert link.is_symlink()
    assert real.read_bytes() == b"new"


def test_places_that_cannot_be_are_refused_before_any_work(tmp_path: Path) -> None:
    source = tmp_path / "curves.xlsx"
    source.write_bytes(b"")
    with pytest.raises(FileError, match="would be overwritten"):
        check_places([tmp_path / "." / "curves.xlsx"], [source])
    with pytest.raises(FileError, match="two outputs"):
        check_places([tmp_path / "a", tmp_path / "a"], [])
    with pytest.raises(FileError, match="folder does not exist"):
        check_places([tmp_path / "none" / "a.xlsx"], [])
    with pytest.raises(FileError, match="is a folder"):
        check_places([tmp_path], [])
    check_places([tmp_path / "a.xlsx", tmp_path / "b.json"], [source])
    assert os.listdir(tmp_path) == ["curves.xlsx"]


def test_a_device_or_pipe_is_never_replaced_by_a_file(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe.json"
    os.mkfifo(pipe)
    with pytest.raises(FileError, match=r"pipe\.json: is a device or pipe"):
        check_places([pipe], [])
    assert pipe.is_fifo()
