"""Moves a view by hand: dragging the sky, zooming about a pixel, stepping; each returns a new View.

A drag keeps the direction that was grabbed under the pointer, a zoom the direction under the pixel where it happens.
The pole stays up meanwhile, so that the centre is not found by one rotation: it is found by a few, each with the page
of the centre before.
"""

from dataclasses import replace

import numpy as np

from colure import frames
from colure.arrays import DEG, Float, norm, spherical, unit
from colure.projections import Projector, projector
from colure.session import NARROWEST, WIDEST, Centre, Session, View
from colure.sky import Axes

ROUNDS = 6
CLOSE = 1e-9
"""A direction within this many radians of its pixel is there."""

Rect = tuple[float, float, float, float]


def page(view: View, axes: Axes, frame: Rect, centre: Float | None = None) -> Projector:
    """Return the projector of a view on a map rectangle in logical pixels, about `centre` (3,) or the view's own."""
    return projector(
        view.projection,
        axes.centre if centre is None else centre,
        axes.pole,
        axes.spare,
        east_left=view.east_left,
        width=view.width_deg * DEG,
        rotation=view.rotation_deg * DEG,
        frame=frame,
    )


def dragged(session: Session, axes: Axes, frame: Rect, grabbed: Float, x: float, y: float) -> View:
    """Return the view in which the direction `grabbed` (3,), on ICRS axes, lies as near as can be to a pixel."""
    return _centred(session, session.view, axes.centre, _settle(session.view, axes, frame, grabbed, x, y))


def zoomed(session: Session, axes: Axes, frame: Rect, x: float, y: float, factor: float) -> View:
    """Return the view magnified by `factor` about a pixel: the direction there stays; off the sky, about the centre.

    The width stays between one arcminute and the widest that the projection can show.
    """
    view = session.view
    width = float(np.clip(view.width_deg / factor, NARROWEST, WIDEST[view.projection]))
    wider = replace(view, width_deg=width)
    held = page(view, axes, frame).unproject(np.array([x, y]))
    if wider == view or not np.isfinite(held).all():
        return wider
    return _centred(session, wider, axes.centre, _settle(wider, axes, frame, held, x, y))


def stepped(session: Session, axes: Axes, frame: Rect, right: float, down: float) -> View:
    """Return the view moved over the sky by logical pixels: what lay to the right comes nearer the centre."""
    left, top, far, bottom = frame
    x, y = 0.5 * (left + far), 0.5 * (top + bottom)
    held = page(session.view, axes, frame).unproject(np.array([x + right, y + down]))
    if not np.isfinite(held).all():
        return session.view
    return _centred(session, session.view, axes.centre, _settle(session.view, axes, frame, held, x, y))


def centred_on(session: Session, direction: Float) -> View:
    """Return the view centred on a direction (3,) on ICRS axes."""
    return _centred(session, session.view, None, direction)


def _settle(view: View, axes: Axes, frame: Rect, held: Float, x: float, y: float) -> Float:
    """Return the centre (3,) for which `held` lies at a pixel."""
    centre = axes.centre
    for _ in range(ROUNDS):
        there = page(view, axes, frame, centre).unproject(np.array([x, y]))
        if not np.isfinite(there).all():
            break
        moved = _turn(there, held, centre)
        if float(norm(moved - centre)) < CLOSE:
            break
        centre = moved
    return centre


def _turn(start: Float, end: Float, v: Float) -> Float:
    """Return v after the shortest rotation that brings `start` to `end`, all unit vectors (3,)."""
    axis = np.cross(start, end)
    c = float(start @ end)
    if c < -0.999999:
        return v
    return unit(v * c + np.cross(axis, v) + axis * (axis @ v) / (1.0 + c))


def _centred(session: Session, view: View, before: Float | None, centre: Float) -> View:
    """Return the view with a new centre, in the frame of the old; a chart that followed a body is let go."""
    if before is not None and float(norm(centre - before)) < CLOSE:
        return view
    name = view.centre.frame
    if view.centre.body is not None:
        name = "icrs" if view.up == "zenith" else view.up
    lon, lat = spherical(frames.from_icrs(centre, name, session.moment, session.site))
    # A tenth of a milliarcsecond: the session stays readable, and the picture does not move.
    return replace(view, centre=Centre(name, round(float(lon) / DEG, 8), round(float(lat) / DEG, 8)))
