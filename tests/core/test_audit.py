"""The audit of one position: digits read, verdicts worded, data mended, nonsense refused."""

import re

import numpy as np
import pytest

from colure import audit, names
from colure.arrays import DEG, spherical
from colure.audit import Numbers, Question, Stars
from colure.audit.verdict import judge
from colure.bodies import longitudes
from colure.errors import AngleError, BodyError, ColureError, FrameError, MomentError, TargetError
from colure.moment import Moment
from colure.reduction import Observer, reduce_bodies
from colure.sites import DEMO
from colure.stars import catalogue


def aldebaran() -> Stars:
    return Stars.of_ids([names.find("Aldebaran")], "Aldebaran")


# Digits


@pytest.mark.parametrize(
    ("text", "x", "y", "half_x", "half_y"),
    [
        ("12.34 -5.6", 12.34, -5.6, 0.005, 0.05),
        ("12 5", 12.0, 5.0, 0.5, 0.5),
        ("12.340, +5.60", 12.34, 5.6, 0.0005, 0.005),
        ("400.5 100.25", 400.5, 100.25, 0.05, 0.005),  # numbers that are no coordinates may still be explained
        ("12h34m56.7s −05°06′07″", 188.73625, -(5 + 6 / 60 + 7 / 3600), 0.05 * 15 / 3600, 0.5 / 3600),
        ("12h34.5m +5°06′", 188.625, 5.1, 0.05 * 15 / 60, 0.5 / 60),
        ("349°05.3′ 3°", 349 + 5.3 / 60, 3.0, 0.05 / 60, 0.5),
    ],
)
def test_numbers_and_their_rounding(text: str, x: float, y: float, half_x: float, half_y: float) -> None:
    found = audit.read(text)
    assert (found.x[0], found.y[0]) == pytest.approx((x, y), abs=1e-12)
    assert (found.half_x[0], found.half_y[0]) == pytest.approx((half_x, half_y), rel=1e-12)


def test_numbers_written_with_units_are_no_radians_and_no_packed_digits() -> None:
    bare = audit.audit("10.00 20.00", Stars.point(10.0, 20.0), claim="icrs")
    spelt = audit.audit("10°00′ 20°00′", Stars.point(10.0, 20.0), claim="icrs")
    assert "A3" in {code for one in bare.candidates for code in one.hypothesis.codes}
    assert not {"A2", "A3"} & {code for one in spelt.candidates for code in one.hypothesis.codes}


def test_an_unknown_coordinate() -> None:
    found = audit.read("? -5.6")
    assert np.isnan(found.x[0])
    assert found.half_y[0] == 0.05
    assert np.isnan(audit.read("12h34m56s ?").y[0])


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "nothing was given"),
        ("12", "one angle"),
        ("12 34 56 -10 20 30", "hours or degrees"),
        ("abc def", "no number|no part"),
        ("? ?", "neither coordinate"),
        ("1e400 2", "too large"),
        ("12345678901 2", "expected a coordinate"),
        ("1,2,3", "more than one comma"),
        ("12h70m, 5", "less than 60"),
        ("1 2 3", "where does the latitude begin"),
        ("9" * 300, "characters long"),
    ],
)
def test_text_that_is_no_pair_is_refused_in_one_line(text: str, reason: str) -> None:
    with pytest.raises(AngleError, match=reason) as caught:
        audit.read(text)
    assert "\n" not in str(caught.value)


def test_impossible_roundings_are_refused() -> None:
    for half in (0.0, -1.0, np.nan):
        with pytest.raises(AngleError, match="rounding"):
            Numbers.of(1.0, 2.0, half, 1.0)
    with pytest.raises(AngleError):
        audit.read("1 2").rounded_to(-3.0)


# The one rule of certainty


def test_certain_is_one_within_three_and_the_next_beyond_five_sigma() -> None:
    n_sigma = np.array([[1.0, 1.0, 1.0, 3.5, 2.9], [5.1, 4.9, 2.0, 9.0, 5.0001]])
    judged = judge(n_sigma)
    assert judged.certain.tolist() == [True, False, False, False, True]
    assert judged.none.tolist() == [False, False, False, True, False]
    assert judged.inside.sum(axis=0).tolist() == [1, 1, 2, 0, 1]


# Verdicts


def test_hours_read_as_degrees_is_certain_and_mended() -> None:
    answer = audit.audit("4.5987 16.5093", aldebaran(), claim="icrs")
    assert answer.status == "certain"
    assert answer.best.hypothesis.codes == ("A1", "B1")
    assert "68.980500°" in answer.mending.note


def test_none_of_these_is_said_and_nothing_is_mended() -> None:
    answer = audit.audit("200.1234 -70.1234", aldebaran(), Moment.parse("2026-06-01"), claim="icrs")
    assert answer.status == "none"
    assert answer.verdict.startswith("none of these")
    assert answer.mending.commands == ()


def test_numbers_as_claimed_need_no_mending() -> None:
    star = aldebaran()
    at = Moment.parse("2026-06-01")
    lon, lat = spherical(star.direction(np.asarray([2026.4])))
    answer = audit.ask(Numbers.of(lon / DEG, lat / DEG, 2e-6, 2e-6), Question(star, at, claim="icrs"))
    assert answer.simplest.hypothesis.steps <= 1
    assert answer.members[0].n_sigma < 20.0


