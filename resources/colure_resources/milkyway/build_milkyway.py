"""Derives isophotes of the Milky Way from the star catalogue's own counts; prints the densities and the rings.

    python build_milkyway.py

Stars of 6 < V < 11.5 are counted in half-degree cells of galactic longitude and latitude, counts and areas are each
smoothed by a Gaussian of 1.3 degrees on the sky, and lines of equal density are traced. Needs the built star catalogue.
"""

from pathlib import Path

import erfa
import numpy as np

from colure import stars
from colure_resources import _provenance

HERE = Path(__file__).parent
LEVELS = (46.0, 62.0, 82.0, 108.0, 150.0)
"""Stars per square degree; the sky's poles have 13, the plane about 80, the brightest clouds over 200."""
STEP = 0.5
SIGMA = 1.3
SMALLEST_DEG2 = 3.0
TOLERANCE_DEG = 0.04


def counts():
    rows = stars.catalogue().brighter(11.5)
    lon, lat = rows.lonlat()
    keep = rows.vmag > 6.0
    lon, lat = erfa.icrs2g(lon[keep], lat[keep])
    nl, nb = int(360 / STEP), int(180 / STEP)
    column = np.minimum((np.degrees(lon) % 360 / STEP).astype(int), nl - 1)
    row = np.clip(((np.degrees(lat) + 90) / STEP).astype(int), 0, nb - 1)
    return np.bincount(row * nl + column, minlength=nl * nb).reshape(nb, nl).astype(float)


def smooth(grid):
    """Gaussian on the sky: along the latitude as it is, along the longitude wider towards the poles."""
    nb, nl = grid.shape
    b = (np.arange(nb) + 0.5) * STEP - 90
    frequency = np.fft.rfftfreq(nl)
    sigma = SIGMA / STEP / np.maximum(np.cos(np.radians(b)), 0.03)
    turned = np.fft.rfft(grid, axis=1) * np.exp(-2 * (np.pi * frequency * sigma[:, None]) ** 2)
    along = np.fft.irfft(turned, n=nl, axis=1)
    distance = (b[:, None] - b) / SIGMA
    return np.exp(-0.5 * distance**2) @ along


def trace(density, level):
    """Closed lines of a level as arrays (n, 2) of l, b in degrees, the denser side on the left; l may pass 360."""
    nb, nl = density.shape
    high = density >= level
    following = {}
    # Each square of four nodes gives one or two pieces, keyed by the grid edge they leave and the edge they enter.
    for i in range(nb - 1):
        for j in range(nl):
            k = (j + 1) % nl
            corners = (high[i, j], high[i, k], high[i + 1, k], high[i + 1, j])
            if all(corners) or not any(corners):
                continue
            edges = (("h", i, j), ("v", i, k), ("h", i + 1, j), ("v", i, j))  # south, east, north, west
            # Walking round the square counter-clockwise: where the density falls a line leaves, where it rises one
            # enters; the line keeps the dense corner on its left.
            falls = [e for e in range(4) if corners[e] and not corners[(e + 1) % 4]]
            rises = [e for e in range(4) if not corners[e] and corners[(e + 1) % 4]]
            middle = density[[i, i, i + 1, i + 1], [j, k, k, j]].mean() >= level
            for e in falls:
                if len(rises) == 1:
                    other = rises[0]
                else:  # a saddle: the mean decides whether the two dense corners are joined
                    other = (e + 1) % 4 if middle else (e - 1) % 4
                following[edges[e]] = edges[other]
    lines = []
    while following:
        start = key = next(iter(following))
        points = []
        while key in following:
            kind, i, j = key
            k, m = (j + 1) % nl, i + 1
            low, top = (density[i, j], density[i, k]) if kind == "h" else (density[i, j], density[m, j])
            t = (level - low) / (top - low)
            points.append((j + 0.5 + (t if kind == "h" else 0), i + 0.5 + (0 if kind == "h" else t)))
            key = following.pop(key)
        assert key == start, "an open line"
        line = np.array(points) * STEP - [0, 90]
        line[:, 0] = np.degrees(np.unwrap(np.radians(line[:, 0])))
        lines.append(line)
    return lines


