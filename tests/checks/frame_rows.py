"""Rows about frames, precession and the turn of the Earth: reads a row's inputs and asks the public functions."""

from collections.abc import Callable
from functools import cache
from typing import Any

import numpy as np
from harness import Row

from colure import (
    constellations,
    fk4,
    frames,
    nutation,
    obliquity,
    planes,
    precession,
    precessionrates,
    sidereal,
    stars,
)
from colure.arrays import ARCSEC, DEG, Float, cartesian, separation, spherical
from colure.ephemeris import KM_PER_AU
from colure.moment import Moment
from colure.reduction import C_AU_DAY, Observer, reduce_bodies, space_motion, space_velocity
from colure.reduction.steps import GM_SUN
from colure.sites import Site

SECOND = 15.0 * ARCSEC
MAS = ARCSEC / 1000.0
CENTURY = 100.0


@cache
def moment(text: str) -> Moment:
    return Moment.parse(text)


def at(row: Row) -> Moment | None:
    return moment(row.inputs["at"]) if "at" in row.inputs else None


def when(row: Row) -> Moment:
    return moment(row.inputs["at"])


def numbers(text: str) -> Float:
    return np.array([float(part) for part in text.split()])


def direction(row: Row) -> tuple[Float, float]:
    """Return the unit vector that a row gives, and the unit of its angles in radians."""
    names = ("lon", "lat") if any(key.startswith("lon_") for key in row.inputs) else ("ra", "dec")
    unit = "rad" if f"{names[0]}_rad" in row.inputs else "deg"
    size = 1.0 if unit == "rad" else DEG
    lon, lat = (row.number(f"{name}_{unit}") * size for name in names)
    return cartesian(lon, lat), size


def given(row: Row, vector: Float, size: float) -> Any:
    """Return what the row asks for of a direction, in the unit of its input (or as `give` says)."""
    lon, lat = (float(angle) for angle in spherical(vector))
    match row.inputs["give"]:
        case "lon":
            return lon / size
        case "lat":
            return lat / size
        case "lon_deg":
            return lon / DEG
        case "lat_deg":
            return lat / DEG
        case "pair":
            return lon / size, lat / size
    raise AssertionError(row.inputs["give"])


def convert(row: Row) -> Any:
    vector, size = direction(row)
    epoch = row.number("epoch") if "epoch" in row.inputs else None
    turned = frames.convert(vector, row.inputs["from"], row.inputs["to"], at(row), epoch=epoch)
    if "then_to" in row.inputs:  # a second rotation, of axes that are taken for those of the first's end
        turned = planes.between(row.inputs["then_from"], row.inputs["then_to"]).apply(turned)
    return given(row, turned, size)


def axes(row: Row) -> Any:
    images = frames.convert(np.eye(3), row.inputs["from"], row.inputs["to"], at(row), epoch=row.number("epoch"))
    return images.T.ravel()


def matrix(row: Row) -> Any:
    return frames.rotation(row.inputs["frame"], at(row)).matrix.ravel()


def matrix_between(row: Row) -> Any:
    return planes.between(row.inputs["from"], row.inputs["to"], at(row)).matrix.ravel()


def vector_between(row: Row) -> Any:
    return planes.between(row.inputs["from"], row.inputs["to"], at(row)).apply(numbers(row.inputs["vector"]))


def matrix_between_poles(row: Row) -> Any:
    """Return the matrix whose rows are equinox, its perpendicular and pole of the long-term equator."""
    equator, ecliptic = precession.long_term_poles(row.number("year"))
    equinox = np.cross(equator, ecliptic)
    equinox /= np.linalg.norm(equinox)
    return np.array([equinox, np.cross(equator, equinox), equator]).ravel()


def long_pole(row: Row) -> Any:
    return precession.long_term_poles(row.number("year"))[row.inputs["pole"] == "ecliptic"]


def epj(row: Row) -> Any:
    return float(precession.julian_years(when(row)))


def orbit(row: Row) -> Any:
    elements = [np.asarray(row.number(f"{name}_deg") * DEG) for name in ("inclination", "node", "peri")]
    turned = planes.turn_orbit(*elements, planes.between(row.inputs["from"], row.inputs["to"]))
    return float(turned[("inclination", "node", "peri").index(row.inputs["give"])]) / DEG


