"""Directions of an overlay on ICRS axes, by the one path that turns every frame, FK4 included."""

from functools import lru_cache
from typing import Any

import numpy as np

from colure import frames
from colure.arrays import Float, cartesian
from colure.errors import FrameError
from colure.framenames import Frame
from colure.moment import Moment
from colure.overlays.model import Overlay
from colure.overlays.store import STORE, Rows, Store
from colure.precession import J2000, YEAR


def besselian(epoch: float | None) -> float | None:
    """Return a Julian year as a Besselian one, as FK4 counts its epochs."""
    if epoch is None:
        return None
    import erfa

    return float(erfa.epb(J2000, (epoch - 2000.0) * YEAR))


def to_icrs(vectors: Float, frame: str, epoch: float | None, moment: Moment | None = None, site: Any = None) -> Float:
    """Return unit vectors (…, 3) in a declared frame turned to ICRS axes.

    `epoch` is the Julian year of the positions: the epoch of an FK4 observation, and the date of a frame of date, which
    is that of `moment` where there is no epoch. FrameError where a date or a site is missing.
    """
    parsed = Frame.parse(frame)
    if parsed.needs_moment:
        at = moment if epoch is None else Moment.from_julian_year(epoch)
        if at is None:
            raise FrameError(f"frame '{frame}': moves with time; the overlay needs an epoch or a moment")
        return frames.to_icrs(vectors, parsed, at, site)
    return frames.to_icrs(vectors, parsed, None, None, None if parsed.is_rotation else besselian(epoch))


def from_icrs(vectors: Float, frame: str, epoch: float | None) -> Float:
    """Return vectors (…, 3) on ICRS axes turned into a declared frame at an epoch: the inverse of `to_icrs`."""
    parsed = Frame.parse(frame)
    if parsed.needs_moment:
        if epoch is None:
            raise FrameError(f"frame '{frame}': moves with time; the overlay needs an epoch or a moment")
        return frames.from_icrs(vectors, parsed, Moment.from_julian_year(epoch))
    return frames.from_icrs(vectors, parsed, None, None, None if parsed.is_rotation else besselian(epoch))


def native(rows: Rows) -> Float:
    """Return unit vectors (N, 3) of rows on the axes of their own frame."""
    return cartesian(rows.lon, rows.lat)


def of(overlay: Overlay, moment: Moment | None = None, site: Any = None, store: Store = STORE) -> Float | None:
    """Return the directions (N, 3) of a table's rows on ICRS axes; None where its rows cannot be had.

    The last few answers are kept: an overlay costs nothing until its frame, its epoch or the date of its frame changes.
    """
    rows = store.rows(overlay)
    if rows is None:
        return None
    parsed = Frame.parse(overlay.frame)
    at = moment if parsed.needs_moment and overlay.epoch is None else None
    return _kept(_Held(rows), overlay.frame, overlay.epoch, at, site if parsed.needs_site else None)


class _Held:
    """Carries rows past the cache's key: equal when they are the same object."""

    __slots__ = ("rows",)

    def __init__(self, rows: Rows) -> None:
        self.rows = rows

    def __hash__(self) -> int:
        return id(self.rows)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Held) and other.rows is self.rows


@lru_cache(maxsize=8)
def _kept(held: _Held, frame: str, epoch: float | None, moment: Moment | None, site: Any) -> Float:
    vectors = np.asarray(to_icrs(native(held.rows), frame, epoch, moment, site))
    vectors.flags.writeable = False
    return vectors
