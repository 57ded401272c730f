"""Build the tables of time: leap seconds, Earth orientation and ΔT.

Run as a script from anywhere: `python build_time.py`. Needs the packages astropy-iers-data and skyfield (the latter
carries Table S15.2020 of Morrison et al. 2021 as a plain array). Prints residuals against the sources.
"""

import sys
from importlib.metadata import version
from importlib.util import find_spec
from pathlib import Path

import erfa
import numpy as np

HERE = Path(__file__).parent
sys.path.insert(0, str(HERE.parent.parent))
from colure_resources import _provenance  # noqa: E402

DATE = "2026-12-01"

# Table S15 of Stephenson, Morrison & Hohenkerk 2016 (Proc. R. Soc. A 472, 20160404, supplement): start of the segment,
# a0, a1, a2, a3; a segment ends where the next begins, the last at 2016.
S15_2016 = """
-720 20550.593 -21268.478 11863.418 -4541.129
400 6604.404 -5981.266 -505.093 1349.609
1000 1467.654 -2452.187 2460.927 -1183.759
1500 292.635 -216.322 -43.614 56.681
1600 89.380 -66.754 31.607 -10.497
1650 43.736 -49.043 0.227 15.811
1720 10.730 -1.321 62.250 -52.946
1800 18.714 -4.457 -1.509 2.507
1810 15.255 0.046 6.012 -4.634
1820 16.679 -1.831 -7.889 3.799
1830 10.758 -6.211 3.509 -0.388
1840 7.668 -0.357 2.345 -0.338
1850 9.317 1.659 0.332 -0.932
1855 10.376 -0.472 -2.463 1.596
1860 9.038 -0.610 2.325 -2.497
1865 8.256 -3.450 -5.166 2.729
1870 2.369 -5.596 3.020 -0.919
1875 -1.126 -2.312 0.264 -0.037
1880 -3.211 -1.894 0.154 0.562
1885 -4.388 0.101 1.841 -1.438
1890 -3.884 -0.531 -2.473 1.870
1895 -5.017 0.134 3.138 -0.232
1900 -1.977 5.715 2.443 -1.257
1905 4.923 6.828 -1.329 0.720
1910 11.142 6.330 0.831 -0.825
1915 17.479 5.518 -1.643 0.262
1920 21.617 3.020 -0.856 0.008
1925 23.789 1.333 -0.831 0.127
1930 24.418 0.052 -0.449 0.142
1935 24.164 -0.419 -0.022 0.702
1940 24.426 1.645 2.086 -1.106
1945 27.050 2.499 -1.232 0.614
1950 28.932 1.127 0.220 -0.277
1953 30.002 0.737 -0.610 0.631
1956 30.760 1.409 1.282 -0.799
1959 32.652 1.577 -1.115 0.507
1962 33.621 0.868 0.406 0.199
1965 35.093 2.275 1.002 -0.414
1968 37.956 3.035 -0.242 0.202
1971 40.951 3.157 0.364 -0.229
1974 44.244 3.198 -0.323 0.172
1977 47.291 3.069 0.193 -0.192
1980 50.361 2.878 -0.384 0.081
1983 52.936 2.354 -0.140 -0.166
1986 54.984 1.577 -0.637 0.448
1989 56.373 1.649 0.709 -0.277
1992 58.453 2.235 -0.122 0.111
1995 60.677 2.324 0.212 -0.315
1998 62.899 1.804 -0.732 0.112
2001 64.082 0.675 -0.396 0.193
2004 64.555 0.463 0.184 -0.008
2007 65.194 0.809 0.161 -0.101
2010 66.063 0.828 -0.142 0.168
2013 66.917 1.046 0.360 -0.282
"""

