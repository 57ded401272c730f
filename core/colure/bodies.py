"""What is to be said of the Sun, the Moon and the planets at a moment: place, motion, phase, light, and how sure it is.

`facts` gives every figure as an array over bodies and moments under the project's own key names; `records` turns that
into one dictionary per body and moment.
"""

from collections.abc import Sequence
from typing import Any

import erfa
import numpy as np

from colure import appearance, constellations, frames, horizon, phases, photometry, refraction, sidereal
from colure.arrays import ARCSEC, DEG, TWO_PI, Float, Int, norm, position_angle, rotate, spherical
from colure.ephemeris import SYSTEM_BARYCENTRES, Ephemeris, default
from colure.errors import SiteError
from colure.frames import Frame
from colure.moment import Moment
from colure.reduction import C_AU_DAY, Directions, Observer, ObserverState, reduce_bodies
from colure.sites import Site

CAUTION_DEG = 20.0
"""Nearer to the Sun than this, optics can injure: every answer says so."""
RATE_STEP_DAYS = 30.0 / 86400.0
"""Half the span over which a rate is taken: at this step the Moon's topocentric rate is good to 1e-6 of itself."""
TRUE_ECLIPTIC = Frame.parse("ecliptic/true/date")
TRUE_EQUATOR = Frame.parse("equator/true/date")
FROM_EARTH = ("earth", "emb", "site")


def sun_longitude(moment: Moment, ephemeris: Ephemeris | None = None) -> Float:
    """Return the Sun's apparent geocentric longitude (*shape), rad, mean ecliptic of date, true equinox."""
    return np.asarray(longitudes(("sun",), moment, ephemeris=ephemeris)[0][0])


def longitudes(
    bodies: Sequence[str],
    moment: Moment,
    *,
    frame: Frame | str = TRUE_ECLIPTIC,
    place: str = "apparent",
    observer: Observer | None = None,
    ephemeris: Ephemeris | None = None,
) -> tuple[Float, Float]:
    """Return longitudes (0 to 2π) and latitudes, both (bodies, *shape), in a frame that is a rotation.

    The short way for many moments; `facts` says more and takes longer.
    """
    frame = Frame.parse(frame) if isinstance(frame, str) else frame
    seen = reduce_bodies(bodies, moment, observer=observer or Observer(), place=place, ephemeris=ephemeris)
    matrix = frames.rotation(frame, moment, observer.site if observer else None).matrix
    return turned(seen.vectors, matrix)


def apparent_ecliptic(
    bodies: Sequence[str], moment: Moment, *, ephemeris: Ephemeris | None = None
) -> tuple[Float, Float]:
    """Return apparent geocentric longitudes and latitudes (bodies, *shape), rad, true equinox and ecliptic of date."""
    return longitudes(bodies, moment, ephemeris=ephemeris)


def moon_mean_node(moment: Moment) -> Float:
    """Return the longitude (*shape) of the mean ascending node of the Moon's orbit, rad, mean equinox of date.

    IERS Conventions 2003 (Simon et al. 1994); within 0.01° over four thousand years about J2000.
    """
    tdb1, tdb2 = moment.tdb
    return np.asarray(erfa.faom03((np.asarray(tdb1) - 2451545.0 + tdb2) / 36525.0) % TWO_PI)


def turned(vectors: Float, matrix: Float) -> tuple[Float, Float]:
    """Return longitude and latitude of unit vectors (bodies, *shape, 3) after the matrices (*shape, 3, 3) or (3, 3)."""
    axes = matrix.ndim
    m = matrix.transpose(axes - 2, axes - 1, *range(axes - 2)).copy()
    x, y, z = vectors[..., 0], vectors[..., 1], vectors[..., 2]
    a = m[0, 0] * x
    a += m[0, 1] * y
    a += m[0, 2] * z
    b = m[1, 0] * x
    b += m[1, 1] * y
    b += m[1, 2] * z
    lon = np.arctan2(b, a)
    lon = np.where(lon < 0.0, lon + TWO_PI, lon)
    lon = np.where(lon >= TWO_PI, 0.0, lon)
    c = m[2, 0] * x
    c += m[2, 1] * y
    c += m[2, 2] * z
    # From both components, so that a place near the pole keeps its digits.
    return lon, np.arctan2(c, np.hypot(a, b))


