"""What a pixel of a chart points at: the object there or the bare direction, in words, and measuring between two."""

from dataclasses import dataclass, replace

import numpy as np

from colure import angles, bodies, constellations, deepsky, everyframe, names
from colure.arrays import ARCSEC, DEG, Float, cartesian, position_angle, separation
from colure.errors import ColureError, SpanError
from colure.frames import Frame, from_icrs, to_icrs
from colure.marks import Scene
from colure.reduction import apply_context, star_context
from colure.sky import Sky
from colure.stars import EPOCH_JD, catalogue
from colure.targets import Target

BODIES, STARS, DEEP_SKY, DIRECTION = "bodies", "stars", "deep sky", "direction"
"""Kinds of what is pointed at; the first three are names of layers."""

STAR_SIGMA = 0.05
"""Arcseconds that the place of a catalogue star may be off, decades from its epoch."""
DEEP_SKY_SIGMA = 1.0


@dataclass(frozen=True, slots=True)
class Pointed:
    """An object or a bare direction: `row` in its layer's source, `direction` (3 numbers) on ICRS axes.

    `detail` is a line of facts in plain words; `sigma_arcsec` the uncertainty of the direction.
    """

    kind: str
    row: int
    name: str
    direction: tuple[float, float, float]
    detail: str
    sigma_arcsec: float

    @property
    def vector(self) -> Float:
        """The direction as an array (3,)."""
        return np.array(self.direction)


def at(sky: Sky, scene: Scene, x: float, y: float, reach: float = 8.0) -> Pointed | None:
    """Return what lies within `reach` logical pixels, or the bare direction there, or None off the sky."""
    picked = scene.pick(x, y, reach)
    if picked is not None and picked.layer in (BODIES, STARS, DEEP_SKY):
        found = named(sky, picked.layer, picked.row)
        if found is not None:
            return found
    vector = scene.unproject(x, y)
    if vector is None:
        return None
    near = scene.unproject(x + 1.0, y)
    if near is None:
        near = scene.unproject(x - 1.0, y)
    pixel = 60.0 if near is None else max(float(separation(vector, near)) / ARCSEC, 1e-3)
    return bare(vector, pixel)


def bare(vector: Float, sigma_arcsec: float) -> Pointed:
    """Return a direction with no object, as good as the pixel that it was read from."""
    return Pointed(DIRECTION, -1, "Direction", _plain(vector), _constellation(vector), sigma_arcsec)


def named(sky: Sky, kind: str, row: int) -> Pointed | None:
    """Return an object by its layer and row as it stands in a sky; None if the sky does not hold it."""
    if kind == BODIES:
        return body(sky, sky.session.bodies[row]) if 0 <= row < len(sky.session.bodies) else None
    if kind == STARS:
        return star(sky, row)
    return deep_sky_object(row)


def again(sky: Sky, pointed: Pointed) -> Pointed:
    """Return the same object as it stands in another sky, or the same direction."""
    try:
        if pointed.kind == BODIES:
            return body(sky, pointed.name.casefold()) or pointed
        if pointed.kind == STARS:
            return replace(pointed, direction=_plain(_star_direction(sky, pointed.row)))
    except ColureError:
        return pointed
    return pointed


def target(sky: Sky, found: Target) -> Pointed | None:
    """Return what a search found as it stands in a sky; None for a body that has no place there."""
    match found.kind:
        case "body":
            return body(sky, str(found.ref))
        case "star":
            return star(sky, int(found.ref))
        case "deepsky":
            return deep_sky_object(int(found.ref))
    if found.frame is None or found.lon_deg is None or found.lat_deg is None:
        return None
    local = cartesian(found.lon_deg * DEG, found.lat_deg * DEG)
    vector = to_icrs(local, found.frame, sky.session.moment, sky.session.site)
    return Pointed(DIRECTION, -1, found.name, _plain(vector), found.detail, STAR_SIGMA)


def body(sky: Sky, name: str) -> Pointed | None:
    """Return a body as it stands in a sky, with its facts."""
    session = sky.session
    vector = sky["bodies"].vector(name)
    if vector is None:
        return None
    site = session.site if session.from_site else None
    facts = bodies.facts([name], session.moment, site=site, frame="icrs", place=session.place, rates=False)
    sigma = float(np.ravel(facts["uncertainty_arcsec"])[0])
    parts = []
    for key, text in (
        ("magnitude", "mag {}"),
        ("illuminated", "{} lit"),
        ("diameter_arcsec", "{}″ across"),
        ("distance_au", "{} au"),
    ):
        value = float(np.ravel(facts[key])[0]) if key in facts else float("nan")
        if not np.isfinite(value) or (name == "sun" and key == "illuminated"):
            continue
        shown = (
            f"{100.0 * value:.0f} %"
            if key == "illuminated"
            else angles.format_number(value, 4 if key == "distance_au" else 1)
        )
        parts.append(text.format(shown))
    detail = " · ".join([*parts, _constellation(vector)])
    return Pointed(BODIES, -1, name.capitalize(), _plain(vector), detail, max(sigma, 1e-3))


def nearest_body(sky: Sky, scene: Scene) -> Pointed | None:
    """Return the shown body nearest to the middle of the map, or None where none is on it."""
    left, top, right, bottom = scene.frame
    known = sky["bodies"]
    best: tuple[float, str] | None = None
    for name, (x, y) in zip(known.names, scene.projector.project(known.vectors), strict=True):
        inside = left <= x <= right and top <= y <= bottom and name in sky.session.bodies
        off = float(np.hypot(x - 0.5 * (left + right), y - 0.5 * (top + bottom)))
        if inside and (best is None or off < best[0]):
            best = off, name
    return body(sky, best[1]) if best is not None and sky.session.layers.bodies else None


