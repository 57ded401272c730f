"""The frame that a written reference system and equinox stand for: FITS, VOTable and column names share these words."""

import re

import erfa

from colure.framenames import Frame
from colure.precession import J2000, YEAR

_YEAR = re.compile(r"(?P<letter>[JB]?)\s*(?P<year>[+-]?\d{1,4}(?:\.\d*)?)", re.IGNORECASE | re.ASCII)
FIRST, LAST = 1700.0, 2100.0
"""Equinoxes that modern files have; anything else is a slip of the pen."""


def year_of(text: str) -> tuple[str, float] | None:
    """Return the letter (J, B or none) and the year of a text such as `J2000.0`, or None where it holds no year."""
    found = _YEAR.fullmatch(text.strip().strip("'\""))
    return None if found is None else (found["letter"].upper(), float(found["year"]))


def julian_epoch(letter: str, year: float) -> float:
    """Return a year as a Julian one; a letter B says that it is Besselian."""
    if letter != "B":
        return year
    jd1, jd2 = erfa.epb2jd(year)
    return float(2000.0 + ((jd1 - J2000) + jd2) / YEAR)


def julian_year_of_mjd(mjd: float) -> float:
    """Return the Julian year of a modified Julian date (TT; UTC differs by 2e-6 of a year)."""
    return 2000.0 + (mjd + 2400000.5 - J2000) / YEAR


def digits(year: float) -> str:
    """Return a year without needless zeros."""
    return f"{year:.10f}".rstrip("0").rstrip(".")


def equatorial(system: str, year: float) -> str:
    """Return the frame of `FK4`, `FK4-NO-E` or `FK5` at an equinox: Besselian for FK4, Julian for FK5.

    FK5 is a frame of its own: its axes as Hipparcos found them, precessed by the model it is defined with, IAU 1976.
    """
    if system == "FK5":
        return str(Frame.parse(f"equator/mean/J{digits(year)}@iau1976"))
    kind = "fk4" if system == "FK4" else "fk4-no-e"
    return str(Frame.parse(f"equator/{kind}/B{digits(year)}"))


def ecliptic(system: str, year: float) -> str:
    """Return the mean ecliptic that belongs to `ICRS`, `FK5` or `FK4`, at an equinox."""
    if system == "ICRS":
        return str(Frame.parse(f"ecliptic/mean/J{digits(year)}"))
    if system == "FK5":
        return str(Frame.parse(f"ecliptic/mean/J{digits(year)}@iau1976"))
    return str(Frame.parse(f"ecliptic/mean/B{digits(year)}@newcomb"))
