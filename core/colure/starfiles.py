"""The star catalogue's files: the rows' layout, their flags, and how cells of the sky are found in a tier."""

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.arrays import ARCSEC, TWO_PI

EPOCH = 2016.0
"""Julian year (TDB) of the stored positions."""
EPOCH_JD = 2457389.0
"""The same as a Julian date (TDB)."""

ROW = np.dtype(
    [("ra", "<u4"), ("dec", "<i4"), ("pmra", "<i2"), ("pmdec", "<i2"), ("v", "<i2"), ("bv", "i1"), ("flags", "u1")]
)
"""One star: right ascension and declination in 360°/2³², motion in 0.1 mas/yr (μα with cos δ; 1 mas/yr where the flag
COARSE_MOTION is set), V in mmag, B−V in 1/40 mag (−128: unknown), flags."""

FINE = np.dtype(
    [
        ("row", "<u4"),
        ("ra", "<f8"),
        ("dec", "<f8"),
        ("pmra", "<f4"),
        ("pmdec", "<f4"),
        ("parallax", "<f4"),
        ("rv", "<f4"),
    ]
)
"""One naked-eye star: its row number, radians, mas/yr (μα with cos δ), mas, km/s (NaN where unknown)."""

SOURCE_MASK = 0b0000_0011
FROM_TYCHO, FROM_HIPPARCOS, FROM_GAIA = 0, 1, 2
"""Where the position comes from: the two lowest bits of the flags."""
DOUBLE = 0b0000_0100
"""Known to have a companion, resolved or not (Hipparcos components, CCDM, or a Tycho-2 neighbour within 3″)."""
VARIABLE = 0b0000_1000
"""Variable or suspected so by Hipparcos, by more than a few hundredths of a magnitude."""
NO_MOTION = 0b0001_0000
"""No proper motion is known; it is stored as zero, or as that of a bright neighbour."""
PHOTOCENTRE = 0b0010_0000
"""The position is that of the blended light of two stars."""
COARSE_MOTION = 0b0100_0000
"""Motion above 3.2767″/yr, stored in units of 1 mas/yr."""
ROUGH_V = 0b1000_0000
"""V was estimated from one band, without a colour."""

NAKED_EYE = 6.5
TURN = TWO_PI / 2.0**32
"""Radians per unit of the stored angles."""
AU_PER_YEAR = 4.740470463533349
"""km/s in one au per Julian year: 149597870.7 km / (365.25 × 86400 s)."""
SLOW = 0.5 * ARCSEC
"""Radians per year; the faster stars are listed, so that a search at another date stays narrow."""
LIMITS = (-2.0, 8.0, 10.5)
"""The V that each tier begins with; a tier ends where the next begins."""


class Tier(NamedTuple):
    """One magnitude tier.

    Rows (n,), the same rows as words (n, 4), cell starts (zones, cells + 1), first row number, V of its brightest star.
    """

    rows: NDArray[Any]
    words: NDArray[np.uint32]
    starts: NDArray[np.int32]
    first: int
    brightest: float

    def slices(self, lon: float, lat: float, radius: float) -> list[tuple[int, int]]:
        """Return row ranges of the cells that a circle (radians) touches."""
        zones, cells = self.starts.shape[0], self.starts.shape[1] - 1
        height = np.pi / zones
        low = max(int((lat - radius + np.pi / 2) / height), 0)
        high = min(int((lat + radius + np.pi / 2) / height), zones - 1)
        if abs(lat) + radius >= np.pi / 2 - 1e-9:
            spans = [(0, cells)]
        else:
            half = float(np.arcsin(np.sin(radius) / np.cos(lat)))
            width = TWO_PI / cells
            a, b = int(np.floor((lon - half) / width)), int(np.floor((lon + half) / width)) + 1
            if b - a >= cells:
                spans = [(0, cells)]
            elif a < 0:
                spans = [(0, b), (a + cells, cells)]
            elif b > cells:
                spans = [(0, b - cells), (a, cells)]
            else:
                spans = [(a, b)]
        found = []
        for zone in self.starts[low : high + 1]:
            found += [(int(zone[a]), int(zone[b])) for a, b in spans]
        return found


def pack_tycho(region: Any, number: Any, component: Any) -> Any:
    """Return TYC1 (14 bits), TYC2 (14 bits) and TYC3 (2 bits; 4 is kept as 0) in one whole number."""
    return region * 65536 + number * 4 + component % 4


def unpack_tycho(packed: Any) -> Any:
    """Return TYC1, TYC2, TYC3 (..., 3) of packed identifiers (...); zeros where there is none."""
    component = np.where((packed > 0) & (packed & 3 == 0), 4, packed & 3)
    return np.stack([packed >> 16, (packed >> 2) & 0x3FFF, component], axis=-1)
