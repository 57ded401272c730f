"""Every hypothesis that applies to a question, with the position that each predicts: all at once, as arrays."""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from colure import precession
from colure.arrays import Bool, Float, norm, unit
from colure.audit import shifts as time_shifts
from colure.audit.axes import AXES, BY_KEY, EQUINOXES, Axes, of_claim
from colure.audit.numbers import Numbers
from colure.audit.readings import AS_READ, BARE, READINGS, Read, Reading, hour_angles
from colure.audit.reference import Question
from colure.audit.shifts import Shift
from colure.audit.sights import SIGHTS, Sky, keys
from colure.ephemeris import default
from colure.moment import Moment

PLACES = ("astrometric", "apparent")
MODEL_ARCSEC = 0.005
"""What rotations and star places may be wrong by: interpolated nutation, places of the catalogue at its epoch."""
NATURAL = ("icrs", "equator/true/date", "ecliptic/mean/J2000", "ecliptic/true/date")
"""The axes on which mistakes of origin and time are tried where nothing is claimed."""
FK4_YEARS = (1700.0, 2100.0)
"""Years of observation that FK4's slow turn is carried to."""
SURE_CLOCK_S = 0.01
"""ΔT known to this moves nothing by what anybody's digits show (the Moon by 0.006″)."""
HOUR_ANGLE_AXES = ("equator/true/date", "equator/mean/date", "icrs")


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """One explanation: what the digits mean, on which axes, how far reduced, at which wrong time.

    `codes` are those of the list of hypotheses; `steps` counts the mistakes against what is claimed (0: none).
    """

    reading: Reading
    axes: Axes
    sight: str
    shift: Shift | None
    codes: tuple[str, ...]
    steps: int

    @property
    def key(self) -> str:
        """A name that tells it apart from all others."""
        parts = [self.reading.key, self.axes.key, self.sight, self.shift.key if self.shift else ""]
        return "|".join(parts)

    @property
    def code(self) -> str:
        """The codes joined: `A1+B8`."""
        return "+".join(self.codes) or "as claimed"

    @property
    def words(self) -> str:
        """The explanation in words."""
        parts = [f"{self.axes.words}, {SIGHTS[self.sight].words}"]
        if self.reading.key != "read":
            parts.append(self.reading.words)
        if self.shift is not None:
            parts.append(f"moment {self.shift.words}")
        return "; ".join(parts)


@dataclass(frozen=True, slots=True)
class Predictions:
    """Hypotheses (h) and what they say of n positions.

    `lon`, `lat` (h, n) rad predicted; `n_sigma` (h, n) the distance of the numbers from them in units of their
    rounding, infinite where the digits cannot have that meaning; `off_lon`, `off_lat` (h, n) rad the residuals.
    """

    hypotheses: tuple[Hypothesis, ...]
    lon: Float
    lat: Float
    off_lon: Float
    off_lat: Float
    n_sigma: Float
    sigma_lon: Float
    sigma_lat: Float


@dataclass(slots=True)
class _Plan:
    """The hypotheses in the making: one list for each way of computing."""

    question: Question
    claim: Axes | None
    found: list[Hypothesis] = field(default_factory=list)
    seen: set[tuple[str, str, str, str]] = field(default_factory=set)

    def add(
        self, reading: Reading, axes: Axes, sight: str, shift: Shift | None, codes: Sequence[str], steps: int
    ) -> None:
        mark = (reading.key, axes.key, sight, shift.key if shift else "")
        if mark not in self.seen:
            self.seen.add(mark)
            self.found.append(
                Hypothesis(reading, axes, sight, shift, tuple(dict.fromkeys(c for c in codes if c)), steps)
            )

    def steps(self, axes: Axes, place: str) -> int:
        if self.claim is None:
            return 0 if place == self.question.default_place(axes.of_date) else 1
        wanted = self.question.default_place(self.claim.of_date)
        return (axes.key != self.claim.key) + (place != wanted)


