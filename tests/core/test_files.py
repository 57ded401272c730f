"""Files are written whole or not at all, and read up to a limit."""

import os
import stat
from pathlib import Path

import pytest

from colure import files
from colure.files import FileError, atomic_write, read_bounded


def test_a_new_file_and_a_replaced_one(tmp_path: Path) -> None:
    path = tmp_path / "a.txt"
    atomic_write(path, "Ω\n")
    assert path.read_bytes() == "Ω\n".encode()
    path.chmod(0o640)
    atomic_write(str(path), b"new")
    assert path.read_bytes() == b"new"
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert os.listdir(tmp_path) == ["a.txt"]


def test_an_interrupted_write_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")

    def broken(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(files.os, "replace", broken)
    with pytest.raises(KeyboardInterrupt):
        atomic_write(path, b"new")
    assert path.read_text() == "old"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_a_full_disk_leaves_the_old_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "a.txt"
    path.write_text("old")

    def full(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(files.os, "fsync", full)
    with pytest.raises(FileError, match=r"a\.txt': cannot be written, no space left"):
        atomic_write(path, b"new")
    assert path.read_text() == "old"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_links_are_followed_and_devices_written(tmp_path: Path) -> None:
    target, link = tmp_path / "real.txt", tmp_path / "link.txt"
    target.write_text("old")
    link.symlink_to(target)
    atomic_write(link, b"new")
    assert link.is_symlink()
    assert target.read_text() == "new"
    atomic_write("/dev/null", b"gone")


def test_places_that_cannot_be_written_or_read_say_why(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="no such file"):
        atomic_write(tmp_path / "none" / "a.txt", b"")
    with pytest.raises(FileError, match="folder"):
        atomic_write(tmp_path, b"")
    with pytest.raises(FileError, match="null"):
        atomic_write("a\x00b", b"")
    with pytest.raises(FileError, match="no such file"):
        read_bounded(tmp_path / "none", 10)
    path = tmp_path / "big"
    path.write_bytes(b"x" * 11)
    with pytest.raises(FileError, match="more than 10 bytes"):
        read_bounded(path, 10)
    assert read_bounded(path, 11) == b"x" * 11
