"""The belt about an ecliptic: outline, twelve divisions, cardinal points, colures, constellations that it crosses.

Every function takes an ecliptic as the matrix (3, 3) from ICRS axes to its frame, `frames.rotation(...).matrix`, and
answers with unit vectors on ICRS axes. Longitudes are those of that frame, counted from its equinox, in radians.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from colure import constellations
from colure.arrays import DEG, TWO_PI, Bool, Float, cartesian, cross, unit
from colure.ephemeris import Ephemeris
from colure.moment import Moment
from colure.reduction import reduce_bodies

DIVISION_GLYPHS = tuple(chr(0x2648 + i) for i in range(12))
"""The twelve signs of the divisions, the first beginning at the equinox; the shipped fonts draw them as text."""
DIVISION_NAMES = (
    "Aries", "Taurus", "Gemini", "Cancer", "Leo", "Virgo",
    "Libra", "Scorpio", "Sagittarius", "Capricorn", "Aquarius", "Pisces",
)  # fmt: skip
DIVISION = TWO_PI / 12.0
SIDEREAL_YEAR_DAYS = 365.25636
"""In this time the Sun returns to the same place among the stars, so every constellation is entered once."""

_STEP = DEG
_NUMBERS: Float = np.arange(12, dtype=np.float64)
_PER_SECOND = TWO_PI / 86400.0
_PER_MINUTE = np.pi / 10800.0


def text_presentation(glyph: str) -> str:
    """Return a glyph followed by U+FE0E, which asks a terminal or a browser for text instead of a coloured picture."""
    return glyph + "\ufe0e"


@dataclass(frozen=True, slots=True)
class Polylines:
    """Polyline i is `points[starts[i]:starts[i + 1]]`; `points` (n, 3) on ICRS axes, `starts` (m + 1,)."""

    points: Float
    starts: NDArray[np.int32]


@dataclass(frozen=True, slots=True)
class Marks:
    """Named directions: `points` (n, 3) on ICRS axes, a glyph or short label and a full name for each."""

    labels: tuple[str, ...]
    names: tuple[str, ...]
    points: Float


def _lines(points: Float) -> Polylines:
    """Return polylines (m, k, 3) of equal length end to end."""
    count, length = points.shape[:2]
    return Polylines(points.reshape(-1, 3), np.arange(count + 1, dtype=np.int32) * length)


def parallels(ecliptic: Float, latitudes: Float, step: float = _STEP) -> Polylines:
    """Return the closed circles of these latitudes (m,), in radians, sampled at most `step` of longitude apart."""
    lon = np.linspace(0.0, TWO_PI, int(np.ceil(TWO_PI / step - 1e-9)) + 1)
    return _lines(cartesian(lon[None, :], np.asarray(latitudes)[:, None]) @ ecliptic)


def outline(ecliptic: Float, half_width: float, step: float = _STEP) -> Polylines:
    """Return the two edges of the belt, north and south, as closed circles; the belt lies between them."""
    return parallels(ecliptic, np.array([half_width, -half_width]), step)


def division_lines(ecliptic: Float, half_width: float, step: float = _STEP) -> Polylines:
    """Return the twelve arcs that cut the belt every 30° from the equinox, each from its south edge to its north."""
    lat = np.linspace(-half_width, half_width, int(np.ceil(2.0 * half_width / step - 1e-9)) + 1)
    lon = _NUMBERS * DIVISION
    return _lines(cartesian(lon[:, None], lat[None, :]) @ ecliptic)


def division_marks(ecliptic: Float, latitude: float = 0.0) -> Marks:
    """Return the middles of the twelve divisions at a latitude, with glyph and name."""
    points = cartesian((_NUMBERS + 0.5) * DIVISION, latitude) @ ecliptic
    return Marks(DIVISION_GLYPHS, DIVISION_NAMES, points)


def division_of(longitude: Float | float) -> NDArray[np.intp]:
    """Return the number of the division, 0 to 11, that holds a longitude (...) in radians."""
    return np.asarray(np.floor(np.asarray(longitude) % TWO_PI / DIVISION).astype(np.intp) % 12)


def inside(vectors: Float, ecliptic: Float, half_width: float) -> Bool:
    """Return which directions (..., 3) on ICRS axes lie in the belt, edges included."""
    return np.asarray(np.abs(unit(vectors) @ ecliptic[2]) <= np.sin(half_width))


def cardinal_points(ecliptic: Float, equator: Float) -> Marks:
    """Return the equinox and solstice points of an ecliptic on an equator, and the poles of both.

    The first equinox is the ascending node of the ecliptic on that equator; of the frame's own equator this is
    longitude 0. `equator` is the matrix (3, 3) from ICRS axes to the equatorial frame.
    """
    pole, equator_pole = ecliptic[2], equator[2]
    equinox = unit(cross(equator_pole, pole))
    solstice = cross(pole, equinox)
    return Marks(
        labels=("♈", "♋", "♎", "♑", "NEP", "SEP", "NCP", "SCP"),
        names=(
            "March equinox",
            "June solstice",
            "September equinox",
            "December solstice",
            "north ecliptic pole",
            "south ecliptic pole",
            "north celestial pole",
            "south celestial pole",
        ),
        points=np.stack([equinox, solstice, -equinox, -solstice, pole, -pole, equator_pole, -equator_pole]),
    )


def colures(ecliptic: Float, equator: Float, step: float = _STEP) -> Polylines:
    """Return the equinoctial and the solstitial colure as closed great circles that begin at the equator's north pole.

    Both run through the poles of the equator, the first through the equinoxes, the second through the solstices.
    """
    pole = equator[2]
    equinox = unit(np.cross(pole, ecliptic[2]))
    along = np.linspace(0.0, TWO_PI, int(np.ceil(TWO_PI / step - 1e-9)) + 1)[:, None]
    return _lines(
        np.stack([np.cos(along) * pole + np.sin(along) * side for side in (equinox, np.cross(pole, equinox))])
    )


@dataclass(frozen=True, slots=True)
class Crossings:
    """Where an ecliptic passes from one constellation into the next, in the order of longitude.

    `longitude` (n,) in radians in its own frame, `points` (n, 3) on ICRS axes, `left` and `entered` (n,) abbreviations.
    """

    longitude: Float
    points: Float
    left: NDArray[np.str_]
    entered: NDArray[np.str_]


def crossings(ecliptic: Float) -> Crossings:
    """Return the crossings of an ecliptic with the edges of the constellations, in closed form."""
    to_b1875 = constellations.b1875_matrix()
    # The ecliptic in B1875 axes: a point of longitude u is cos(u) x + sin(u) y.
    x, y = (to_b1875 @ ecliptic[0]), (to_b1875 @ ecliptic[1])
    arcs = constellations.arcs()
    parallel = arcs[:, 0] == 0
    # A meridian's plane holds the points that are square to (−sin α, cos α, 0): two opposite ones for each.
    on = arcs[~parallel].astype(np.float64)
    ra = on[:, 1] * _PER_SECOND
    u = np.arctan2(np.sin(ra) * x[0] - np.cos(ra) * x[1], np.cos(ra) * y[1] - np.sin(ra) * y[0])
    u = np.stack([u, u + np.pi])
    v = np.cos(u)[..., None] * x + np.sin(u)[..., None] * y
    minute = np.arctan2(v[..., 2], np.hypot(v[..., 0], v[..., 1])) / _PER_MINUTE
    same_side = v[..., 0] * np.cos(ra) + v[..., 1] * np.sin(ra) > 0.0
    found = [u[same_side & (minute >= on[:, 2]) & (minute <= on[:, 3])]]
    # A parallel holds the points of one z = A cos(u − u0): two or none.
    on = arcs[parallel].astype(np.float64)
    ratio = np.sin(on[:, 1] * _PER_MINUTE) / np.hypot(x[2], y[2])
    reached = np.abs(ratio) < 1.0
    on, turn = on[reached], np.arccos(ratio[reached])
    u = np.arctan2(y[2], x[2]) + np.stack([turn, -turn])
    v = np.cos(u)[..., None] * x + np.sin(u)[..., None] * y
    past = (np.arctan2(v[..., 1], v[..., 0]) / _PER_SECOND - on[:, 2]) % 86400.0
    found.append(u[past <= on[:, 3] - on[:, 2]])
    lon = np.sort(np.concatenate(found) % TWO_PI)
    # The constellations are those of the middles between neighbouring crossings; a corner may have been found twice.
    after = (lon + np.diff(lon, append=lon[0] + TWO_PI) / 2.0) % TWO_PI
    entered = constellations.of(cartesian(after, 0.0) @ ecliptic)
    left = np.roll(entered, 1)
    change = entered != left
    lon = lon[change]
    return Crossings(lon, cartesian(lon, 0.0) @ ecliptic, left[change], entered[change])


@dataclass(frozen=True, slots=True)
class SunEntries:
    """When the Sun enters constellations: `moments`, `left`, `entered` (n,), and its `points` (n, 3) on ICRS axes."""

    moments: Moment
    left: NDArray[np.str_]
    entered: NDArray[np.str_]
    points: Float

    def dates_of(self, at: Crossings) -> NDArray[np.intp]:
        """Return for each crossing (m,) which entry is the same passage, or −1 where the Sun made none such."""
        same = (at.left[:, None] == self.left) & (at.entered[:, None] == self.entered)
        # A constellation could be entered twice from one neighbour: the nearer place is meant.
        near = np.where(same, at.points @ self.points.T, -2.0)
        if not len(self.left):
            return np.full(len(at.left), -1)
        return np.where(same.any(axis=1), np.argmax(near, axis=1), -1)


def sun_entries(start: Moment, days: float = SIDEREAL_YEAR_DAYS, *, ephemeris: Ephemeris | None = None) -> SunEntries:
    """Return when the Sun's geocentric astrometric place enters each constellation in `days` from a moment.

    Astrometric, because the edges are fixed among the stars of a catalogue: the apparent Sun is 20.5″ (8 min) behind,
    and so are the stars beside it. Good to 1 s on the boundary used, whose own 0.3″ make 7 s. Raises
    EphemerisSpanError outside the ephemeris.
    """
    # Six hours are a quarter of a degree: no constellation on the ecliptic is that narrow within centuries of today.
    offsets = np.arange(0.0, days + 0.25, 0.25)
    offsets = np.append(offsets[offsets < days], days)
    place = constellations.indices(_sun(start.shifted(offsets), ephemeris))
    at = np.flatnonzero(place[1:] != place[:-1])
    low, high = offsets[at], offsets[at + 1]
    for _ in range(16):  # 6 h / 2^16 = 0.3 s
        middle = (low + high) / 2.0
        before = constellations.indices(_sun(start.shifted(middle), ephemeris)) == place[at]
        low, high = np.where(before, middle, low), np.where(before, high, middle)
    codes = np.array([*(entry.code for entry in constellations.constellations()), ""])
    moments = start.shifted(high)
    return SunEntries(moments, codes[place[at]], codes[place[at + 1]], _sun(moments, ephemeris))


def _sun(moments: Moment, ephemeris: Ephemeris | None) -> Float:
    """Return the Sun's astrometric unit vectors (n, 3) from the Earth's centre."""
    seen = reduce_bodies(("sun",), moments, place="astrometric", ephemeris=ephemeris)
    return np.asarray(seen.vectors[0])