def body(row: Row) -> Any:
    origin = Observer(row.inputs["origin"])
    seen = reduce_bodies((row.inputs["body"],), when(row), observer=origin, place=row.inputs["place"])
    return given(row, frames.from_icrs(seen.vectors[0], row.inputs["frame"], when(row)), DEG)


def star(row: Row) -> Any:
    """Return a catalogue star's place at a moment, space motion included."""
    return given(
        row, frames.from_icrs(catalogued(row, precession.julian_years(when(row))), row.inputs["frame"], when(row)), DEG
    )


def catalogued(row: Row, years: Float) -> Float:
    number = stars.catalogue().by_hip(int(row.inputs["hip"]))
    assert number is not None
    one = stars.catalogue().rows([number])
    position, velocity = one.vectors()
    return space_motion(position[0], velocity[0], np.asarray(years) - stars.EPOCH)


def star_place(row: Row) -> Any:
    """Return the mean place of a star that the row gives with its motion, in another mean equator."""
    dec = row.number("dec_deg") * DEG
    if "pm_mas" in row.inputs:
        pm_ra, pm_dec = numbers(row.inputs["pm_mas"]) * MAS
    else:
        pm_ra, pm_dec = row.number("pm_ra_s") * SECOND * np.cos(dec), row.number("pm_dec_arcsec") * ARCSEC
    position, velocity = space_velocity(
        *(np.asarray(x) for x in (row.number("ra_deg") * DEG, dec, pm_ra, pm_dec, 0.0, 0.0))
    )
    target = frames.Frame.parse(row.inputs["to"])
    if "years" in row.inputs:
        years = row.number("years")
    else:
        years = float(precession.julian_years(when(row) if target.needs_moment else target.equinox_tt())) - 2000.0
    if row.inputs.get("motion") == "linear":
        moved = cartesian(row.number("ra_deg") * DEG + pm_ra / np.cos(dec) * years, dec + pm_dec * years)
    else:
        moved = space_motion(position, velocity, years)
    return given(row, frames.convert(moved, row.inputs["from"], target, at(row)), DEG)


def nearest_pole(row: Row) -> Any:
    """Return the year of least distance to the mean pole, or the distance in degrees."""
    years = np.arange(row.number("first"), row.number("last"), 0.05)
    pole = precession.equator_pole(Moment.from_julian_year(years))
    if "hip" in row.inputs:
        path = catalogued(row, years)
    else:
        vector, _ = direction(row)
        pm = numbers(row.inputs["pm_mas"]) * MAS
        lon, lat = spherical(vector)
        position, velocity = space_velocity(lon, lat, *(np.asarray(x) for x in (*pm, 0.0, 0.0)))
        path = space_motion(position, velocity, years - 2000.0)
    apart = separation(path, pole)
    best = int(np.argmin(apart))
    return float(years[best]) if row.inputs["give"] == "year" else float(apart[best]) / DEG


def leaves(row: Row) -> Any:
    """Return the first year in which a cardinal point is no longer in a constellation."""
    years = np.arange(row.number("first"), row.number("last"), 0.01)
    points = planes.cardinal_points("ecliptic/mean/date", Moment.from_julian_year(years))
    inside = constellations.of(points[:, int(row.inputs["point"])]) == row.inputs["of"]
    assert inside[0]
    assert not inside[-1]
    return float(years[np.argmin(inside)])


def constellation(row: Row) -> Any:
    vector, _ = direction(row)
    return str(constellations.of(frames.to_icrs(vector, row.inputs["frame"])))


def crossing(row: Row) -> Any:
    found = planes.mutual(row.inputs["plane"], row.inputs["on"])
    return float(getattr(found, row.inputs["give"])) / DEG


def node_in(row: Row) -> Any:
    """Return the longitude, in the plane's own frame, of its ascending node on another."""
    node = planes.mutual(row.inputs["plane"], row.inputs["on"]).node
    there = frames.convert(cartesian(float(node), 0.0), row.inputs["on"], row.inputs["frame"])
    return float(spherical(there)[0]) / DEG


