"""The grammar of frames: every sensible name round-trips, every senseless one gets one clear line."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from colure import framenames
from colure.errors import FrameError
from colure.frames import Frame

YEARS = st.floats(-9999, 9999, allow_nan=False).map(lambda year: round(year, 3))
EQUINOXES = st.one_of(
    st.just("date"),
    YEARS.map(lambda year: f"{year:.3f}"),
    YEARS.map(lambda year: f"J{year:.3f}"),
    st.integers(1, 3000).map(lambda year: f"B{year}"),
)
MODELS = st.sampled_from(["", "@auto", "@iau2006", "@vondrak2011", "@iau1976"])


@given(st.sampled_from(["equator", "ecliptic"]), st.sampled_from(["mean", "true"]), EQUINOXES, MODELS)
def test_canonical_name_parses_to_the_same_frame(plane: str, kind: str, equinox: str, model: str) -> None:
    frame = Frame.parse(f"{plane}/{kind}/{equinox}{model}")
    assert Frame.parse(str(frame)) == frame
    assert str(Frame.parse(str(frame))) == str(frame)
    assert frame.needs_moment == (equinox == "date")


def parsed(text: str) -> tuple[Frame | None, str]:
    try:
        return Frame.parse(text), ""
    except FrameError as fault:
        return None, str(fault)


@given(st.sampled_from(framenames.PLANES), st.text(max_size=12), st.text(max_size=12), st.text(max_size=12))
def test_any_text_gives_a_frame_or_one_line(plane: str, kind: str, equinox: str, model: str) -> None:
    for text in (f"{plane}/{kind}/{equinox}@{model}", f"{plane}/{kind}", f"{kind}/{equinox}", kind):
        frame, fault = parsed(text)
        assert len(fault.splitlines()) == (frame is None)
        if frame is not None:
            assert Frame.parse(str(frame)) == frame
            assert frame.label()


@pytest.mark.parametrize(
    ("text", "canonical"),
    [
        ("ICRS", "icrs"),
        (" equator / mean / j2000 ", "equator/mean/J2000"),
        ("equator/mean/2000", "equator/mean/J2000"),
        ("equator/mean/J2000.0", "equator/mean/J2000"),
        ("ecliptic/mean/-1000", "ecliptic/mean/-1000"),
        ("ecliptic/mean/J-1000", "ecliptic/mean/-1000"),
        ("ecliptic/mean/\u22121000@vondrak2011", "ecliptic/mean/-1000@vondrak2011"),
        ("ecliptic/mean/date@auto", "ecliptic/mean/date"),
        ("ecliptic/mean/0", "ecliptic/mean/J0"),
        ("ecliptic/mean/-0", "ecliptic/mean/J0"),
        ("ecliptic/J2000", "ecliptic/mean/J2000"),
        ("ecliptic/iau76", "ecliptic/iau76/J2000"),
        ("ecliptic/sun", "ecliptic/sun/date"),
        ("equator/fk4", "equator/fk4/B1950"),
        ("equator/fk4-no-e/B1875", "equator/fk4-no-e/B1875"),
        ("equator/mean/J1991.25", "equator/mean/J1991.25"),
        ("horizon@iau2006", "horizon@iau2006"),
    ],
)
def test_canonical_names(text: str, canonical: str) -> None:
    assert str(Frame.parse(text)) == canonical


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "unknown plane"),
        ("eclptic/mean/J2000", "did you mean 'ecliptic'"),
        ("ecliptic", "'ecliptic/true/date'"),
        ("equator/date", "mean or true"),
        ("equator/mena/J2000", "did you mean 'mean'"),
        ("equator/mean", "no equinox"),
        ("equator/mean/J2000/x", "too many parts"),
        ("equator/mean/J20x0", "equinox 'J20x0'"),
        ("equator/mean/nan", "equinox 'nan'"),
        ("equator/mean/inf", "equinox 'inf'"),
        ("equator/mean/999999", "outside"),
        ("equator/iau76/J2000", "unknown kind 'iau76'"),
        ("equator/fk4/date", "fixed equinox"),
        ("equator/fk4/B1200", "1700 to 2100"),
        ("ecliptic/fk4/B1950", "unknown kind 'fk4'"),
        ("ecliptic/iau76/B1950", "J2000 only"),
        ("ecliptic/sun/J2000", "ecliptic/sun/date"),
        ("icrs/J2000", "takes no kind"),
        ("galactic@iau2006", "no model can be forced"),
        ("equator/fk4/B1950@newcomb", "no model can be forced"),
        ("ecliptic/mean/date@laskar1986", "the obliquity only"),
        ("ecliptic/mean/date@iau200", "did you mean 'iau2006'"),
        ("ecliptic/mean/date@", "no model after '@'"),
        ("equator/true/date@newcomb", "no nutation"),
        ("x" * 5000, "expected a name such as"),
    ],
)
def test_senseless_names_are_refused_with_the_reason(text: str, says: str) -> None:
    with pytest.raises(FrameError) as caught:
        Frame.parse(text)
    assert says in str(caught.value)
    assert len(str(caught.value)) < 250


def test_labels_say_what_the_plane_is() -> None:
    assert Frame.parse("ecliptic/mean/date").label() == "mean ecliptic and equinox of date"
    assert Frame.parse("ecliptic/true/date").label() == "mean ecliptic and true equinox of date"
    assert Frame.parse("ecliptic/mean/-1000@vondrak2011").label() == "mean ecliptic and equinox −1000 (vondrak2011)"


def test_equinoxes_are_dates_of_tt() -> None:
    # Definitions: J2000.0 = JD 2451545.0 TT, B1950.0 = JD 2433282.42345905 (Lieske 1979).
    assert sum(Frame.parse("equator/mean/J2000").equinox_tt()) == 2451545.0
    assert sum(Frame.parse("equator/mean/B1950").equinox_tt()) == pytest.approx(2433282.42345905, abs=1e-8)
    assert Frame.parse("equator/fk4/B1950").besselian_year() == 1950.0
