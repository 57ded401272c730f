"""What a drag, a wheel or a key makes of a view: the new View under which the sky stays below the pointer.

Every function takes the scene that the user sees and answers with a View; nothing is changed.
"""

from dataclasses import replace

import numpy as np

from colure.arrays import DEG, Float
from colure.marks import Scene
from colure.scene.context import projector_of
from colure.session import NARROWEST, WIDEST, Centre, Session, View
from colure.sky import frame_axes

ROUNDS = 12
"""Steps of the search for a centre; each leaves a small part of the error, and the last is below a thousandth pixel."""


def panned(session: Session, scene: Scene, start: tuple[float, float], end: tuple[float, float]) -> View:
    """Return the view after dragging the sky from one pixel to another; unchanged if it was grasped off the sky."""
    grasped = scene.projector.unproject(np.array(start))
    if not np.isfinite(grasped).all():
        return session.view
    return _with_under(session, scene, session.view, grasped, end)


def zoomed(session: Session, scene: Scene, factor: float, about: tuple[float, float] | None = None) -> View:
    """Return the view magnified by `factor` about a pixel, or about the middle of the map.

    A view centred on a body stays so, and is magnified about its middle.
    """
    view = session.view
    width = min(max(view.width_deg / factor, NARROWEST), WIDEST[view.projection])
    nearer = replace(view, width_deg=width)
    if about is None or view.centre.body is not None:
        return nearer
    fixed = scene.projector.unproject(np.array(about))
    if not np.isfinite(fixed).all():
        return nearer
    return _with_under(session, scene, nearer, fixed, about)


def centred(session: Session, direction: Float) -> View:
    """Return the view centred on a direction (3,) on ICRS axes, in the frame of its present centre."""
    frame = session.view.centre.frame
    axes = frame_axes(frame, session.moment, session.site, session.omitted)
    lon, lat = axes.spherical(np.asarray(direction)[None, :])
    at = Centre(frame, float(lon[0]) / DEG, float(np.clip(lat[0] / DEG, -90.0, 90.0)))
    return replace(session.view, centre=at)


def _with_under(session: Session, scene: Scene, view: View, direction: Float, pixel: tuple[float, float]) -> View:
    """Return the view whose centre is moved until a direction lies under a pixel.

    The centre is moved by the turn of the sphere that takes what now lies under the pixel to the direction; as up stays
    up, one turn does not do it quite, and is repeated.
    """
    frame = view.centre.frame
    axes = frame_axes(frame, session.moment, session.site, session.omitted)
    up = frame_axes("horizon" if view.up == "zenith" else view.up, session.moment, session.site, session.omitted)
    pole = up.columns(np.zeros(1), np.pi / 2)[:, 0]
    spare = up.columns(np.zeros(1), 0.0)[:, 0]
    middle = np.asarray(scene.projector.centre, dtype=np.float64)
    best, best_error = middle, np.inf
    for _ in range(ROUNDS):
        projector = projector_of(view, scene.frame, middle, pole, spare)
        here = projector.unproject(np.array(pixel))
        if not np.isfinite(here).all():
            break
        error = float(np.linalg.norm(here - direction))
        if error < best_error:
            best, best_error = middle, error
        if error < 1e-12:
            break
        middle = _turned(middle, here, direction)
        # The pole itself has no north: stay a hair off it.
        if abs(float(middle @ pole)) > 1.0 - 1e-12:
            break
    lon, lat = axes.spherical(best[None, :])
    at = Centre(frame, float(lon[0]) / DEG, float(np.clip(lat[0] / DEG, -90.0, 90.0)))
    return replace(view, centre=at)


def _turned(vector: Float, first: Float, last: Float) -> Float:
    """Return a vector turned by the shortest turn that takes one direction to another."""
    axis = np.cross(first, last)
    cosine = float(first @ last)
    if cosine < -0.999999:
        return vector
    # Rodrigues' formula with the sine taken into the axis.
    out = vector * cosine + np.cross(axis, vector) + axis * (axis @ vector) / (1.0 + cosine)
    return np.asarray(out / np.sqrt(out @ out))
