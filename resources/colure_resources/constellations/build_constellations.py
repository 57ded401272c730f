"""Build the constellation grid, its edges and the label anchors from Roman's table of zones.

Input: `constellation_data_roman87.dat` as carried by the package `astropy` (BSD-3-Clause), which is CDS catalogue
VI/42: N. G. Roman 1987, PASP 99, 695. Its right ascensions are rounded to 1e-4 h and its declinations to 1e-4°; the
boundaries (Delporte 1930) are whole seconds and whole minutes of arc at the equator and equinox of B1875, so both
are rounded back here. The full names come from `constellation_names.dat` of the same package; the genitives below
are the Latin ones of common usage, written from memory.

Run from anywhere:  python build_constellations.py
"""

import sys
from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent))
import _provenance  # noqa: E402

DAY = 86400  # seconds of right ascension in a turn
POLE = 5400  # minutes of arc from the equator to a pole

GENITIVES = """
And Andromedae; Ant Antliae; Aps Apodis; Aql Aquilae; Aqr Aquarii; Ara Arae; Ari Arietis; Aur Aurigae; Boo Boötis;
CMa Canis Majoris; CMi Canis Minoris; CVn Canum Venaticorum; Cae Caeli; Cam Camelopardalis; Cap Capricorni;
Car Carinae; Cas Cassiopeiae; Cen Centauri; Cep Cephei; Cet Ceti; Cha Chamaeleontis; Cir Circini; Cnc Cancri;
Col Columbae; Com Comae Berenices; CrA Coronae Australis; CrB Coronae Borealis; Crt Crateris; Cru Crucis; Crv Corvi;
Cyg Cygni; Del Delphini; Dor Doradus; Dra Draconis; Equ Equulei; Eri Eridani; For Fornacis; Gem Geminorum; Gru Gruis;
Her Herculis; Hor Horologii; Hya Hydrae; Hyi Hydri; Ind Indi; LMi Leonis Minoris; Lac Lacertae; Leo Leonis;
Lep Leporis; Lib Librae; Lup Lupi; Lyn Lyncis; Lyr Lyrae; Men Mensae; Mic Microscopii; Mon Monocerotis; Mus Muscae;
Nor Normae; Oct Octantis; Oph Ophiuchi; Ori Orionis; Pav Pavonis; Peg Pegasi; Per Persei; Phe Phoenicis; Pic Pictoris;
PsA Piscis Austrini; Psc Piscium; Pup Puppis; Pyx Pyxidis; Ret Reticuli; Scl Sculptoris; Sco Scorpii; Sct Scuti;
Ser Serpentis; Sex Sextantis; Sge Sagittae; Sgr Sagittarii; Tau Tauri; Tel Telescopii; TrA Trianguli Australis;
Tri Trianguli; Tuc Tucanae; UMa Ursae Majoris; UMi Ursae Minoris; Vel Velorum; Vir Virginis; Vol Volantis;
Vul Vulpeculae
"""

# Misspelt in the source ("Chamaleon", "Ophiucus", "Pisces Austrinus"); the IAU's list has these.
CORRECTED = {"Cha": "Chamaeleon", "Oph": "Ophiuchus", "PsA": "Piscis Austrinus"}


