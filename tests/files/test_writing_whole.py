"""Files are written whole or not at all."""

import os
import stat
import sys

import pytest

from cant.errors import FileError
from cant.files.whole import write_whole


def test_new_file_in_pieces(tmp_path):
    write_whole(tmp_path / "a.json", iter([b"one ", b"two"]))
    assert (tmp_path / "a.json").read_bytes() == b"one two"


def test_failure_on_the_way_leaves_the_old_file(tmp_path):
    target = tmp_path / "a.json"
    target.write_bytes(b"old")

    def pieces():
        yield b"half"
        message = "stop"
        raise RuntimeError(message)

    with pytest.raises(RuntimeError):
        write_whole(target, pieces())
    assert target.read_bytes() == b"old"
    assert os.listdir(tmp_path) == ["a.json"]


def test_permissions_stay(tmp_path):
    target = tmp_path / "a.json"
    target.write_bytes(b"old")
    target.chmod(0o640)
    write_whole(str(target), b"new")
    assert target.read_bytes() == b"new"
    assert stat.S_IMODE(target.stat().st_mode) == 0o640


def test_link_is_followed(tmp_path):
    target = tmp_path / "real.json"
    target.write_bytes(b"old")
    (tmp_path / "link.json").symlink_to(target)
    write_whole(tmp_path / "link.json", b"new")
    assert target.read_bytes() == b"new"
    assert (tmp_path / "link.json").is_symlink()


def test_missing_folder_is_said(tmp_path):
    with pytest.raises(FileError, match="cannot be written \\(no such file or directory\\)"):
        write_whole(tmp_path / "missing" / "a.json", b"x")


def test_folder_is_said(tmp_path):
    with pytest.raises(FileError, match="is a folder"):
        write_whole(tmp_path, b"x")


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="needs /dev/full")
def test_full_disk_is_said():
    with pytest.raises(FileError, match="no space left"):
        write_whole("/dev/full", b"x" * 100)
