"""The ledger: every step of one direction's reduction in order, with its size, direction, model and uncertainty.

`of` takes a target as `colure.lookup` finds it; `body`, `star`, `position` and `direction` take what they are named
for. All return a Ledger, which `colure.ledger.printing` writes as records, text, JSON and CSV.
"""

from collections.abc import Collection
from dataclasses import replace
from typing import Any

import numpy as np

from colure import lookup
from colure.arrays import Float
from colure.ephemeris import Ephemeris
from colure.errors import FrameError, TargetError
from colure.frames import Frame
from colure.ledger import build, given
from colure.ledger.build import body
from colure.ledger.entries import Entry, Ledger
from colure.ledger.given import Motion, upper
from colure.ledger.printing import as_csv, as_json, as_text, full_records, records
from colure.ledger.turns import omission
from colure.moment import Moment
from colure.reduction import GEOCENTRE, Observer, unapply
from colure.reduction.bodypath import check_place
from colure.stepnames import STEPS
from colure.targets import Target

__all__ = [
    "STEPS",
    "Entry",
    "Ledger",
    "Motion",
    "as_csv",
    "as_json",
    "as_text",
    "body",
    "direction",
    "full_records",
    "of",
    "omission",
    "position",
    "records",
    "star",
    "upper",
]


def star(row: int, moment: Moment, *, name: str | None = None, **asked: Any) -> Ledger:
    """Return the ledger of a star of the catalogue by its row; `asked` as for `body`."""
    return build.source(given.star(row, name), moment, **asked)


def position(
    lon_deg: float,
    lat_deg: float,
    source_frame: Frame | str,
    moment: Moment,
    *,
    epoch: Moment | None = None,
    motion: Motion | None = None,
    covariance: Float | None = None,
    name: str | None = None,
    kind: str = "position",
    seen: str | None = None,
    **asked: Any,
) -> Ledger:
    """Return the ledger of a position given in a frame, such as a catalogue has it; `asked` as for `body`.

    A position read at another place than the astrometric, such as a mount's, says so in `seen` ("apparent" or
    "observed", which is the default in `horizon`): it is first led back to where the light came from.

    `epoch` is that of the position (by default its equinox, J2000 without one). `covariance` (n, n), in mas, mas/yr
    and km/s, is of longitude (times cos lat), latitude, parallax, the two motions and the radial velocity: the first 2
    or 5 of them, all 6, or 4 without the parallax.
    """
    observer: Observer = asked.get("observer", GEOCENTRE)
    found = given.position(
        lon_deg,
        lat_deg,
        source_frame,
        moment,
        observer.site,
        epoch=epoch,
        motion=motion,
        covariance=covariance,
        name=name,
        kind=kind,
    )
    if seen is None:
        at_site = observer.origin == "site"
        seen = "astrometric" if found.frame.plane != "horizon" else "observed" if at_site else "apparent"
    return build.source(led_back(found, seen, moment, observer, asked.get("ephemeris")), moment, **asked)


def led_back(
    source: given.Source, seen: str, moment: Moment, observer: Observer, ephemeris: Ephemeris | None = None
) -> given.Source:
    """Return a source whose position was read at a place, led back to where its light came from."""
    check_place(seen, observer)
    if seen in ("geometric", "astrometric"):
        return source
    if source.velocity is not None or source.spread is not None:
        raise FrameError(f"a position seen at the {seen} place: takes no motion and no covariance")
    kernel: Any = ephemeris
    steps = build.star_steps(source, seen, observer)
    way = build.contexts(moment, observer, seen, source.epoch_jd, steps, kernel)
    back = unapply(way[-1], source.position[None, :])[0]
    return replace(source, position=back, seen=seen, seen_as=source.position)


def direction(
    vector: Float,
    moment: Moment,
    *,
    seen: str = "astrometric",
    name: str = "direction",
    sigma_arcsec: float | None = None,
    observer: Observer = GEOCENTRE,
    place: str | None = None,
    frame: Frame | str = "icrs",
    omitted: Collection[str] = (),
    ephemeris: Ephemeris | None = None,
) -> Ledger:
    """Return the ledger of a bare direction (3,) on ICRS axes, as a pointer has it: infinitely far and at rest.

    `seen` is the place at which the direction was read; it is first led back to where the light came from. The
    contexts of a moment are kept, so that a pointer on the move costs about a millisecond.
    """
    source = led_back(given.direction(vector, name, sigma_arcsec), seen, moment, observer, ephemeris)
    return build.source(
        source, moment, observer=observer, place=place, frame=frame, omitted=omitted, ephemeris=ephemeris
    )


def of(
    target: Target | str,
    moment: Moment,
    *,
    source_frame: str = "icrs",
    epoch: Moment | None = None,
    motion: Motion | None = None,
    covariance: Float | None = None,
    seen: str | None = None,
    **asked: Any,
) -> Ledger:
    """Return the ledger of a target or of a text that names one (a body, a star, an object, a point or a position).

    `source_frame` is that of a position typed without one. `epoch`, `motion`, `covariance` and `seen` belong to
    positions: TargetError where they come with something that has its own.
    """
    found = lookup.find(target, frame=source_frame) if isinstance(target, str) else target
    extra = {"epoch": epoch, "motion": motion, "covariance": covariance, "seen": seen}
    if found.kind in ("body", "star"):
        wrong = [name for name, value in extra.items() if value is not None]
        if wrong:
            raise TargetError(f"{wrong[0]}: belongs to a position; the {found.kind} '{found.name}' has its own")
        if found.kind == "body":
            return body(str(found.ref), moment, **asked)
        return star(int(found.ref), moment, name=found.name, **asked)
    if found.frame is None or found.lon_deg is None or found.lat_deg is None:
        raise TargetError(f"target '{found.name}': has no place of its own")
    return position(
        found.lon_deg,
        found.lat_deg,
        found.frame,
        moment,
        epoch=epoch,
        motion=motion,
        covariance=None if covariance is None else np.asarray(covariance),
        name=None if found.kind == "position" else found.name,
        kind=found.kind,
        seen=seen,
        **asked,
    )