# Standard error of ΔT by year, from the tables beside Morrison et al. 2021 (HM Nautical Almanac Office, "ΔT & lod").
SIGMA = """
-2000 1080  -1600 720  -900 360  -720 180  -700 170  -600 160  -500 150  -400 130  -300 120  -200 110  -100 100
0 90  100 80  200 70  300 60  400 50  500 40  700 30  800 25  900 20  1000 15  1620 20  1660 15  1670 10  1680 5
1730 2  1770 1  1800 0.5  1802 0.4  1805 0.3  1809 0.2  1831 0.1  1870 0.05  1952 0.05
"""
# From the end of the shipped table on, the same source's growth: years after it, and standard error in seconds.
SIGMA_AFTER = "1 1  8 2  18 4  28 6  78 10  178 20  278 30  378 50  478 100"


def package(name: str) -> Path:
    spec = find_spec(name)
    assert spec is not None, f"install {name}"
    assert spec.origin is not None, f"{name} is no package"
    return Path(spec.origin).parent


def read_leap_seconds(data: Path) -> np.ndarray:
    rows = [line.split() for line in (data / "Leap_Second.dat").read_text().splitlines() if line.strip()]
    return np.array([(int(float(r[0])), int(r[4])) for r in rows if not r[0].startswith("#")], dtype=np.int32)


def tai_minus_utc(mjd: np.ndarray) -> np.ndarray:
    """TAI−UTC at 0h UTC; before 1972 with the drift of that time, which ERFA carries."""
    year, month, day, _ = erfa.jd2cal(2400000.5, mjd)
    return erfa.dat(year, month, day, 0.0)


def read_orientation(data: Path) -> tuple[np.ndarray, dict[str, float], np.ndarray]:
    final = []
    for line in (data / "eopc04.1962-now").read_text().splitlines():
        if not line.startswith("#"):
            r = line.split()  # 8 columns of values after the date, then their errors in the same order
            final.append((float(r[4]), float(r[7]), float(r[5]), float(r[6]), float(r[15])))
    c04 = np.array(final)
    rapid = []
    for line in (data / "finals2000A.all").read_text().splitlines():
        if line[58:68].strip() and line[18:27].strip():
            rapid.append(tuple(float(line[a:b]) for a, b in ((7, 15), (58, 68), (18, 27), (37, 46), (68, 78))))
    a = np.array(rapid)
    both = np.intersect1d(c04[:, 0], a[:, 0])
    gap = c04[np.isin(c04[:, 0], both)][-365:] - a[np.isin(a[:, 0], both)][-365:]
    rows = np.vstack([c04, a[a[:, 0] > c04[-1, 0]]])
    assert np.all(np.diff(rows[:, 0]) == 1.0), "a day is missing"
    delta_t = 32.184 + tai_minus_utc(rows[:, 0]) - rows[:, 1]
    out = np.stack([rows[:, 0], np.round(delta_t * 1e7), np.round(rows[:, 2] * 1e6), np.round(rows[:, 3] * 1e6)])
    assert np.abs(out).max() < 2**31
    error = np.abs(out[1] * 1e-7 - delta_t).max()
    # Standard errors of UT1, the mean about every fifth year and at both ends.
    years = 2000.0 + (rows[:, 0] - 51544.5) / 365.25
    nodes = np.array([years[0], *np.arange(1965.0, 2025.1, 5.0), 2000.0 + (c04[-1, 0] - 51544.5) / 365.25, years[-1]])
    errors = np.array([rows[np.abs(years - node) < 0.1, 4].mean() for node in nodes])
    errors[-1] = rows[-1, 4]
    facts = {"c04_end": c04[-1, 0], "end": rows[-1, 0], "quantised": error, "gap": np.abs(gap[:, 1]).max()}
    return np.ascontiguousarray(out, dtype=np.int32), facts, np.stack([nodes, errors], axis=1)


