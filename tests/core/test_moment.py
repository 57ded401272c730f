"""Moments: grammar, scales against ERFA, round trips, steps, and what is refused."""

import copy
import math
import pickle

import erfa
import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from colure import leapseconds, orientation
from colure.arrays import ARCSEC
from colure.errors import MomentError
from colure.moment import FIRST_JD, LAST_JD, Moment
from colure.tdb import tdb_minus_tt
from colure.time_steps import Step

RNG = np.random.default_rng(20261201)


@pytest.mark.parametrize(
    ("text", "printed"),
    [
        ("2026-12-01 21:36 UTC", "2026-12-01 21:36:00 UTC"),
        ("2026-12-01T21:36:00Z", "2026-12-01 21:36:00 UTC"),
        ("2026-12-01 21:36+09:30", "2026-12-01 12:06:00 UTC"),
        ("2026-12-01T21:36:00,5", "2026-12-01 21:36:00.5 UTC"),
        ("2026-12-01 24:00", "2026-12-02 00:00:00 UTC"),
        ("2026-12-01.5", "2026-12-01 12:00:00 UTC"),
        ("2016-12-31 23:59:60.25 UTC", "2016-12-31 23:59:60.25 UTC"),
        ("-1200-03-30", "−1200-03-30 00:00:00 UT (Julian calendar)"),
        ("−1200-03-30 12:00 UT (Julian calendar)", "−1200-03-30 12:00:00 UT (Julian calendar)"),
        ("0000-02-29 TT", "0000-02-29 00:00:00 TT (Julian calendar)"),
        ("1582-10-04", "1582-10-04 00:00:00 UT (Julian calendar)"),
        ("1582-10-15", "1582-10-15 00:00:00 UT"),
        ("1582-10-10 gregorian", "1582-10-10 00:00:00 UT (Gregorian calendar)"),
        ("1700-02-29 julian TT", "1700-02-29 00:00:00 TT (Julian calendar)"),
        ("1971-12-31", "1971-12-31 00:00:00 UT"),
        ("1972-01-01", "1972-01-01 00:00:00 UTC"),
        ("2100-06-01 12:00", "2100-06-01 12:00:00 UT"),
        ("JD 2455200.5 TT", "2010-01-04 00:00:00 TT"),
        ("MJD 51544.5 TDB", "2000-01-01 12:00:00 TDB"),
        ("JD2451545", "2000-01-01 12:00:00 UTC"),
        ("J2000.0", "2000-01-01 12:00:00 TT"),
    ],
)
def test_texts_are_read_and_printed(text: str, printed: str) -> None:
    moment = Moment.parse(text)
    assert str(moment) == printed
    again = Moment.parse(str(moment))
    assert again.calendar_used == moment.calendar_used
    assert abs((again.tt1 - moment.tt1) + (again.tt2 - moment.tt2)) < 1e-13


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "nothing was given"),
        ("hello", "not understood"),
        ("1582-10-10", "does not exist"),
        ("2026-02-29", "no such day"),
        ("2026-13-01", "expected 1 to 12"),
        ("2026-12-01 25:00", "hour 25"),
        ("2026-12-01 12:60", "minute 60"),
        ("2026-12-01 12:00:61", "second 61"),
        ("2015-12-31 23:59:60 UTC", "no leap second"),
        ("2016-12-31 23:59:60 TT", "only UTC has leap seconds"),
        ("2016-12-31 12:00:60", "leap second ends a UTC day"),
        ("1960-01-01 UTC", "starts in 1972"),
        ("2100-01-01 UTC", "end of the shipped IERS table"),
        ("-5000-01-01", "−4999 to 4999"),
        ("+999999-01-01", "−4999 to 4999"),
        ("JD 99999999999 TT", "−4999 to 4999"),
        ("JD nan", "not understood"),
        ("J99999", "−4999 to 4999"),
        ("26-12-01", "fewer than three digits"),
        ("01/02/2026", "year-month-day"),
        ("2451545", "a bare number"),
        ("2026-12-01 12:00 TAI", "'TAI' is no scale"),
        ("2026-12-01 TT UTC", "two time scales"),
        ("2026-12-01 julian gregorian", "two calendars"),
        ("2026-12-01T12:00Z TT", "offset from UTC"),
        ("J2000 UTC", "TT or TDB"),
        ("x" * 500, "too long"),
    ],
)
def test_bad_texts_say_why(text: str, reason: str) -> None:
    with pytest.raises(MomentError, match=reason):
        Moment.parse(text)


@given(st.text(max_size=40))
def test_any_text_is_a_moment_or_refused(text: str) -> None:
    try:
        moment = Moment.parse(text)
    except MomentError as error:
        lines = str(error).splitlines()
        moment = Moment(FIRST_JD)
    else:
        lines = ["read"]
    assert len(lines) == 1
    assert FIRST_JD <= moment.jd_tt <= LAST_JD


