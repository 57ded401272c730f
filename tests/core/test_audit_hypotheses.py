"""Every hypothesis of the audit on 200 seeded cases at three roundings, made by ERFA and DE440 alone (audit_truth).

Rounding is to a last digit of 0.1″, 1″ or 1′ (of time where the digits are hours), dates are 1900 to 2100. A verdict
counts as due when exactly one hypothesis lies within 3σ and the next beyond 5σ; the class is whatever lies within 3σ.
"""

import zlib
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import audit_truth as truth
import numpy as np
import pytest

from colure import audit
from colure.audit.numbers import Numbers
from colure.audit.orientation import View, offsets, position_angles
from colure.audit.reference import Question, Stars
from colure.audit.verdict import judge
from colure.moment import Moment
from colure.reduction import Observer
from colure.sites import Site

CASES = 200
UNITS = (0.1, 1.0, 60.0)
SITES = (
    Site("north", 10.2, 52.4, 300.0),
    Site("south", 129.4, -25.9, 710.0),
    Site("west", -111.6, 31.9, 2100.0),
    Site("equator", -78.3, 0.4, 2800.0),
)


@dataclass
class Tally:
    """Counts of one hypothesis at one rounding."""

    due: int = 0
    right: int = 0
    in_class: int = 0
    lost: int = 0
    size: int = 0
    others: Counter[str] = field(default_factory=Counter)


def moments(rng: np.random.Generator, count: int = CASES, years: tuple[float, float] = (1900.0, 2100.0)) -> Moment:
    return Moment.from_jd(2451545.0 + (rng.uniform(*years, count) - 2000.0) * 365.25, scale="TT")


def tally(n_sigma: Any, keys: list[str], codes: list[str], wanted: str, into: Tally) -> None:
    row = keys.index(wanted)
    judged = judge(n_sigma)
    right = judged.best == row
    into.due += int(judged.certain.sum())
    into.right += int((judged.certain & right).sum())
    into.in_class += int((~judged.certain & judged.inside[row]).sum())
    into.lost += int((~judged.certain & ~judged.inside[row]).sum())
    into.size += int(judged.inside.sum())
    # The class is what lies within 3σ and nothing else.
    assert not np.any(judged.inside & (n_sigma > 3.0))
    for at in np.flatnonzero(judged.inside.any(axis=1)):
        if at != row:
            into.others[codes[at]] += int(judged.inside[at].sum())


def report(tallies: dict[tuple[str, float], Tally]) -> None:
    print(f"\n{'truth':66s} {'digit':>5s} {'due':>4s} {'right':>5s} {'class':>5s} {'lost':>4s} {'size':>5s}  with")
    for (name, unit), found in tallies.items():
        total = found.due + found.in_class + found.lost
        with_whom = ", ".join(f"{code} {count / total:.0%}" for code, count in found.others.most_common(4))
        label = f"{unit:g}″"
        print(
            f"{name:66s} {label:>5s} {found.due:4d} {found.right:5d} {found.in_class:5d} {found.lost:4d} "
            f"{found.size / total:5.1f}  {with_whom}"
        )
    due, right = sum(t.due for t in tallies.values()), sum(t.right for t in tallies.values())
    held, lost = sum(t.in_class for t in tallies.values()), sum(t.lost for t in tallies.values())
    print(f"all: {due} verdicts due, {right} right; {held} classes hold the answer, {lost} do not")


def check(tallies: dict[tuple[str, float], Tally]) -> None:
    report(tallies)
    for (name, unit), found in tallies.items():
        assert found.due == found.right, f"{name} at {unit}″: {found.due - found.right} wrong and labelled certain"
        assert found.lost == 0, f"{name} at {unit}″: {found.lost} classes without the right answer"
        assert found.due + found.in_class == CASES
    assert sum(found.due for found in tallies.values()) > 0.05 * CASES * len(tallies), "verdicts are hardly ever due"


