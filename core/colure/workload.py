"""How many stars a session would carry, judged before any is read, and the same session with fewer."""

from dataclasses import replace

import numpy as np

from colure.arrays import DEG
from colure.session import Session
from colure.sky_layers import limit_of

STARS_TO_8, GROWTH = 46_000, 0.45
"""Stars of the whole sky to V 8, and the growth of their number's logarithm in a magnitude (to V 12, roughly)."""

REACH = 1.35
"""Radius of the cone of stars kept ready, in widths of the map: its corners, and room to move in."""


def stars(session: Session) -> int:
    """Return about how many stars the chart of a session reads and reduces; good to a factor of two."""
    if not session.layers.stars:
        return 0
    return int(_share(session) * STARS_TO_8 * 10.0 ** (GROWTH * (limit_of(session.view) - 8.0)))


def lighter(session: Session, most: int) -> Session:
    """Return the session with a brighter magnitude limit where it would carry more than `most` stars."""
    count = stars(session)
    if count <= most:
        return session
    limit = round(limit_of(session.view) - float(np.log10(count / most)) / GROWTH, 1)
    return replace(session, view=replace(session.view, limit_mag=limit))


def _share(session: Session) -> float:
    """Return the part of the sky that stars are taken from."""
    radius = min(REACH * session.view.width_deg * DEG, np.pi)
    return float(0.5 * (1.0 - np.cos(radius)))
