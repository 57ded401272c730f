"""The self-check: whether the data files are whole, which versions are at work, and how far the tables reach.

Nothing is imported to learn its version, so the report can be had where Qt is missing or broken.
"""

import platform
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from importlib import metadata
from typing import Any

import colure
from colure import calendars, ephemeris, orientation, resources
from colure.errors import ColureError

FOLDERS = (
    "constellations",
    "deepsky",
    "ephemeris",
    "fonts",
    "metrics",
    "milkyway",
    "names",
    "nutation",
    "sites",
    "stars",
    "time",
)
"""Every folder of data that is shipped; one that is missing whole has no PROVENANCE.toml to say so."""
FONTS = (
    "ColureSans-Regular.ttf",
    "ColureSans-Bold.ttf",
    "ColureSerif-Regular.ttf",
    "ColureSerif-Italic.ttf",
    "ColureSerif-Bold.ttf",
)
NEEDED = ("numpy", "pyerfa")
WINDOW = ("PySide6-Essentials", "pyqtgraph", "click", "tomli-w")
FILES = ("astropy",)
BROKEN = {("PySide6-Essentials", "6.12.0"): "this release aborts the interpreter; install another"}


@dataclass(frozen=True, slots=True)
class Item:
    """One line of the report: what was looked at (`topic`, `name`), what was found, and the fault if there is one."""

    topic: str
    name: str
    value: str
    fault: str = ""

    @property
    def ok(self) -> bool:
        """Whether nothing is wrong."""
        return not self.fault


@dataclass(frozen=True, slots=True)
class Report:
    """What the self-check found."""

    items: tuple[Item, ...]

    @property
    def ok(self) -> bool:
        """Whether nothing at all is wrong."""
        return all(item.ok for item in self.items)

    @property
    def faults(self) -> tuple[Item, ...]:
        """The items with a fault."""
        return tuple(item for item in self.items if item.fault)

    def records(self) -> list[dict[str, Any]]:
        """Return one dictionary per item with the keys `topic`, `name`, `value`, `ok` and `fault`."""
        return [
            {"topic": item.topic, "name": item.name, "value": item.value, "ok": item.ok, "fault": item.fault}
            for item in self.items
        ]

    def text(self) -> str:
        """Return the report for reading: the verdict first, whole files as one line a folder, faults in full."""
        files = [item for item in self.items if item.topic == "file"]
        faults = self.faults
        verdict = "all is well" if not faults else f"{len(faults)} fault{'s' if len(faults) > 1 else ''}"
        lines = [f"colure {colure.__version__} self-check: {verdict}"]
        lines += [f"  FAULT  {item.topic} {item.name}: {item.fault}" for item in faults]
        lines.append("data files")
        for folder in sorted({item.name.partition("/")[0] for item in files}):
            mine = [item for item in files if item.name.partition("/")[0] == folder]
            whole = sum(item.ok for item in mine)
            lines.append(f"  {folder:<28} {whole} of {len(mine)} whole")
        for topic, title in (("version", "versions"), ("platform", "platform"), ("font", "fonts"), ("table", "tables")):
            lines.append(title)
            lines += [f"  {item.name:<28} {item.value}" for item in self.items if item.topic == topic]
        return "\n".join(lines)


def run() -> Report:
    """Return the report; reads every data file once to compare its sha256."""
    return Report((*_files(), *_versions(), *_platform(), *_fonts(), *_tables()))


def _files() -> Iterator[Item]:
    try:
        base = resources.root()
    except ColureError as error:
        yield Item("file", "colure_resources", "missing", str(error))
        return
    for folder in FOLDERS:
        if not (base / folder / "PROVENANCE.toml").is_file():
            yield Item("file", f"{folder}/PROVENANCE.toml", "missing", "missing; install 'colure' whole")
    for check in resources.verify():
        size = f"{check.bytes} bytes" + (f", {check.licence}" if check.licence else "")
        yield Item("file", check.path, size, check.fault)


def _version(name: str) -> str | None:
    try:
        return metadata.version(name)
    except metadata.PackageNotFoundError:
        return None


def _versions() -> Iterator[Item]:
    yield Item("version", "colure", colure.__version__)
    python = platform.python_version()
    supported = (3, 11) <= sys.version_info[:2] < (3, 14)
    yield Item("version", "python", python, "" if supported else f"{python}, expected 3.11 to 3.13")
    for name in (*NEEDED, *WINDOW, *FILES):
        found = _version(name)
        if found is None and name in NEEDED:
            yield Item("version", name, "not installed", "not installed; the core needs it")
        elif found is None:
            use = "the window and the command line need it" if name in WINDOW else "VOTable, FITS and ECSV need it"
            yield Item("version", name, f"not installed ({use})")
        else:
            yield Item("version", name, found, BROKEN.get((name, found), ""))


def _platform() -> Iterator[Item]:
    yield Item("platform", "system", platform.platform())
    yield Item("platform", "interpreter", f"{platform.python_implementation()} on {platform.machine()}")


def _fonts() -> Iterator[Item]:
    for name in FONTS:
        try:
            resources.path(f"fonts/{name}")
        except ColureError as error:
            yield Item("font", name, "missing", str(error))
        else:
            yield Item("font", name, "present")


def _tables() -> Iterator[Item]:
    unreadable = (ColureError, OSError, IndexError, KeyError, TypeError, ValueError)
    try:
        end = _date(orientation.utc_end() + 2400001)
    except unreadable as error:
        yield Item("table", "IERS", "unreadable", f"time/iers.npy: unreadable ({error})")
    else:
        yield Item("table", "IERS", f"ΔUT1 and polar motion up to {end}")
    try:
        source = ephemeris.default()
        first, last = (_date(int(jd + 0.5)) for jd in source.span)
    except unreadable as error:
        yield Item("table", "ephemeris", "unreadable", f"ephemeris: unreadable ({error})")
    else:
        yield Item("table", "ephemeris", f"{source.name}, {first} to {last} TDB")


def _date(day_number: int) -> str:
    """Return the date of a whole Julian day number in the mixed calendar."""
    year, month, day = calendars.calendar_date(day_number)
    return f"{calendars.year_text(int(year))}-{int(month):02d}-{int(day):02d}"