# Stars: reading, axes, sight, claim, whether a site is needed, years, declinations


STARS: list[tuple[str, str, str, str]] = [
    *(
        (reading, "icrs", "astrometric", "icrs")
        for reading in (
            "hours", "fifteenfold", "radians", "packed-hours", "packed-degrees", "sign-lost", "minutes-added",
            "swapped", "colatitude", "mirrored", "ha",
        )
    ),
    *(
        (ha, "equator/true/date", "apparent", "equator/true/date")
        for ha in ("ha", "ha-mean", "ha-east", "ha-tt", "ha-utc")
    ),
    ("read", "equator/mean/J2000", "astrometric", "icrs"),
    ("read", "equator/mean/date", "astrometric", "icrs"),
    ("read", "equator/mean/date", "apparent", "icrs"),
    ("read", "equator/true/date", "astrometric", "icrs"),
    ("read", "equator/true/date", "apparent", "icrs"),
    ("read", "icrs", "apparent", "icrs"),
    ("read", "cirs", "apparent", "equator/true/date"),
    ("read", "equator/fk4/B1950", "astrometric", "icrs"),
    ("read", "fk4-now", "astrometric", "icrs"),
    ("read", "equator/mean/B1950", "astrometric", "icrs"),
    ("read", "equator/mean/B1875", "astrometric", "icrs"),
    ("read", "equator/mean/B1900", "astrometric", "icrs"),
    ("read", "icrs", "epoch-2000", "icrs"),
    ("read", "icrs", "epoch-1991.25", "icrs"),
    ("read", "icrs", "epoch-2016", "icrs"),
    ("read", "equator/fk4/B1950", "epoch-1950", "icrs"),
    ("read", "twice", "astrometric", "equator/mean/date"),
    ("read", "backwards", "astrometric", "equator/mean/date"),
    ("read", "lambda-only", "astrometric", "ecliptic/mean/date"),
    ("read", "equator/mean/date@iau1976", "astrometric", "equator/mean/date"),
    ("read", "equator/true/date@iau1976", "apparent", "equator/true/date"),
    ("read", "ecliptic/mean/date", "astrometric", "ecliptic/mean/J2000"),
    ("read", "ecliptic/true/date", "astrometric", "ecliptic/mean/J2000"),
    ("read", "ecliptic/true/date", "apparent", "ecliptic/mean/J2000"),
    ("read", "ecliptic/true/J2000", "astrometric", "ecliptic/mean/J2000"),
    ("read", "ecliptic/mean/B1950", "astrometric", "ecliptic/mean/J2000"),
    ("read", "ecliptic/iau76/J2000", "astrometric", "ecliptic/mean/J2000"),
    ("read", "j2000-obliquity-of-date", "astrometric", "ecliptic/mean/J2000"),
    ("read", "true-obliquity-on-mean", "astrometric", "ecliptic/true/date"),
    ("read", "mean-obliquity-on-true", "astrometric", "ecliptic/true/date"),
    ("read", "mean-obliquity-on-true-2000", "astrometric", "ecliptic/mean/J2000"),
    ("read", "wrong-way-2000", "astrometric", "ecliptic/mean/J2000"),
    ("read", "wrong-way-date", "astrometric", "ecliptic/mean/J2000"),
    ("read", "icrs", "astrometric", "ecliptic/mean/J2000"),  # C10: equatorial numbers said to be ecliptic
    ("read", "galactic", "astrometric", "icrs"),
    ("read", "supergalactic", "astrometric", "icrs"),
    ("read", "equator/fk4-no-e/B1950", "astrometric", "icrs"),
    ("read", "equator/fk4/B1900", "astrometric", "icrs"),
    ("read", "equator/fk4/B1875", "astrometric", "icrs"),
    ("read", "equator/true/date", "no-parallax-apparent", "equator/true/date"),
    ("read", "equator/true/date", "no-deflection", "equator/true/date"),
    ("read", "equator/true/date", "no-diurnal", "equator/true/date"),
    ("read", "icrs", "no-parallax", "icrs"),
    ("read", "equator/true/date", "refracted", "equator/true/date"),
    # Pairs that occur in practice.
    ("hours", "equator/fk4/B1950", "astrometric", "icrs"),
    ("packed-hours", "equator/mean/date", "astrometric", "icrs"),
    ("swapped", "ecliptic/mean/date", "astrometric", "ecliptic/mean/J2000"),
    ("minutes-added", "equator/true/date", "apparent", "icrs"),
    ("read", "equator/fk4/B1950", "apparent", "icrs"),
]  # fmt: skip