def read_source(folder: Path) -> tuple[np.ndarray, list[str], dict[str, str]]:
    """Return the zones (n, 3) as whole seconds, seconds and minutes, their abbreviations, and the full names."""
    zones, codes = [], []
    worst_ra = worst_dec = 0.0
    for line in (folder / "constellation_data_roman87.dat").read_text(encoding="utf-8").splitlines():
        if line.startswith("#") or not line.strip():
            continue
        low, high, bottom, code = line.split()
        exact = np.array([float(low) * 3600, float(high) * 3600, float(bottom) * 60])
        whole = np.rint(exact)
        worst_ra = max(worst_ra, float(abs(exact - whole)[:2].max()))
        worst_dec = max(worst_dec, float(abs(exact - whole)[2]))
        zones.append(whole.astype(int))
        codes.append(code)
    print(
        f"{len(zones)} zones; rounding moved right ascension by at most {worst_ra:.3f} s, "
        f"declination by at most {worst_dec * 60:.3f} arcsec"
    )
    # Half a unit of the printed fourth decimal is 0.18 s; more would mean that the figure was no whole second.
    assert worst_ra <= 0.18
    assert worst_dec <= 0.003 + 1e-9
    seconds = {int(s) for zone in zones for s in zone[:2]}
    odd = sorted(s for s in seconds if s % 5)
    print(f"{len(seconds)} distinct right ascensions, not multiples of 5 s: {odd}")
    names = {}
    for line in (folder / "constellation_names.dat").read_text(encoding="utf-8").splitlines():
        if not line.startswith("#") and line.strip():
            code, name = line.split(maxsplit=1)
            names[code] = name.strip()
    names.update(CORRECTED)
    return np.array(zones), codes, names


