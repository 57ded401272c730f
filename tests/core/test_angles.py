"""Angles: what is read, what is refused and why, and what is printed."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colure import angles
from colure.errors import AngleError


@pytest.mark.parametrize(
    ("text", "degrees"),
    [
        ("129.4", 129.4),
        ("-0.5", 359.5),
        ("12h34m56.7s", 15 * (12 + 34 / 60 + 56.7 / 3600)),
        ("12ʰ34ᵐ56ˢ.7", 15 * (12 + 34 / 60 + 56.7 / 3600)),
        ("12 h 34 m", 188.5),
        ("12h34", 188.5),
        ("12°34′56″", 12 + 34 / 60 + 56 / 3600),
        ("12 deg 34 arcmin 56 arcsec", 12 + 34 / 60 + 56 / 3600),
        ("12d34m56s", 12 + 34 / 60 + 56 / 3600),
        ("12:34:56", 12 + 34 / 60 + 56 / 3600),
        ("12:34:56h", 15 * (12 + 34 / 60 + 56 / 3600)),
        ("24h", 0.0),
        ("360", 0.0),
        ("−10°", 350.0),
        ("1e2", 100.0),
    ],
)
def test_longitude_is_read(text: str, degrees: float) -> None:
    assert angles.parse_longitude(text) == pytest.approx(degrees, abs=1e-12)


@pytest.mark.parametrize(
    ("text", "degrees"),
    [
        ("-00°12′03″", -(12 / 60 + 3 / 3600)),
        ("-0 12 3", -(12 / 60 + 3 / 3600)),
        ("−00:00:01", -1 / 3600),
        ("+45", 45.0),
        ("45° 30'", 45.5),
        ("1' 30\"", 0.025),
        ("-90", -90.0),
    ],
)
def test_latitude_keeps_the_sign_of_minus_zero(text: str, degrees: float) -> None:
    assert angles.parse_latitude(text) == pytest.approx(degrees, abs=1e-14)


def test_a_sexagesimal_right_ascension_without_unit_is_refused_with_both_readings() -> None:
    for text in ("12 34 56 -12 34 56", "12:34:56 5:00:00", "12:34:56, -5"):
        with pytest.raises(AngleError) as caught:
            angles.parse_position(text, equatorial=True)
        message = str(caught.value)
        assert "12h34m56s (188.7333°)" in message
        assert "12°34′56″ (12.5822°)" in message
        lon, _ = angles.parse_position(text, equatorial=False)
        assert lon == pytest.approx(12 + 34 / 60 + 56 / 3600)


@pytest.mark.parametrize(
    ("text", "equatorial", "position"),
    [
        ("188.7 -12.5", True, (188.7, -12.5)),
        ("188.7, -12.5", True, (188.7, -12.5)),
        ("188.7 12.5", False, (188.7, 12.5)),
        ("12h34m56s -12°34′56″", True, (188.7333333333, -12.5822222222)),
        ("12h34m56s -12 34 56", True, (188.7333333333, -12.5822222222)),
        ("12h 34m 56s, -12 34 56", True, (188.7333333333, -12.5822222222)),
        ("12:34:56h 5:0:0", True, (188.7333333333, 5.0)),
        ("12°34′ 5°6′", True, (12.5666666667, 5.1)),
        ("12 34 56 12 34 56", False, (12.5822222222, 12.5822222222)),
        ("12h30m 45°", True, (187.5, 45.0)),
    ],
)
def test_position_is_parted(text: str, equatorial: bool, position: tuple[float, float]) -> None:
    assert angles.parse_position(text, equatorial=equatorial) == pytest.approx(position, abs=1e-9)


@pytest.mark.parametrize(
    ("text", "reason"),
    [
        ("", "nothing was given"),
        ("abc", "no part of an angle"),
        ("nan 5", "no part of an angle"),
        ("12", "one angle"),
        ("400 5", "−360° to 360°"),
        ("5 95", "−90° to 90°"),
        ("25h 5", "up to 24h"),
        ("12h 5h", "hours"),
        ("12 61 00 5 00 00", "less than 60"),
        ("1.5 30 -5", "not the last part"),
        ("1 -5 -6", "2 signs"),
        ("1,2,3", "2 commas"),
        ("5m 3", "of time or of arc"),
        ("1 2 3", "where does the latitude begin"),
        ("12°34s56m, 5", "in this order"),
        ("1e999 5", "too large"),
        ("1" * 200, "characters long"),
    ],
)
def test_bad_positions_say_why(text: str, reason: str) -> None:
    with pytest.raises(AngleError, match=reason):
        angles.parse_position(text, equatorial=False)


def test_extent_must_be_positive() -> None:
    assert angles.parse_extent("30′") == pytest.approx(0.5)
    with pytest.raises(AngleError, match="more than zero"):
        angles.parse_extent("0")


@pytest.mark.parametrize(
    ("value", "kwargs", "text"),
    [
        (-0.0001, {}, "−00°00′00″"),
        (-0.2, {"decimals": 1}, "−00°12′00.0″"),
        (59.9999999, {"decimals": 1}, "+60°00′00.0″"),
        (359.99999999, {"decimals": 2, "longitude": True}, "000°00′00.00″"),
        (-10.0, {"longitude": True}, "350°00′00″"),
        (12.508, {"smallest": "minute"}, "+12°30′"),
        (-12.508, {"smallest": "degree"}, "−13°"),
        (-1.5, {"decimals": 1, "ascii_only": True}, "-01:30:00.0"),
        (math.nan, {}, "—"),
    ],
)
def test_degrees_minutes_seconds(value: float, kwargs: dict[str, object], text: str) -> None:
    assert angles.format_dms(value, **kwargs) == text  # type: ignore[arg-type]


def test_hours_wrap_and_carry() -> None:
    assert angles.format_hms(359.99999) == "00h00m00.0s"
    assert angles.format_hms(188.736, 2) == "12h34m56.64s"
    assert angles.format_hms(-15.0, 0) == "23h00m00s"


def test_figures_follow_the_uncertainty() -> None:
    assert angles.format_with_sigma(20391.4, 180, "s") == "20390 ± 180 s"
    assert angles.format_with_sigma(-2.149, 0.05, "s") == "−2.15 ± 0.05 s"
    assert angles.format_with_sigma(69.109, 0.8) == "69.1 ± 0.8"
    assert angles.decimals_for(0.02) == 2
    assert angles.decimals_for(30.0) == -1
    assert angles.format_position(188.736, -12.5, equatorial=True, sigma_arcsec=0.3) == "12h34m56.64s −12°30′00.0″"
    assert angles.format_position(188.736, -12.5, equatorial=False, sigma_arcsec=60.0) == "188°44′ −12°30′"


@given(st.floats(-90.0, 90.0), st.integers(0, 6))
def test_printed_latitude_reads_back(value: float, decimals: int) -> None:
    for ascii_only in (False, True):
        text = angles.format_dms(value, decimals, ascii_only=ascii_only)
        assert "60.0" not in text
        assert angles.parse_latitude(text) == pytest.approx(value, abs=0.51 * 10.0**-decimals / 3600.0)


@given(st.floats(-720.0, 720.0), st.integers(0, 6))
def test_printed_longitude_reads_back(value: float, decimals: int) -> None:
    for text, unit in (
        (angles.format_dms(value, decimals, longitude=True), 1.0),
        (angles.format_hms(value, decimals), 15.0),
    ):
        off = (angles.parse_longitude(text, equatorial=True) - value + 180.0) % 360.0 - 180.0
        assert abs(off) <= 0.51 * unit * 10.0**-decimals / 3600.0 + 1e-10


@given(st.text(max_size=40))
def test_any_text_is_read_or_refused_in_one_line(text: str) -> None:
    try:
        lon, lat = angles.parse_position(text, equatorial=True)
    except AngleError as error:
        lines = str(error).splitlines()
    else:
        lines = ["read"]
        assert 0.0 <= lon < 360.0
        assert -90.0 <= lat <= 90.0
    assert len(lines) == 1


@given(st.text(alphabet="0123456789 .:+-−hdms°′″,e", max_size=30), st.booleans())
def test_near_angles_are_read_or_refused(text: str, equatorial: bool) -> None:
    try:
        lon, lat = angles.parse_position(text, equatorial=equatorial)
    except AngleError:
        return
    assert 0.0 <= lon < 360.0
    assert -90.0 <= lat <= 90.0
