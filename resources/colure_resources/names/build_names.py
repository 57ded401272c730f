"""Builds names.tsv: IAU proper names, Bayer and Flamsteed designations by catalogue row; prints the counts.

    pip install colure[data]
    apt-get download swe-basic-data; dpkg-deb -x swe-basic-data_*.deb FOLDER        (…/libswe/ephe/sefstars.txt)
    python build_names.py --sefstars sefstars.txt

Needs the built star catalogue, and is run again after each build of it: a name stands beside the row of its star. From
pyephemera (MIT): 410 proper names with Hipparcos number and designation. From sefstars.txt (CC0-1.0 in Debian), read as
text: designations, places and magnitudes, matched to the catalogue.
"""

import argparse
import re
from pathlib import Path

import ephemera
import numpy as np

from colure import designations, stars
from colure.arrays import ARCSEC, cartesian, separation
from colure_resources import _provenance

HERE = Path(__file__).parent
DATE = "2026-12-01"
HIP_END = 200_000
"""Numbers are Hipparcos numbers below this and Gaia numbers above it."""
SLIPS = {"etOri": ["05", "24", "28.61672", "-02", "23", "49.7311"]}
"""Places mistyped in sefstars.txt: η Orionis stands there at 05h 42m, where there is no star."""


def printed(code):
    """sefstars' "ga-1And", "61CygA", "k01Pup", "P_Pup" as "γ1 And", "61 Cyg", "k1 Pup", "P Pup"; or None."""
    form = re.fullmatch(r"(\d+|[a-z]+|[A-Z](?=_))[-_]?0?(\d)?([A-Z][A-Za-z]{2})[A-Z]?", code)
    return designations.parse(f"{form[1]}{form[2] or ''} {form[3]}") if form else None


def proper_names():
    """Hipparcos number, name and designation of every named star."""
    ephemera.load_package_data("stars")
    found = {}
    for hip in range(1, 120500):
        index = ephemera.star_find(f"HIP {hip}")
        if index is not None:
            found[hip] = (ephemera.star_name(index), designations.parse(ephemera.star_designation(index)) or "")
    assert len(found) == ephemera.star_count() - 1, "a name without a Hipparcos number"
    return found


def records(path):
    """Designation (or other catalogue number) and Hipparcos number of the records of sefstars.txt."""
    catalogue = stars.catalogue()
    out, seen, unmatched = [], set(), []
    for line in path.read_text(encoding="latin-1").splitlines():
        cells = [cell.strip() for cell in line.split(",")]
        if line.startswith("#") or len(cells) < 14 or cells[2] not in {"ICRS", "2000"} or cells[1] in seen:
            continue
        seen.add(cells[1])
        code = printed(cells[1])
        other = re.fullmatch(r"(HD|HR|V\d+)\s*(\w+)", cells[1])
        if code is None and other is None:
            continue
        h, m, s, deg, arcmin, arcsec = (float(cell) for cell in SLIPS.get(cells[1], cells[3:9]))
        lat = (abs(deg) + arcmin / 60 + arcsec / 3600) * (-1 if cells[6].startswith("-") else 1)
        lon = np.radians((h + m / 60 + s / 3600) * 15)
        there = cartesian(lon, np.radians(lat))
        near = catalogue.cone(lon, np.radians(lat), 60 * ARCSEC, vmag=13.0, year=2000.0)
        near = near.take((near.hip > 0) | (near.gaia > 0))
        apart = separation(near.directions(2000.0), there) / ARCSEC
        off = np.abs(near.vmag - float(cells[13]))
        # A catalogued magnitude may be that of a pair, or of another phase of a variable: then the place decides.
        good = ((apart < 10) & (off < 1.0)) | ((apart < 2.5) & (off < 2.5))
        if not good.any():
            unmatched.append(cells[1])
            continue
        best = np.flatnonzero(good)[np.argmin((apart / 5 + 2 * off + 9 * (near.hip == 0))[good])]
        out.append(
            (code or f"{other[1]} {other[2]}", int(near.hip[best]) or int(near.gaia[best]), float(near.vmag[best]))
        )
    return out, unmatched


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--sefstars", type=Path, required=True)
    options = parser.parse_args()
    table = {hip: [name, "", "", []] for hip, (name, _) in proper_names().items()}
    everything = stars.catalogue()
    vmag = {hip: everything.rows([everything.by_hip(hip)]).vmag[0] for hip in table}
    claims = [(code, hip, vmag[hip]) for hip, (_, code) in proper_names().items() if code]
    extra, unmatched = records(options.sefstars)
    # The brightest of several stars with one designation is the one that is meant (α Centauri is not Proxima).
    claims = sorted(claims, key=lambda claim: claim[2]) + sorted(extra, key=lambda claim: claim[2])
    owner = {}
    for code, hip, _ in claims:
        if owner.setdefault(code, hip) != hip:
            print(f"  {code}: HIP {owner[code]} keeps it, HIP {hip} has no part in it")
            continue
        row = table.setdefault(hip, ["", "", "", []])
        kind = 2 if code[0].isdigit() else 1
        is_other = code.startswith(("HD ", "HR ", "V")) and code[1:2] in "DR0123456789"
        if is_other or row[kind] not in {"", code}:
            if code not in row[3]:
                row[3].append(code)
        else:
            row[kind] = code
    # Three naked-eye stars have no solution in Hipparcos-2: they go by their Gaia number, which is far greater.
    row_of = {n: everything.by_hip(n) if n < HIP_END else everything.by_gaia(n) for n in table}
    # Rows, brightest first: whoever reads the file has no number to look up and no magnitude to fetch.
    bright = sorted(table, key=lambda n: (everything.rows([row_of[n]]).vmag[0], n))
    lines = ["row\tproper\tbayer\tflamsteed\talso"]
    for number in bright:
        p, b, f, also = table[number]
        lines.append(f"{row_of[number]}\t{p}\t{b}\t{f}\t{';'.join(also)}")
    (HERE / "names.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    proper, bayer, flamsteed = (sum(bool(row[k]) for row in table.values()) for k in range(3))
    greek = sum(row[1][:1] > "z" for row in table.values())
    counts = (
        f"{proper} IAU proper names, {bayer} Bayer letters ({greek} of them Greek), {flamsteed} Flamsteed "
        "numbers: as far as the sources carry them; Bayer and Flamsteed designations are not complete"
    )
    print(f"{len(table)} stars: {counts}")
    print(f"sefstars records with a designation but no star: {unmatched}")
    cut = everything.brighter(6.5)
    naked_eye = list(zip(cut.hip.tolist(), cut.vmag.tolist(), strict=True))
    for limit in (2.0, 3.0, 4.0, 5.0):
        bright = [hip for hip, v in naked_eye if v < limit and hip]
        print(f"  V < {limit}: {sum(hip in table for hip in bright)} of {len(bright)} Hipparcos stars have a name")
    _provenance.write(
        HERE,
        [
            {
                "path": "names.tsv",
                "source": "IAU proper names: PyPI pyephemera (MIT); designations: pyephemera and sefstars.txt of "
                "Debian swe-basic-data (CC0-1.0)",
                "version": "pyephemera 0.4.1; swe-basic-data 4.0-20221111",
                "licence": "MIT AND CC0-1.0",
                "date": DATE,
                "script": "names/build_names.py",
                "rows": len(table),
                "completeness": counts,
            }
        ],
    )


if __name__ == "__main__":
    main()