def equation_of_time(moment: Moment, ephemeris: Ephemeris | None = None) -> Float:
    """Return apparent minus mean solar time (*shape), seconds of time, −3600 × 12 to 3600 × 12."""
    ra = longitudes(("sun",), moment, frame=TRUE_EQUATOR, ephemeris=ephemeris)[0][0]
    ut1, ut2 = moment.ut1
    mean_hour_angle = TWO_PI * ((np.asarray(ut1) % 1.0 + np.asarray(ut2)) % 1.0)  # a Julian day begins at noon
    turn = (np.asarray(sidereal.gast(moment)) - ra - mean_hour_angle + np.pi) % TWO_PI - np.pi
    return np.asarray(turn * 86400.0 / TWO_PI)


def defaults(frame: Frame, site: Site | None, place: str | None, origin: str | None) -> tuple[str, str]:
    """Return the place and the origin that a frame and a site imply where none is given."""
    if origin is None:
        origin = "earth" if site is None else "site"
    if place is None:
        if origin in ("sun", "ssb"):
            place = "geometric"
        elif frame.plane == "horizon":
            place = "observed"
        else:
            place = "apparent" if frame.equinox == "date" or frame.plane == "cirs" else "astrometric"
    return place, origin


def facts(
    bodies: Sequence[str],
    moment: Moment,
    *,
    site: Site | None = None,
    frame: Frame | str = "icrs",
    place: str | None = None,
    origin: str | None = None,
    ephemeris: Ephemeris | None = None,
    polar_motion: bool = True,
    rates: bool = True,
) -> dict[str, Any]:
    """Return every figure about bodies at moments, as arrays (bodies, *shape) in the units that their keys name.

    `frame`, `place`, `origin`, `ephemeris`, `tt_jd` and the like are echoed. `altitude_deg` and `azimuth_deg` are of
    the apparent place, lifted by refraction where `place` is "observed" (`altitude_kind` says which); with a site
    only. `xyz_au` (bodies, *shape, 3) are rectangular coordinates in the frame. A magnitude that no formula gives is
    NaN, with the reason under `magnitude_note` of the body.
    """
    frame = Frame.parse(frame) if isinstance(frame, str) else frame
    place, origin = defaults(frame, site, place, origin)
    source = ephemeris if ephemeris is not None else default()
    observer = Observer(origin, site, polar_motion)
    bodies = tuple(bodies)
    with_sun = bodies if "sun" in bodies or origin == "sun" else (*bodies, "sun")
    seen = reduce_bodies(with_sun, moment, observer=observer, place=place, ephemeris=source)
    count = len(bodies)
    vectors = seen.vectors[:count]
    distance = seen.distance_au[:count]

    local = _local(vectors, frame, moment, seen.observer, site)
    lon, lat = spherical(local)
    out: dict[str, Any] = {
        "body": bodies,
        "frame": str(frame),
        "place": place,
        "origin": origin,
        "lon_deg": lon / DEG,
        "lat_deg": lat / DEG,
        "distance_au": distance,
        "light_time_s": distance * (86400.0 / C_AU_DAY),
        "xyz_au": local * distance[..., None],
        "heliocentric_au": norm(seen.heliocentric[:count]),
    }
    out |= _light(bodies, moment, seen)
    out |= _elongations(seen, with_sun, count, moment, observer)
    if rates:
        out |= _rates(bodies, moment, observer, place, source, frame, local, lon, lat)
    if site is not None and origin == "site":
        out |= _altitudes(bodies, moment, seen, observer, site, source)
    out["constellation"] = constellations.of(vectors)
    out["uncertainty_arcsec"] = _uncertainty(bodies, moment, observer, distance, out, source, place)
    out["centre"] = tuple("system barycentre" if body in SYSTEM_BARYCENTRES else "centre" for body in bodies)
    out["ephemeris"] = _sources(source, moment)
    return out


def _light(bodies: tuple[str, ...], moment: Moment, seen: Directions) -> dict[str, Any]:
    """Return phase, magnitude and size: true geometry, without aberration."""
    count = len(bodies)
    sight = seen.sight[:count]
    from_sun = seen.heliocentric[:count]
    phase = phases.phase_angle(from_sun, sight)
    tdb1, tdb2 = moment.tdb
    left = np.asarray(tdb1) + np.asarray(tdb2) - seen.light_time_s[:count] / 86400.0
    magnitude = np.empty_like(phase)
    diameter = np.empty_like(phase)
    notes = []
    for row, body in enumerate(bodies):  # a dozen bodies, each with a formula of its own
        magnitude[row] = appearance.magnitude(body, from_sun[row], sight[row], left[row])
        diameter[row] = appearance.diameter_arcsec(body, seen.distance_au[row])
        notes.append(photometry.reason(body, magnitude[row], phase[row]))
    lit = phases.illuminated(phase)
    for row, body in enumerate(bodies):
        if body == "sun":
            lit[row], phase[row] = 1.0, 0.0
    return {
        "phase_angle_deg": phase / DEG,
        "illuminated": lit,
        "magnitude": magnitude,
        "magnitude_note": tuple(notes),
        "diameter_arcsec": diameter,
    }


