"""The frame of a FITS header's celestial axes by the rules of FITS 4.0, with the rule that decided in words."""

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from colure import calendars
from colure.errors import ColureError
from colure.overlays.systems import FIRST, LAST, digits, ecliptic, equatorial, julian_year_of_mjd, year_of
from colure.wording import one_line

SYSTEMS = ("ICRS", "FK5", "FK4", "FK4-NO-E", "GAPPT")
"""Values of RADESYS in FITS 4.0, table 25."""
FK5_FROM = 1984.0
"""An EQUINOX without RADESYS is FK4 before this year and FK5 from it on (FITS 4.0, section 8.3)."""

PAIRS = {
    ("RA", "DEC"): "equatorial",
    ("ELON", "ELAT"): "ecliptic",
    ("GLON", "GLAT"): "galactic",
    ("SLON", "SLAT"): "supergalactic",
}
"""Celestial axes of FITS 4.0, table 23, that a frame of the sky can be named for."""

_ISO = re.compile(r"(\d{4})-(\d{2})-(\d{2})(?:[T ](\d{2}):(\d{2})(?::(\d{2}(?:\.\d*)?))?)?Z?", re.ASCII)
_OLD = re.compile(r"(\d{2})/(\d{2})/(\d{2})", re.ASCII)


@dataclass(frozen=True, slots=True)
class Ruling:
    """What a header's axes are.

    `frame` is None where the header does not say it and a user must; `rule` is the sentence that decided; `doubts` are
    lines about what is missing, obsolete or contradictory. `epoch` is the Julian year of the exposure, or None.
    """

    frame: str | None
    rule: str
    doubts: tuple[str, ...] = ()
    epoch: float | None = None
    epoch_rule: str = ""


def decide(cards: Mapping[str, Any], axes: str = "equatorial", alternate: str = "") -> Ruling:
    """Return the frame of the celestial axes of a header given as keyword → value.

    `axes` is one of the values of PAIRS; `alternate` the letter of an alternate description.
    """
    doubts: list[str] = []
    epoch, epoch_rule = exposure(cards)
    system = _system(cards, alternate, doubts)
    equinox = _equinox(cards, alternate, doubts)
    if axes in ("galactic", "supergalactic"):
        rule = f"axes {'GLON, GLAT' if axes == 'galactic' else 'SLON, SLAT'}: {axes} coordinates need no RADESYS"
        return Ruling(axes, rule, tuple(doubts), epoch, epoch_rule)
    chosen, year, rule = _chosen(system, equinox, doubts)
    if chosen == "GAPPT":
        if epoch is None:
            rule = "RADESYS GAPPT (apparent place of date), but no MJD-OBS or DATE-OBS: of which date?"
            return Ruling(None, rule, tuple(doubts), None, "")
        doubts.append("GAPPT: the aberration in these positions is not removed; they can be off by 20″")
        plane = "equator" if axes == "equatorial" else "ecliptic"
        frame = f"{plane}/true/J{digits(epoch)}"
    elif axes == "ecliptic":
        if chosen.startswith("FK4"):
            doubts.append("ELON, ELAT of FK4: drawn on Newcomb's ecliptic without the E-terms, which are below 0.35″")
        frame = ecliptic(chosen.removesuffix("-NO-E"), year)
    else:
        frame = "icrs" if chosen == "ICRS" else equatorial(chosen, year)
    return Ruling(frame, rule, tuple(doubts), epoch, epoch_rule)


def _chosen(system: str | None, equinox: float | None, doubts: list[str]) -> tuple[str, float, str]:
    """Return system, equinox and the rule (FITS 4.0, section 8.3) for what was read of RADESYS and EQUINOX."""
    if system is None and equinox is None:
        doubts.append("the header has neither RADESYS nor EQUINOX: ICRS is only the default of the standard")
        return "ICRS", 2000.0, "no RADESYS, no EQUINOX: ICRS by default (FITS 4.0, 8.3)"
    if system is None:
        assert equinox is not None
        found = "FK4" if equinox < FK5_FROM else "FK5"
        side = "before" if equinox < FK5_FROM else "from"
        return (
            found,
            equinox,
            f"EQUINOX {digits(equinox)} without RADESYS: {found}, as it is {side} 1984 (FITS 4.0, 8.3)",
        )
    if system in ("ICRS", "GAPPT"):
        if equinox is not None and not (system == "ICRS" and equinox == 2000.0):
            doubts.append(
                f"RADESYS {system} and EQUINOX {digits(equinox)} contradict each other: {system} has no equinox; "
                "RADESYS is followed"
            )
        return system, 2000.0, f"RADESYS {system}"
    if equinox is None:
        year = 2000.0 if system == "FK5" else 1950.0
        return system, year, f"RADESYS {system} without EQUINOX: {digits(year)} by default (FITS 4.0, 8.3)"
    if (system == "FK5") == (equinox < FK5_FROM):
        usual = "FK4" if equinox < FK5_FROM else "FK5"
        doubts.append(
            f"RADESYS {system} with EQUINOX {digits(equinox)}: allowed, but {usual} is usual; taken as written"
        )
    return system, equinox, f"RADESYS {system}, EQUINOX {digits(equinox)}"