def star_case(rng: Any, reading: str, axes: str, sight: str, claim: str) -> tuple[Question, Callable[[float], Numbers]]:
    """Return the question, and the numbers at a rounding."""
    needs_site = reading.startswith("ha") or sight in ("refracted", "no-diurnal")
    site = SITES[int(rng.integers(len(SITES)))] if needs_site else None
    count = CASES * 8 if sight == "refracted" else CASES
    # UTC exists from 1972 to the end of the shipped table of the Earth's rotation.
    at = moments(rng, count, (1972.1, 2025.9) if reading == "ha-utc" else (1900.0, 2100.0))
    span = {"sign-lost": (-0.95, -0.05), "minutes-added": (-80.0, -1.2)}.get(reading, (-85.0, 85.0))
    rows = truth.star_rows(rng, count, span)
    when = truth.When.of(at, site)
    skip = {"no-deflection": "deflection", "no-diurnal": "diurnal"}.get(sight, "")
    if sight.startswith("epoch-"):
        seen = truth.star(rows, when, epoch=float(sight.removeprefix("epoch-")))
    elif sight.startswith("no-parallax"):
        seen = truth.star(rows, when, "apparent" if sight.endswith("apparent") else "astrometric", skip="parallax")
    else:
        seen = truth.star(rows, when, "astrometric" if sight == "astrometric" else "apparent", skip=skip)
    if sight == "refracted":
        zenith = truth.observer(when)[3]
        up = np.degrees(np.arcsin((seen * zenith).sum(-1)))
        keep = np.flatnonzero(up > 20.0)[:CASES]  # below, refraction is no longer two constants
        assert len(keep) == CASES
        seen, at, rows = seen[keep], at[keep], rows.take(keep)
        seen = truth.refracted(seen, zenith[keep], Observer("site", site).atmosphere)
        when = truth.When.of(at, site)
    lon, lat = truth.axes(axes, seen, when)
    if reading == "minutes-added":  # of date, a declination may have crossed the last whole degree
        lat = np.minimum(lat, np.radians(-1.2))
    lst = truth.local_sidereal(when, reading) if reading.startswith("ha") else None
    question = Question(Stars.of_rows(rows), at, site, claim)
    return question, lambda unit: Numbers.of(*truth.written(reading, lon, lat, unit, lst))


def seed(*parts: str) -> np.random.Generator:
    return np.random.default_rng(zlib.crc32("|".join(parts).encode()))


def test_every_hypothesis_on_stars() -> None:
    tallies: dict[tuple[str, float], Tally] = {}
    for case in STARS:
        reading, axes, sight, _ = case
        question, numbers = star_case(seed(*case), *case)
        for unit in UNITS:
            found, _ = audit.audit_each(numbers(unit), question)
            keys = [one.key for one in found.hypotheses]
            codes = [one.code for one in found.hypotheses]
            into = tallies[f"{reading} {axes} {sight}", unit] = Tally()
            tally(found.n_sigma, keys, codes, f"{reading}|{axes}|{sight}|", into)
    check(tallies)


# Bodies: axes, sight, time shift, claim