def main() -> None:
    iers = package("astropy_iers_data") / "data"
    leaps = read_leap_seconds(iers)
    table, facts, errors = read_orientation(iers)
    new = np.load(package("skyfield") / "data" / "delta_t.npz")["Table-S15.2020.txt"]
    # The package stores rows x0, x1, a3, a2, a1, a0; ours are x0, x1, a0, a1, a2, a3.
    s2020 = np.ascontiguousarray(np.vstack([new[:2], new[:1:-1]]).T)
    rows = [list(map(float, line.split())) for line in S15_2016.split("\n") if line]
    starts = [row[0] for row in rows]
    s2016 = np.array([[row[0], end, *row[1:]] for row, end in zip(rows, [*starts[1:], 2016.0], strict=True)])
    for name, s in (("S15.2020", s2020), ("S15.2016", s2016)):
        jump = s[:-1, 2:].sum(axis=1) - s[1:, 2]
        print(f"{name}: {len(s)} segments, largest step at a knot {np.abs(jump).max():.4f} s")
    end_year = 2000.0 + (facts["end"] - 51544.5) / 365.25
    pairs = np.array(SIGMA.split(), dtype=float).reshape(-1, 2)
    after = np.array(SIGMA_AFTER.split(), dtype=float).reshape(-1, 2)
    after[:, 0] += end_year
    sigma = np.vstack([pairs, errors, after])
    ends = ", ".join(f"{error:.1e} s at {year:.1f}" for year, error in errors[[0, -1]])
    print(f"standard error of UT1: {ends}")
    assert np.all(np.diff(sigma[:, 0]) > 0)
    np.save(HERE / "leapseconds.npy", leaps)
    np.save(HERE / "iers.npy", table)
    np.save(HERE / "deltat_s15_2020.npy", s2020)
    np.save(HERE / "deltat_s15_2016.npy", s2016)
    np.save(HERE / "deltat_sigma.npy", sigma)
    print(f"leap seconds: {len(leaps)}, last {leaps[-1]}")
    print(f"orientation: {table.shape[1]} days, MJD {table[0, 0]} to {table[0, -1]}, C04 to {facts['c04_end']:.0f}")
    print(f"  quantisation ≤ {facts['quantised']:.1e} s; C04 − Bulletin A in the last year ≤ {facts['gap']:.1e} s")
    iers_version = version("astropy-iers-data")
    common = {"date": DATE, "script": "time/build_time.py"}
    _provenance.write(
        HERE,
        [
            {
                "path": "leapseconds.npy",
                "source": "IERS Leap_Second.dat, as carried by PyPI astropy-iers-data",
                "version": iers_version,
                "licence": "IERS data, free with credit",
                "rows": len(leaps),
                "completeness": "MJD of the first day and TAI−UTC in s, every step since 1972-01-01",
                **common,
            },
            {
                "path": "iers.npy",
                "source": "IERS 20 C04 and, after its end, finals2000A (Bulletin A), as carried by astropy-iers-data",
                "version": iers_version,
                "licence": "IERS data, free with credit",
                "rows": table.shape[1],
                "completeness": "daily at 0h UTC: MJD, TT−UT1 in 1e-7 s, pole x and y in 1e-6 arcsec; "
                f"predictions after MJD {facts['c04_end']:.0f}",
                **common,
            },
            {
                "path": "deltat_s15_2020.npy",
                "source": "Morrison, Stephenson, Hohenkerk & Zawilski 2021, Proc. R. Soc. A 477, 20200776, "
                "Table S15.2020, as carried by PyPI skyfield",
                "version": version("skyfield"),
                "licence": "published figures; the package is MIT",
                "rows": len(s2020),
                "completeness": "every segment, −720 to 2019: start, end, a0 to a3",
                **common,
            },
            {
                "path": "deltat_s15_2016.npy",
                "source": "Stephenson, Morrison & Hohenkerk 2016, Proc. R. Soc. A 472, 20160404, Table S15",
                "version": "2016",
                "licence": "published figures",
                "rows": len(s2016),
                "completeness": "every segment, −720 to 2016: start, end, a0 to a3",
                **common,
            },
            {
                "path": "deltat_sigma.npy",
                "source": "standard errors beside Morrison et al. 2021 (HM Nautical Almanac Office, ΔT & lod)",
                "version": "2021",
                "licence": "published figures",
                "rows": len(sigma),
                "completeness": "year and standard error in s, −2000 to 2505; 1962 to the table's end by IERS's errors",
                **common,
            },
        ],
    )


if __name__ == "__main__":
    main()