def pole(row: Row) -> Any:
    return given(row, frames.from_icrs(planes.pole(row.inputs["frame"]), row.inputs["on"]), DEG)


def galactic_1958(row: Row) -> Any:
    vector, size = direction(row)
    return given(row, fk4.galactic_1958() @ vector, size)


def from_galactic_1958(row: Row) -> Any:
    vector, size = direction(row)
    b1950 = fk4.galactic_1958().T @ vector
    return given(row, b1950 if row.inputs.get("without") == "e-terms" else fk4.add_e_terms(b1950, 1950.0), size)


def add_e_terms(row: Row) -> Any:
    vector, _ = direction(row)
    return float(spherical(fk4.add_e_terms(vector, row.number("equinox")))[1]) - row.number("dec_rad")


def star_fk(row: Row) -> Any:
    vector, _ = direction(row)
    ra, dec = (float(angle) for angle in spherical(vector))
    if "pm_ra_arcsec" in row.inputs:
        pm = row.number("pm_ra_arcsec") * ARCSEC, row.number("pm_dec_arcsec") * ARCSEC
    else:
        pm = float(row.inputs.get("pm_ra_rad", 0.0)), float(row.inputs.get("pm_dec_rad", 0.0))
    function = fk4.star_to_fk5 if row.inputs["what"] == "star_to_fk5" else fk4.star_from_fk5
    rest = float(row.inputs.get("parallax", 0.0)), float(row.inputs.get("rv", 0.0))
    lon, lat, pm_lon, pm_lat, _, rv = (np.asarray(x) for x in function(*(np.asarray(x) for x in (ra, dec, *pm, *rest))))
    match row.inputs["give"]:
        case "pm_ra":
            return float(pm_lon)
        case "rv":
            return float(rv)
    if "moved_to" in row.inputs:
        none = np.asarray(0.0)
        position, velocity = space_velocity(lon, lat, pm_lon * np.cos(lat), pm_lat, none, none)
        return given(row, space_motion(position, velocity, row.number("moved_to") - 1950.0), 1.0)
    return given(row, cartesian(lon, lat), 1.0)


def annual(row: Row) -> Any:
    """Return yearly rates of a place or of the equator, in the unit that the row's `what` names."""
    m, n = (float(rate) for rate in precessionrates.equatorial(when(row), row.inputs["model"]))
    match row.inputs["what"]:
        case "m_s":
            return m / SECOND
        case "n_s":
            return n / SECOND
        case "n_arcsec":
            return n / ARCSEC
        case "half_m":
            return m / 2.0 / ARCSEC * CENTURY
        case "n":
            return n / ARCSEC * CENTURY
    ra, dec = row.number("ra_deg") * DEG, row.number("dec_deg") * DEG
    if row.inputs["what"] == "annual_ra_s":
        return (m + n * np.sin(ra) * np.tan(dec)) / SECOND
    return n * np.cos(ra) / ARCSEC


def general(row: Row) -> Any:
    return float(precessionrates.general(when(row), row.inputs["model"])) / ARCSEC * CENTURY


def pole_rate(row: Row) -> Any:
    p, q = precessionrates.ecliptic_turn(when(row), row.inputs["model"])
    return float(p if row.inputs["what"] == "P_rate" else q) / ARCSEC * CENTURY


def angle_rate(row: Row) -> Any:
    """Return the rate of a precession angle at J2000, arcsec a century, by a difference over two years."""
    ends = [precessionrates.angles((precession.J2000, side * 365.25))[row.inputs["angle"]] for side in (-1.0, 1.0)]
    return float(ends[1] - ends[0]) / ARCSEC / 2.0 * CENTURY


def bias(row: Row) -> Any:
    b = frames.rotation("equator/mean/J2000").matrix
    return float({"xi0": b[2, 0], "eta0": b[2, 1], "dalpha0": b[0, 1]}[row.inputs["give"]]) / ARCSEC


def obliquity_of_year(row: Row) -> Any:
    return float(obliquity.mean_deg(row.number("year"), row.inputs["model"]))