@given(
    st.from_regex(
        r"[+-]?\d{1,5}-\d{1,2}-\d{1,2}( \d\d:\d\d(:\d\d(\.\d{1,4})?)?)?( (UTC|UT1|TT|TDB|julian))?", fullmatch=True
    )
)
def test_near_dates_are_read_back_or_refused(text: str) -> None:
    try:
        moment = Moment.parse(text)
    except MomentError:
        return
    again = Moment.parse(str(moment))
    assert abs((again.tt1 - moment.tt1) + (again.tt2 - moment.tt2)) < 2e-14


@settings(max_examples=200)
@example(-104787.0, 0.0, "UTC", "gregorian")  # a day of −5000 in that calendar
@given(
    st.floats(FIRST_JD + 10.0, LAST_JD - 10.0),
    st.floats(0.0, 1.0),
    st.sampled_from(["UTC", "UT1", "TT", "TDB"]),
    st.sampled_from(["mixed", "julian", "gregorian"]),
)
def test_printed_moments_read_back_to_a_nanosecond(jd: float, part: float, scale: str, calendar: str) -> None:
    moment = Moment(math.floor(jd) + 0.5, part, scale, calendar)
    again = Moment.parse(str(moment))
    assert abs((again.tt1 - moment.tt1) + (again.tt2 - moment.tt2)) * 86400.0 < 2e-9


def test_not_finite_and_far_dates_are_refused() -> None:
    for bad in (math.nan, math.inf, -1e7, 1e12, np.array([2451545.0, np.nan])):
        with pytest.raises(MomentError, match="−4999 to 4999"):
            Moment.from_jd(bad)
    for bad_field in ({"hour": 24}, {"second": math.nan}, {"minute": -1}):
        with pytest.raises(MomentError):
            Moment.from_civil(2026, 1, 1, **bad_field)  # type: ignore[arg-type]
    with pytest.raises(MomentError, match="unknown"):
        Moment(2451544.5, 0.5, "TAI")


def test_utc_agrees_with_erfa_at_every_leap_second() -> None:
    """ERFA's utctai and taiutc (its own leap second table, left as it is) on and about each step."""
    steps = [int(mjd) for mjd in leapseconds._table()[0][1:]]
    jd1 = np.repeat(np.array(steps) + 2400000.5, 6)
    tai2 = np.tile(np.array([-2.0, -1.0, -0.5, -1e-6, 0.5, 40.0]), len(steps)) / 86400.0
    offset = np.repeat([float(leapseconds.tai_minus_utc(mjd)) for mjd in steps], 6)
    tai2 = tai2 + offset / 86400.0
    moment = Moment(jd1, tai2 + 32.184 / 86400.0)
    utc1, utc2 = erfa.taiutc(jd1, tai2)
    mine1, mine2 = moment.utc
    assert np.max(np.abs((mine1 - utc1) + (mine2 - utc2))) * 86400.0 < 1e-7
    back = Moment.from_jd(mine1, mine2, "UTC")
    assert np.max(np.abs((back.tt1 - moment.tt1) + (back.tt2 - moment.tt2))) * 86400.0 < 1e-9
    for i in range(moment.size):  # the scalar path gives the same
        a1, a2 = moment[i].utc
        assert abs((a1 - mine1[i]) + (a2 - mine2[i])) * 86400.0 < 1e-9


def test_within_a_leap_second_the_clock_reads_sixty() -> None:
    moments = Moment.from_civil(2016, 12, 31, 23, 59, [59.0, 60.0, 60.5], scale="UTC").isot("UTC", 1)
    assert list(moments) == ["2016-12-31T23:59:59.0", "2016-12-31T23:59:60.0", "2016-12-31T23:59:60.5"]
    assert Moment.parse("2026-06-30 23:59:59.9996").isot(decimals=3) == "2026-07-01T00:00:00.000"


def test_tdb_agrees_with_the_whole_series() -> None:
    """ERFA dtdb is the whole series of Fairhead & Bretagnon (1990)."""
    for low, high, limit in ((1550, 2650, 5e-6), (-3000, 3000, 25e-6)):
        jd = 2451545.0 + (RNG.uniform(low, high, 4000) - 2000.0) * 365.25
        moment = Moment.from_jd(jd)
        exact = erfa.dtdb(moment.tt1, moment.tt2, 0.0, 0.0, 0.0, 0.0)
        assert np.max(np.abs(tdb_minus_tt(*moment.tt) - exact)) < limit
        back = Moment.from_jd(*moment.tdb, "TDB")
        assert np.max(np.abs((back.tt1 - moment.tt1) + (back.tt2 - moment.tt2))) * 86400.0 < 2e-10


def test_one_moment_gives_what_many_give() -> None:
    year = RNG.uniform(-4900, 4900, 300)
    many = Moment.from_julian_year(year)
    ones = [many[i] for i in range(many.size)]
    for name in ("tdb", "ut1"):
        first, second = getattr(many, name)
        got = [getattr(one, name) for one in ones]
        assert all(isinstance(part, float) for pair in got for part in pair)
        gap = [(a - first[i]) + (b - second[i]) for i, (a, b) in enumerate(got)]
        assert np.max(np.abs(gap)) * 86400.0 < 5e-6  # arrays sum TDB's small terms in single precision
    assert np.allclose([one.delta_t_s for one in ones], many.delta_t_s, rtol=0, atol=1e-9)
    assert np.allclose([one.delta_t_sigma_s for one in ones], many.delta_t_sigma_s, rtol=0, atol=1e-9)
    assert [one.text() for one in ones] == list(many.text()) or many.shown_scale == "UT1"