BODY_CASES: list[tuple[str, str, str, str]] = [
    ("equator/mean/date", "astrometric", "", "icrs"),
    ("equator/true/date", "apparent", "", "icrs"),
    ("icrs", "apparent", "", "icrs"),
    ("cirs", "apparent", "", "equator/true/date"),
    ("equator/fk4/B1950", "astrometric", "", "icrs"),
    ("ecliptic/mean/date", "astrometric", "", "ecliptic/mean/J2000"),
    ("ecliptic/true/date", "apparent", "", "ecliptic/mean/J2000"),
    ("icrs", "earth-astrometric", "", "icrs"),
    ("equator/true/date", "earth-apparent", "", "equator/true/date"),
    ("icrs", "sun", "", "icrs"),
    ("ecliptic/mean/J2000", "sun-light", "", "ecliptic/mean/J2000"),
    ("icrs", "ssb", "", "icrs"),
    ("icrs", "emb", "", "icrs"),
    ("icrs", "swapped", "", "icrs"),
    ("icrs", "geometric", "", "icrs"),
    ("equator/true/date", "no-light-time", "", "equator/true/date"),
    ("equator/true/date", "no-deflection", "", "equator/true/date"),
    ("equator/true/date", "no-diurnal", "", "equator/true/date"),
    ("equator/true/date", "refracted", "", "equator/true/date"),
    ("icrs", "west-site", "", "icrs"),
    ("icrs", "mean-anomaly", "", "icrs"),
    ("ecliptic/mean/J2000", "elements-b1950", "", "ecliptic/mean/J2000"),
    ("icrs", "astrometric", "tt-late", "icrs"),
    ("equator/true/date", "apparent", "tt-early", "equator/true/date"),
    ("icrs", "astrometric", "tai-late", "icrs"),
    ("icrs", "astrometric", "tai-early", "icrs"),
    ("icrs", "astrometric", "zone", "icrs"),
    ("icrs", "astrometric", "half-early", "icrs"),
    ("icrs", "astrometric", "half-late", "icrs"),
    ("icrs", "astrometric", "middle", "icrs"),
    ("icrs", "astrometric", "calendar", "icrs"),
    ("icrs", "astrometric", "year-1", "icrs"),
    # Pairs: time and origin, equinox and origin.
    ("icrs", "earth-astrometric", "half-late", "icrs"),
    ("equator/true/date", "earth-apparent", "", "icrs"),
]
EXPOSURE_S = 600.0


def shift_days(shift: str, at: Moment, zone: float) -> Any:
    """Return how far the moment used is from the moment meant, by ERFA's leap seconds and calendar."""
    import erfa

    tt1, tt2 = np.asarray(at.tt1), np.asarray(at.tt2)
    year, month, day, _ = erfa.jd2cal(tt1, tt2)
    if shift in ("tt-late", "tt-early"):
        seconds = np.array(at.delta_t_s, dtype=np.float64)
        utc = np.asarray(at.has_utc)
        seconds[utc] = erfa.dat(year[utc], month[utc], day[utc], 0.5) + 32.184
        return (-1.0 if shift == "tt-late" else 1.0) * seconds / 86400.0
    if shift in ("tai-late", "tai-early"):
        return (-1.0 if shift == "tai-late" else 1.0) * erfa.dat(year, month, day, 0.5) / 86400.0
    if shift == "zone":
        return np.full(at.shape, zone / 24.0)
    if shift in ("half-early", "half-late"):
        return np.full(at.shape, -0.5 if shift == "half-early" else 0.5)
    if shift == "middle":
        return np.full(at.shape, EXPOSURE_S / 2.0 / 86400.0)
    if shift == "calendar":
        # A date as written, taken for one of the Julian calendar, is 12 days late, 13 from 1900 March 1 (Julian: 29
        # February) on, until 2100 February 28.
        return np.where((year > 1900) | (month > 2), 13.0, 12.0)
    safe = np.where((month == 2) & (day == 29), 28, day)
    return erfa.cal2jd(year - 1, month, safe)[1] - erfa.cal2jd(year, month, safe)[1]


