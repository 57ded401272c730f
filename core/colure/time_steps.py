"""Step through time: elapsed seconds to sidereal days, and days, months, years and centuries of the calendar."""

import re
from dataclasses import dataclass

import numpy as np

from colure import calendars
from colure.arrays import Float
from colure.errors import MomentError
from colure.moment import Moment
from colure.wording import one_line

MOST = 5_000_000
"""The most moments that one range may have."""
SIDEREAL_DAY = 0.99726956633
"""Days of UT1 in a mean sidereal day (IERS: 86164.09053 s)."""

_ELAPSED = {"s": 1.0 / 86400.0, "min": 1.0 / 1440.0, "h": 1.0 / 24.0, "sidereal-d": SIDEREAL_DAY}
_MONTHS = {"month": 1, "yr": 12, "century": 1200}
UNITS = ("s", "min", "h", "d", "sidereal-d", "month", "yr", "century")
_ALIASES = {
    **{unit: unit for unit in UNITS},
    **dict.fromkeys(("sec", "second", "seconds"), "s"),
    **dict.fromkeys(("minute", "minutes"), "min"),
    **dict.fromkeys(("hour", "hours"), "h"),
    **dict.fromkeys(("day", "days"), "d"),
    **dict.fromkeys(("sidereal-day", "sidereal-days"), "sidereal-d"),
    **dict.fromkeys(("months",), "month"),
    **dict.fromkeys(("year", "years"), "yr"),
    **dict.fromkeys(("centuries",), "century"),
}
_TEXT = re.compile(r"([+-]?(?:\d+(?:\.\d*)?|\.\d+))?\s*([a-z-]+)\Z", re.IGNORECASE | re.ASCII)


@dataclass(frozen=True, slots=True)
class Step:
    """A number of one unit of `UNITS`; negative goes back in time."""

    number: float
    unit: str

    @classmethod
    def parse(cls, text: str) -> "Step":
        """Return the step that a text such as `10 min`, `1 month` or `-0.5 d` names; raise MomentError."""
        found = _TEXT.match(text.replace("−", "-").strip()) if len(text) < 60 else None
        unit = _ALIASES.get(found[2].casefold()) if found else None
        if found is None or unit is None:
            raise MomentError(f"step '{one_line(text)}': expected a number and a unit ({', '.join(UNITS)})")
        number = float(found[1]) if found[1] else 1.0
        if number == 0.0:
            raise MomentError(f"step '{one_line(text)}': zero leads nowhere")
        if unit in _MONTHS and number != int(number):
            raise MomentError(f"step '{one_line(text)}': a calendar step is a whole number of {unit}")
        if abs(number) > 1e12:
            raise MomentError(f"step '{one_line(text)}': too large")
        return cls(number, unit)

    def __str__(self) -> str:
        return f"{self.number:g} {self.unit}"

    @property
    def days(self) -> float:
        """Length in days, the mean length for months, years and centuries."""
        if self.unit in _MONTHS:
            return self.number * _MONTHS[self.unit] * 30.436875
        return self.number * _ELAPSED.get(self.unit, 1.0)

    def from_moment(self, start: Moment, counts: Float | float) -> Moment:
        """Return `start` moved on by whole `counts` of the step (an array of counts gives an array)."""
        steps = np.asarray(counts, dtype=np.float64)
        if self.unit in _ELAPSED:
            return start.shifted(steps * self.days)
        scale = start.shown_scale
        try:
            return self._by_clock(start, steps, scale)
        except MomentError:
            if scale != "UTC":
                raise
            # The steps leave the time that has UTC: take the clock of UT1 for all of them.
            return self._by_clock(start, steps, "UT1")

    def _by_clock(self, start: Moment, steps: Float, scale: str) -> Moment:
        year, month, day, hour, minute, second = start.civil(scale, 9)
        # Within a leap second the clock of other days has no such time: take their last nanosecond.
        clock: Float = np.minimum(hour * 3600.0 + minute * 60.0 + second, 86399.999999999) / 86400.0
        if self.unit == "d":
            number = calendars.day_number(year, month, day, start.calendar)
            moved = steps * self.number
            whole = np.floor(moved)
            midnight = np.asarray(number - 0.5 + whole, dtype=np.float64)
            return Moment.from_jd(midnight, clock + (moved - whole), scale, start.calendar)
        months = np.rint(year * 12 + month - 1 + steps * self.number * _MONTHS[self.unit])
        if np.any(np.abs(months) > 12e5):
            raise MomentError(f"step {self}: leads beyond the years −4999 to 4999")
        days = calendars.nearest_day(months // 12, months % 12 + 1, day, start.calendar)
        return Moment.from_jd(np.asarray(days, dtype=np.float64) - 0.5, clock, scale, start.calendar)


def moments(start: Moment, until: Moment, step: str) -> Moment:
    """Return the moments from `start` to `until` by the step named in a text; see `Moment.range`."""
    by = Step.parse(step)
    span = (until.tt1 - start.tt1) + (until.tt2 - start.tt2)
    if np.ndim(span) != 0:
        raise MomentError("a range of time starts and ends at one moment each")
    if span * by.number < 0.0:
        raise MomentError(f"step {by}: leads away from {until.text()}, which is {'after' if span > 0 else 'before'} it")
    # A hair of 0.1 ms keeps an end that is met exactly; calendar steps are counted generously and cut.
    hair = 1e-4 / 86400.0
    count = int((abs(float(span)) + hair) / abs(by.days) * (1.1 if by.unit in _MONTHS else 1.0)) + 2
    if count > MOST:
        raise MomentError(f"step {by}: {count} moments up to {until.text()}; expected at most {MOST}")
    found = _within(by, start, count)
    past = (found.tt1 - until.tt1) + (found.tt2 - until.tt2)
    kept = past * np.sign(by.number) <= hair
    return found[kept]


def _within(by: Step, start: Moment, count: int) -> Moment:
    """Return up to `count` moments, fewer where the last ones would leave the years that a moment may have."""
    for spare in (0, 1, 2):
        try:
            return by.from_moment(start, np.arange(max(count - spare, 1), dtype=np.float64))
        except MomentError:
            continue
    return by.from_moment(start, np.arange(max(int(count / 1.1) - 1, 1), dtype=np.float64))
