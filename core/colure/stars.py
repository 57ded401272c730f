"""The star catalogue: 2.55 million stars on disk, cut all over the sky by magnitude or around a point.

Layout on disk (`colure_resources/stars`): three tiers of magnitude, each a memory-mapped array of 16-byte rows sorted
by declination zone and, within a zone, by right ascension, with a table of cell starts beside it. Reading the first
tier is enough for a chart of the whole sky; a small deep field touches a few pages of the others. A row number counts
through the tiers and is what the rest of the program keeps of a star.

Positions are on ICRS axes at the epoch J2016.0 (TDB), which is Gaia's: most bright stars are stored where they were
measured. Naked-eye stars have a second, finer record with parallax and radial velocity.

A star moves in a straight line: with p0 its unit vector at the epoch and v its velocity in units of its own distance
per Julian year, its direction at the year t is the unit vector along p0 + v (t − 2016.0), exact at any distance in
time for which the star keeps its velocity (perspective acceleration included, light time within the motion not).
"""

from collections.abc import Sequence
from functools import cache, cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import MAS, TWO_PI, Float
from colure.errors import ResourceError
from colure.starfiles import AU_PER_YEAR, COARSE_MOTION, FINE, LIMITS, ROW, SLOW, TURN, Tier, pack_tycho, unpack_tycho
from colure.starfiles import DOUBLE as DOUBLE
from colure.starfiles import EPOCH as EPOCH
from colure.starfiles import EPOCH_JD as EPOCH_JD
from colure.starfiles import NAKED_EYE as NAKED_EYE
from colure.starfiles import VARIABLE as VARIABLE