def body_seen(name: str, sight: str, when: truth.When) -> Any:
    place = "apparent" if sight.endswith("apparent") or sight in (
        "no-light-time", "no-deflection", "no-diurnal", "refracted"
    ) else "astrometric"  # fmt: skip
    match sight:
        case "astrometric" | "apparent" | "geometric":
            return truth.body(name, when, sight)
        case "earth-astrometric" | "earth-apparent":
            return truth.body(name, when.no_site(), place)
        case "west-site":
            return truth.body(name, when.west(), place)
        case "sun":
            return truth.body(name, when, "geometric", centre="sun")
        case "sun-light":
            return truth.body(name, when, "astrometric", centre="sun")
        case "ssb":
            return truth.body(name, when, "geometric", centre="ssb")
        case "emb":
            return truth.body(name, when, place, centre="emb")
        case "swapped":
            return -truth.body(name, when, place)
        case "no-light-time":
            return truth.body(name, when, place, skip="light time")
        case "no-deflection":
            return truth.body(name, when, place, skip="deflection")
        case "no-diurnal":
            return truth.body(name, when, place, skip="diurnal")
        case "refracted":
            return truth.body(name, when, place)
        case "mean-anomaly":
            return truth.body(name, when, place, spoil=truth.mean_for_true)
        case "elements-b1950":
            return truth.body(name, when, place, spoil=truth.from_b1950)
    raise KeyError(sight)


def bodies_for(sight: str) -> tuple[str, ...]:
    if sight in ("mean-anomaly", "elements-b1950"):
        return tuple(name for name in truth.BODIES if name not in ("sun", "moon"))
    if sight in ("sun", "sun-light", "no-deflection"):
        return tuple(name for name in truth.BODIES if name != "sun")
    return truth.BODIES


def test_every_hypothesis_on_bodies() -> None:
    tallies: dict[tuple[str, float], Tally] = {}
    for case in BODY_CASES:
        axes, sight, shift, claim = case
        rng = seed(*case)
        names = bodies_for(sight)
        each = CASES // len(names)
        for at_body, name in enumerate(names):
            count = CASES - each * (len(names) - 1) if at_body == 0 else each
            site = SITES[int(rng.integers(len(SITES)))]
            needs_utc = shift.startswith("tai")
            at = moments(
                rng, count * 10 if sight == "refracted" else count, (1972.1, 2025.9) if needs_utc else (1900.0, 2100.0)
            )
            zone = float(rng.choice([-8.0, -5.0, 1.0, 2.0, 5.5, 9.0]))
            when = truth.When.of(at, site)
            if sight == "refracted":
                zenith = truth.observer(when)[3]
                up = np.degrees(np.arcsin((body_seen(name, sight, when) * zenith).sum(-1)))
                at = at[np.flatnonzero(up > 20.0)[:count]]
                assert at.size == count
                when = truth.When.of(at, site)
            key = f"zone{zone:+g}" if shift == "zone" else shift
            if shift:
                when = truth.When.of(at.shifted(shift_days(shift, at, zone)), site)
            seen = body_seen(name, sight, when)
            if sight == "refracted":
                seen = truth.refracted(seen, truth.observer(when)[3], Observer("site", site).atmosphere)
            lon, lat = truth.axes(axes, seen, when)
            question = Question(name, at, site, claim, exposure_s=EXPOSURE_S)
            for unit in UNITS:
                found, _ = audit.audit_each(Numbers.of(*truth.written("read", lon, lat, unit)), question)
                keys = [one.key for one in found.hypotheses]
                codes = [one.code for one in found.hypotheses]
                into = tallies.setdefault((f"{axes} {sight} {shift} ({claim})", unit), Tally())
                tally(found.n_sigma, keys, codes, f"read|{axes}|{sight}|{key}", into)
    check(tallies)


# Images, offsets and rates