def to_vectors(line):
    lon, lat = erfa.g2icrs(np.radians(line[:, 0]), np.radians(line[:, 1]))
    return np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)], axis=-1)


def area(v):
    """Solid angle to the left of a closed line in square degrees, negative for a hole: half the cross products' sum."""
    return np.degrees(np.degrees(0.5 * np.linalg.norm(np.cross(v, np.roll(v, -1, axis=0)).sum(axis=0))))


def simplify(v):
    """Leave out points that lie within the tolerance of the line without them (Douglas and Peucker)."""
    keep = np.zeros(len(v), bool)
    far = int(np.argmax(((v - v[0]) ** 2).sum(axis=1)))
    spans = [(0, far), (far, len(v))]
    closed = np.concatenate([v, v[:1]])
    while spans:
        a, b = spans.pop()
        keep[a] = True
        if b - a < 2:
            continue
        chord = closed[b] - closed[a]
        chord /= max(np.linalg.norm(chord), 1e-12)
        offset = closed[a + 1 : b] - closed[a]
        distance = np.linalg.norm(offset - (offset @ chord)[:, None] * chord, axis=1)
        # Between two far points a straight line leaves the sphere; a short way along it is close enough to an arc.
        if distance.max() > np.radians(TOLERANCE_DEG):
            middle = a + 1 + int(np.argmax(distance))
            spans += [(a, middle), (middle, b)]
    return v[keep]


def main():
    grid = counts()
    b = (np.arange(grid.shape[0]) + 0.5) * STEP - 90
    cell = np.repeat((STEP * STEP * np.cos(np.radians(b)))[:, None], grid.shape[1], axis=1)
    density = smooth(grid) / smooth(cell)
    print(f"{grid.sum():.0f} stars; per square degree: poles {density[[0, -1]].mean():.0f}, peak {density.max():.0f}")
    for name, lon, lat in (("rift", 20, 3), ("Coalsack", 303, -1), ("beside it", 298, 0), ("Scutum", 27, -3)):
        print(f"  {name} ({lon}, {lat}): {density[int((lat + 90) / STEP), int(lon / STEP)]:.0f}")
    points, rings = [], []
    for number, level in enumerate(LEVELS, start=1):
        found = []
        for line in trace(density, level):
            v = to_vectors(line)
            winds = abs(line[-1, 0] - line[0, 0]) > 180
            if winds or area(v) >= SMALLEST_DEG2:
                found.append((winds, simplify(v)))
        for _, v in found:
            rings.append((sum(map(len, points)), number))
            points.append(v)
        around, share = sum(w for w, _ in found), 100 * (cell * (density >= level)).sum() / cell.sum()
        print(
            f"  level {number}, {level:.0f} per square degree: {len(found)} rings, {around} of them round the sky, "
            f"{sum(len(v) for _, v in found)} points, {share:.1f} % of the sky"
        )
    np.save(HERE / "points.npy", np.concatenate(points).astype("<f4"))
    np.save(HERE / "rings.npy", np.array(rings, dtype="<i4"))
    common = {
        "source": "counts of 6 < V < 11.5 in the star catalogue of this package",
        "version": "stars 2026-12-01",
        "licence": "CC-BY-SA-3.0-IGO",
        "date": "2026-12-01",
        "script": "milkyway/build_milkyway.py",
        "completeness": f"lines of {', '.join(f'{level:.0f}' for level in LEVELS)} stars per square degree, "
        f"smoothed by {SIGMA} degrees; islands and holes under {SMALLEST_DEG2:.0f} square degrees left out",
    }
    n = sum(map(len, points))
    _provenance.write(
        HERE, [{"path": "points.npy", "rows": n, **common}, {"path": "rings.npy", "rows": len(rings), **common}]
    )


if __name__ == "__main__":
    main()
