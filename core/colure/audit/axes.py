"""The axes that two numbers may refer to, right and wrong: lists B and C of the hypotheses."""

from collections.abc import Callable
from dataclasses import dataclass

import erfa
import numpy as np

from colure import frames, obliquity, precession
from colure.arrays import Float, rotate, rotation_x, spherical, unit
from colure.frames import Frame
from colure.moment import Moment
from colure.nutation import nutation

Turn = Callable[[Float, Moment | None], Float]
"""From vectors (..., n, 3) on ICRS axes and the moments (n,) to vectors on other axes."""


@dataclass(frozen=True, slots=True)
class Axes:
    """One way of setting up axes.

    `codes` are those of an astrometric and of an apparent place on them; `frame` is the name of the frame where it is
    one; `of_date` whether they move; `kind` "frame" for a frame that people use, "slip" for what only errors make.
    """

    key: str
    codes: tuple[str, str]
    words: str
    frame: str | None
    of_date: bool
    kind: str
    turn: Turn
    equatorial: bool = True

    def lonlat(self, vectors: Float, moment: Moment | None) -> tuple[Float, Float]:
        """Return longitude (0 to 2π) and latitude (..., n) of vectors (..., n, 3) on ICRS axes."""
        return spherical(self.turn(vectors, moment))


def _at(moment: Moment | None) -> Moment:
    assert moment is not None  # axes of date are never asked for without a moment
    return moment


def _mean(moment: Moment, model: str = "auto") -> Float:
    return precession.bias_precession_matrix(moment, model)


def _named(name: str) -> Turn:
    frame = Frame.parse(name)

    def turn(vectors: Float, moment: Moment | None) -> Float:
        if not frame.is_rotation:
            return frames.from_icrs(vectors, frame)
        matrix = frames.rotation(frame, moment if frame.needs_moment else None).matrix
        return vectors @ matrix.T if matrix.ndim == 2 else rotate(matrix, vectors)

    return turn


def _fk4_now(vectors: Float, moment: Moment | None) -> Float:
    year = np.asarray(erfa.epb(*_at(moment).tt), dtype=np.float64)
    return frames.from_icrs(vectors, "equator/fk4/B1950", epoch=year)


def _matrix(make: Callable[[Moment], Float]) -> Turn:
    return lambda vectors, moment: rotate(make(_at(moment)), vectors)


def _twice(at: Moment) -> Float:
    return np.asarray(_mean(at) @ _mean(at))


def _backwards(at: Moment) -> Float:
    return np.swapaxes(_mean(at), -1, -2)


def _wrong_obliquity(at: Moment) -> Float:
    return rotation_x(obliquity.mean(at))


def _wrong_way(at: Moment) -> Float:
    return np.asarray(rotation_x(-obliquity.mean(at)) @ _mean(at))


def _true_on_mean(at: Moment) -> Float:
    return np.asarray(rotation_x(obliquity.mean(at) + nutation(at)[1]) @ _mean(at))


def _mean_on_true(at: Moment) -> Float:
    return np.asarray(rotation_x(obliquity.mean(at)) @ frames.rotation("equator/true/date", at).matrix)


def _lambda_only(vectors: Float, moment: Moment | None) -> Float:
    on_j2000 = frames.from_icrs(vectors, "ecliptic/mean/J2000")
    years = np.asarray(_at(moment).julian_year, dtype=np.float64) - 2000.0
    # IAU 2006 general precession in longitude (Capitaine et al. 2003, eq. 39), arcseconds of Julian centuries.
    t = years / 100.0
    angle = (5028.796195 + 1.1054348 * t) * t * np.pi / 648000.0
    x, y, z = on_j2000[..., 0], on_j2000[..., 1], on_j2000[..., 2]
    c, s = np.cos(angle), np.sin(angle)
    return np.stack([c * x - s * y, s * x + c * y, np.broadcast_to(z, (c * x).shape)], axis=-1)


_J2000 = (precession.J2000, 0.0)


def _fixed(make: Callable[[], Float]) -> Turn:
    return lambda vectors, moment: unit(vectors @ make().T)


def _mean_on_true_2000() -> Float:
    return np.asarray(rotation_x(obliquity.mean(_J2000)) @ frames.rotation("equator/true/J2000").matrix)


def _wrong_way_2000() -> Float:
    return rotation_x(-obliquity.mean(_J2000))