def difference(row: Row) -> Any:
    a, b = (float(obliquity.mean_deg(row.number("year"), row.inputs[key])) for key in ("model", "against"))
    return (a - b) * 3600.0


def tilt(row: Row) -> Any:
    """Return an obliquity or a nutation angle, in the unit that the row's `what` names."""
    model = row.inputs.get("model", "auto")
    dpsi, deps = (float(angle) for angle in nutation.nutation(when(row), nutation.series_of(model)))
    match row.inputs["what"]:
        case "mean":
            return float(obliquity.mean(when(row), model)) / DEG
        case "mean_arcsec":
            return float(obliquity.mean(when(row), model)) / ARCSEC
        case "true":
            return float(obliquity.true(when(row), model)) / DEG
        case "equinoxes_s":
            return float(sidereal.equation_of_equinoxes(when(row))) / SECOND
        case "dpsi" | "deps":
            return (dpsi if row.inputs["what"] == "dpsi" else deps) / ARCSEC
    return (dpsi if row.inputs["what"] == "dpsi_deg" else deps) / DEG


def complementary(row: Row) -> Any:
    dpsi, _ = nutation.nutation(when(row))
    return float(sidereal.equation_of_equinoxes(when(row)) - dpsi * np.cos(obliquity.mean(when(row))))


def turns_a_day(row: Row) -> Any:
    """Return the Earth's turns in a day of UT1."""
    jd1, jd2 = when(row).ut1
    start, end = (sidereal.era(Moment.from_jd(float(jd1) + k, float(jd2), "UT1")) for k in (0.0, 1.0))
    return 1.0 + float((end - start) % (2.0 * np.pi)) / (2.0 * np.pi)


def days(row: Row) -> Any:
    ends = [frames.Frame.parse(f"equator/mean/{row.inputs[key]}").equinox_tt() for key in ("from", "to")]
    return (ends[1][0] - ends[0][0]) + (ends[1][1] - ends[0][1])


def _gaussian_constant(_: Row) -> float:
    return float(np.sqrt(GM_SUN))


FUNCTIONS: dict[str, Callable[[Row], Any]] = {
    "gaussian_constant": _gaussian_constant,
    **{
        function.__name__: function
        for function in (
            convert, axes, matrix, matrix_between, vector_between, matrix_between_poles, long_pole, epj, orbit, body,
            star, star_place, nearest_pole, leaves, constellation, crossing, node_in, pole, galactic_1958,
            from_galactic_1958,
            add_e_terms, general, angle_rate, bias, complementary, turns_a_day, days,
        )
    },
    **dict.fromkeys(("star_to_fk5", "star_from_fk5"), star_fk),
    **dict.fromkeys(("annual_ra_s", "annual_dec_arcsec", "m_s", "n_s", "n_arcsec", "half_m", "n"), annual),
    **dict.fromkeys(("P_rate", "Q_rate"), pole_rate),
    **dict.fromkeys(("mean", "mean_arcsec", "true", "equinoxes_s", "dpsi", "deps", "dpsi_deg", "deps_deg"), tilt),
    "obliquity": obliquity_of_year,
    "difference_arcsec": difference,
    "newcomb_matrix": lambda row: precession.newcomb_matrix(row.number("from"), row.number("to")).ravel(),
    "e_terms": lambda row: fk4.e_terms(row.number("year")),
    "gmst_h": lambda row: float(sidereal.gmst(when(row), row.inputs.get("model", "iau2006"))) * 12.0 / np.pi,
    "era": lambda row: float(sidereal.era(when(row))) / DEG,
    "last_h": lambda row: float(sidereal.local(when(row), Site("row", row.number("lon_deg"), 0.0, 0.0))) * 12.0 / np.pi,
    "speed_of_light_km_s": lambda row: C_AU_DAY * KM_PER_AU / 86400.0,
    "light_time_au_s": lambda row: 86400.0 / C_AU_DAY,
}  # fmt: skip


def compute(row: Row) -> Any:
    """Return the figure that the row's `what` names."""
    return FUNCTIONS[row.inputs["what"]](row)