def test_a_class_says_what_is_settled_and_what_would_decide() -> None:
    at = Moment.parse("2026-06-01")
    mars = audit.audit("35.9 13.9", "mars", at, rounding_arcsec=3600.0)
    assert mars.status == "class"
    assert mars.separation is not None
    assert mars.separation.text
    star = Stars.point(100.0, 10.0)
    answer = audit.audit("100.00 10.00", star, claim="icrs")
    assert answer.status == "class"
    assert answer.settled["place"] == "astrometric"
    assert answer.separation is not None
    assert answer.separation.rounding_arcsec < 0.05  # ICRS and FK5 are 0.02″ apart
    assert "last digit" in answer.separation.text


def test_the_observation_that_decides_really_does() -> None:
    # A body whose class splits at another date: the date that is named must set the members apart.
    at = Moment.parse("2026-06-01")
    lon, lat = spherical(
        reduce_bodies(("jupiter",), at, observer=Observer("site", DEMO), place="astrometric").vectors[0]
    )
    answer = audit.ask(Numbers.of(lon / DEG, lat / DEG, 0.5 / 3600, 0.5 / 3600), Question("jupiter", at, DEMO, "icrs"))
    assert answer.separation is not None
    found = re.search(r"on (\d{4}-\d\d-\d\d) \(([\d.]+)″ apart\)", answer.separation.text)
    finer = re.search(r"last digit at ([\d.]+)″", answer.separation.text)
    assert found or finer
    if found:
        assert float(found[2]) > 5.0 * 0.5
    if finer:
        better = Numbers.of(lon / DEG, lat / DEG, float(finer[1]) / 7200.0, float(finer[1]) / 7200.0)
        assert len(audit.ask(better, answer.question).members) < len(answer.members)


# Against the catalogue


def test_a_star_is_found_under_a_wrong_frame() -> None:
    import erfa

    star = catalogue().rows([names.find("α Tau")])
    ra, dec = erfa.c2s(star.directions(1950.0)[0])
    ra, dec, *_ = erfa.fk54z(*erfa.hfk5z(ra, dec, 2451545.0, 0.0)[:2], 1950.0)
    numbers = Numbers.of(np.degrees(ra) % 360.0, np.degrees(dec), 0.5 / 3600.0, 0.5 / 3600.0)
    found = audit.audit_unknown(numbers, Moment.parse("1950-01-01"))
    assert found
    assert found[0].name == "Aldebaran"
    assert "B8" in {code for one in found[0].audit.members for code in one.hypothesis.codes}


def test_the_catalogue_is_not_asked_with_a_rounding_that_meets_anything() -> None:
    with pytest.raises(TargetError, match="by chance"):
        audit.audit_unknown(audit.read("75 12"))
    with pytest.raises(AngleError, match="both coordinates"):
        audit.audit_unknown(audit.read("75.12345 ?"))


def test_random_points_are_never_certain_against_the_catalogue() -> None:
    rng = np.random.default_rng(11)
    for _ in range(30):
        numbers = Numbers.of(rng.uniform(0.0, 360.0), np.degrees(np.arcsin(rng.uniform(-1, 1))), 1e-4, 1e-4)
        for found in audit.audit_unknown(numbers, Moment.parse("2026-06-01")):
            assert found.audit.status != "certain"


@pytest.mark.parametrize("when", ["-2999-02-01", "-1200-03-30", "-0001-01-01", "1582-10-15", "2999-12-20"])
def test_any_year_that_the_ephemeris_reaches_can_be_asked_about(when: str) -> None:
    at = Moment.parse(when)
    lon, lat = (np.atleast_1d(part) / DEG for part in longitudes(("mars",), at, frame="equator/true/date"))
    lon, lat = lon.reshape(1), lat.reshape(1)
    answer = audit.ask(Numbers.of(lon, lat, 0.01, 0.01), Question("mars", at, claim="equator/true/date"))
    assert answer.simplest.hypothesis.steps == 0
    assert answer.simplest.n_sigma < 1e-3
    star = audit.ask(Numbers.of(12.3, 4.5, 0.01, 0.01), Question(aldebaran(), at, DEMO, "equator/true/date"))
    assert star.candidates


# Bad questions


@pytest.mark.parametrize(
    ("make", "error", "reason"),
    [
        (lambda: Question("mras"), BodyError, "mras"),
        (lambda: Question("earth", Moment.parse("2026-01-01")), BodyError, "cannot be seen"),
        (lambda: Question("mars"), MomentError, "a moment is needed"),
        (lambda: Question(Stars.point(1, 2), claim="equator/true/date"), FrameError, "a moment is needed"),
        (lambda: Question(Stars.point(1, 2), claim="horizon"), FrameError, "frame of the sky"),
        (lambda: Question(Stars.point(1, 2), claim="b1950"), FrameError, "unknown plane"),
        (lambda: Question(Stars.point(1, 2), site=DEMO), MomentError, "moment"),
        (lambda: Question("mars", Moment.parse("2026-01-01"), exposure_s=-5.0), MomentError, "exposure"),
        (lambda: Question("mars", Moment.parse("2026-01-01"), place="seen"), FrameError, "seen"),
        (lambda: Stars.point(1, 2, "equator/mean/date"), FrameError, "a moment is needed"),
    ],
)
def test_questions_without_sense_are_refused_in_one_line(make, error, reason) -> None:  # type: ignore[no-untyped-def]
    with pytest.raises(error, match=reason) as caught:
        make()
    assert isinstance(caught.value, ColureError)
    assert "\n" not in str(caught.value)
