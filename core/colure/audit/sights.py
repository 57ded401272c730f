"""Directions in which a body or a star can be put, rightly or wrongly reduced (list D): vectors on ICRS axes."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from colure import precession
from colure.arrays import Float, dot, norm, unit
from colure.audit.reference import Question, Stars
from colure.ephemeris import default
from colure.reduction import C_AU_DAY, Observer, observer_state, reduce_bodies
from colure.reduction.optics import aberrated, deflected, refracted

GM_SUN = 2.9591220828559093e-4
SUN_TO_SYSTEM = {
    "mercury": 6023600.0,
    "venus": 408523.72,
    "emb": 328900.56,
    "mars": 3098703.6,
    "jupiter": 1047.3486,
    "saturn": 3497.898,
    "uranus": 22902.98,
    "neptune": 19412.24,
    "pluto": 1.352e8,
}
"""Mass of the Sun over that of the planet with its satellites (IAU 2009 system of constants; from memory)."""
FAR = 1e9
"""Distance in au at which a star stands for its deflection."""


@dataclass(frozen=True, slots=True)
class Sight:
    """One way of reducing: key, code in the list of hypotheses, and words."""

    key: str
    code: str
    words: str


SIGHTS = {
    sight.key: sight
    for sight in (
        Sight("astrometric", "", "astrometric"),
        Sight("apparent", "", "apparent"),
        Sight("geometric", "D6", "geometric (no light time)"),
        Sight("earth-astrometric", "D1", "astrometric from the Earth's centre, not from the site"),
        Sight("earth-apparent", "D1", "apparent from the Earth's centre, not from the site"),
        Sight("site-astrometric", "D1", "astrometric from the site, not from the Earth's centre"),
        Sight("site-apparent", "D1", "apparent from the site, not from the Earth's centre"),
        Sight("sun", "D2", "heliocentric"),
        Sight("sun-light", "D2", "heliocentric with light time"),
        Sight("ssb", "D3", "from the solar system's barycentre"),
        Sight("emb", "D4", "astrometric from the Earth–Moon barycentre"),
        Sight("emb-apparent", "D4", "apparent from the Earth–Moon barycentre"),
        Sight("swapped", "D5", "origin and body interchanged (direction reversed)"),
        Sight("swapped-apparent", "D5", "apparent with origin and body interchanged (direction reversed)"),
        Sight("no-light-time", "D6", "apparent without light time"),
        Sight("no-deflection", "D7", "apparent without light deflection"),
        Sight("no-diurnal", "D8", "apparent from the site without diurnal aberration"),
        Sight("no-parallax", "D9", "without the star's parallax"),
        Sight("no-parallax-apparent", "D9", "apparent without the star's parallax"),
        Sight("refracted", "D10", "observed: refraction is in it"),
        Sight("mean-anomaly", "D11", "mean anomaly taken for true anomaly"),
        Sight("elements-b1950", "D12", "orbital elements of B1950 taken for J2000"),
        Sight("west-site", "E9", "from a site with the sign of its longitude reversed"),
        Sight("west-site-apparent", "E9", "apparent from a site with the sign of its longitude reversed"),
        *(
            Sight(f"epoch-{year:g}", "B12", f"epoch {prefix}{year:g}, proper motion not carried to the date")
            for prefix, year in (("J", 2000.0), ("J", 2016.0), ("J", 1991.25), ("", 1950.0), ("", 1900.0))
        ),
    )
}
EPOCHS = (2000.0, 2016.0, 1991.25, 1950.0, 1900.0)


def keys(question: Question) -> tuple[str, ...]:
    """Return the keys of the sights that a question allows, without the two that every frame is tried with."""
    site = question.site is not None and question.moment is not None
    turned = ("west-site", "west-site-apparent", "refracted", "no-diurnal") if site else ()
    if question.is_body:
        body = question.reference
        found = ["geometric", "no-light-time", "no-deflection", "swapped", "swapped-apparent"]
        if body != "sun":
            found += ["sun", "sun-light"]
        found += ["ssb"] + ([] if body == "emb" else ["emb", "emb-apparent"])
        if body not in ("sun", "moon"):
            found += ["mean-anomaly", "elements-b1950"]
        if body == "sun":
            found.remove("no-deflection")
        return (*found, *_other_origin(question), *turned)
    assert isinstance(question.reference, Stars)
    found = []
    if question.reference.motion is not None and question.moment is not None:
        found += [f"epoch-{year:g}" for year in EPOCHS]
    if question.moment is not None:
        found += ["no-deflection"]
        if question.reference.parallax is not None and np.any(question.reference.parallax > 0.0):
            found += ["no-parallax", "no-parallax-apparent"]
    return (*found, *(key for key in turned if not key.startswith("west")))


def _other_origin(question: Question) -> tuple[str, ...]:
    if question.site is None:
        return ()
    at = "earth" if question.observer.origin == "site" else "site"
    return (f"{at}-astrometric", f"{at}-apparent")


class Sky:
    """The sights of a question, each computed once when it is asked for."""

    def __init__(self, question: Question) -> None:
        self.question = question
        self._held: dict[str, Float] = {}

    def __getitem__(self, key: str) -> Float:
        """Return the unit vectors (n, 3) of a sight; n is the number of moments, or of stars."""
        if key not in self._held:
            make = _body if self.question.is_body else _star
            self._held[key] = make(self.question, key)
        return self._held[key]


def _seen(question: Question, place: str, observer: Observer, omit: tuple[str, ...] = ()) -> Float:
    assert isinstance(question.reference, str)
    assert question.moment is not None
    seen = reduce_bodies((question.reference,), question.moment, observer=observer, place=place, omit=omit)
    return np.asarray(seen.vectors[0])


def _body(question: Question, key: str) -> Float:
    observer = question.observer
    base, _, place = key.partition("-")
    if base in ("earth", "site", "emb", "west"):
        other: Observer = Observer("emb") if base == "emb" else Observer("earth")
        if base in ("site", "west") and question.site is not None:
            site = question.site
            if base == "west":
                site = type(site)(site.name, -site.lon_deg, site.lat_deg, site.height_m)
            other = Observer("site", site)
        return _seen(question, "apparent" if key.endswith("apparent") else "astrometric", other)
    match key:
        case "astrometric" | "apparent" | "geometric":
            return _seen(question, key, observer)
        case "sun":
            return _seen(question, "geometric", Observer("sun"))
        case "sun-light":
            return _seen(question, "astrometric", Observer("sun"))
        case "ssb":
            return _seen(question, "geometric", Observer("ssb"))
        case "swapped" | "swapped-apparent":
            return -_seen(question, "apparent" if place else "astrometric", observer)
        case "no-light-time":
            return _seen(question, "apparent", observer, ("light time",))
        case "no-deflection":
            return _seen(question, "apparent", observer, ("deflection",))
        case "refracted":
            return _seen(question, "observed", Observer("site", question.site))
        case "no-diurnal":
            return _no_diurnal(question)
        case "mean-anomaly" | "elements-b1950":
            return _wrong_orbit(question, key)
    raise AssertionError(f"no sight '{key}' of a body")


def _no_diurnal(question: Question) -> Float:
    """Return the apparent direction from the site with the velocity of the Earth's centre alone."""
    moment = question.moment
    assert moment is not None
    observer = Observer("site", question.site)
    unmoved = _seen(question, "apparent", observer, ("aberration",))
    return _aberrated(unmoved, question, observer, centre=True)