def north_angle(pole: str, lon: Any, lat: Any, when: truth.When) -> Any:
    """Return the position angle (rad) of a pole, from ICRS north through east, by ERFA's spherical triangle."""
    import erfa

    if pole == "zenith":
        theta, phi = erfa.c2s(truth.observer(when)[3])
    else:
        matrix = {
            "north": lambda: np.eye(3),
            "date": lambda: erfa.pnm06a(when.tt1, when.tt2),
            "b1950": lambda: erfa.pmat06(*truth.B1950),
            "ecliptic": lambda: erfa.ecm06(truth.J2000, 0.0),
        }[pole]()
        theta, phi = erfa.c2s(np.broadcast_to(matrix[..., 2, :], (*np.shape(lon), 3)))
    return erfa.pas(lon, lat, theta, phi) if pole != "north" else np.zeros(np.shape(lon))


HANDS = {
    "": (1.0, 0.0), "mirrored": (-1.0, 0.0), "upside-down": (1.0, 180.0), "quarter": (1.0, 90.0),
    "quarter-back": (1.0, -90.0), "sign": (-1.0, 0.0),
}  # fmt: skip
IMAGES = [
    ("mirrored", "north"), ("upside-down", "north"), ("quarter", "north"), ("quarter-back", "north"),
    ("sign", "north"), ("", "date"), ("", "b1950"), ("", "ecliptic"), ("", "zenith"), ("mirrored", "date"),
    ("sign", "ecliptic"), ("upside-down", "zenith"),
]  # fmt: skip


def test_every_hypothesis_on_images() -> None:
    tallies: dict[tuple[str, float], Tally] = {}
    for hand, pole in IMAGES:
        rng = seed("image", hand, pole)
        at, site = moments(rng), SITES[int(rng.integers(len(SITES)))]
        when = truth.When.of(at, site)
        lon, lat = rng.uniform(0.0, 2.0 * np.pi, CASES), np.arcsin(rng.uniform(-0.95, 0.95, CASES))
        true = rng.uniform(0.0, 360.0, CASES)
        factor, added = HANDS[hand]
        wrong = factor * (true - np.degrees(north_angle(pole, lon, lat, when))) + added
        view = View.of(Stars.point(np.degrees(lon), np.degrees(lat)), at, site)
        for unit in UNITS:
            step = unit / 3600.0
            found = position_angles(np.rint(wrong / step) * step, step / 2.0, true, view, mirrored=hand == "mirrored")
            into = tallies[f"{hand} {pole}", unit] = Tally()
            tally(
                found.n_sigma,
                [one.key for one in found.hypotheses],
                [one.code for one in found.hypotheses],
                f"{hand}|{pole}",
                into,
            )
    check(tallies)


OFFSETS: dict[str, Callable[[Any, Any, Any], tuple[Any, Any]]] = {
    "time": lambda x, y, c: (x / 15.0 / c, y),
    "time-cos": lambda x, y, c: (x / 15.0, y),
    "fifteen": lambda x, y, c: (15.0 * x, y),
    "no-cos": lambda x, y, c: (x / c, y),
    "cos-twice": lambda x, y, c: (x * c, y),
    "mirrored": lambda x, y, c: (-x, y),
    "upside-down": lambda x, y, c: (-x, -y),
    "swapped": lambda x, y, c: (y, x),
}


def test_every_hypothesis_on_offsets() -> None:
    tallies: dict[tuple[str, float], Tally] = {}
    for name, wrong in OFFSETS.items():
        rng = seed("offset", name)
        lat = np.arcsin(rng.uniform(-0.95, 0.95, CASES))
        view = View.of(Stars.point(rng.uniform(0.0, 360.0, CASES), np.degrees(lat)), moments(rng))
        x, y = rng.normal(size=(2, CASES)) * 1800.0
        dx, dy = wrong(x, y, np.cos(lat))
        for unit in UNITS:
            found = offsets(np.rint(dx / unit) * unit, np.rint(dy / unit) * unit, unit / 2.0, (x, y), view)
            into = tallies[name, unit] = Tally()
            tally(
                found.n_sigma, [one.key for one in found.hypotheses], [one.code for one in found.hypotheses], name, into
            )
    check(tallies)