def _elongations(
    seen: Directions, names: tuple[str, ...], count: int, moment: Moment, observer: Observer
) -> dict[str, Any]:
    """Return where the bodies stand with respect to the Sun, seen at the same place."""
    shape = seen.vectors[:count].shape[:-1]
    if observer.origin == "sun":
        nothing = np.full(shape, np.nan)
        return {
            "elongation_deg": nothing,
            "lon_from_sun_deg": nothing.copy(),
            "bright_limb_deg": nothing.copy(),
            "caution": np.zeros(shape, dtype=np.bool_),
        }
    sun = seen.vectors[names.index("sun")]
    ecliptic = frames.rotation(TRUE_ECLIPTIC, moment).matrix
    angle = phases.elongation(seen.vectors[:count], sun, ecliptic[..., 2, :])
    lon, _ = turned(seen.vectors, ecliptic)
    limb = position_angle(seen.vectors[:count], np.broadcast_to(sun, (*shape, 3)))
    for row, name in enumerate(names[:count]):
        if name == "sun":
            limb[row] = np.nan
            angle[row] = 0.0
    return {
        "elongation_deg": angle / DEG,
        "lon_from_sun_deg": phases.longitude_from_sun(lon[:count], lon[names.index("sun")]) / DEG,
        "bright_limb_deg": limb / DEG,
        "caution": (np.abs(angle) < CAUTION_DEG * DEG) & (observer.origin in FROM_EARTH),
    }


def _around(moment: Moment) -> Moment:
    """Return the moments a rate step before and after, as one array moment (2, *shape)."""
    tt1, tt2 = np.broadcast_arrays(np.asarray(moment.tt1, dtype=np.float64), np.asarray(moment.tt2, dtype=np.float64))
    return Moment(
        np.stack([tt1, tt1]), np.stack([tt2 - RATE_STEP_DAYS, tt2 + RATE_STEP_DAYS]), moment.scale, moment.calendar
    )


def _tangent(local: Float, lon: Float, lat: Float) -> tuple[Float, Float]:
    """Return the components along growing longitude and latitude of small vectors (..., 3)."""
    cl, sl, cb, sb = np.cos(lon), np.sin(lon), np.cos(lat), np.sin(lat)
    east = -sl * local[..., 0] + cl * local[..., 1]
    north = cb * local[..., 2] - sb * (cl * local[..., 0] + sl * local[..., 1])
    return east, north


def _rates(
    bodies: tuple[str, ...],
    moment: Moment,
    observer: Observer,
    place: str,
    source: Ephemeris,
    frame: Frame,
    local: Float,
    lon: Float,
    lat: Float,
) -> dict[str, Any]:
    """Return the motion in the frame: longitude's times the cosine of the latitude, and its position angle."""
    around = _around(moment)
    seen = reduce_bodies(bodies, around, observer=observer, place=place, ephemeris=source)
    ends = _local(seen.vectors, frame, around, seen.observer, observer.site)
    change = ends[:, 1] - ends[:, 0]
    east, north = _tangent(change, lon, lat)
    scale = 1.0 / (2.0 * RATE_STEP_DAYS * 24.0) / ARCSEC
    east, north = east * scale, north * scale
    return {
        "rate_lon_arcsec_h": east,
        "rate_lat_arcsec_h": north,
        "pa_deg": np.arctan2(east, north) % TWO_PI / DEG,
    }


def _altitudes(
    bodies: tuple[str, ...], moment: Moment, seen: Directions, observer: Observer, site: Site, source: Ephemeris
) -> dict[str, Any]:
    """Return altitude, azimuth and air mass of the apparent (or observed) place at the site."""
    vectors = seen.vectors[: len(bodies)]
    if seen.place not in ("apparent", "observed"):
        vectors = reduce_bodies(bodies, moment, observer=observer, place="apparent", ephemeris=source).vectors
    azimuth, altitude = horizontal(vectors, seen.observer, site)
    kind = "refracted" if seen.place == "observed" else "airless"
    lifted = altitude if seen.place == "observed" else refraction.apparent_altitude(altitude, observer.atmosphere)
    return {
        "altitude_deg": altitude / DEG,
        "azimuth_deg": azimuth / DEG,
        "altitude_kind": kind,
        "airmass": horizon.airmass(lifted),
    }