def _frame(name: str, codes: tuple[str, str], *, kind: str = "frame") -> Axes:
    frame = Frame.parse(name)
    return Axes(
        str(frame), codes, frame.label(), str(frame), frame.needs_moment, kind, _named(name), frame.is_equatorial
    )


def _slip(key: str, codes: tuple[str, str], words: str, turn: Turn, *, date: bool = True, equator: bool = True) -> Axes:
    return Axes(key, codes, words, None, date, "slip", turn, equator)


AXES = (
    _frame("icrs", ("B1", "B6")),
    _frame("equator/mean/J2000", ("B2", "B2")),
    _frame("equator/mean/date", ("B3", "B3")),
    _frame("equator/true/date", ("B4", "B5")),
    _frame("cirs", ("B7", "B7")),
    _frame("equator/fk4/B1950", ("B8", "B8")),
    _frame("equator/fk4-no-e/B1950", ("B8", "B8")),
    _frame("equator/mean/B1950", ("B9", "B9")),
    _frame("equator/mean/B1875", ("B10", "B10")),
    _frame("equator/fk4/B1875", ("B10", "B10")),
    _frame("equator/mean/B1900", ("B11", "B11")),
    _frame("equator/fk4/B1900", ("B11", "B11")),
    _slip("fk4-now", ("B8", "B8"), "FK4 equator and equinox B1950 at the epoch of date", _fk4_now),
    _slip("twice", ("B13", "B13"), "mean equator of date with precession applied twice", _matrix(_twice)),
    _slip("backwards", ("B14", "B14"), "J2000 precessed in the wrong direction", _matrix(_backwards)),
    _frame("equator/mean/date@iau1976", ("B16", "B16"), kind="slip"),
    _frame("equator/mean/date@newcomb", ("B16", "B16"), kind="slip"),
    _frame("equator/true/date@iau1976", ("B16", "B16"), kind="slip"),
    _frame("ecliptic/mean/J2000", ("C1", "C1")),
    _frame("ecliptic/mean/date", ("C2", "C2")),
    _frame("ecliptic/true/date", ("C3", "C4")),
    _frame("ecliptic/true/J2000", ("C5", "C5"), kind="slip"),
    _frame("ecliptic/mean/B1950", ("B9", "B9")),
    _frame("ecliptic/iau76/J2000", ("C8", "C8")),
    _slip("lambda-only", ("B15", "B15"), "ecliptic with precession in longitude only", _lambda_only, equator=False),
    _slip(
        "j2000-obliquity-of-date",
        ("C6", "C6"),
        "ecliptic made of the J2000 equator with the obliquity of date",
        _matrix(_wrong_obliquity),
        equator=False,
    ),
    _slip(
        "true-obliquity-on-mean",
        ("C7", "C7"),
        "ecliptic made of the mean equator of date with the true obliquity",
        _matrix(_true_on_mean),
        equator=False,
    ),
    _slip(
        "mean-obliquity-on-true",
        ("C7", "C7"),
        "ecliptic made of the true equator of date with the mean obliquity",
        _matrix(_mean_on_true),
        equator=False,
    ),
    _slip(
        "mean-obliquity-on-true-2000",
        ("C7", "C7"),
        "ecliptic made of the true equator of J2000 with the mean obliquity",
        _fixed(_mean_on_true_2000),
        date=False,
        equator=False,
    ),
    _slip(
        "wrong-way-2000",
        ("C9", "C9"),
        "ecliptic J2000 with the obliquity of the wrong sign",
        _fixed(_wrong_way_2000),
        date=False,
        equator=False,
    ),
    _slip(
        "wrong-way-date",
        ("C9", "C9"),
        "ecliptic of date with the obliquity of the wrong sign",
        _matrix(_wrong_way),
        equator=False,
    ),
    _frame("galactic", ("C12", "C12")),
    _frame("supergalactic", ("C12", "C12")),
)
"""Every set of axes that is tried."""

BY_KEY = {axes.key: axes for axes in AXES}
EQUINOXES = (
    "icrs",
    "equator/fk4/B1950",
    "equator/mean/date",
    "equator/true/date",
    "ecliptic/mean/J2000",
    "ecliptic/mean/date",
    "ecliptic/true/date",
    "galactic",
)
"""The axes that a wrong reading of the digits is combined with."""


def of_claim(claim: str) -> Axes:
    """Return the axes of a frame as claimed, one of AXES or made for it."""
    name = str(Frame.parse(claim))
    return BY_KEY.get(name) or _frame(name, ("", ""))