def _aberrated(vectors: Float, question: Question, observer: Observer, *, centre: bool = False) -> Float:
    assert question.moment is not None
    state = observer_state(observer, question.moment)
    velocity = state.centre_vel if centre else state.vel
    return np.asarray(aberrated(vectors.T, velocity.T, norm(state.pos - state.sun_pos)).T)


def _wrong_orbit(question: Question, key: str) -> Float:
    """Return astrometric directions of a body whose heliocentric place was spoilt."""
    assert isinstance(question.reference, str)
    assert question.moment is not None
    body, observer = question.reference, question.observer
    state = observer_state(observer, question.moment)
    tdb1, tdb2 = question.moment.tdb
    late = np.asarray(tdb2, dtype=np.float64)
    gm = GM_SUN * (1.0 + 1.0 / SUN_TO_SYSTEM[body])
    spoil: Callable[[Float, Float, float], Float] = _mean_for_true if key == "mean-anomaly" else _from_b1950
    sight = np.zeros_like(state.pos)
    for _ in range(3):  # the light time of the place found; each round gains four figures
        pos, vel = default().posvel((body, "sun"), tdb1, late)
        sight = spoil(pos[0] - pos[1], vel[0] - vel[1], gm) + pos[1] - state.pos
        late = np.asarray(tdb2) - norm(sight) / C_AU_DAY
    return unit(sight)


def _from_b1950(place: Float, velocity: Float, gm: float) -> Float:
    """Return places (n, 3) whose elements refer to the mean ecliptic of B1950 as if to that of J2000."""
    old = precession.ecliptic_matrix(precession.B1950)
    new = precession.ecliptic_matrix((precession.J2000, 0.0))
    # The numbers on the old axes, laid down on the new ones.
    return np.asarray(place @ (new.T @ old).T)


def _mean_for_true(place: Float, velocity: Float, gm: float) -> Float:
    """Return places (n, 3) on the osculating ellipse where the true anomaly has the value of the mean one."""
    r = norm(place)
    momentum = np.cross(place, velocity)
    eccentric = np.cross(velocity, momentum) / gm - place / r[:, None]
    e = norm(eccentric)
    p = dot(momentum, momentum) / gm
    x_axis = eccentric / e[:, None]
    y_axis = np.cross(unit(momentum), x_axis)
    true = np.arctan2(dot(place, y_axis), dot(place, x_axis))
    half = np.sqrt((1.0 - e) / (1.0 + e)) * np.tan(true / 2.0)
    anomaly = 2.0 * np.arctan(half)
    mean = anomaly - e * np.sin(anomaly)
    radius = p / (1.0 + e * np.cos(mean))
    return np.asarray(radius[:, None] * (np.cos(mean)[:, None] * x_axis + np.sin(mean)[:, None] * y_axis))


def _star(question: Question, key: str) -> Float:
    stars = question.reference
    assert isinstance(stars, Stars)
    if key.startswith("epoch-"):
        return unit(stars.direction(float(key.removeprefix("epoch-"))))
    if question.moment is None:
        return unit(stars.direction(2000.0))
    observer = question.observer
    if key in ("refracted", "no-diurnal"):
        observer = Observer("site", question.site)
    state = observer_state(observer, question.moment)
    distant = stars.direction(question.years)
    if stars.parallax is not None and not key.startswith("no-parallax"):
        distant = distant - stars.parallax[:, None] * state.pos
    direction = unit(np.broadcast_to(distant, (max(len(distant), len(state.pos)), 3)))
    if key in ("astrometric", "no-parallax", "geometric"):
        return direction
    from_sun = (state.pos - state.sun_pos).T
    seen = direction.T
    if key != "no-deflection":
        seen = deflected(seen, seen * FAR, from_sun)
    velocity = state.centre_vel if key == "no-diurnal" else state.vel
    seen = aberrated(seen, velocity.T, norm(from_sun.T))
    if key == "refracted":
        assert state.zenith is not None
        seen = refracted(seen, state.zenith.T, observer.atmosphere)
    return unit(seen.T)
