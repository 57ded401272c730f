"""The names of frames: `PLANE[/KIND][/EQUINOX][@MODEL]`, parsed, checked for sense, printed in one canonical way."""

import math
import re
from dataclasses import dataclass

import erfa

from colure import precession
from colure.errors import FrameError, near_names
from colure.wording import one_line

PLANES = ("icrs", "gcrs", "cirs", "equator", "ecliptic", "galactic", "supergalactic", "invariable", "horizon")
KINDS = {
    "equator": ("mean", "true", "fk4", "fk4-no-e"),
    "ecliptic": ("mean", "true", "iau76", "sun"),
}
_DEFAULT_EQUINOX = {"fk4": "B1950", "fk4-no-e": "B1950", "iau76": "J2000", "sun": "date"}
_MODELLED_PLANES = ("cirs", "horizon")
_YEAR = re.compile(r"(?P<letter>[JB]?)(?P<year>[+-]?\d{1,6}(?:\.\d{0,12})?)", re.IGNORECASE | re.ASCII)
FIRST_YEAR, LAST_YEAR = precession.SPANS["vondrak2011"]


@dataclass(frozen=True, slots=True)
class Frame:
    """What a longitude and a latitude refer to: a plane, how it is meant, its equinox, and a model if one is forced.

    Make one with `Frame.parse`; `str()` gives the canonical name back, which parses to an equal Frame.
    """

    plane: str
    kind: str | None = None
    equinox: str | None = None
    model: str | None = None

    @classmethod
    def parse(cls, text: str) -> "Frame":
        """Return the frame that a name stands for; raise FrameError with what was expected and near names."""
        if not isinstance(text, str) or len(text) > 100:
            raise FrameError(f"frame '{one_line(str(text), 40)}': expected a name such as 'ecliptic/mean/J2000'")
        text = one_line(text, 100)
        body, at, model_text = text.replace("\u2212", "-").partition("@")
        parts = [part.strip() for part in body.split("/")]
        plane = parts[0].casefold()
        if plane not in PLANES:
            raise FrameError(f"frame '{text}': unknown plane '{parts[0]}'; {_expected(plane)}")
        if at and not model_text.strip():
            raise FrameError(f"frame '{text}': no model after '@'")
        model = _model(model_text.strip().casefold()) if at else None
        if plane not in KINDS:
            if len(parts) > 1:
                raise FrameError(f"frame '{text}': '{plane}' takes no kind and no equinox")
            return cls(plane, model=_allowed_model(text, plane, None, model))
        return cls._of_a_plane_of_date(text, plane, parts[1:], model)

    @classmethod
    def _of_a_plane_of_date(cls, text: str, plane: str, rest: list[str], model: str | None) -> "Frame":
        kinds = KINDS[plane]
        if not rest or (len(rest) == 1 and rest[0].casefold() == "date"):
            raise FrameError(
                f"frame '{text}': mean or true, and of which equinox? expected for example "
                f"'{plane}/mean/J2000' or '{plane}/true/date'"
            )
        kind = rest[0].casefold()
        if kind not in kinds:
            if len(rest) == 1 and _YEAR.fullmatch(kind):  # an equinox alone is that of a mean plane
                kind, rest = "mean", ["mean", rest[0]]
            else:
                raise FrameError(
                    f"frame '{text}': unknown kind '{rest[0]}'; expected {', '.join(kinds)}{near_names(kind, kinds)}"
                )
        if len(rest) > 2:
            raise FrameError(f"frame '{text}': too many parts; expected PLANE/KIND/EQUINOX[@MODEL]")
        given = rest[1] if len(rest) == 2 else _DEFAULT_EQUINOX.get(kind)
        if given is None:
            raise FrameError(f"frame '{text}': no equinox; expected 'date', 'J2000', 'B1950' or a year")
        equinox = _equinox(text, given)
        if kind == "iau76" and equinox != "J2000":
            raise FrameError(f"frame '{text}': 'ecliptic/iau76' exists for equinox J2000 only")
        if kind == "sun" and equinox != "date":
            raise FrameError(f"frame '{text}': 'ecliptic/sun' follows the Sun of date; expected 'ecliptic/sun/date'")
        if kind.startswith("fk4"):
            if equinox == "date":
                raise FrameError(f"frame '{text}': a catalogue system has a fixed equinox; expected such as 'B1950'")
            if not 1700.0 <= _year(equinox) <= 2100.0:
                raise FrameError(f"frame '{text}': FK4 is carried to equinoxes from 1700 to 2100 only")
        return cls(plane, kind, equinox, _allowed_model(text, plane, kind, model))

    def __str__(self) -> str:
        """Return the canonical name."""
        name = "/".join(part for part in (self.plane, self.kind, self.equinox) if part)
        return f"{name}@{self.model}" if self.model else name

    @property
    def is_rotation(self) -> bool:
        """Whether the frame is reached from ICRS axes by a rotation; only FK4 is not."""
        return self.kind not in ("fk4", "fk4-no-e")

    @property
    def needs_moment(self) -> bool:
        """Whether the frame's axes move with the moment."""
        return self.equinox == "date" or self.plane in ("cirs", "horizon")

    @property
    def needs_site(self) -> bool:
        """Whether the frame belongs to a site."""
        return self.plane == "horizon"

    @property
    def is_equatorial(self) -> bool:
        """Whether longitudes are right ascensions."""
        return self.plane in ("icrs", "gcrs", "cirs", "equator")

    def equinox_tt(self) -> tuple[float, float]:
        """Return the two-part TT of a fixed equinox; J2000 where the frame has none."""
        if self.equinox is None or self.equinox == "date":
            return precession.J2000, 0.0
        if self.equinox.startswith("B"):
            jd1, jd2 = erfa.epb2jd(_year(self.equinox))
        else:
            jd1, jd2 = precession.J2000, (_year(self.equinox) - 2000.0) * precession.YEAR
        return float(jd1), float(jd2)

    def besselian_year(self) -> float:
        """Return the equinox as a Besselian year (the measure of FK4)."""
        if self.equinox is not None and self.equinox.startswith("B"):
            return _year(self.equinox)
        return float(erfa.epb(*self.equinox_tt()))

    def label(self) -> str:
        """Return the frame in words, for charts and tables."""
        of = "of date" if self.equinox == "date" else _spoken(self.equinox)
        words = {
            ("icrs", None): "ICRS",
            ("gcrs", None): "GCRS",
            ("cirs", None): "intermediate equator and origin of date (CIRS)",
            ("galactic", None): "galactic",
            ("supergalactic", None): "supergalactic",
            ("invariable", None): "invariable plane",
            ("horizon", None): "horizon",
            ("equator", "mean"): f"mean equator and equinox {of}",
            ("equator", "true"): f"true equator and equinox {of}",
            ("equator", "fk4"): f"FK4, equator and equinox {of}",
            ("equator", "fk4-no-e"): f"FK4 without E-terms, equator and equinox {of}",
            ("ecliptic", "mean"): f"mean ecliptic and equinox {of}",
            ("ecliptic", "true"): f"mean ecliptic and true equinox {of}",
            ("ecliptic", "iau76"): "ecliptic J2000 of orbital elements (IAU 1976 obliquity)",
            ("ecliptic", "sun"): "ecliptic of date, longitude from the Sun",
        }[self.plane, self.kind]
        return f"{words} ({self.model})" if self.model else words


