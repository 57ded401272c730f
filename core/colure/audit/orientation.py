"""Position angles, offsets and rates: which north, which hand, which factor (lists A10, A11 and F)."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from colure import frames
from colure.arrays import DEG, Float, norm, position_angle
from colure.audit.reference import Stars
from colure.errors import AngleError
from colure.moment import Moment
from colure.reduction import Observer, observer_state
from colure.sites import Site


@dataclass(frozen=True, slots=True)
class View:
    """Where an image or an offset is: ICRS directions `place` (n, 3), moments (n,) or one, a site if there is one."""

    place: Float
    moment: Moment | None = None
    site: Site | None = None

    @classmethod
    def of(cls, stars: Stars, moment: Moment | None = None, site: Site | None = None) -> "View":
        """Return the view of fixed points or stars."""
        if moment is not None and moment.shape == ():
            moment = moment[None]
        years = 2000.0 if moment is None else moment.julian_year
        place = stars.direction(years)
        return cls(place / norm(place)[:, None], moment, site)


@dataclass(frozen=True, slots=True)
class Turn:
    """One hypothesis on an image or an offset: key, codes, words and the number of mistakes."""

    key: str
    codes: tuple[str, ...]
    words: str
    steps: int

    @property
    def code(self) -> str:
        """The codes joined."""
        return "+".join(self.codes) or "as claimed"


@dataclass(frozen=True, slots=True)
class TurnPredictions:
    """Hypotheses (h) on n images or offsets, with the distance of the numbers from each, in σ (h, n).

    `predicted` holds the predicted position angles in degrees (h, n), or the offsets (h, n, 2).
    """

    hypotheses: tuple[Turn, ...]
    predicted: Float
    n_sigma: Float


def poles(view: View) -> tuple[tuple[str, str, str, Float], ...]:
    """Return the norths that an angle may be counted from: key, code, words, and their angle (n,) from ICRS's."""
    found = [("north", "", "from celestial north (ICRS)", np.zeros(len(view.place)))]
    moment = view.moment

    def north_of(key: str, code: str, words: str, frame: str) -> None:
        matrix = frames.rotation(frame, moment).matrix
        pole = np.broadcast_to(matrix[..., 2, :], view.place.shape)
        found.append((key, code, words, position_angle(view.place, pole)))

    if moment is not None:
        north_of("date", "F5", "from celestial north of date", "equator/true/date")
    north_of("b1950", "F5", "from celestial north of B1950", "equator/mean/B1950")
    north_of("ecliptic", "F6", "from ecliptic north", "ecliptic/mean/J2000")
    if moment is not None and view.site is not None:
        zenith = observer_state(Observer("site", view.site), moment).zenith
        assert zenith is not None
        found.append(
            ("zenith", "F7", "from the zenith", position_angle(view.place, np.broadcast_to(zenith, view.place.shape)))
        )
    return tuple(found)


_HANDS: tuple[tuple[str, str, str, float, float, bool], ...] = (
    # key, code, words, factor of the angle, degrees added, whether the image's hand is changed
    ("", "", "", 1.0, 0.0, False),
    ("mirrored", "F1", "image mirrored", -1.0, 0.0, True),
    ("upside-down", "F2", "turned by 180°", 1.0, 180.0, False),
    ("quarter", "F3", "turned by 90° (width for height)", 1.0, 90.0, False),
    ("quarter-back", "F3", "turned by −90° (width for height)", 1.0, -90.0, False),
    ("sign", "F4", "counted from north through west", -1.0, 0.0, False),
)


