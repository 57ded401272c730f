"""Looking a typed text up: names of every kind, positions, what is offered while typing, and what is refused."""

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from colure import constellations, lookup, targets
from colure.arrays import DEG, cartesian
from colure.errors import AngleError, ColureError, FrameError, TargetError
from colure.framenames import Frame
from colure.targets import Target


def _names(text: str, **options: object) -> list[str]:
    return [target.name for target in lookup.search(text, **options)]


@pytest.mark.parametrize(
    ("text", "kind", "name"),
    [
        ("mars", "body", "Mars"),
        ("the Moon", "body", "Moon"),
        ("EMB", "body", "Earth–Moon barycentre"),
        ("earth-moon barycenter", "body", "Earth–Moon barycentre"),
        ("aldebaran", "star", "Aldebaran"),
        ("alpha Tauri", "star", "Aldebaran"),
        ("alf Tau", "star", "Aldebaran"),
        ("HIP 21421", "star", "Aldebaran"),
        ("tyc 1266-1416-1", "star", "Aldebaran"),
        ("61 Cyg", "star", "61 Cyg"),
        ("barnards star", "star", "Barnard's Star"),
        ("M31", "deepsky", "M 31"),
        ("Messier 31", "deepsky", "M 31"),
        ("ngc 224", "deepsky", "NGC 224"),
        ("the orion nebula", "deepsky", "Orion Nebula"),
        ("orion", "constellation", "Orion"),
        ("UMa", "constellation", "Ursa Major"),
        ("bootis", "constellation", "Boötes"),
        ("vernal equinox", "point", "March equinox"),
        ("gegenschein", "point", "opposition point"),
        ("zenith", "point", "zenith"),
    ],
)
def test_find_by_whole_name(text: str, kind: str, name: str) -> None:
    target = lookup.find(text)
    # A designation may be printed as it was asked for or by the proper name: the star is what counts.
    same = target == lookup.find(name) or target.ref == lookup.find(name).ref
    assert (target.kind, same) == (kind, True)
    # What `find` takes, `search` offers first of all.
    assert (lookup.search(text)[0].kind, lookup.search(text)[0].ref) == (kind, target.ref)


def test_places_of_what_is_found() -> None:
    # SIMBAD, ICRS J2000.0, from memory: Aldebaran 68.98016 +16.50930, M 31 10.6847 +41.2690.
    star, galaxy = lookup.find("Aldebaran"), lookup.find("M 31")
    assert (star.frame, star.lon_deg, star.lat_deg) == (
        "icrs",
        pytest.approx(68.98016, abs=3e-5),
        pytest.approx(16.5093, abs=3e-5),
    )
    assert (galaxy.lon_deg, galaxy.lat_deg) == (pytest.approx(10.6847, abs=1e-3), pytest.approx(41.2690, abs=1e-3))
    # Barnard's Star: +10328.1 mas/yr in declination at J1991.25 (van Leeuwen 2007), growing by 1.28 mas/yr² as it comes
    # nearer (perspective acceleration, from memory): 1040.4″ in the century from 2000; 1″ for the second figure.
    now, then = (lookup.find("Barnard's Star", year=year).lat_deg for year in (2000.0, 2100.0))
    assert now is not None
    assert then is not None
    assert (then - now) * 3600.0 == pytest.approx(1040.4, abs=1.0)
    for entry in constellations.constellations():
        place = lookup.find(entry.name)
        assert place.kind == "constellation"
        assert place.lon_deg is not None
        assert place.lat_deg is not None
        assert constellations.of(cartesian(place.lon_deg * DEG, place.lat_deg * DEG)) == entry.code
    mars = lookup.find("Mars")
    assert (mars.frame, mars.lon_deg, mars.lat_deg) == (None, None, None)


def test_every_point_has_a_frame_that_exists() -> None:
    for names, frame, lon, lat in targets.POINTS:
        assert str(Frame.parse(frame)) == frame
        for name in names:
            target = lookup.find(name)
            assert (target.ref, target.frame, target.lon_deg, target.lat_deg) == (names[0], frame, lon, lat)


@pytest.mark.parametrize(
    ("text", "frame", "lon", "lat"),
    [
        ("75.5 -6.25", "icrs", 75.5, -6.25),
        ("12h30m -5", "icrs", 187.5, -5.0),
        ("ecliptic/mean/date 75 6", "ecliptic/mean/date", 75.0, 6.0),
        ("Ecliptic/Mean/-1000@vondrak2011 350.25, -0.5", "ecliptic/mean/-1000@vondrak2011", 350.25, -0.5),
        ("galactic 0 0", "galactic", 0.0, 0.0),
        ("equator/fk4/B1950 04h33m02.9s +16°24′37″", "equator/fk4/B1950", 68.2620833333, 16.4102777778),
        ("icrs 68.98 deg 16.5 deg", "icrs", 68.98, 16.5),
    ],
)
def test_typed_positions(text: str, frame: str, lon: float, lat: float) -> None:
    target = lookup.find(text)
    assert (target.kind, target.frame) == ("position", str(Frame.parse(frame)))
    assert (target.lon_deg, target.lat_deg) == (pytest.approx(lon, abs=1e-9), pytest.approx(lat, abs=1e-9))
    assert lookup.search(text) == (target,)
    # The reference is a text that says the same again.
    again = lookup.find(str(target.ref))
    assert (again.frame, again.lon_deg, again.lat_deg) == (target.frame, target.lon_deg, target.lat_deg)