def star(sky: Sky, row: int) -> Pointed:
    """Return a star of the catalogue as it stands in a sky."""
    every = names.identify(row)
    rows = catalogue().rows([row])
    vector = _star_direction(sky, row)
    parts = [f"V {angles.format_number(float(rows.vmag[0]), 2)}"]
    if np.isfinite(rows.bv[0]):
        parts.append(f"B−V {angles.format_number(float(rows.bv[0]), 2)}")
    parts.append(_constellation(vector))
    detail = " · ".join(parts)
    if len(every.every) > 1:
        detail += "\n" + " · ".join(every.every[1:])
    return Pointed(STARS, row, every.best, _plain(vector), detail, STAR_SIGMA)


def deep_sky_object(row: int) -> Pointed:
    """Return a deep-sky object at its catalogue position."""
    every = deepsky.names(row)
    objects = deepsky.everything().take(np.array([row]))
    vector = objects.vectors[0]
    parts = [deepsky.type_of(row)]
    if np.isfinite(objects.magnitude[0]):
        parts.append(f"mag {angles.format_number(float(objects.magnitude[0]), 1)}")
    size = objects.size_arcmin[0]
    if np.isfinite(size).all():
        parts.append(f"{size[0]:g}′ × {size[1]:g}′" if size[0] != size[1] else f"{size[0]:g}′")
    detail = " · ".join([*parts, _constellation(vector)])
    if len(every) > 1:
        detail += "\n" + " · ".join(every[1:])
    return Pointed(DEEP_SKY, row, every[0], _plain(vector), detail, DEEP_SKY_SIGMA)


def _star_direction(sky: Sky, row: int) -> Float:
    """Return a star's direction (3,) at the chart's moment and place, reduced alone and in full precision."""
    session = sky.session
    star_rows = catalogue().rows([row])
    state = star_rows.state(np.float64)
    try:
        context = star_context(session.moment, observer=sky.observer, place=session.place, epoch_jd=EPOCH_JD)
    except SpanError:
        # Beyond the ephemeris the chart's stars are moved, and no more.
        return np.asarray(star_rows.directions(float(session.moment.julian_year))[0])
    parallax = star_rows.parallax_mas * (1e-3 * ARCSEC)
    return np.asarray(apply_context(context, state[:3].T, state[3:].T, parallax)[0])


def readout(sky: Sky, scene: Scene, x: float, y: float) -> str:
    """Return what the pointer is over, in one line: object, position in the frame of the chart, constellation."""
    vector = scene.unproject(x, y)
    if vector is None:
        return ""
    session = sky.session
    name = session.view.centre.frame if session.view.centre.body is None else session.view.up
    if name == "zenith":
        name = "horizon"
    neighbour = scene.unproject(x + 1.0, y)
    pixel = 60.0 if neighbour is None else max(float(separation(vector, neighbour)) / ARCSEC, 1e-3)
    row = everyframe.row(vector, name, session.moment, site=session.site, sigma_arcsec=pixel)
    parts = [f"{row.lon_name} {row.lon_text}  {row.lat_name} {row.lat_text}", row.label, _constellation(vector)]
    picked = scene.pick(x, y, 8.0)
    if picked is not None and picked.layer in (BODIES, STARS, DEEP_SKY):
        label = short_name(sky, picked.layer, picked.row)
        if label:
            parts.insert(0, label)
    return "  ·  ".join(part for part in parts if part)


def short_name(sky: Sky, kind: str, row: int) -> str:
    """Return the name of an object alone."""
    if kind == BODIES:
        return sky.session.bodies[row].capitalize() if 0 <= row < len(sky.session.bodies) else ""
    if kind == STARS:
        return names.identify(row).best
    return deepsky.names(row)[0]


@dataclass(frozen=True, slots=True)
class Measured:
    """From one direction to another: separation and position angle in degrees, in the frame whose north is up."""

    separation_deg: float
    pa_deg: float
    frame: str
    sigma_arcsec: float

    @property
    def text(self) -> str:
        """The separation and the position angle with the figures that the pixels support."""
        smallest, places = angles.dms_places(self.sigma_arcsec)
        apart = angles.format_dms(self.separation_deg, places, smallest=smallest, plus=False)
        decimals = angles.decimals_for(self.sigma_arcsec * ARCSEC / DEG / max(np.sin(self.separation_deg * DEG), 1e-6))
        places = min(max(decimals, 0), 3)
        turned = angles.format_degrees(round(self.pa_deg, places) % 360.0, places)
        return f"{apart}, position angle {turned}"


def measure(sky: Sky, a: Pointed, b: Pointed) -> Measured:
    """Return the separation and the position angle of b seen from a, counted from the north that is up on the chart."""
    session = sky.session
    name = "icrs" if session.view.up == "zenith" else session.view.up
    first, second = (from_icrs(v.vector, Frame.parse(name), session.moment, session.site) for v in (a, b))
    # A tiny angle west of north comes as a full turn.
    angle = float(position_angle(first, second)) / DEG % 360.0
    angle = 0.0 if angle > 360.0 - 1e-9 else angle
    sigma = float(np.hypot(a.sigma_arcsec, b.sigma_arcsec))
    return Measured(float(separation(a.vector, b.vector)) / DEG, angle, name, sigma)


def _plain(vector: Float) -> tuple[float, float, float]:
    x, y, z = (float(v) for v in vector)
    return x, y, z


def _constellation(vector: Float) -> str:
    code = str(constellations.of(np.asarray(vector, dtype=np.float64)))
    return next((entry.name for entry in constellations.constellations() if entry.code == code), code)