def position_angles(
    pa_deg: Float | float,
    half_deg: Float | float,
    reference_deg: Float | float,
    view: View,
    *,
    mirrored: bool | None = None,
) -> TurnPredictions:
    """Return what every hypothesis on position angles (n,) says, given the true ones, north (ICRS) through east.

    `mirrored` says whether the image's hand was found to be the opposite of the reference's; None where it is not
    known, and a mirrored image and a reversed sign are then one and the same.
    """
    pa, half, true = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(v, dtype=np.float64)) for v in (pa_deg, half_deg, reference_deg))
    )
    if not (np.all(np.isfinite(pa)) and np.all(np.isfinite(true)) and np.all(half > 0.0)):
        raise AngleError("audit of position angles: expected finite angles and a rounding above zero")
    turns, rows, sigma = [], [], []
    for hand, hand_code, hand_words, factor, added, changes in _HANDS:
        if mirrored is None and hand == "sign":
            continue
        for pole, pole_code, pole_words, angle in poles(view):
            words = f"position angle {pole_words}" + (f", {hand_words}" if hand else "")
            if mirrored is None and hand == "mirrored":
                words += " (or counted through west)"
            codes = tuple(code for code in (hand_code, pole_code) if code)
            turns.append(Turn(f"{hand}|{pole}", codes, words, len(codes)))
            predicted = (factor * (true - angle / DEG) + added) % 360.0
            rows.append(np.broadcast_to(predicted, pa.shape))
            off = np.abs((pa - predicted + 180.0) % 360.0 - 180.0) / half
            wrong_hand = mirrored is not None and changes != mirrored
            sigma.append(np.full(pa.shape, np.inf) if wrong_hand else np.broadcast_to(off, pa.shape))
    return TurnPredictions(tuple(turns), np.stack(rows), np.stack(sigma))


def offsets(
    east: Float | float,
    north: Float | float,
    half: Float | float,
    reference: Sequence[Float | float],
    view: View,
) -> TurnPredictions:
    """Return what every hypothesis on offsets or rates (n,) says, in any one unit.

    `reference` is the true pair: along right ascension, times the cosine of the declination, and along declination.
    """
    dx, dy, sigma = np.broadcast_arrays(*(np.atleast_1d(np.asarray(v, dtype=np.float64)) for v in (east, north, half)))
    rx, ry = (np.broadcast_to(np.asarray(part, dtype=np.float64), dx.shape) for part in reference)
    if not (np.all(np.isfinite(dx + dy + rx + ry)) and np.all(sigma > 0.0)):
        raise AngleError("audit of offsets: expected finite numbers and a rounding above zero")
    cos_lat = np.broadcast_to(np.hypot(view.place[:, 0], view.place[:, 1]), dx.shape)
    plain = [
        ("", (), "as claimed", rx, ry),
        ("time", ("A10",), "seconds of time along right ascension, read as arcseconds", rx / (15.0 * cos_lat), ry),
        ("time-cos", ("A10",), "seconds of time times cos δ, read as arcseconds", rx / 15.0, ry),
        ("fifteen", ("A10",), "multiplied by 15 once too often along right ascension", rx * 15.0, ry),
        ("fifteen-cos", ("A10", "A11"), "multiplied by 15 once too often, without cos δ", rx * 15.0 / cos_lat, ry),
        ("no-cos", ("A11",), "without cos δ along right ascension", rx / cos_lat, ry),
        ("cos-twice", ("A11",), "with cos δ twice along right ascension", rx * cos_lat, ry),
        ("mirrored", ("F1",), "east and west interchanged", -rx, ry),
        ("upside-down", ("F2",), "turned by 180° (the wrong way round)", -rx, -ry),
        ("quarter", ("F3",), "turned by 90°", ry, -rx),
        ("quarter-back", ("F3",), "turned by −90°", -ry, rx),
        ("south", ("F2",), "north and south interchanged", rx, -ry),
        ("swapped", ("A6",), "the two components are swapped", ry, rx),
    ]
    for pole, code, words, angle in poles(view)[1:]:
        c, s = np.cos(angle), np.sin(angle)
        plain.append((pole, (code,), f"measured {words}", rx * c - ry * s, rx * s + ry * c))
    turns = tuple(Turn(key, codes, words, len(codes)) for key, codes, words, *_ in plain)
    predicted = np.stack([np.stack([x, y], axis=-1) for *_, x, y in plain])
    distance = np.hypot((dx - predicted[..., 0]) / sigma, (dy - predicted[..., 1]) / sigma)
    return TurnPredictions(turns, predicted, distance)
