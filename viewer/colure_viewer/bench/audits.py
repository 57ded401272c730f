"""Audit figures: one position against every hypothesis, and a table of 100,000 rows matched and dated."""

import erfa
import numpy as np

from colure import audit
from colure.arrays import DEG, spherical
from colure.audit import Numbers, Question, Stars
from colure.moment import Moment
from colure.reduction import reduce_bodies
from colure.sites import DEMO
from colure.stars import catalogue
from colure_viewer.bench.measure import Accuracy, Figure, Target, in_turn

ROWS = 100_000
EQUINOX, EPOCH, NOISE_ARCSEC = 1975.3, 1950.0, 0.5
"""What the table is made with: places of 1950 on the mean equator of 1975.3, each wrong by half an arcsecond."""


def audit_one() -> Figure:
    """One position from a site, nothing claimed, a new moment each time; the slowest of the kinds in `parts`.

    `none` is explained by nothing, so that the hypotheses with an unknown are fitted as well; `fitted` is a day late,
    which one of them finds; `class` is so coarse that the observation that would decide is looked for.
    """
    count = iter(range(1_000_000))
    star = Stars.of_rows(catalogue().brighter(4.0).take(np.array([100])))
    nowhere = Numbers.of(200.123, -40.123, 5e-4, 5e-4)

    def moment() -> Moment:
        return Moment.from_jd(2461000.5, 0.01 * next(count))

    def near(at: Moment, half: float) -> Numbers:
        lon, lat = spherical(reduce_bodies(("mars",), at, place="astrometric").vectors[0])
        return Numbers.of(lon / DEG, lat / DEG, half, half)

    def late() -> object:
        at = moment()
        return audit.ask(near(at.shifted(1.03), 5e-4), Question("mars", at, DEMO))

    def coarse() -> object:
        at = moment()
        return audit.ask(near(at, 0.01), Question("mars", at, DEMO))

    times = in_turn(
        {
            "none": lambda: audit.ask(nowhere, Question("mars", moment(), DEMO)),
            "fitted": late,
            "class": coarse,
            "star": lambda: audit.ask(nowhere, Question(star, moment(), DEMO)),
        },
        runs=30,
    )
    return Figure(max(times.values()), "ms", (Target("max", 200.0),), parts=times)


def audit_table_100k() -> Figure:
    """A table of 100,000 stars without names, matched to the catalogue and fitted: equinox, epoch, model."""
    rng = np.random.default_rng(3)
    stars = catalogue().brighter(9.3)
    stars = stars.take(rng.choice(len(stars), ROWS, replace=False))
    lon, lat = erfa.c2s(stars.directions(EPOCH) @ erfa.ltpb(EQUINOX).T)
    lon_deg = np.degrees(lon) % 360.0 + rng.normal(size=ROWS) * NOISE_ARCSEC / 3600.0 / np.cos(lat)
    lat_deg = np.degrees(lat) + rng.normal(size=ROWS) * NOISE_ARCSEC / 3600.0
    found = audit.fit_unidentified(lon_deg, lat_deg)
    seconds = in_turn({"colure": lambda: audit.fit_unidentified(lon_deg, lat_deg)}, runs=5)["colure"] / 1e3
    error = Accuracy(abs(found.best.year - EQUINOX), "yr", 0.02, "the equinox put in, by ERFA's precession")
    return Figure(
        seconds,
        "s",
        (Target("max", 2.0),),
        error,
        parts={"matched": float((found.rows == stars.ids).mean()), "epoch": found.epoch},
    )
