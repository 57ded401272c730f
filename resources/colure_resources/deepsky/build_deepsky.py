"""Builds the deep-sky list from OpenNGC (PyPI pyongc, CC BY-SA 4.0); prints what it holds.

pip install colure[data]
python build_deepsky.py
"""

import re
import sqlite3
from collections import Counter
from importlib.util import find_spec
from pathlib import Path

import numpy as np

from colure import deepsky
from colure_resources import _provenance

HERE = Path(__file__).parent
CATALOGUES = {"Cl": "Cr", "H": "Harvard"}
"""OpenNGC's short names of catalogues that are better known by another."""


def printed(name):
    """OpenNGC's "NGC0224", "IC0186A", "ESO056-115" as "NGC 224", "IC 186A", "ESO 56-115"."""
    letters, rest = re.fullmatch(r"([A-Za-z]+)(.*)", name).groups()
    rest = re.sub(r"\b0+(?=\d)", "", rest)
    return f"{CATALOGUES.get(letters, letters)} {rest}"


def main():
    path = Path(find_spec("pyongc").submodule_search_locations[0]) / "ongc.db"
    base = sqlite3.connect(f"file:{path}?mode=ro", uri=True)
    base.row_factory = sqlite3.Row
    records = [dict(row) for row in base.execute("select * from objects order by id")]
    rows = {record["name"]: record for record in records}
    also = {record["name"]: [] for record in records}

    def target(record):
        """What a duplicate stands for, through a chain of duplicates."""
        for column, prefix in (("ngc", "NGC"), ("ic", "IC"), ("messier", "M")):
            if record[column]:
                number = re.sub(r"^0+(?=\d)", "", record[column])
                if prefix == "M":
                    same = [r for r in records if r["messier"] == record["messier"] and r["type"] != "Dup"]
                    return same[0]
                name = next((n for n in rows if re.fullmatch(rf"{prefix}0*{number}", n)), None)
                if name is not None:
                    found = rows[name]
                    return target(found) if found["type"] == "Dup" else found
        return None

    lost = []
    for record in records:
        if record["type"] == "Dup":
            main_one = target(record)
            if main_one is None:
                lost.append(record["name"])
            else:
                also[main_one["name"]].append(printed(record["name"]))
    kept = [r for r in records if r["type"] != "Dup"]
    nowhere = [r["name"] for r in kept if r["ra"] is None]
    kept = [r for r in kept if r["ra"] is not None]
    brightness = [r["vmag"] if r["vmag"] is not None else (r["bmag"] or 90) for r in kept]
    kept = [kept[k] for k in np.argsort(brightness, kind="stable")]
    table = np.zeros(len(kept), dtype=deepsky.ROW)

    def column(key, missing=np.nan):
        return [missing if r[key] is None else r[key] for r in kept]

    lon, lat = np.array(column("ra")), np.array(column("dec"))
    table["ra"] = np.rint(lon / deepsky.TURN).astype(np.int64) % 2**32
    table["dec"] = np.rint(lat / deepsky.TURN)
    for name, key in (("major", "majax"), ("minor", "minax"), ("vmag", "vmag"), ("bmag", "bmag"), ("sb", "sbrightn")):
        table[name] = column(key)
    table["pa"] = column("pa", -1)
    codes = [code for code, _ in deepsky.TYPES]
    table["type"] = [codes.index(r["type"]) for r in kept]
    table["messier"] = [int(r["messier"] or 0) for r in kept]
    np.save(HERE / "objects.npy", table)
    lines = ["name\tcommon\talso"]
    for r in kept:
        common = ";".join(re.sub(r"^the ", "", name.strip()) for name in (r["commonnames"] or "").split(",") if name)
        lines.append(f"{printed(r['name'])}\t{common}\t{';'.join(also[r['name']])}")
    (HERE / "names.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")

    stored = np.stack([table["ra"] * deepsky.TURN - lon, table["dec"] * deepsky.TURN - lat])
    worst = np.degrees(np.abs((stored + np.pi) % (2 * np.pi) - np.pi)).max() * 3.6e6
    counts = Counter(r["type"] for r in kept)
    shown = sum(n for code, n in counts.items() if code not in deepsky.HIDDEN)
    print(f"{len(records)} records, {len(kept)} kept, {shown} of kinds that are shown")
    print(f"largest residual of a place: {worst:.2f} mas")
    print(f"duplicates turned into other names: {sum(map(len, also.values()))}; without a target: {lost}")
    print(f"without a position: {nowhere}; Messier numbers: {len(np.unique(table['messier'])) - 1}")
    print(dict(counts))
    common = {
        "version": "pyongc 1.2.2",
        "licence": "CC-BY-SA-4.0",
        "source": "OpenNGC by Mattia Verga (PyPI pyongc), CC BY-SA 4.0; changed: columns chosen, magnitudes and "
        "sizes rounded to single precision, duplicates turned into other names, sorted by magnitude",
        "date": "2026-12-01",
        "script": "deepsky/build_deepsky.py",
        "rows": len(kept),
        "completeness": "all NGC and IC objects and 64 others, duplicates and those without a position aside; "
        f"{np.isfinite(table['vmag']).sum()} V and {np.isfinite(table['bmag']).sum()} B magnitudes",
    }
    _provenance.write(HERE, [{"path": "objects.npy", **common}, {"path": "names.tsv", **common}])


if __name__ == "__main__":
    main()