def test_polar_motion_fades_outside_the_table() -> None:
    first, last = orientation.span()
    x, y = Moment(np.array([first - 400.0, first, last, last + 400.0]), 0.0).polar_motion
    assert x[0] == y[0] == x[3] == y[3] == 0.0
    # IERS 20 C04 at 1962-01-01: x −0.0127″, y 0.2130″.
    assert np.array([x[1], y[1]]) / ARCSEC == pytest.approx([-0.0127, 0.2130], abs=1e-6)


def test_ut1_comes_back_in_all_ages() -> None:
    jd = 2451545.0 + (RNG.uniform(-4900, 4900, 2000) - 2000.0) * 365.25
    moment = Moment.from_jd(np.floor(jd) + 0.5, jd % 1.0, "UT1")
    first, second = moment.ut1
    assert np.max(np.abs((first - np.floor(jd) - 0.5) + (second - jd % 1.0))) * 86400.0 < 1e-8


def test_equality_hash_and_copies() -> None:
    one = Moment.parse("2026-12-01 21:36")
    assert one == Moment.parse("2026-12-01T21:36:00Z")
    assert one != one.with_scale("TT")
    assert hash(one) == hash(Moment.parse("2026-12-01T21:36:00Z"))
    many = Moment.from_jd(np.array([2451545.0, 2451546.0]))
    assert many == copy.deepcopy(many)
    assert pickle.loads(pickle.dumps(many)) == many
    assert many[1] == Moment.from_jd(2451546.0)
    assert many.shape == (2,)
    with pytest.raises(ValueError, match="read-only"):
        many.tt1[0] = 0.0  # type: ignore[index]


def test_shift_keeps_precision() -> None:
    start = Moment.from_jd(2451545.0)
    assert start.shifted(-1e6).shifted(1e6) == start
    later = start.shifted(np.array([0.0, 1.25]))
    assert later.shape == (2,)
    assert later[1].jd_tt == 2451546.25


@pytest.mark.parametrize(
    ("start", "until", "step", "last", "count"),
    [
        ("2026-12-01 21:36", "2026-12-02 21:36", "10 min", "2026-12-02 21:36:00 UTC", 145),
        ("2026-01-31", "2026-12-31", "1 month", "2026-12-31 00:00:00 UTC", 12),
        ("2026-01-01", "2030-01-01", "yr", "2029-01-01 00:00:00 UT", 4),
        ("2016-12-31", "2017-01-02", "1 d", "2017-01-02 00:00:00 UTC", 3),
        ("1582-09-10", "1582-11-10", "1 month", "1582-11-10 00:00:00 UT", 3),
        ("-1200-03-30", "-200-03-30", "1 century", "−0200-03-30 00:00:00 UT (Julian calendar)", 11),
        ("2026-03-01", "2026-01-01", "-1 month", "2026-01-01 00:00:00 UTC", 3),
        ("4900-01-01", "4999-12-31", "1 century", "4900-01-01 00:00:00 UT", 1),
        ("2026-01-01", "2026-01-01", "1 d", "2026-01-01 00:00:00 UTC", 1),
    ],
)
def test_ranges(start: str, until: str, step: str, last: str, count: int) -> None:
    moments = Moment.range(Moment.parse(start), Moment.parse(until), step)
    assert len(moments) == count
    if step != "yr":  # 2030 lies after the IERS table, so that this range is on the clock of UT1 and ends before until
        assert moments.text()[-1] == last
    else:
        assert str(moments.text()[-1]).startswith("2029-01-01 00:00:00")


@pytest.mark.parametrize("text", ["", "5", "0 d", "1 fortnight", "nan d", "1.5 month", "1e3 d", "1e99 yr", "d d"])
def test_bad_steps_are_refused(text: str) -> None:
    with pytest.raises(MomentError, match="step"):
        Step.parse(text)


def test_ranges_that_lead_nowhere_are_refused() -> None:
    start, until = Moment.parse("2026-01-01"), Moment.parse("2027-01-01")
    with pytest.raises(MomentError, match="leads away"):
        Moment.range(start, until, "-1 d")
    with pytest.raises(MomentError, match="at most"):
        Moment.range(start, until, "1 s")


def test_a_sidereal_day_brings_the_same_stars() -> None:
    """ERFA's era00: after a mean sidereal day the Earth rotation angle is the same but for precession (0.13″ a day)."""
    start = Moment.parse("2026-12-01 21:36")
    later = Step.parse("1 sidereal-d").from_moment(start, 1.0)
    turn = erfa.era00(*later.ut1) - erfa.era00(*start.ut1)
    assert abs((turn + math.pi) % (2 * math.pi) - math.pi) / ARCSEC < 0.2