def make_grid(zones: np.ndarray, zone_code: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Return columns (s), rows (arcmin, from −90°) and the code of every cell, (rows − 1, columns − 1)."""
    columns = np.unique(np.concatenate([zones[:, 0], zones[:, 1], [0, DAY]]))
    rows = np.unique(np.concatenate([zones[:, 2], [-POLE, POLE]]))
    cells = np.full((len(rows) - 1, len(columns) - 1), 255, dtype=np.uint8)
    # The rule of the table: the first zone in file order that holds the point names it; so write the last one first.
    for zone, code in zip(zones[::-1], zone_code[::-1], strict=True):
        inside = (columns[:-1] >= zone[0]) & (columns[:-1] < zone[1])
        above = rows[:-1] >= zone[2]
        cells[np.ix_(above, inside)] = code
    assert cells.max() < 255
    return columns, rows, cells


def make_edges(columns: np.ndarray, rows: np.ndarray, cells: np.ndarray) -> np.ndarray:
    """Return the arcs (n, 6): kind, fixed coordinate, start, end, codes on either side.

    Kind 0 is a parallel (fixed in arcmin, from start to end in seconds; the codes are those below and above);
    kind 1 is a meridian (fixed in seconds, from start to end in arcmin; the codes are those west and east of it,
    that is at the smaller and the greater right ascension). An end past 86400 s has gone through 0h.
    """
    arcs: list[tuple[int, ...]] = []
    wide = len(columns) - 1
    for i in range(1, len(rows) - 1):
        below, above = cells[i - 1], cells[i]
        runs: list[list[int]] = []
        for j in range(wide):
            if below[j] == above[j]:
                continue
            pair = [int(below[j]), int(above[j])]
            if runs and runs[-1][1] == columns[j] and runs[-1][2:] == pair:
                runs[-1][1] = int(columns[j + 1])
            else:
                runs.append([int(columns[j]), int(columns[j + 1]), *pair])
        if len(runs) > 1 and runs[0][0] == 0 and runs[-1][1] == DAY and runs[0][2:] == runs[-1][2:]:
            runs[-1][1] += runs[0][1]  # one arc through 0h, not two that meet there
            del runs[0]
        arcs += [(0, int(rows[i]), *run) for run in runs]
    for j in range(wide):
        west, east = cells[:, j - 1], cells[:, j]
        runs = []
        for i in range(len(rows) - 1):
            if west[i] == east[i]:
                continue
            pair = [int(west[i]), int(east[i])]
            if runs and runs[-1][1] == rows[i] and runs[-1][2:] == pair:
                runs[-1][1] = int(rows[i + 1])
            else:
                runs.append([int(rows[i]), int(rows[i + 1]), *pair])
        arcs += [(1, int(columns[j]), *run) for run in runs]
    return np.array(arcs, dtype=np.int32)


def find_regions(cells: np.ndarray) -> np.ndarray:
    """Return the number of the connected region of every cell, joined through 0h and over the poles."""
    high, wide = cells.shape
    region = np.arange(high * wide).reshape(high, wide)
    while True:
        before = region.copy()
        for axis, shift in ((0, 1), (0, -1), (1, 1), (1, -1)):
            same = np.roll(cells, shift, axis) == cells
            if axis == 0:
                same[0 if shift == 1 else -1] = False
            region = np.where(same, np.minimum(region, np.roll(region, shift, axis)), region)
        for pole in (0, -1):
            if len(set(cells[pole].tolist())) == 1:
                region[pole] = region[pole].min()
        if (region == before).all():
            break
    return np.asarray(np.unique(region, return_inverse=True)[1]).reshape(high, wide)


def vectors(ra_s: np.ndarray, dec_min: np.ndarray) -> np.ndarray:
    ra, dec = np.asarray(ra_s) * (2 * np.pi / DAY), np.asarray(dec_min) * (np.pi / 10800)
    return np.stack([np.cos(ra) * np.cos(dec), np.sin(ra) * np.cos(dec), np.sin(dec) + 0 * ra], axis=-1)


def sample(arc: np.ndarray, step_deg: float) -> np.ndarray:
    kind, fixed, start, end = arc[:4]
    length = (end - start) / (240.0 if kind == 0 else 60.0)
    along = np.linspace(start, end, int(np.ceil(length / step_deg)) + 1)
    return vectors(along, np.full(along.shape, fixed)) if kind == 0 else vectors(np.full(along.shape, fixed), along)


def find_anchors(columns, rows, cells, region, arcs):
    """Return for every region its code and the interior point farthest from its own border, B1875 degrees.

    A grid of 20' finds the neighbourhood; three finer grids of ±1 step about the best point settle it to 0.3'.
    """

    def region_at(ra, dec):
        j = np.searchsorted(columns, ra % DAY, side="right") - 1
        i = np.clip(np.searchsorted(rows, dec, side="right") - 1, 0, len(rows) - 2)
        return region[i, j]

    dec = np.arange(-POLE + 10, POLE, 20.0)
    ra_all, dec_all = [], []
    for d in dec:
        n = max(4, int(np.ceil(1080 * np.cos(np.radians(d / 60)))))
        ra_all.append(np.arange(n) * DAY / n)
        dec_all.append(np.full(n, d))
    ra, dec = np.concatenate(ra_all), np.concatenate(dec_all)
    where = region_at(ra, dec)
    anchors = []
    for number in range(region.max() + 1):
        code = cells[region == number][0]
        border = np.concatenate([sample(a, 0.2) for a in arcs if code in a[4:]])
        pts = np.stack([ra[where == number], dec[where == number]], axis=-1)
        step = 20.0
        for _ in range(4):
            cosine = np.max(vectors(pts[:, 0], pts[:, 1]) @ border.T, axis=1)
            best = pts[np.argmin(cosine)]
            radius = np.degrees(np.arccos(cosine.min()))
            step /= 4.0
            offsets = np.arange(-4, 5) * step
            scale = 4.0 / max(np.cos(np.radians(best[1] / 60)), 0.02)
            r, d = np.meshgrid(best[0] + offsets * scale, np.clip(best[1] + offsets, -POLE, POLE))
            pts = np.stack([r.ravel() % DAY, d.ravel()], axis=-1)
            pts = np.concatenate([best[None], pts[region_at(pts[:, 0], pts[:, 1]) == number]])
        anchors.append((int(code), best[0] / 240.0, best[1] / 60.0, radius))
    return sorted(anchors, key=lambda a: (a[0], -a[3]))


def areas(columns, rows, cells) -> np.ndarray:
    wide = np.diff(columns) * (2 * np.pi / DAY)
    high = np.diff(np.sin(rows * (np.pi / 10800)))
    return np.bincount(cells.ravel(), weights=np.outer(high, wide).ravel()) * (180 / np.pi) ** 2


def main() -> None:
    import astropy
    import astropy.coordinates

    folder = Path(astropy.coordinates.__file__).parent / "data"
    zones, zone_names, latin = read_source(folder)
    genitive = {}
    for part in GENITIVES.replace("\n", " ").split(";"):
        code, name = part.strip().split(" ", 1)
        genitive[code] = name
    codes = sorted(set(zone_names))
    assert len(codes) == 88
    assert codes == sorted(genitive) == sorted(latin)
    zone_code = np.array([codes.index(name) for name in zone_names])
    columns, rows, cells = make_grid(zones, zone_code)
    arcs = make_edges(columns, rows, cells)
    region = find_regions(cells)
    anchors = find_anchors(columns, rows, cells, region, arcs)
    parallels, pairs = int((arcs[:, 0] == 0).sum()), {tuple(sorted(a[4:])) for a in arcs.tolist()}
    through_0h = int(((arcs[:, 0] == 0) & (arcs[:, 3] > DAY)).sum())
    print(
        f"grid {cells.shape[0]} × {cells.shape[1]}; {parallels} parallels ({through_0h} of them through 0h) and "
        f"{len(arcs) - parallels} meridians; {len(pairs)} pairs of neighbours; {region.max() + 1} regions"
    )
    # Cut at 0h, the parallels number 399.
    assert (parallels + through_0h, len(arcs) - parallels, len(pairs), region.max() + 1) == (399, 379, 255, 89)
    # Areas from memory of the list of IAU constellation areas (Levin 1935), square degrees.
    area = dict(zip(codes, areas(columns, rows, cells), strict=True))
    for code, known in {"UMi": 255.864, "Oph": 948.340, "Hya": 1302.844, "Cru": 68.447, "Ser": 636.928}.items():
        print(f"area {code} {area[code]:.3f}, listed {known}: {area[code] - known:+.4f}")
        assert abs(area[code] - known) < 0.002

    np.save(HERE / "columns.npy", columns.astype(np.int32))
    np.save(HERE / "rows.npy", rows.astype(np.int32))
    np.save(HERE / "cells.npy", cells)
    np.save(HERE / "edges.npy", arcs)
    lines = ["code\tname\tgenitive"] + [f"{c}\t{latin[c]}\t{genitive[c]}" for c in codes]
    (HERE / "names.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    lines = ["code\tra_b1875_deg\tdec_b1875_deg\tradius_deg"]
    lines += [f"{codes[c]}\t{ra:.3f}\t{dec:.3f}\t{radius:.2f}" for c, ra, dec, radius in anchors]
    (HERE / "anchors.tsv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    common = {
        "source": "N. G. Roman 1987, PASP 99, 695 (CDS VI/42), constellation_data_roman87.dat as carried by astropy; "
        "rounded back to whole seconds and minutes of arc (Delporte 1930)",
        "version": f"astropy {astropy.__version__}",
        "licence": "BSD-3-Clause",
        "date": "2026-12-01",
        "script": "constellations/build_constellations.py",
    }
    whole = "complete: the whole sky"
    _provenance.write(
        HERE,
        [
            {"path": "columns.npy", **common, "rows": len(columns), "completeness": whole},
            {"path": "rows.npy", **common, "rows": len(rows), "completeness": whole},
            {"path": "cells.npy", **common, "rows": int(cells.size), "completeness": whole},
            {
                "path": "edges.npy",
                **common,
                "rows": len(arcs),
                "completeness": "392 parallels, 7 of them through 0h, and 379 meridians",
            },
            {"path": "anchors.tsv", **common, "rows": len(anchors), "completeness": "89 regions, Serpens in two"},
            {
                "path": "names.tsv",
                **common,
                "source": "abbreviations and names: constellation_names.dat as carried by astropy, three spellings "
                "corrected; genitives: common Latin usage, written by hand in the build script",
                "rows": len(codes),
                "completeness": "the 88 constellations of the IAU",
            },
        ],
    )


if __name__ == "__main__":
    main()