def _text(value: Any) -> str:
    return one_line(str(value), 30)


def _system(cards: Mapping[str, Any], alternate: str, doubts: list[str]) -> str | None:
    """Return the reference system named by RADESYS, or by its obsolete form RADECSYS, or None."""
    named = {key: str(cards[key]).strip().upper() for key in (f"RADESYS{alternate}", "RADECSYS") if cards.get(key)}
    named = {key: value for key, value in named.items() if value}
    for key, value in list(named.items()):
        if value in ("FK4_NO_E", "FK4-NOE", "FK4NOE"):
            named[key] = "FK4-NO-E"
        elif value not in SYSTEMS:
            doubts.append(f"{key} '{_text(value)}' is no reference system; expected {', '.join(SYSTEMS)}; left out")
            del named[key]
    if len(named) == 2 and len(set(named.values())) == 2:
        new, old = named[f"RADESYS{alternate}"], named["RADECSYS"]
        doubts.append(
            f"RADESYS {new} and RADECSYS {old} contradict each other; RADESYS is followed, the other is obsolete"
        )
    elif list(named) == ["RADECSYS"]:
        doubts.append("RADECSYS is obsolete; read as RADESYS")
    return next(iter(named.values()), None)


def _equinox(cards: Mapping[str, Any], alternate: str, doubts: list[str]) -> float | None:
    """Return the year of EQUINOX, or of its obsolete form EPOCH, or None."""
    new, old = _year(cards, f"EQUINOX{alternate}", doubts), None
    if "EPOCH" in cards and not alternate:
        quiet: list[str] = []
        old = _year(cards, "EPOCH", quiet)
        if new is None:
            doubts += quiet
            if old is not None:
                doubts.append("EPOCH is obsolete; read as EQUINOX")
        elif old is not None and old != new:
            doubts.append(
                f"EQUINOX {digits(new)} and EPOCH {digits(old)} contradict each other; EQUINOX is followed "
                "(FITS 4.0, 8.3), EPOCH may be the date of the exposure"
            )
    return old if new is None else new


def _year(cards: Mapping[str, Any], key: str, doubts: list[str]) -> float | None:
    value = cards.get(key)
    if value is None or isinstance(value, bool):
        return None
    if isinstance(value, str):
        found = year_of(value)
        if found is None:
            if value.strip():
                doubts.append(f"{key} is the text '{_text(value)}'; expected a year as a number; left out")
            return None
        doubts.append(f"{key} is the text '{_text(value)}'; expected a number; read as {digits(found[1])}")
        if (found[0] == "J") == (found[1] < FK5_FROM) and found[0]:
            doubts.append(
                f"{key}: the letter {found[0]} and the year {digits(found[1])} do not belong together usually"
            )
        year = found[1]
    else:
        try:
            year = float(value)
        except (TypeError, ValueError, OverflowError):
            return None
    if not (math.isfinite(year) and FIRST <= year <= LAST):
        doubts.append(f"{key} {_text(value)} is no year from {FIRST:g} to {LAST:g}; left out")
        return None
    return year


def exposure(cards: Mapping[str, Any]) -> tuple[float | None, str]:
    """Return the Julian year of an exposure and the keyword it is from; the middle where that is given."""
    for key in ("MJD-AVG", "DATE-AVG", "MJD-OBS", "DATE-OBS", "MJD-BEG", "DATE-BEG"):
        value = cards.get(key)
        if key.startswith("MJD"):
            if isinstance(value, int | float) and not isinstance(value, bool) and 1.0 < value < 1e5:
                return julian_year_of_mjd(float(value)), key
        elif isinstance(value, str) and (year := _date(value)) is not None:
            return year, key
    value = cards.get("JEPOCH")
    if isinstance(value, int | float) and not isinstance(value, bool) and FIRST <= value <= LAST:
        return float(value), "JEPOCH"
    return None, ""


def _date(text: str) -> float | None:
    """Return the Julian year of a date in ISO 8601 or, before 2000, as DD/MM/YY."""
    text = text.strip()
    found, old = _ISO.fullmatch(text), _OLD.fullmatch(text)
    hours = 0.0
    if found:
        year, month, day = (int(part) for part in found.group(1, 2, 3))
        hours = float(found[4] or 0) + float(found[5] or 0) / 60.0 + float(found[6] or 0) / 3600.0
    elif old:
        day, month, year = (int(part) for part in old.groups())
        year += 1900
    else:
        return None
    try:
        number = calendars.day_number(np.asarray(year), np.asarray(month), np.asarray(day), "gregorian")
    except ColureError:
        return None
    # Day numbers begin at noon, dates at midnight.
    return julian_year_of_mjd(float(number) - 2400001.0 + hours / 24.0)
