"""What a ledger is made of: its entries, one for each step, with the figures that follow from the directions."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from colure.arrays import ARCSEC, DEG, Float, dot, norm, position_angle, spherical
from colure.moment import Moment
from colure.reduction import Observer


@dataclass(frozen=True, slots=True, eq=False)
class Stage:
    """A step as it is found, before its figures: components (3,) before and after it on the axes that it ends in.

    `arrow` (2, 3) are unit vectors on ICRS axes: where the direction would be read without the step, and where with it.
    `frame` names the axes after the step, `equatorial` says whether their longitudes are right ascensions.
    """

    step: str
    frame: str
    equatorial: bool
    before: Float | None
    after: Float
    arrow: Float
    model: str
    omitted: bool = False
    matrix: Float | None = None
    covariance: Float | None = None
    on_axes: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class Entry:
    """One line of a ledger.

    `lon_deg` and `lat_deg` are the direction after the step in `frame`. `size_arcsec` is the angle between what would
    be read without the step and with it, `pa_deg` its position angle from the north of the axes before the step,
    through growing longitude; both NaN for the first line. `uncertainty_arcsec` is 1σ of this step alone (NaN:
    unknown), `source` what it rests on. `matrix` (3, 3) of a turn takes components before to components after;
    `arrow` (2, 3) is the step on the sky, ICRS axes; `covariance` (2, 2), arcsec², of Δlon cos lat and Δlat after it.
    """

    step: str
    frame: str
    equatorial: bool
    lon_deg: float
    lat_deg: float
    size_arcsec: float
    pa_deg: float
    model: str
    uncertainty_arcsec: float
    source: str
    omitted: bool
    components: Float
    arrow: Float
    matrix: Float | None = None
    covariance: Float | None = None

    @property
    def is_turn(self) -> bool:
        """Whether the step changes the axes and not the direction."""
        return self.matrix is not None


@dataclass(frozen=True, slots=True, eq=False)
class Ledger:
    """The ordered steps of one direction to the place and frame asked for.

    `direction` (3,) is the end on ICRS axes, `vector` (3,) its components in `frame`. `given` says how the position
    was given (epoch, motion), `omitted` which steps were left out.
    """

    target: str
    kind: str
    moment: Moment
    observer: Observer
    place: str
    frame: str
    entries: tuple[Entry, ...]
    direction: Float
    vector: Float
    omitted: frozenset[str] = frozenset()
    given: dict[str, Any] = field(default_factory=dict)

    def __getitem__(self, step: str) -> Entry:
        """Return the entry of a step by its name."""
        for entry in self.entries:
            if entry.step == step:
                return entry
        raise KeyError(step)

    @property
    def steps(self) -> tuple[str, ...]:
        """The names of the steps in order."""
        return tuple(entry.step for entry in self.entries)

    @property
    def lon_deg(self) -> float:
        """Longitude of the end, degrees."""
        return self.entries[-1].lon_deg

    @property
    def lat_deg(self) -> float:
        """Latitude of the end, degrees."""
        return self.entries[-1].lat_deg

    @property
    def uncertainty_arcsec(self) -> float:
        """1σ of the end: the steps' own, as if independent; steps of unknown uncertainty are not in it."""
        return float(np.sqrt(np.nansum([entry.uncertainty_arcsec**2 for entry in self.entries])))

    @property
    def has_unknown(self) -> bool:
        """Whether a step's uncertainty is not known, so that the sum is a lower bound."""
        return any(entry.uncertainty_arcsec != entry.uncertainty_arcsec for entry in self.entries)


def measured(stages: Sequence[Stage]) -> tuple[Float, Float, Float, Float]:
    """Return sizes (arcsec), position angles, longitudes and latitudes (degrees), each (n,), of stages, in one call."""
    after = np.array([stage.after for stage in stages])
    before = np.array([stage.after if stage.before is None else stage.before for stage in stages])
    gap = np.cross(before, after)
    size = np.arctan2(norm(gap), dot(before, after)) / ARCSEC
    angle = position_angle(before, after) / DEG
    angle[size < 1e-9] = np.nan  # rounding has no direction
    lon, lat = spherical(after)
    return size, angle, lon / DEG, lat / DEG


def entry(stage: Stage, figures: tuple[Any, Any, Any, Any], doubt: tuple[float, str]) -> Entry:
    """Return the entry of a stage with its figures and its doubt."""
    size, angle, lon, lat = (float(figure) for figure in figures)
    if stage.before is None:
        size, angle = np.nan, np.nan
    return Entry(
        stage.step,
        stage.frame,
        stage.equatorial,
        lon,
        lat,
        size,
        angle,
        stage.model,
        *doubt,
        stage.omitted,
        stage.after,
        stage.arrow,
        stage.matrix,
        stage.covariance,
    )