class Rows:
    """Some stars of the catalogue: row numbers `ids` (N,) int64, and their columns, decoded when asked for."""

    def __init__(self, source: "Catalogue", ids: NDArray[np.int64], data: NDArray[Any]) -> None:
        self.source = source
        self.ids = ids
        self.data = data
        self._states: dict[str, NDArray[Any]] = {}

    def __len__(self) -> int:
        return len(self.ids)

    def take(self, which: NDArray[Any]) -> "Rows":
        """Return the stars picked by an index or boolean array (N,), decoded vectors included."""
        picked = Rows(self.source, self.ids[which], self.data[which])
        picked._states = {name: state[:, which] for name, state in self._states.items()}
        return picked

    @cached_property
    def vmag(self) -> NDArray[np.float32]:
        """V magnitude (N,)."""
        return self.data["v"].astype(np.float32) * np.float32(0.001)

    @cached_property
    def bv(self) -> NDArray[np.float32]:
        """B−V (N,), NaN where unknown."""
        raw = self.data["bv"]
        return np.where(raw == -128, np.float32(np.nan), raw * np.float32(1.0 / 40.0)).astype(np.float32)

    @property
    def flags(self) -> NDArray[np.uint8]:
        """Quality flags (N,), bits as named in `colure.starfiles`."""
        flags: NDArray[np.uint8] = self.data["flags"]
        return flags

    @cached_property
    def _fine(self) -> tuple[NDArray[np.int64], NDArray[Any]]:
        """Return which of these stars have a finer record, and those records."""
        fine = self.source.fine
        at = np.searchsorted(fine["row"], self.ids)
        at[at == len(fine)] = 0
        mine = np.flatnonzero(fine["row"][at] == self.ids)
        return mine, fine[at[mine]]

    @cached_property
    def _motion(self) -> tuple[Float, Float, Float, Float]:
        """Return longitude, latitude (radians) and motion in both (rad/yr, the first with cos δ), each (N,)."""
        data = self.data
        unit = np.where(data["flags"] & COARSE_MOTION, MAS, 0.1 * MAS)
        lon, lat = data["ra"] * TURN, data["dec"] * TURN
        east, north = data["pmra"] * unit, data["pmdec"] * unit
        mine, fine = self._fine
        lon[mine], lat[mine] = fine["ra"], fine["dec"]
        east[mine], north[mine] = fine["pmra"] * MAS, fine["pmdec"] * MAS
        return lon, lat, east, north

    def lonlat(self) -> tuple[Float, Float]:
        """Return right ascension and declination (N,) in radians, ICRS, at the epoch J2016.0."""
        return self._motion[0], self._motion[1]

    def proper_motion(self) -> tuple[Float, Float]:
        """Return μα cos δ and μδ (N,) in radians per Julian year at the epoch."""
        return self._motion[2], self._motion[3]

    @cached_property
    def parallax_mas(self) -> Float:
        """Parallax (N,) in mas; 0 where unknown or measured negative, and for all but the naked-eye stars."""
        out = np.zeros(len(self))
        mine, fine = self._fine
        out[mine] = np.maximum(fine["parallax"], 0.0)
        return out

    @cached_property
    def rv_km_s(self) -> Float:
        """Radial velocity (N,) in km/s, positive outwards; NaN where unknown."""
        out = np.full(len(self), np.nan)
        mine, fine = self._fine
        out[mine] = fine["rv"]
        return out

    def state(self, dtype: Any = np.float64) -> NDArray[Any]:
        """Return (6, N), contiguous: rows 0–2 the unit vectors p0, rows 3–5 the velocities v per Julian year; ICRS.

        With a rotation M (3, 3) and dt = t − EPOCH, `np.hstack([M, M * dt]) @ state` is one product that gives the
        rotated, moved, not yet normalised vectors (3, N). Cached for each dtype.
        """
        name = np.dtype(dtype).char
        if name not in self._states:
            lon, lat, east, north = self._motion
            radial = np.nan_to_num(self.rv_km_s) * self.parallax_mas * (MAS / AU_PER_YEAR)
            sin_lon, cos_lon, sin_lat, cos_lat = np.sin(lon), np.cos(lon), np.sin(lat), np.cos(lat)
            out = np.empty((6, len(self)), dtype=dtype)
            x, y = cos_lat * cos_lon, cos_lat * sin_lon
            out[0], out[1], out[2] = x, y, sin_lat
            inward = sin_lat * north
            out[3] = -sin_lon * east - cos_lon * inward + x * radial
            out[4] = cos_lon * east - sin_lon * inward + y * radial
            out[5] = cos_lat * north + sin_lat * radial
            self._states[name] = out
        return self._states[name]

    def vectors(self, dtype: Any = np.float64) -> tuple[NDArray[Any], NDArray[Any]]:
        """Return p0 and v, each (N, 3), views of `state(dtype)`: unit vectors and velocities per Julian year, ICRS."""
        state = self.state(dtype)
        return state[:3].T, state[3:].T

    def directions(self, year: float = EPOCH) -> Float:
        """Return unit vectors (N, 3) at a Julian year (TDB), ICRS, seen from the barycentre."""
        state = self.state(np.float64)
        moved = state[:3] + state[3:] * (year - EPOCH)
        return np.asarray((moved / np.sqrt((moved * moved).sum(axis=0))).T)

    @cached_property
    def hip(self) -> NDArray[np.int64]:
        """Hipparcos numbers (N,); 0 where there is none."""
        return _sparse(self.ids, *self.source.hip)

    @cached_property
    def gaia(self) -> NDArray[np.int64]:
        """Gaia DR3 source identifiers (N,); 0 where there is none."""
        return _sparse(self.ids, *self.source.gaia)

    @cached_property
    def tycho(self) -> NDArray[np.int64]:
        """Tycho identifiers (N, 3), zeros where there is none."""
        packed = np.zeros(len(self), dtype=np.int64)
        for tier, identifiers in zip(self.source.tiers, self.source.tycho, strict=True):
            mine = (self.ids >= tier.first) & (self.ids < tier.first + len(identifiers))
            packed[mine] = identifiers[self.ids[mine] - tier.first]
        return np.asarray(unpack_tycho(packed))


