"""An instant, or an array of instants, held as a two-part Julian date of TT and shown in UTC, UT1, TT or TDB."""

import math
import time
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from typing import Any, TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

from colure import calendars, deltat, leapseconds, moment_text, orientation, timescales
from colure.arrays import Bool, Float
from colure.errors import MomentError
from colure.tdb import tdb_minus_tt
from colure.wording import one_line

SCALES = ("UTC", "UT1", "TT", "TDB")
FIRST_JD = -104826.5
LAST_JD = 3547272.5
"""Moments run from −4999-01-01 (Julian) up to 5000-01-01 (Gregorian): ΔT is uncertain by hours there."""
DAY = 86400.0
_J2000 = 2451545.0

T = TypeVar("T")


@dataclass(frozen=True, slots=True, eq=False)
class Moment:
    """TT Julian date `tt1 + tt2`, floats or arrays of one shape, with the scale and calendar it is to be shown in.

    `tt1` is a midnight (ends in .5) and 0 ≤ `tt2` < 1. Raises MomentError for what is not finite or lies outside the
    years −4999 to 4999. `scale` UTC falls back to UT1 in print where there is no UTC. Equal when all four are equal.
    """

    tt1: Float | float
    tt2: Float | float = 0.0
    scale: str = "UTC"
    calendar: str = "mixed"
    _found: dict[str, Any] = field(default_factory=dict, init=False, repr=False)

    def __post_init__(self) -> None:
        """Normalise the two parts and check them."""
        if self.scale not in SCALES:
            raise MomentError(f"time scale '{self.scale}': unknown; expected one of {', '.join(SCALES)}")
        if self.calendar not in calendars.CALENDARS:
            raise MomentError(f"calendar '{self.calendar}': unknown; expected {', '.join(calendars.CALENDARS)}")
        tt1, tt2 = self.tt1, self.tt2
        if isinstance(tt1, float | int) and isinstance(tt2, float | int):
            if not FIRST_JD <= tt1 + tt2 < LAST_JD:
                raise _outside(float(tt1 + tt2))
            day = math.floor(tt1 - 0.5) + 0.5
            part = (tt1 - day) + tt2
            whole = math.floor(part)
            object.__setattr__(self, "tt1", float(day + whole))
            object.__setattr__(self, "tt2", float(part - whole))
            return
        j1, j2 = np.broadcast_arrays(np.asarray(tt1, dtype=np.float64), np.asarray(tt2, dtype=np.float64))
        total = j1 + j2
        bad = ~((total >= FIRST_JD) & (total < LAST_JD))
        if np.any(bad):
            raise _outside(float(total[bad].flat[0]))
        days = np.floor(j1 - 0.5) + 0.5
        parts = np.asarray((j1 - days) + j2)
        wholes = np.floor(parts)
        if days.ndim == 0:
            object.__setattr__(self, "tt1", float(days + wholes))
            object.__setattr__(self, "tt2", float(parts - wholes))
            return
        for name, value in (("tt1", days + wholes), ("tt2", parts - wholes)):
            value.flags.writeable = False
            object.__setattr__(self, name, value)

    # Making

    @classmethod
    def parse(cls, text: str, *, now: "Moment | None" = None) -> "Moment":
        """Return the moment that a text names; `now` stands in for the clock.

        ISO 8601 with signed years, then an optional scale and calendar; `JD …`, `MJD …`, `J2000.0`, `B1950.0`, `now`.
        Without a scale: UTC where it exists, else UT1. Raises MomentError with the reason.
        """
        parts = moment_text.parse(text)
        calendar = parts.calendar or "mixed"
        try:
            match parts.kind:
                case "now":
                    moment = now if now is not None else cls.now()
                    return replace(moment, scale=parts.scale or moment.scale, calendar=calendar)
                case "epoch":
                    if parts.scale not in (None, "TT", "TDB"):
                        raise MomentError(f"an epoch is in TT or TDB, not in {parts.scale}")
                    return cls.from_jd(parts.day, parts.part, parts.scale or "TT", calendar)
                case "jd":
                    scale = parts.scale or timescales.scale_at(round(parts.day + parts.part - 2400001.0))
                    return cls.from_jd(parts.day, parts.part, scale, calendar)
            number = int(calendars.day_number(parts.year, parts.month, parts.day_of_month, calendar))
            return cls._from_days(number, parts.seconds, parts.scale, calendar, parts.offset)
        except MomentError as fault:
            message = str(fault)
            raise MomentError(
                message if message.startswith("moment") else f"moment '{one_line(text)}': {message}"
            ) from None

    @classmethod
    def from_jd(
        cls, jd1: Float | float, jd2: Float | float = 0.0, scale: str = "TT", calendar: str = "mixed"
    ) -> "Moment":
        """Return the moment of a two-part Julian date in `scale`, shown in that scale.

        A Julian date of UTC counts days that may have 86401 s (the "quasi-JD" of the SOFA library).
        """
        if scale == "TT":
            return cls(jd1, jd2, "TT", calendar)
        at = cls(jd1, jd2, scale, calendar)  # normalised as if it were TT
        if scale == "TDB":
            return cls(at.tt1, at.tt2 - tdb_minus_tt(at.tt1, at.tt2) / DAY, scale, calendar)
        if scale == "UT1":
            return cls(at.tt1, timescales.ut1_to_tt(at.tt1, at.tt2), scale, calendar)
        mjd = np.rint(np.asarray(at.tt1) - 2400000.5).astype(np.int64)
        timescales.refuse_utc(mjd)
        seconds = np.asarray(at.tt2) * leapseconds.day_length(mjd)
        tt1, tt2 = leapseconds.join_tt(mjd, seconds)
        return cls(tt1, tt2, scale, calendar)

    @classmethod
    def from_civil(
        cls,
        year: ArrayLike,
        month: ArrayLike = 1,
        day: ArrayLike = 1,
        hour: ArrayLike = 0,
        minute: ArrayLike = 0,
        second: ArrayLike = 0.0,
        *,
        scale: str | None = None,
        calendar: str = "mixed",
    ) -> "Moment":
        """Return the moment(s) of calendar dates and clock times, arrays broadcast.

        Without a scale: UTC if all of them are where UTC exists, else UT1. A second of 60 is taken only in the
        minute before a leap second of UTC.
        """
        number = calendars.day_number(year, month, day, calendar)
        for what, value, end in (("hour", hour, 24), ("minute", minute, 60), ("second", second, 61)):
            array = np.asarray(value, dtype=np.float64)
            bad = ~((array >= 0) & (array < end))
            if np.any(bad):
                raise MomentError(f"{what} {array[bad].flat[0]:g}: expected 0 to below {end}")
        seconds = 3600.0 * np.asarray(hour) + 60.0 * np.asarray(minute) + np.asarray(second, dtype=np.float64)
        return cls._from_days(number, seconds, scale, calendar, leap=np.asarray(second, dtype=np.float64) >= 60.0)

    @classmethod
    def _from_days(
        cls,
        number: Any,
        seconds: Any,
        scale: str | None,
        calendar: str,
        offset: float = 0.0,
        leap: Any = None,
    ) -> "Moment":
        """Return moments of day numbers and seconds of the day; `offset` is the local clock ahead of UTC in s."""
        mjd = np.asarray(number) - 2400001
        clock = np.asarray(seconds, dtype=np.float64)
        is_leap = clock >= DAY if leap is None else leap
        if offset:
            clock = clock - offset
            shift = np.floor(clock / DAY).astype(np.int64)
            mjd, clock = mjd + shift, clock - shift * DAY
        scale = scale or timescales.scale_at(mjd)
        if scale == "UTC":
            timescales.refuse_utc(mjd)
            length = np.asarray(leapseconds.day_length(mjd))
            wrong = is_leap & ((clock < DAY) | (clock >= length))
            if np.any(wrong):
                raise MomentError("second 60: no leap second was inserted there")
            tt1, tt2 = leapseconds.join_tt(mjd, clock)
            return cls(np.asarray(tt1), np.asarray(tt2), scale, calendar)
        if np.any(is_leap):
            raise MomentError(f"second 60: only UTC has leap seconds, not {'UT' if scale == 'UT1' else scale}")
        return cls.from_jd(np.asarray(mjd + 2400000.5), np.asarray(clock / DAY), scale, calendar)

    @classmethod
    def from_julian_year(cls, year: Float | float, *, scale: str = "TT") -> "Moment":
        """Return the moment of Julian epochs (TT): 2000.0 is JD 2451545.0 TT."""
        return cls(_J2000, (np.asarray(year, dtype=np.float64) - 2000.0) * 365.25, scale)

    @classmethod
    def now(cls) -> "Moment":
        """Return the clock's moment in UTC; past the shipped IERS table it is taken for UT1 (0.9 s)."""
        days, seconds = divmod(time.time(), DAY)
        number = int(days) + 40587 + 2400001
        return cls._from_days(number, seconds, None, "mixed")

    @classmethod
    def range(cls, start: "Moment", until: "Moment", step: str) -> "Moment":
        """Return the moments from `start` to `until` (kept if met exactly) at a step such as `10 min` or `1 month`.

        Steps of s, min, h and sidereal-d are elapsed time; d, month, yr and century keep the clock time of the scale
        shown, and the day of the month where there is one. Raises MomentError for a step that leads nowhere.
        """
        from colure.time_steps import moments  # the module builds on this one

        return moments(start, until, step)

    # Scales

    def _once(self, name: str, make: Callable[[], T]) -> T:
        """Return what `make` returns, computed at the first call only."""
        try:
            found: T = self._found[name]
        except KeyError:
            found = self._found[name] = make()
        return found

    @property
    def tt(self) -> tuple[Float | float, Float | float]:
        """TT as a two-part Julian date: a midnight and a part of a day."""
        return self.tt1, self.tt2

    @property
    def tdb(self) -> tuple[Float | float, Float | float]:
        """TDB as a two-part Julian date, at the Earth's centre, good to 5 µs within 1550–2650 (see `tdb`)."""
        return self._once("tdb", lambda: (self.tt1, self.tt2 + tdb_minus_tt(self.tt1, self.tt2) / DAY))

    @property
    def ut1(self) -> tuple[Float | float, Float | float]:
        """UT1 as a two-part Julian date, by the IERS table or the ΔT of the module `deltat`."""
        return self._once("ut1", lambda: (self.tt1, self.tt2 - self.delta_t_s / DAY))

    @property
    def utc(self) -> tuple[Float | float, Float | float]:
        """UTC as a two-part quasi-JD; MomentError before 1972 and after the end of the shipped IERS table."""
        mjd, seconds = self._utc_parts()
        return mjd + 2400000.5, seconds / leapseconds.day_length(mjd)

    def _utc_parts(self) -> tuple[Any, Any]:
        if not self._all_utc:
            raise MomentError(f"UTC does not exist at {self.isot('UT1')!s:.60} UT: {timescales.utc_span()}")
        return leapseconds.split_tt(self.tt1, self.tt2)

    @property
    def _all_utc(self) -> bool:
        return self._once("all utc", lambda: bool(np.all(self.has_utc)))

    @property
    def has_utc(self) -> Bool | bool:
        """Whether UTC exists, and is known, at the moment: a bool or an array of them."""
        jd = self.tt1 + self.tt2
        return (jd >= 2441317.5 + 42.184 / DAY) & (jd <= orientation.span()[1])

    @property
    def delta_t_s(self) -> Float | float:
        """ΔT = TT−UT1 in seconds."""
        return self._once("delta_t", lambda: deltat.of_tt(self.tt1, self.tt2))

    @property
    def delta_t_sigma_s(self) -> Float | float:
        """Standard error of ΔT in seconds."""
        return deltat.sigma(self.julian_year)

    @property
    def julian_year(self) -> Float | float:
        """Julian epoch of TT in years."""
        return 2000.0 + ((self.tt1 - _J2000) + self.tt2) / 365.25

    @property
    def jd_tt(self) -> Float | float:
        """Julian date of TT in one number (good to 40 µs)."""
        return self.tt1 + self.tt2

    @property
    def polar_motion(self) -> tuple[Float | float, Float | float]:
        """Coordinates xp, yp of the pole in radians (IERS); fading to zero outside the table."""
        return self._once("pole", lambda: orientation.pole(self.tt1, self.tt2))

    # Shape and change

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of the array of moments, `()` for one moment."""
        return np.shape(self.tt1)

    @property
    def size(self) -> int:
        """Number of moments."""
        return int(np.size(self.tt1))

    def __len__(self) -> int:
        return len(np.asarray(self.tt1))

    def __getitem__(self, key: Any) -> "Moment":
        return replace(self, tt1=np.asarray(self.tt1)[key], tt2=np.asarray(self.tt2)[key])

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Moment):
            return NotImplemented
        return (
            self.scale == other.scale
            and self.calendar == other.calendar
            and np.array_equal(self.tt1, other.tt1)
            and np.array_equal(self.tt2, other.tt2)
        )

    def __hash__(self) -> int:
        return hash((np.asarray(self.tt1).tobytes(), np.asarray(self.tt2).tobytes(), self.scale, self.calendar))

    def shifted(self, days: Float | float) -> "Moment":
        """Return the moment(s) later by days of 86400 s of TT; an array of days makes an array of moments."""
        if isinstance(days, float | int):
            whole: Any = math.floor(days) if math.isfinite(days) else days
        else:
            whole = np.floor(days)
        return Moment(self.tt1 + whole, self.tt2 + (days - whole), self.scale, self.calendar)

    def with_scale(self, scale: str, calendar: str | None = None) -> "Moment":
        """Return the same instant shown in another scale, and calendar if given."""
        return replace(self, scale=scale, calendar=calendar or self.calendar)

    # Print

    @property
    def shown_scale(self) -> str:
        """The scale really used in print: UT1 in place of UTC where some of the moments have no UTC."""
        return "UT1" if self.scale == "UTC" and not self._all_utc else self.scale

    @property
    def calendar_used(self) -> NDArray[np.str_] | str:
        """`julian` or `gregorian`: what the date shown is in, by element."""
        if self.calendar != "mixed":
            return self.calendar if self.shape == () else np.full(self.shape, self.calendar)
        number, _ = self._clock(self.shown_scale)
        used = np.where(np.asarray(number) >= calendars.CHANGEOVER, "gregorian", "julian")
        return str(used) if used.ndim == 0 else used

    def _clock(self, scale: str) -> tuple[Any, Any]:
        """Return the day number and the seconds of the civil day in a scale."""
        if scale == "UTC":
            mjd, seconds = self._utc_parts()
            return mjd + 2400001, seconds
        jd1, jd2 = {"UT1": lambda: self.ut1, "TT": lambda: self.tt, "TDB": lambda: self.tdb}[scale]()
        whole = np.floor(jd2)
        return np.rint(np.asarray(jd1) + whole + 0.5).astype(np.int64), (jd2 - whole) * DAY

    def civil(self, scale: str | None = None, decimals: int = 3) -> tuple[Any, Any, Any, Any, Any, Any]:
        """Return year, month, day, hour, minute, second in a scale, the second rounded with all carries done.

        Arrays of the moment's shape; the second may be 60 within a leap second of UTC and never otherwise.
        """
        scale = scale or self.shown_scale
        if scale not in SCALES:
            raise MomentError(f"time scale '{scale}': unknown; expected one of {', '.join(SCALES)}")
        number, seconds = (np.asarray(part) for part in self._clock(scale))
        unit = 10**decimals
        ticks = np.rint(seconds * unit).astype(np.int64)
        # An int looks a single day up in a list, twenty times as fast as an array of no dimension.
        mjd = (int(number) if number.ndim == 0 else number) - 2400001
        length = leapseconds.day_length(mjd) if scale == "UTC" else 86400
        over = ticks >= np.asarray(length) * unit
        number, ticks = number + over, np.where(over, 0, ticks)
        year, month, day = calendars.calendar_date(number, self.calendar)
        hour = np.minimum(ticks // (3600 * unit), 23)
        minute = np.minimum((ticks - hour * 3600 * unit) // (60 * unit), 59)
        second = (ticks - (hour * 60 + minute) * 60 * unit) / unit
        return year, month, day, hour, minute, second

    def isot(self, scale: str | None = None, decimals: int = 3) -> Any:
        """Return ISO 8601 text without the scale, such as `2026-12-01T21:36:00.000`: a str or an array of str."""
        return moment_text.iso(self.civil(scale, decimals), decimals)

    def scale_label(self) -> str:
        """Return the scale as people read it: UT1 is `UT` where it only stands in for UTC."""
        shown = self.shown_scale
        return "UT" if shown == "UT1" and not self._all_utc else shown

    def text(self, decimals: int = 0) -> Any:
        """Return `2026-12-01 21:36:00 UTC`, with the calendar's name where a reader could take it for another."""
        iso = self.isot(None, decimals)
        label = self.scale_label()
        if isinstance(iso, str):
            return moment_text.human(iso, label, str(self.calendar_used))
        used = np.asarray(self.calendar_used)
        pairs = zip(iso.flat, used.flat, strict=True)
        return np.array([moment_text.human(a, label, b) for a, b in pairs]).reshape(iso.shape)

    def __str__(self) -> str:
        """Return text that `parse` reads back to the nanosecond; for an array its span."""
        if self.shape == ():
            return moment_text.shortest(str(self.text(9)))
        if self.size == 0:
            return "no moments"
        flat = [replace(self, tt1=np.ravel(self.tt1)[i], tt2=np.ravel(self.tt2)[i]) for i in (0, -1)]
        return f"{self.size} moments, {flat[0]} to {flat[1]}"


def _outside(jd: float) -> MomentError:
    what = f"Julian date {jd:.10g}" if math.isfinite(jd) else f"Julian date {jd}"
    return MomentError(f"{what}: expected a finite date within the years −4999 to 4999")