def _horizon_matrix(state: ObserverState, site: Site) -> Float:
    """Return the matrices (*shape, 3, 3) from ICRS axes to north, east and up: left-handed, longitude is azimuth."""
    if state.to_itrs is None:
        raise SiteError("altitude and azimuth: the observer is not at a site")
    lon, lat = site.lon_deg * DEG, site.lat_deg * DEG
    sl, cl, sb, cb = np.sin(lon), np.cos(lon), np.sin(lat), np.cos(lat)
    triad = np.array([[-sb * cl, -sb * sl, cb], [-sl, cl, 0.0], [cb * cl, cb * sl, sb]])
    return np.asarray(triad @ state.to_itrs)


def horizontal(vectors: Float, state: ObserverState, site: Site) -> tuple[Float, Float]:
    """Return azimuth (north through east) and altitude, rad, of directions (bodies, *shape, 3) on ICRS axes."""
    return turned(vectors, _horizon_matrix(state, site))


def _local(vectors: Float, frame: Frame, moment: Moment, state: ObserverState, site: Site | None) -> Float:
    """Return vectors (bodies, *shape, 3) turned into a frame; the horizon is the observer's own, its pole included."""
    if frame.plane == "horizon" and site is not None and state.to_itrs is not None:
        return rotate(_horizon_matrix(state, site), vectors)
    return frames.from_icrs(vectors, frame, moment, site)


def _uncertainty(
    bodies: tuple[str, ...],
    moment: Moment,
    observer: Observer,
    distance: Float,
    known: dict[str, Any],
    source: Ephemeris,
    place: str,
) -> Float:
    """Return a bound on the error of the direction, arcsec: ephemeris, and ΔT where it enters.

    A moment in UT is uncertain in TT: the body's own motion counts. A moment in TT is certain for the body, but how
    far the Earth has turned is not: the parallax of a site counts. Above the horizon frame refraction is not counted.
    """
    tdb1, tdb2 = moment.tdb
    bound = source.uncertainty_arcsec(bodies, tdb1, tdb2, distance)
    sigma_h = np.asarray(moment.delta_t_sigma_s, dtype=np.float64) / 3600.0
    if moment.scale in ("UTC", "UT1"):
        if "rate_lon_arcsec_h" in known:
            motion = np.hypot(known["rate_lon_arcsec_h"], known["rate_lat_arcsec_h"])
        else:
            motion = np.asarray(distance) * 0.0 + 4000.0  # more than any body but the Moon from a site
        bound = bound + sigma_h * motion
    elif observer.origin == "site":
        turning = 15.041 * 3600.0 * 4.2635e-5 / np.maximum(distance, 1e-4)  # 6378 km in au, carried round
        bound = bound + sigma_h * turning
    return np.asarray(bound)


def _sources(source: Ephemeris, moment: Moment) -> Any:
    """Return what the answer rests on: one name, or one for each moment where they differ."""
    tdb1, tdb2 = moment.tdb
    days = np.asarray(np.asarray(tdb1) + np.asarray(tdb2))
    if days.size == 0:
        return source.name
    names = {source.source(float(days.min())), source.source(float(days.max()))}
    if len(names) == 1:
        return names.pop()
    labels: Any = np.array([source.source(float(day)) for day in days.ravel()])
    return labels.reshape(days.shape)


def records(answer: dict[str, Any]) -> list[dict[str, Any]]:
    """Return one dictionary per body and moment (body first, moments in order) from the arrays of `facts`."""
    names: tuple[str, ...] = answer["body"]
    shape = np.shape(answer["lon_deg"])
    rows = []
    index: tuple[Int | int, ...]
    for index in np.ndindex(*shape):
        row: dict[str, Any] = {"body": names[int(index[0])]}
        for key, value in answer.items():
            if key == "body":
                continue
            if isinstance(value, tuple):
                row[key] = value[int(index[0])]
            elif np.ndim(value) == 0:
                row[key] = value
            elif np.shape(value)[: len(shape)] == shape:
                item = value[index]
                row[key] = item.tolist() if np.ndim(item) else item.item()
            else:  # one for each moment
                row[key] = value[index[1:]].item()
        rows.append(row)
    return rows