def bases(question: Question) -> tuple[tuple[Axes, str], ...]:
    """Return the axes and places on which mistakes of origin and time are tried: the claim, or the usual four."""
    names = NATURAL if question.claim is None else (question.claim,)
    found = [of_claim(name) for name in names]
    usable = [axes for axes in found if question.moment is not None or not axes.of_date]
    return tuple((axes, question.default_place(axes.of_date)) for axes in usable)


def plan(question: Question) -> tuple[Hypothesis, ...]:
    """Return the hypotheses that apply to a question, alone and in the pairs that occur in practice."""
    claim = None if question.claim is None else of_claim(question.claim)
    made = _Plan(question, claim)
    dated = question.moment is not None
    usable = _usable(question, claim)
    origins = ["", *_other(question)]
    # Equinox alone and with the place, and for a body with the origin.
    places = PLACES if dated else ("astrometric",)
    for axes in usable:
        for place in places:
            for origin in origins:
                code = axes.codes[place == "apparent"]
                sight = f"{origin}-{place}" if origin else place
                extra = "D1" if origin else ""
                mark = "B6" if place == "apparent" and not axes.of_date and code != "B6" else ""
                made.add(AS_READ, axes, sight, None, (code, mark, extra), made.steps(axes, place) + bool(origin))
    sights = keys(question)
    for axes in usable:
        if not axes.of_date and axes.kind == "frame":
            for sight in sights:
                if sight.startswith("epoch-"):
                    code = axes.codes[0]
                    made.add(AS_READ, axes, sight, None, (code, "B12"), made.steps(axes, "astrometric") + 1)
    grounds = bases(question)
    for axes, place in grounds:
        for sight in sights:
            made.add(AS_READ, axes, sight, None, (axes.codes[place == "apparent"], SIGHTS[sight].code), 1)
    _readings(made, usable)
    if question.is_body and question.moment is not None:
        for axes, place in grounds:
            for shift in time_shifts.shifts(question.moment, question.exposure_s):
                for origin in origins:
                    sight = f"{origin}-{place}" if origin else place
                    code = axes.codes[place == "apparent"]
                    codes = (code, "D1" if origin else "", shift.code)
                    made.add(AS_READ, axes, sight, shift, codes, 1 + bool(origin))
    return tuple(made.found)


def _usable(question: Question, claim: Axes | None) -> list[Axes]:
    """Return the axes that can be set up: those of date need a moment, and old models do not reach every year."""
    every = (*AXES, claim) if claim is not None and claim.key not in BY_KEY else AXES
    if question.moment is None:
        return [axes for axes in every if not axes.of_date]
    years = np.asarray(question.moment.julian_year)

    def reaches(axes: Axes) -> bool:
        first, last = precession.SPANS.get(axes.key.partition("@")[2], (-np.inf, np.inf))
        if axes.key == "fk4-now":
            first, last = FK4_YEARS
        return bool(years.min(initial=last) >= first and years.max(initial=first) <= last)

    return [axes for axes in every if axes is claim or reaches(axes)]


def _other(question: Question) -> list[str]:
    if question.site is None or question.moment is None:
        return []
    if not question.is_body:
        return []  # a star has no diurnal parallax, and diurnal aberration is a mistake of its own
    return ["earth" if question.observer.origin == "site" else "site"]


def _readings(made: _Plan, usable: Sequence[Axes]) -> None:
    question = made.question
    named = list(EQUINOXES) + ([made.claim.key] if made.claim is not None else [])
    wanted = [axes for axes in usable if axes.key in named]
    for reading in READINGS:
        for axes in wanted:
            if reading.key in ("hours", "fifteenfold", "packed-hours") and not axes.equatorial:
                continue
            steps = 1 + (made.claim is not None and axes.key != made.claim.key)
            # A mean place of date is mostly given without aberration.
            both = ("astrometric",) if axes.key.endswith("/mean/date") else ()
            for place in (question.default_place(axes.of_date), *both):
                used = place if question.moment is not None else "astrometric"
                made.add(reading, axes, used, None, (reading.code, axes.codes[used == "apparent"]), steps)
    if question.site is None or question.moment is None:
        return
    for reading in hour_angles(question.moment, question.site):
        for name in HOUR_ANGLE_AXES:
            axes = BY_KEY[name]
            codes = (reading.code, axes.codes[axes.of_date])
            steps = 1 + (reading.key != "ha") + (name != "equator/true/date")
            made.add(reading, axes, question.default_place(axes.of_date), None, codes, steps)


