"""A user's own SPK kernel as an ephemeris, read through the optional library jplephem."""

from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from colure.arrays import Float
from colure.ephemeris import uncertainty
from colure.ephemeris.protocol import BODIES, KM_PER_AU, Days, check_bodies, check_each, check_span
from colure.errors import ColureError, ResourceError

NAIF = {
    "sun": 10,
    "mercury": 1,
    "venus": 2,
    "emb": 3,
    "mars": 4,
    "jupiter": 5,
    "saturn": 6,
    "uranus": 7,
    "neptune": 8,
    "pluto": 9,
    "moon": 301,
    "earth": 399,
}
"""Integer codes of the bodies in SPK files; 1 and 2 are barycentres that coincide with planets without satellites."""

ICRF_FRAME = 1
"""SPK frame code of "J2000", which the kernels of the DE4xx series use for the ICRF."""


class KernelError(ColureError):
    """A kernel file that cannot be read or used."""


class Kernel:
    """An SPK kernel (segments of type 2 or 3) behind the Ephemeris protocol."""

    def __init__(self, path: str | Path) -> None:
        """Open `path`; raise KernelError with one clear line if it is no usable kernel."""
        self.path = Path(path)
        self.name = self.path.name
        self._chains: dict[str, tuple[_Leg, ...]] = {}
        self._spk = _open(self.path)
        try:
            self._survey()
        except BaseException:
            self._spk.close()
            raise

    def posvel(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> tuple[Float, Float]:
        """Return positions (au) and velocities (au/day), both (bodies, *shape, 3), barycentric, ICRS axes."""
        pos, vel = self._evaluate(bodies, tdb1, tdb2, each, rates=True)
        return pos, vel

    def position(self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, *, each: bool = False) -> Float:
        """Return positions (bodies, *shape, 3) in au, barycentric, ICRS axes."""
        return self._evaluate(bodies, tdb1, tdb2, each, rates=False)[0]

    def source(self, tdb: float) -> str:
        """Return the kernel's file name, whatever the date."""
        return self.name

    def uncertainty_arcsec(
        self, bodies: Sequence[str], tdb1: Days, tdb2: Days = 0.0, distance: ArrayLike | None = None
    ) -> Float:
        """Return bounds (bodies, *shape) in arcsec; a kernel has no error of fit, the other terms remain."""
        check_bodies(bodies, self.bodies, f"kernel '{self.name}'")
        return uncertainty.bound(bodies, np.asarray(tdb1) + np.asarray(tdb2), distance)

    def close(self) -> None:
        """Close the file; the kernel answers no more."""
        self._spk.close()

    def _survey(self) -> None:
        """Find out which bodies can be placed, and between which dates."""
        legs = _legs(self._spk, self.path)
        for body, code in NAIF.items():
            chain = _chain(code, legs)
            if chain is not None:
                self._chains[body] = chain
        self.bodies = tuple(body for body in BODIES if body in self._chains)
        if not self.bodies:
            targets = ", ".join(str(code) for code in sorted(legs)) or "no segment of type 2 or 3"
            raise KernelError(
                f"kernel '{self.path}': no body can be placed from the solar system's barycentre; it holds {targets}"
            )
        spans = [leg.span for chain in self._chains.values() for leg in chain]
        self.span = (max(first for first, _ in spans), min(last for _, last in spans))
        if self.span[0] >= self.span[1]:
            raise KernelError(f"kernel '{self.path}': its segments have no date in common")

    def _evaluate(
        self, bodies: Sequence[str], tdb1: Days, tdb2: Days, each: bool, *, rates: bool
    ) -> tuple[Float, Float]:
        check_bodies(bodies, self.bodies, f"kernel '{self.name}'")
        day, part = np.broadcast_arrays(np.asarray(tdb1, dtype=np.float64), np.asarray(tdb2, dtype=np.float64))
        if each:
            check_each(day.shape, bodies)
        check_span(day + part, self.span, f"kernel '{self.name}'")
        shape = day.shape[1:] if each else day.shape
        pos = np.empty((len(bodies), *shape, 3))
        vel = np.empty((len(bodies), *shape, 3) if rates else (0,))
        legs: dict[tuple[int, int], tuple[Float, Float]] = {}
        for row, body in enumerate(bodies):
            moments = (day[row].ravel(), part[row].ravel()) if each else (day.ravel(), part.ravel())
            x, v = np.zeros((3, moments[0].size)), np.zeros((3, moments[0].size))
            for leg in self._chains[body]:
                if each or leg.key not in legs:  # the Earth-Moon barycentre serves both Earth and Moon
                    legs[leg.key] = leg.evaluate(*moments, rates=rates)
                x += legs[leg.key][0]
                if rates:
                    v += legs[leg.key][1]
            # The one place where the file's (3, N) kilometres become (..., 3) astronomical units.
            pos[row] = x.T.reshape(*shape, 3) / KM_PER_AU
            if rates:
                vel[row] = v.T.reshape(*shape, 3) / KM_PER_AU
        return pos, vel


class _Leg:
    """All segments that give one target from one centre, joined in time."""

    def __init__(self, segments: list[Any]) -> None:
        self.segments = sorted(segments, key=lambda segment: float(segment.start_jd))
        self.key = (int(segments[0].center), int(segments[0].target))
        self.span = (float(self.segments[0].start_jd), max(float(s.end_jd) for s in self.segments))

    def evaluate(self, day: Float, part: Float, *, rates: bool) -> tuple[Float, Float]:
        """Return (3, N) kilometres and kilometres a day at N dates."""
        if len(self.segments) == 1:
            return _compute(self.segments[0], day, part, rates)
        x, v = np.empty((3, day.size)), np.empty((3, day.size))
        jd = day + part
        # The last segment that starts before a date is the one to use: later segments have precedence in the format.
        owner = np.searchsorted([s.start_jd for s in self.segments[1:]], jd, side="right")
        for number in np.unique(owner):
            chosen = owner == number
            x[:, chosen], rate = _compute(self.segments[number], day[chosen], part[chosen], rates)
            if rates:
                v[:, chosen] = rate
        return x, v


def _compute(segment: Any, day: Float, part: Float, rates: bool) -> tuple[Float, Float]:
    if day.size == 0:
        return np.zeros((3, 0)), np.zeros((3, 0))
    if not rates:
        return np.asarray(segment.compute(day, part))[:3], np.empty(0)
    x, v = segment.compute_and_differentiate(day, part)
    return np.asarray(x)[:3], np.asarray(v)[:3]


def _open(path: Path) -> Any:
    try:
        from jplephem.spk import SPK
    except ImportError as fault:
        raise ResourceError(
            f"kernel '{path}': reading it needs the library jplephem; install it with: pip install 'colure[kernel]'"
        ) from fault
    try:
        return SPK.open(str(path))
    except OSError as fault:
        raise KernelError(f"kernel '{path}': {fault.strerror or fault}") from fault
    except Exception as fault:  # whatever a damaged header makes the reader stumble over
        raise KernelError(f"kernel '{path}': not a readable SPK file ({_line(fault)})") from fault


def _legs(spk: Any, path: Path) -> dict[int, _Leg]:
    """Return the usable legs by target code; prove on the way that each segment's data is there and finite."""
    grouped: dict[tuple[int, int], list[Any]] = {}
    for segment in spk.segments:
        if segment.target not in NAIF.values() or segment.data_type not in (2, 3) or segment.frame != ICRF_FRAME:
            continue
        ends = np.array([segment.start_jd, segment.end_jd])
        try:
            x = np.asarray(segment.compute(ends, np.zeros(2)))
        except Exception as fault:  # a table that is cut short fails in many ways
            raise KernelError(
                f"kernel '{path}': segment of body {segment.target} is damaged ({_line(fault)})"
            ) from fault
        if not np.isfinite(x).all() or np.abs(x).max() > 1e12:
            raise KernelError(f"kernel '{path}': segment of body {segment.target} is damaged (no sensible position)")
        grouped.setdefault((int(segment.center), int(segment.target)), []).append(segment)
    return {target: _Leg(segments) for (_, target), segments in grouped.items()}


def _chain(code: int, legs: dict[int, _Leg]) -> tuple[_Leg, ...] | None:
    """Return the legs from body `code` down to the barycentre of the solar system, or None."""
    chain: list[_Leg] = []
    while code != 0:
        leg = legs.get(code)
        if leg is None or leg in chain:
            return None
        chain.append(leg)
        code = leg.key[0]
    return tuple(chain)


def _line(fault: Exception) -> str:
    return " ".join(str(fault).split()) or type(fault).__name__
