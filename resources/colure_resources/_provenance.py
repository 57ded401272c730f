"""Write a PROVENANCE.toml beside built data files; used by the build scripts only."""

import hashlib
from pathlib import Path
from typing import Any

import tomli_w


def write(folder: Path, entries: list[dict[str, Any]], remarks: dict[str, Any] | None = None) -> None:
    """Write `folder/PROVENANCE.toml`: the entries, each completed with its sha256 and size, and the remarks first.

    An entry has `path`, `source`, `version`, `licence`, `date`, `script`, `rows` and `completeness`.
    """
    complete = []
    for entry in entries:
        data = (folder / entry["path"]).read_bytes()
        complete.append({**entry, "bytes": len(data), "sha256": hashlib.sha256(data).hexdigest()})
    text = tomli_w.dumps({**(remarks or {}), "file": complete}, multiline_strings=True)
    (folder / "PROVENANCE.toml").write_text(text, encoding="utf-8")