def predict(numbers: Numbers, question: Question, hypotheses: Sequence[Hypothesis] | None = None) -> Predictions:
    """Return what every hypothesis says of the numbers (n,), and how many σ of their rounding they are from it.

    The question's moments and stars are one for each position, or one for all.
    """
    chosen = plan(question) if hypotheses is None else tuple(hypotheses)
    count = len(numbers)
    lon, lat = np.empty((len(chosen), count)), np.empty((len(chosen), count))
    _unshifted(chosen, question, lon, lat)
    _shifted(chosen, question, lon, lat)
    floor, nearer = _floor(question, count)
    floors = np.stack([floor * nearer.get(hypothesis.sight, 1.0) for hypothesis in chosen])
    off_lon, off_lat = np.empty_like(lon), np.empty_like(lat)
    n_sigma, s_lon, s_lat = np.empty_like(lon), np.empty_like(lon), np.empty_like(lon)
    groups: dict[str, list[int]] = {}
    for at, hypothesis in enumerate(chosen):
        groups.setdefault(hypothesis.reading.key, []).append(at)
    for rows in groups.values():
        read = chosen[rows[0]].reading.apply(numbers)
        off_lon[rows], off_lat[rows], s_lon[rows], s_lat[rows], n_sigma[rows] = _compare(
            read, lon[rows], lat[rows], floors[rows]
        )
        if numbers.spelt and chosen[rows[0]].reading.key in BARE:
            n_sigma[rows] = np.inf
    return Predictions(chosen, lon, lat, off_lon, off_lat, n_sigma, s_lon, s_lat)


def _unshifted(chosen: Sequence[Hypothesis], question: Question, lon: Float, lat: Float) -> None:
    sky = Sky(question)
    by_axes: dict[str, list[int]] = {}
    for at, hypothesis in enumerate(chosen):
        if hypothesis.shift is None:
            by_axes.setdefault(hypothesis.axes.key, []).append(at)
    for rows in by_axes.values():
        sights = list(dict.fromkeys(chosen[at].sight for at in rows))
        stack = np.stack([np.broadcast_to(sky[sight], (lon.shape[1], 3)) for sight in sights])
        found_lon, found_lat = chosen[rows[0]].axes.lonlat(stack, question.moment)
        places = [sights.index(chosen[at].sight) for at in rows]
        lon[rows], lat[rows] = found_lon[places], found_lat[places]


def _shifted(chosen: Sequence[Hypothesis], question: Question, lon: Float, lat: Float) -> None:
    """Fill in the hypotheses of another time: one reduction of all their moments for each axes and sight."""
    groups: dict[tuple[str, str], list[int]] = {}
    for at, hypothesis in enumerate(chosen):
        if hypothesis.shift is not None:
            groups.setdefault((hypothesis.axes.key, hypothesis.sight), []).append(at)
    if not groups or question.moment is None:
        return
    shifts = [chosen[at].shift for group in groups.values() for at in group]
    every = {shift.key: shift.days for shift in shifts if shift is not None}
    order = list(every)
    days = np.stack([np.broadcast_to(every[key], (question.moment.size,)) for key in order])
    # At the ends of the ephemeris a year more or less may be missing: such a mistake is then not tried.
    first, last = default().span
    here = np.asarray(question.moment.jd_tt)
    days = np.where((here + days > first + 1.0) & (here + days < last - 1.0), days, np.nan)
    moved = question.moment[None].shifted(np.where(np.isnan(days), 0.0, days))
    flat = Sky(question.at(Moment(np.ravel(moved.tt1), np.ravel(moved.tt2), moved.scale, moved.calendar)))
    for (_, sight), rows in groups.items():
        found = chosen[rows[0]].axes.lonlat(flat[sight], flat.question.moment)
        for target, values in zip((lon, lat), found, strict=True):
            table = np.where(np.isnan(days), np.nan, values.reshape(days.shape))
            target[rows] = table[[order.index(chosen[at].shift.key) for at in rows if chosen[at].shift]]  # type: ignore[union-attr]


