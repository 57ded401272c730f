"""The self-check: whole resources pass, and every way of damaging a copy of them is named."""

import json
import shutil
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from colure import orientation, resources, selfcheck

SMALL = ("constellations", "fonts", "time")


def _forget_tables() -> None:
    orientation._table.cache_clear()
    orientation.utc_end.cache_clear()


@pytest.fixture
def copy(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A copy of three small data folders that stands in for the shipped ones."""
    shipped = resources.root()
    for folder in SMALL:
        shutil.copytree(shipped / folder, tmp_path / folder, ignore=shutil.ignore_patterns("*.py", "__pycache__"))
    monkeypatch.setattr(resources, "root", lambda: tmp_path)
    monkeypatch.setattr(selfcheck, "FOLDERS", SMALL)
    _forget_tables()
    yield tmp_path
    _forget_tables()


def _faults() -> dict[str, str]:
    return {item.name: item.fault for item in selfcheck.run().faults}


def test_the_shipped_data_is_whole() -> None:
    report = selfcheck.run()
    assert report.faults == ()
    assert report.ok
    assert report.text().splitlines()[0].endswith("all is well")


def test_every_shipped_folder_is_asked_for() -> None:
    shipped = {path.parent.name for path in resources.root().rglob("PROVENANCE.toml")}
    assert shipped == set(selfcheck.FOLDERS)


def test_a_whole_copy_passes(copy: Path) -> None:
    assert _faults() == {}


def test_one_changed_byte_is_found(copy: Path) -> None:
    path = copy / "constellations" / "cells.npy"
    data = bytearray(path.read_bytes())
    data[-1] ^= 1
    path.write_bytes(data)
    report = selfcheck.run()
    assert not report.ok
    (fault,) = report.faults
    assert (fault.topic, fault.name) == ("file", "constellations/cells.npy")
    assert fault.fault.startswith("sha256 ")
    assert "expected" in fault.fault
    assert "  FAULT  file constellations/cells.npy" in report.text()
    assert "5 of 6 whole" in report.text()


@pytest.mark.parametrize("content", [b"", b"\x93NUMPY", b"no array at all"])
def test_an_unreadable_table_is_named(copy: Path, content: bytes) -> None:
    (copy / "time" / "iers.npy").write_bytes(content)
    faults = _faults()
    assert faults["time/iers.npy"].startswith("sha256 ")
    assert "time/iers.npy" in faults["IERS"]


def test_a_table_of_another_shape_is_named(copy: Path) -> None:
    np.save(copy / "time" / "iers.npy", np.zeros(0, dtype=np.int32))
    assert "time/iers.npy" in _faults()["IERS"]


def test_a_missing_font_is_named_twice(copy: Path) -> None:
    (copy / "fonts" / "ColureSerif-Italic.ttf").unlink()
    faults = _faults()
    assert faults["fonts/ColureSerif-Italic.ttf"] == "missing"
    assert "not found" in faults["ColureSerif-Italic.ttf"]


def test_a_missing_folder_is_named(copy: Path) -> None:
    shutil.rmtree(copy / "constellations")
    assert "missing" in _faults()["constellations/PROVENANCE.toml"]


def test_a_stray_file_is_named(copy: Path) -> None:
    (copy / "time" / "extra.npy").write_bytes(b"x")
    assert _faults() == {"time/extra.npy": "not in any PROVENANCE.toml"}


def test_an_unreadable_provenance_is_named(copy: Path) -> None:
    (copy / "time" / "PROVENANCE.toml").write_bytes(b"[[file]\npath = \xff")
    assert "time/PROVENANCE.toml" in _faults()


def test_records_are_plain(copy: Path) -> None:
    records = json.loads(json.dumps(selfcheck.run().records()))
    assert {tuple(record) for record in records} == {("topic", "name", "value", "ok", "fault")}
    assert {record["topic"] for record in records} == {"file", "version", "platform", "font", "table"}
    by_name = {record["name"]: record["value"] for record in records}
    assert by_name["numpy"] == np.__version__
    assert by_name["python"] == sys.version.split()[0]
    # The table's last day, as the module that reads it gives it.
    last = np.datetime64("1858-11-17") + np.timedelta64(orientation.utc_end(), "D")
    assert by_name["IERS"].endswith(str(last))
    # DE422 begins at JD 625648.5: 1712 Julian years after JD −0.5 (−4712-01-01) is JD 625307.5, −3000-01-01, and 341
    # days on is day 342 of a leap year, 7 December.
    assert "-3000-12-07 to 3000-01-30" in by_name["ephemeris"]


def test_versions_that_break_are_faults(copy: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    found = {"PySide6-Essentials": "6.12.0", "numpy": None, "pyqtgraph": None}
    monkeypatch.setattr(selfcheck, "_version", lambda name: found.get(name, "1.0"))
    report = selfcheck.run()
    assert [item.name for item in report.faults] == ["numpy", "PySide6-Essentials"]
    (window,) = (item for item in report.items if item.name == "pyqtgraph")
    assert window.value.startswith("not installed")


def test_it_imports_no_window_library() -> None:
    code = "import sys; from colure import selfcheck; selfcheck._version('PySide6-Essentials'); print(*sys.modules)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    assert not {"PySide6", "shiboken6", "pyqtgraph", "astropy"} & set(done.stdout.split())