# Hypotheses with one unknown


@pytest.mark.parametrize("plane", ["equator", "ecliptic"])
def test_an_unknown_equinox_is_fitted(plane: str) -> None:
    import erfa

    rng = seed("equinox", plane)
    rows = truth.star_rows(rng, 40)
    years = rng.uniform(1700.0, 2200.0, 40)
    seen = truth.star(rows, truth.When.of(moments(rng, 40)), epoch=2000.0)
    for at, year in enumerate(years):
        tt = 2451545.0, (year - 2000.0) * 365.25
        matrix = erfa.pmat06(*tt) if plane == "equator" else erfa.ecm06(*tt)
        lon, lat = truth._lonlat(erfa.rxp(matrix, seen[at : at + 1]))
        numbers = Numbers.of(*truth.written("read", lon, lat, 1.0))
        question = Question(Stars.of_rows(rows.take(np.array([at]))))
        near = [fit for fit in audit.fits(numbers, question) if fit.frame and fit.frame.startswith(plane)]
        # σ of the year is that of the rounding, and the rounding error is below 1σ in each coordinate.
        assert near, f"no {plane} fits {year}"
        assert abs(near[0].value - year) <= 2.0 * near[0].sigma + 1e-3


def test_an_unknown_time_and_stale_elements_are_fitted() -> None:
    rng = seed("time")
    for name in ("sun", "moon", "mars", "jupiter"):
        for days in rng.uniform(-10.0, 10.0, 3):
            at = moments(rng, 1)
            when = truth.When.of(at.shifted(np.array([days])))
            lon, lat = truth.axes("icrs", truth.body(name, when), when)
            numbers = Numbers.of(*truth.written("read", lon, lat, 1.0))
            found = [fit for fit in audit.fits(numbers, Question(name, at, claim="icrs")) if fit.code == "E2"]
            assert found, f"{name} {days}"
            assert abs(found[0].value - days) <= 2.0 * found[0].sigma + 1e-5
    for name in ("mars", "jupiter"):
        at = moments(rng, 1)
        when = truth.When.of(at)
        late = truth.When.of(at.shifted(np.array([3.5])))
        pos = truth.observer(when)[0]
        sun = truth.posvel("sun", when.tt1, when.tdb2)[0]
        sent = late.tdb2 + (late.tt1 - when.tt1)
        for _ in range(4):
            target = truth.posvel(name, when.tt1, sent)[0] - truth.posvel("sun", when.tt1, sent)[0] + sun
            sent = late.tdb2 + (late.tt1 - when.tt1) - np.linalg.norm(target - pos, axis=-1) / truth.C_AU_DAY
        lon, lat = truth.axes("icrs", truth._unit(target - pos), when)
        numbers = Numbers.of(*truth.written("read", lon, lat, 1.0))
        found = [fit for fit in audit.fits(numbers, Question(name, at, claim="icrs")) if fit.code == "D13"]
        assert found
        assert abs(found[0].value - 3.5) <= 2.0 * found[0].sigma + 1e-4


def test_a_sidereal_zodiac_is_named_but_never_certain() -> None:
    rng = seed("zodiac")
    at = moments(rng, 1)
    when = truth.When.of(at)
    lon, lat = truth.axes("ecliptic/mean/date", truth.body("saturn", when), when)
    numbers = Numbers.of(*truth.written("read", (lon - np.radians(24.2)) % (2 * np.pi), lat, 1.0))
    answer = audit.ask(numbers, Question("saturn", at, claim="ecliptic/true/date"))
    assert answer.status == "fitted"
    zodiac = [fit for fit in answer.fits if fit.code == "C11"]
    assert zodiac
    assert zodiac[0].value == pytest.approx(24.2, abs=1.0 / 3600.0)  # the rounding
