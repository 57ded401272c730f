"""What a position is held against: a body, a star or a point of the sky, seen at moments, with or without a site."""

from dataclasses import dataclass, replace

import numpy as np

from colure import frames
from colure.arrays import DEG, Float, Int, cartesian
from colure.ephemeris import BODIES
from colure.errors import BodyError, FrameError, MomentError
from colure.frames import Frame
from colure.moment import Moment
from colure.reduction import Observer
from colure.sites import Site
from colure.stars import EPOCH, Rows, catalogue

MAX_EXPOSURE_S = 86400.0


@dataclass(frozen=True, slots=True)
class Stars:
    """Stars or fixed points, one for each position: unit vectors `place` (n, 3), ICRS, at the Julian year `epoch`.

    `motion` (n, 3) per Julian year in units of the distance and `parallax` (n,) rad are None for a fixed point.
    """

    place: Float
    motion: Float | None = None
    parallax: Float | None = None
    epoch: float = EPOCH
    name: str = ""

    @classmethod
    def of_rows(cls, rows: Rows, name: str = "") -> "Stars":
        """Return catalogue stars."""
        position, motion = rows.vectors(np.float64)
        return cls(np.asarray(position), np.asarray(motion), rows.parallax_mas / 1000.0 / 3600.0 * DEG, EPOCH, name)

    @classmethod
    def of_ids(cls, ids: Int | list[int], name: str = "") -> "Stars":
        """Return stars by their row numbers in the catalogue."""
        return cls.of_rows(catalogue().rows(np.asarray(ids)), name)

    @classmethod
    def point(
        cls, lon_deg: Float | float, lat_deg: Float | float, frame: str = "icrs", moment: Moment | None = None
    ) -> "Stars":
        """Return fixed points given in a frame, which must not belong to a site."""
        parsed = Frame.parse(frame)
        if parsed.needs_moment and moment is None:
            raise FrameError(f"reference in '{parsed}': moves with time; a moment is needed")
        if parsed.needs_site:
            raise FrameError(f"reference in '{parsed}': expected a frame of the sky")
        vectors = cartesian(np.atleast_1d(lon_deg) * DEG, np.atleast_1d(lat_deg) * DEG)
        return cls(frames.to_icrs(vectors, parsed, moment), None, None, 2000.0, f"{parsed} position")

    def direction(self, years: Float | float) -> Float:
        """Return vectors (n, 3), not normalised, at Julian years, from the barycentre."""
        if self.motion is None:
            return self.place
        return np.asarray(self.place + self.motion * (np.asarray(years)[..., None] - self.epoch))


@dataclass(frozen=True, slots=True)
class Question:
    """What is known of numbers: reference (a body's name, or Stars), moments (n,), site, what they are said to be.

    `claim` names the frame that the numbers are said to be in (None: nothing is said); `place` how far they are said
    to be reduced (None: astrometric in a fixed frame, apparent in one of date); `origin` "earth" or "site" (None: the
    site where there is one). `exposure_s` is the length of an exposure that began at the moment.
    """

    reference: str | Stars
    moment: Moment | None = None
    site: Site | None = None
    claim: str | None = None
    place: str | None = None
    origin: str | None = None
    exposure_s: float | None = None

    def __post_init__(self) -> None:
        if isinstance(self.reference, str):
            if self.reference not in BODIES or self.reference == "earth":
                near = ", ".join(body for body in BODIES if body != "earth")
                raise BodyError(f"body '{self.reference}': cannot be seen from the Earth; expected one of {near}")
            if self.moment is None:
                raise MomentError(f"audit against body '{self.reference}': it moves; a moment is needed")
        if self.claim is not None:
            frame = Frame.parse(self.claim)
            if frame.needs_site:
                raise FrameError(f"claim '{frame}': expected a frame of the sky (hour angles are tried by themselves)")
            if frame.needs_moment and self.moment is None:
                raise FrameError(f"claim '{frame}': moves with time; a moment is needed")
        if self.place not in (None, "geometric", "astrometric", "apparent", "observed"):
            raise FrameError(f"place '{self.place}': expected geometric, astrometric, apparent or observed")
        if self.site is not None and self.moment is None:
            raise MomentError(f"site '{self.site.name}': says nothing without a moment")
        if self.exposure_s is not None and not 0.0 < self.exposure_s <= MAX_EXPOSURE_S:
            raise MomentError(f"exposure of {self.exposure_s:g} s: expected more than 0 and at most a day")
        if self.moment is not None and self.moment.shape == ():
            object.__setattr__(self, "moment", self.moment[None])

    @property
    def is_body(self) -> bool:
        """Whether the reference is a body of the solar system."""
        return isinstance(self.reference, str)

    @property
    def observer(self) -> Observer:
        """The observer that the numbers are said to come from."""
        if self.site is None or self.origin == "earth":
            return Observer("earth")
        return Observer("site", self.site)

    @property
    def years(self) -> Float | float:
        """Julian years of the moments, 2000 where none is given."""
        return 2000.0 if self.moment is None else np.asarray(self.moment.julian_year)

    def at(self, moment: Moment) -> "Question":
        """Return the question of other moments."""
        return replace(self, moment=moment)

    def default_place(self, of_date: bool) -> str:
        """Return the place that goes with axes unless one is claimed."""
        return self.place or ("apparent" if of_date else "astrometric")