def _clock_doubt(question: Question) -> Float:
    """Return what the uncertainty of ΔT moves a body by (n,), arcsec.

    Its motion counts if the moment is in UT, its parallax at a site if it is in TT.
    """
    assert question.moment is not None
    assert isinstance(question.reference, str)
    sigma = np.broadcast_to(np.asarray(question.moment.delta_t_sigma_s), question.moment.shape)
    if question.moment.scale in ("UTC", "UT1"):
        if float(np.max(sigma, initial=0.0)) < SURE_CLOCK_S:
            return np.zeros(question.moment.shape)
        names = (question.reference, "earth")
        days = 1.0 / 24.0
        ends = [default().position(names, *question.moment.shifted(by).tdb) for by in (-days, days)]
        lines = [unit(place[0] - place[1]) for place in ends]
        return np.asarray(norm(lines[1] - lines[0]) / (2.0 * days * 86400.0) * sigma * 648000.0 / np.pi)
    if question.observer.origin != "site":
        return np.zeros(question.moment.shape)
    place = default().position((question.reference, "earth"), *question.moment.tdb)
    # 8.794″ of horizontal parallax at 1 au, turning with the Earth at 7.29e-5 rad/s.
    return np.asarray(8.794 / norm(place[0] - place[1]) * 7.29e-5 * sigma)


def _floor(question: Question, count: int) -> tuple[Float, dict[str, Float]]:
    """Return what a prediction may be wrong by (n,), rad, and by which factor more it is from other origins.

    An error of the ephemeris is an error in place: it looks larger from nearer, as the Sun's does from the barycentre.
    """
    floor = np.full(count, MODEL_ARCSEC)
    nearer: dict[str, Float] = {}
    if isinstance(question.reference, str) and question.moment is not None:
        body = question.reference
        doubt = default().uncertainty_arcsec((body,), *question.moment.tdb)[0]
        floor = np.hypot(floor, np.broadcast_to(np.hypot(doubt, _clock_doubt(question)), (count,)))
        names = tuple(dict.fromkeys((body, "earth", "sun")))
        place = dict(zip(names, default().position(names, *question.moment.tdb), strict=True))
        far = norm(place[body] - place["earth"])
        nearer["ssb"] = np.maximum(1.0, far / norm(place[body]))
        if body != "sun":
            nearer["sun"] = nearer["sun-light"] = np.maximum(1.0, far / norm(place[body] - place["sun"]))
    return np.asarray(floor * np.pi / 648000.0), nearer


def _compare(read: Read, lon: Float, lat: Float, floor: Float) -> tuple[Float, Float, Float, Float, Float]:
    half = read.period / 2.0
    off_lon = (read.lon - lon + half) % read.period - half
    off_lat = read.lat - lat
    sigma_lat = np.hypot(read.sigma_lat, floor) + np.zeros_like(lat)
    sigma_lon = np.hypot(read.sigma_lon, floor / np.maximum(np.cos(lat), 1e-9))
    parts_lon, parts_lat = off_lon / sigma_lon, off_lat / sigma_lat
    # An unknown coordinate (NaN in the numbers) decides nothing; a prediction that does not exist excludes itself.
    unknown_lon, unknown_lat = np.isnan(read.lon), np.isnan(read.lat)
    squares = np.where(unknown_lon, 0.0, parts_lon**2) + np.where(unknown_lat, 0.0, parts_lat**2)
    possible: Bool = read.fits & np.isfinite(lon)
    distance = np.where(possible, np.sqrt(squares), np.inf)
    return off_lon, off_lat, sigma_lon, sigma_lat, distance
