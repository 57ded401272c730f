"""Find, map and verify the data files that are shipped in `colure_resources`."""

from functools import cache
from importlib.util import find_spec
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.errors import ResourceError


@cache
def root() -> Path:
    """Return the folder of the data package, without importing it."""
    spec = find_spec("colure_resources")
    if spec is None or not spec.submodule_search_locations:
        raise ResourceError("data files: package 'colure_resources' is not installed; install 'colure' whole")
    return Path(next(iter(spec.submodule_search_locations)))


def path(relative: str) -> Path:
    """Return the path of a shipped file such as `"time/deltat.toml"`; raise ResourceError if it is not there."""
    found = root() / relative
    if not found.is_file():
        raise ResourceError(f"data file '{relative}': not found in {root()}; the installation is damaged")
    return found


def load_array(relative: str, *, mmap: bool = True) -> NDArray[Any]:
    """Return a shipped `.npy` array, memory-mapped read-only unless `mmap` is false."""
    where = path(relative)
    try:
        array: NDArray[Any] = np.load(where, mmap_mode="r" if mmap else None, allow_pickle=False)
    except (ValueError, OSError, EOFError) as error:
        raise ResourceError(f"data file '{relative}': no readable array ({error}); run 'colure selfcheck'") from error
    return array


def read_toml(relative: str) -> dict[str, Any]:
    """Return a shipped TOML file as a dictionary."""
    import tomllib  # late: most of what is shipped is arrays, and the first chart reads no TOML

    try:
        return tomllib.loads(path(relative).read_text(encoding="utf-8"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as fault:
        raise ResourceError(f"data file '{relative}': {fault}; run 'colure selfcheck'") from fault


class Check(NamedTuple):
    """One shipped file held against its entry in PROVENANCE.toml."""

    path: str
    ok: bool
    fault: str
    licence: str
    bytes: int


def verify() -> tuple[Check, ...]:
    """Compare every shipped data file with the sha256 in its PROVENANCE.toml; files without an entry are faults."""
    import hashlib  # late: it loads a cryptographic library of 3 MiB

    base = root()
    checks: list[Check] = []
    listed: set[Path] = set()
    for provenance in sorted(base.rglob("PROVENANCE.toml")):
        folder = provenance.parent
        listed.add(provenance)
        relative = provenance.relative_to(base).as_posix()
        try:
            entries = read_toml(relative).get("file", [])
        except ResourceError as error:
            checks.append(Check(relative, False, str(error), "", 0))
            continue
        for entry in entries:
            file = folder / entry["path"]
            listed.add(file)
            name = file.relative_to(base).as_posix()
            licence = entry.get("licence", "")
            if not file.is_file():
                checks.append(Check(name, False, "missing", licence, 0))
                continue
            digest = hashlib.sha256(file.read_bytes()).hexdigest()
            fault = "" if digest == entry["sha256"] else f"sha256 {digest[:12]}…, expected {entry['sha256'][:12]}…"
            checks.append(Check(name, not fault, fault, licence, file.stat().st_size))
    for file in sorted(base.rglob("*")):
        is_data = file.is_file() and file.suffix not in {".py", ".pyc", ".typed"} and "LICENSES" not in file.parts
        if is_data and file not in listed:
            checks.append(Check(file.relative_to(base).as_posix(), False, "not in any PROVENANCE.toml", "", 0))
    return tuple(checks)