def _expected(plane: str) -> str:
    return f"expected one of {', '.join(PLANES)}{near_names(plane, PLANES)}"


def _model(name: str) -> str | None:
    return None if precession.check_model(name) == "auto" else name


def _allowed_model(text: str, plane: str, kind: str | None, model: str | None) -> str | None:
    if model is None:
        return None
    if kind not in ("mean", "true", "sun") and plane not in _MODELLED_PLANES:
        raise FrameError(f"frame '{text}': its axes are fixed by definition; no model can be forced")
    if model == "newcomb" and kind != "mean":
        raise FrameError(f"frame '{text}': model 'newcomb' has no nutation; expected kind 'mean'")
    return model


def _equinox(text: str, given: str) -> str:
    """Return an equinox in canonical spelling: `date`, `J2000`, `B1950`, or a bare year where it is negative."""
    if given.casefold() == "date":
        return "date"
    found = _YEAR.fullmatch(given)
    if found is None:
        raise FrameError(f"frame '{text}': equinox '{given}'; expected 'date', 'J2000', 'B1950' or a year")
    year = float(found["year"])
    if not (math.isfinite(year) and FIRST_YEAR <= year <= LAST_YEAR):
        raise FrameError(f"frame '{text}': equinox {given} is outside {FIRST_YEAR:.0f} to {LAST_YEAR:.0f}")
    digits = _digits(year)
    if found["letter"].upper() == "B":
        return f"B{digits}"
    return digits if year < 0 else f"J{digits}"


def _digits(year: float) -> str:
    """Return the shortest plain decimals that read back as the same year."""
    text = format(abs(year), ".12f").rstrip("0").rstrip(".")
    return f"-{text}" if year < 0 and float(text) != 0 else text


def _year(equinox: str) -> float:
    return float(equinox.lstrip("JB"))


def _spoken(equinox: str | None) -> str:
    if equinox is None:
        return ""
    return equinox if equinox[0] in "JB" else "\u2212" + equinox.removeprefix("-")
