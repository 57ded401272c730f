"""How far every frame's numbers are from those of a chosen one, and where its north is, as texts for a table."""

from dataclasses import dataclass

import numpy as np

from colure import everyframe, pointing
from colure.angles import MINUS, UNKNOWN, format_degrees
from colure.arrays import Float
from colure.errors import ColureError
from colure.ledger.printing import size_text
from colure.pointing import Pointed
from colure.reduction import reduce_bodies
from colure.session import Session
from colure.sky import observer_of

MINUTE = 1.0 / 1440.0


@dataclass(frozen=True, slots=True)
class Line:
    """A frame with its differences in longitude (times cos lat) and latitude, the others in its tip."""

    frame: str
    lon: str
    lat: str
    tip: str


def motion(pointed: Pointed, session: Session) -> Float | None:
    """Return where a body goes on the sky (3,), on ICRS axes; None for what stands still."""
    if pointed.kind != pointing.BODIES:
        return None
    later = session.moment.shifted(MINUTE)
    try:
        seen = reduce_bodies((pointed.name.casefold(),), later, observer=observer_of(session), place=session.place)
    except ColureError:
        return None
    return np.asarray(seen.vectors[0] - pointed.vector)


def lines(pointed: Pointed, session: Session, chosen: str, also: tuple[str, ...]) -> tuple[Line, ...]:
    """Return every frame's differences from a chosen one; what the chosen frame refuses is raised."""
    sigma = max(pointed.sigma_arcsec, 1e-3)
    rows = everyframe.differences(
        pointed.vector, session.moment, chosen, site=session.site, motion=motion(pointed, session), also=also
    )
    try:
        among = tuple(row.frame for row in rows)
        norths = everyframe.norths(pointed.vector, session.moment, source=chosen, site=session.site, among=among)
        turns = {one.frame: one.pa_deg for one in norths}
    except ColureError:
        turns = {}

    def text(arcsec: float) -> str:
        if arcsec != arcsec:
            return UNKNOWN
        size = size_text(abs(arcsec), sigma)
        if not any(digit in size for digit in "123456789"):
            return size  # nothing has no sign
        return (MINUS if arcsec < 0.0 else "+") + size

    out = []
    for row in rows:
        tip = [row.label]
        if row.fault:
            tip.append(row.fault)
        else:
            tip.append(f"its numbers, read as {chosen}, are off by {size_text(row.size_arcsec, sigma)}")
            tip.append(f"Δα cos δ {text(row.dra_arcsec)}, Δδ {text(row.ddec_arcsec)} (equator of J2000)")
            tip.append(f"Δλ cos β {text(row.dlam_arcsec)}, Δβ {text(row.dbeta_arcsec)} (ecliptic of J2000)")
            if row.along_arcsec == row.along_arcsec:
                tip.append(f"along the motion {text(row.along_arcsec)}, across {text(row.across_arcsec)}")
            if row.frame in turns and turns[row.frame] == turns[row.frame]:
                angle = format_degrees(round(turns[row.frame], 3) % 360.0, 3)
                tip.append(f"position angle 0° of {chosen} is {angle} from its north")
        out.append(Line(row.frame, text(row.dlon_arcsec), text(row.dlat_arcsec), "\n".join(tip)))
    return tuple(out)