def test_default_frame_of_a_position() -> None:
    target = lookup.find("75 30 00 -6", frame="ecliptic/true/date")
    assert (target.frame, target.lon_deg, target.lat_deg) == ("ecliptic/true/date", 75.5, -6.0)
    assert target.detail == Frame.parse("ecliptic/true/date").label()


@pytest.mark.parametrize(
    ("text", "error", "message"),
    [
        ("aldebran", TargetError, "did you mean 'Aldebaran'"),
        ("jupitr", TargetError, "did you mean 'Jupiter'"),
        ("oriom", TargetError, "did you mean 'Orion'"),
        ("xyzzy", TargetError, "target 'xyzzy': in no list; expected a body"),
        ("", TargetError, "nothing was given"),
        (" \t ", TargetError, "nothing was given"),
        ("x" * 500, TargetError, "500 characters"),
        ("hip 999999", TargetError, "'hip 999999': not in the catalogue"),
        ("ngc 99999", TargetError, "'ngc 99999': in no list"),
        ("99 Tau", TargetError, "'99 Tau': not among"),
        ("433 Eros", TargetError, "'433 Eros': in no list"),
        ("12:30 5", AngleError, "hours or degrees"),
        ("75.5", AngleError, "one angle; expected two"),
        ("ecliptic/mean/date 75 96", AngleError, "'96'"),
        ("ecliptic 5 5", FrameError, "mean or true"),
        ("ecliptic/meen/date 5 5", FrameError, "did you mean 'mean'"),
    ],
)
def test_find_refuses_with_a_reason(text: str, error: type[ColureError], message: str) -> None:
    with pytest.raises(error) as caught:
        lookup.find(text)
    assert message in str(caught.value)
    assert "\n" not in str(caught.value)


def test_offers_while_typing() -> None:
    assert _names("ma")[0] == "Mars"
    assert _names("ald")[:2] == ["Aldebaran", "Alderamin"]  # the brighter first
    assert _names("alpha ta") == ["α Tau"]
    assert set(_names("alpha t")) >= {"α Tau", "α TrA", "α Tri", "α Tuc"}
    assert _names("m3")[0] == "M 3"
    assert "M 31" in _names("m3")
    assert {"Andromeda Galaxy", "Triangulum Galaxy"} <= set(_names("galaxy"))
    assert {"June solstice", "December solstice"} == set(_names("solst"))
    assert "Ursa Major" in _names("major")
    assert _names("orion neb")[0] == "Orion Nebula"
    assert lookup.search("xyzzy") == ()
    assert lookup.search("") == ()
    assert lookup.search("y" * 500) == ()
    assert lookup.search("12:30 5") == ()  # could be hours or degrees: nothing is guessed


def test_kinds_take_turns_and_the_list_is_bounded() -> None:
    offered = lookup.search("a", most=8)
    assert len(offered) == 8
    assert {target.kind for target in offered[:4]} == {"star", "deepsky", "constellation", "point"}
    every = lookup.search("a", most=50)
    assert len({(target.kind, target.ref) for target in every}) == len(every)


def test_every_name_offered_leads_back_to_its_target() -> None:
    for letter in "abcdefghijklmnopqrstuvwxyz":
        for target in lookup.search(letter, most=40):
            if target.kind != "body":
                found = lookup.find(target.name)
                assert (found.kind, found.ref) == (target.kind, target.ref), target


@settings(max_examples=150, deadline=None)
@given(st.text(max_size=40))
@example("1e400 0")
@example("icrs/ 1 2")
@example("α")
@example("\x00")
@example("M 999999999999999999999")
@example("tyc 0-0-0")
@example("the ")
def test_any_text_is_answered_or_refused(text: str) -> None:
    offered = lookup.search(text)
    assert all(isinstance(target, Target) for target in offered)
    refused, target = None, None
    try:
        target = lookup.find(text)
    except ColureError as error:
        refused = str(error)
    if target is None:
        assert refused
        assert "\n" not in refused
    else:
        assert target.name
        if target.kind != "body":
            assert np.isfinite([target.lon_deg, target.lat_deg]).all()