def _sparse(ids: NDArray[np.int64], rows: NDArray[Any], values: NDArray[Any]) -> NDArray[np.int64]:
    """Look values up by row number in a sorted list of the rows that have one."""
    at = np.searchsorted(rows, ids.astype(rows.dtype))
    at[at == len(rows)] = 0
    return np.where(rows[at] == ids, values[at], 0).astype(np.int64)


class Catalogue:
    """The whole catalogue, mapped, not read; `folder` is a folder of `colure_resources`."""

    def __init__(self, folder: str = "stars") -> None:
        self.folder = folder
        tiers: list[Tier] = []
        first = 0
        for k, brightest in enumerate(LIMITS):
            rows = self._load(f"tier{k}.npy", ROW, 1)
            starts = self._load(f"cells{k}.npy", np.dtype("<i4"), 2)
            if starts[-1, -1] != len(rows):
                raise ResourceError(
                    f"data file '{folder}/cells{k}.npy': ends at row {starts[-1, -1]}, expected {len(rows)}; "
                    "run 'colure selfcheck'"
                )
            tiers.append(Tier(rows, rows.view("<u4").reshape(-1, 4), starts, first, brightest))
            first += len(rows)
        self.tiers = tuple(tiers)
        self._size = first
        self._cuts: dict[float, Rows] = {}

    def _load(self, name: str, dtype: np.dtype[Any], dimensions: int) -> NDArray[Any]:
        array = np.asarray(resources.load_array(f"{self.folder}/{name}"))
        if array.dtype != dtype or array.ndim != dimensions:
            raise ResourceError(
                f"data file '{self.folder}/{name}': holds {array.dtype} in {array.ndim} dimensions, expected "
                f"{dtype} in {dimensions}; run 'colure selfcheck'"
            )
        return array

    def __len__(self) -> int:
        return self._size

    @cached_property
    def fine(self) -> NDArray[Any]:
        """The finer records of the naked-eye stars, sorted by row number."""
        return self._load("fine.npy", FINE, 1)

    @cached_property
    def fast(self) -> NDArray[Any]:
        """Row numbers of the stars that move by more than 0.5″ a year."""
        return self._load("fast.npy", np.dtype("<u4"), 1)

    @cached_property
    def hip(self) -> tuple[NDArray[Any], NDArray[Any]]:
        """Row numbers, sorted, and the Hipparcos numbers of those rows."""
        both = self._load("hip.npy", np.dtype("<u4"), 2)
        return both[0], both[1]

    @cached_property
    def gaia(self) -> tuple[NDArray[Any], NDArray[Any]]:
        """Row numbers, sorted, and the Gaia DR3 identifiers of those rows."""
        return self._load("gaia_rows.npy", np.dtype("<u4"), 1), self._load("gaia_ids.npy", np.dtype("<i8"), 1)

    @cached_property
    def tycho(self) -> tuple[NDArray[Any], ...]:
        """Packed Tycho identifiers of each tier's rows; 0 for none."""
        return tuple(self._load(f"tycho{k}.npy", np.dtype("<u4"), 1) for k in range(len(self.tiers)))

    def rows(self, ids: NDArray[Any] | Sequence[int]) -> Rows:
        """Return stars by row number, in the order given; raise IndexError for a number outside the catalogue."""
        wanted = np.asarray(ids, dtype=np.int64).reshape(-1)
        if wanted.size and not (wanted.min() >= 0 and wanted.max() < self._size):
            raise IndexError(f"star row {wanted.min()}..{wanted.max()}: expected 0 to {self._size - 1}")
        data = np.empty(len(wanted), dtype=ROW)
        for tier in self.tiers:
            mine = (wanted >= tier.first) & (wanted < tier.first + len(tier.rows))
            data[mine] = tier.rows[wanted[mine] - tier.first]
        return Rows(self, wanted, data)

    def brighter(self, vmag: float) -> Rows:
        """Return all stars of the sky with V < `vmag`, in row order; the last few cuts are kept with their vectors."""
        vmag = float(vmag)
        if vmag not in self._cuts:
            ids, data = [], []
            for tier in self.tiers:
                if vmag > tier.brightest:
                    mine = np.flatnonzero(tier.rows["v"] < vmag * 1000.0)
                    ids.append(mine + tier.first)
                    data.append(tier.rows[mine])
            found = Rows(self, np.concatenate(ids), np.concatenate(data)) if ids else self.rows([])
            while len(self._cuts) >= KEPT_CUTS:
                del self._cuts[next(iter(self._cuts))]
            self._cuts[vmag] = found
        return self._cuts[vmag]

    def cone(self, lon: float, lat: float, radius: float, vmag: float | None = None, year: float = EPOCH) -> Rows:
        """Return the stars within `radius` of a point, with V < `vmag`; angles in radians, ICRS; in no set order.

        Positions are those of the Julian year `year` (TDB): at the catalogue's epoch nothing is computed but the
        distances of the stars in the cells touched; else the cells are taken with a margin and every star is moved.
        """
        years = abs(year - EPOCH)
        reach = min(radius + SLOW * years, np.pi)
        limit = 32767.0 if vmag is None else vmag * 1000.0
        lon = lon % TWO_PI
        ids: list[NDArray[Any]] = []
        words: list[NDArray[Any]] = []
        for tier in self.tiers:
            if vmag is None or vmag > tier.brightest:
                for start, stop in tier.slices(lon, lat, reach):
                    if stop > start:
                        ids.append(np.arange(tier.first + start, tier.first + stop))
                        words.append(tier.words[start:stop])
        if not ids:
            ids, words = [np.empty(0, dtype=np.int64)], [np.empty((0, 4), dtype=np.uint32)]
        every = np.concatenate(ids)
        data = np.concatenate(words).view(ROW).reshape(-1)
        near = self._within(data, lon, lat, reach, limit)
        found = Rows(self, every[near], data[near])
        if years:
            found = self.rows(np.union1d(found.ids, self.fast)) if len(self.fast) else found
            axis = np.array([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
            chord = ((found.directions(year) - axis) ** 2).sum(axis=1)
            found = found.take((chord <= (2.0 * np.sin(radius / 2.0)) ** 2) & (found.data["v"] < limit))
        return found

    @staticmethod
    def _within(data: NDArray[Any], lon: float, lat: float, radius: float, limit: float) -> NDArray[np.bool_]:
        """Mark rows inside a circle and brighter than a limit in mmag, by the haversine, exact for small circles."""
        dec = data["dec"] * TURN
        half_lon = np.sin((data["ra"] * TURN - lon) * 0.5)
        half_lat = np.sin((dec - lat) * 0.5)
        haversine = half_lat * half_lat + np.cos(lat) * np.cos(dec) * half_lon * half_lon
        inside: NDArray[np.bool_] = haversine <= np.sin(radius * 0.5) ** 2
        return inside if limit >= 32767.0 else inside & (data["v"] < limit)

    def by_hip(self, number: int) -> int | None:
        """Return the row of a Hipparcos number, or None."""
        return _first(*self.hip, number)

    def by_gaia(self, source_id: int) -> int | None:
        """Return the row of a Gaia DR3 source identifier, or None."""
        return _first(*self.gaia, source_id)

    def by_tycho(self, region: int, number: int, component: int) -> int | None:
        """Return the row of a Tycho identifier such as 1266, 1416, 1, or None."""
        if not (0 < region < 2**14 and 0 < number < 2**14 and 1 <= component <= 4):
            return None
        for tier, identifiers in zip(self.tiers, self.tycho, strict=True):
            found = np.flatnonzero(identifiers == pack_tycho(region, number, component))
            if found.size:
                return int(found[0]) + tier.first
        return None


def _first(rows: NDArray[Any], values: NDArray[Any], value: int) -> int | None:
    found = np.flatnonzero(values == value)
    return int(rows[found[0]]) if found.size else None


KEPT_CUTS = 6


@cache
def catalogue() -> Catalogue:
    """Return the shipped catalogue."""
    return Catalogue()
