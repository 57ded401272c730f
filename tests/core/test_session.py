"""Sessions: values checked where they are made, files read back as written, and no file that breaks the reader."""

import math
from dataclasses import fields, replace

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from colure import session_file
from colure.errors import BodyError, ColureError, SessionError
from colure.files import FileError
from colure.moment import Moment
from colure.session import BODIES, PROJECTIONS, Belt, Centre, Circle, Layers, Session, View
from colure.sites import Site

FRAMES = ("icrs", "ecliptic/mean/date", "ecliptic/mean/-1000@vondrak2011", "equator/fk4/B1950", "galactic", "horizon")


def test_the_demo_is_at_quern_hill():
    demo = Session.demo()
    # The invented site of the design: 129.40° E 25.90° S 710 m.
    assert (demo.site.name, demo.site.lon_deg, demo.site.lat_deg, demo.site.height_m) == (
        "Quern Hill",
        129.40,
        -25.90,
        710.0,
    )
    assert demo.moment.isot() == "2026-12-01T21:36:00.000"


def test_the_demo_is_written_and_read_back_whole():
    demo = Session.demo()
    text = session_file.dumps(demo)
    assert text.startswith("format = 1")
    back, unknown = session_file.loads(text)
    assert back == demo
    assert unknown == ()
    assert session_file.dumps(back) == text


numbers = st.floats(allow_nan=False, allow_infinity=False)


@st.composite
def sessions(draw) -> Session:
    def between(low: float, high: float) -> float:
        return draw(st.floats(low, high))

    name = draw(st.sampled_from(PROJECTIONS))
    centre = Centre(
        draw(st.sampled_from(FRAMES)),
        between(0.0, 359.9),
        between(-90.0, 90.0),
        draw(st.none() | st.sampled_from(BODIES)),
    )
    view = View(
        name,
        centre,
        draw(st.sampled_from((*FRAMES, "zenith"))),
        draw(st.booleans()),
        between(0.02, 150.0),
        between(0.0, 359.0),
        draw(st.none() | st.floats(-1.0, 15.0)),
    )
    circles = tuple(
        Circle(
            draw(st.sampled_from(FRAMES)),
            between(-80.0, 80.0),
            draw(st.none() | st.sampled_from(("#000000", "#A1b2C3"))),
            draw(st.booleans()),
            draw(st.booleans()),
            draw(st.none() | st.text(st.characters(codec="utf-8", exclude_categories=("Cs",)), min_size=1, max_size=9)),
        )
        for _ in range(draw(st.integers(0, 4)))
    )
    return Session(
        Moment(
            2451544.5 + draw(st.integers(-900000, 900000)), between(0.0, 0.999), draw(st.sampled_from(("UTC", "TT")))
        ),
        Site(draw(st.text(st.characters(codec="utf-8", exclude_categories=("Cs",)), max_size=9)), 12.5, -3.25, 100.0),
        view,
        draw(st.sampled_from(("geometric", "astrometric", "apparent", "observed"))),
        draw(st.booleans()),
        circles,
        Belt(draw(st.booleans()), "ecliptic/mean/J2000", between(0.2, 50.0)),
        tuple(draw(st.lists(st.sampled_from(BODIES), unique=True))),
        Layers(grid=draw(st.none() | st.just("galactic"))),
    )


@given(sessions())
@settings(max_examples=60, deadline=None)
def test_any_session_is_read_back_as_it_was_written(session):
    back, unknown = session_file.loads(session_file.dumps(session))
    assert back == session
    assert unknown == ()


def test_the_horizon_of_a_site_is_kept():
    site = Site("with hills", 10.0, 50.0, 300.0, horizon=((0.0, 2.0), (180.0, 5.5), (360.0, 2.0)))
    session = replace(Session.demo(), site=site)
    assert session_file.loads(session_file.dumps(session))[0].site == site


def test_unknown_keys_are_reported_kept_and_written_back():
    text = session_file.dumps(Session.demo())
    text = text.replace("[view]", '[view]\nlens = "red"', 1).replace("[[circles]]", "[[circles]]\ninked = 3", 1)
    text = "mood = 7\n" + text + "\n[rails]\nnight = true\n[rails.deep]\nx = 1\n"
    session, unknown = session_file.loads(text)
    assert set(unknown) == {"mood", "view.lens", "circles[0].inked", "rails"}
    assert session == Session.demo()
    again, still = session_file.loads(session_file.dumps(session))
    assert set(still) == set(unknown)
    assert again == session
    # A circle takes its unknown keys along when it is moved.
    moved = replace(again, circles=again.circles[1:] + again.circles[:1])
    assert f"circles[{len(moved.circles) - 1}].inked" in session_file.loads(session_file.dumps(moved))[1]


@pytest.mark.parametrize(
    ("change", "said"),
    [
        (("format = 1", "format = 2"), "format"),
        (("format = 1", "format = true"), "format"),
        (("width_deg = 110.0", "width_deg = nan"), "view.width_deg"),
        (("width_deg = 110.0", "width_deg = inf"), "view.width_deg"),
        (("width_deg = 110.0", 'width_deg = "wide"'), "view.width_deg"),
        (("width_deg = 110.0", "width_deg = true"), "view.width_deg"),
        (("width_deg = 110.0", "width_deg = -4"), "view.width_deg"),
        (('projection = "stereographic"', 'projection = "stereografic"'), "did you mean 'stereographic'"),
        (("lat_deg = -25.9", "lat_deg = 125.9"), "latitude"),
        (("lat_deg = -25.9", "lat_deg = nan"), "site.lat_deg"),
        (('place = "astrometric"', 'place = "seen"'), "place"),
        (('"mars"', '"marz"'), "did you mean 'mars'"),
        (('"mars"', "3"), "bodies[4]"),
        (('"mars"', '"venus"'), "twice"),
        (('colour = "#0072B2"', 'colour = "blue"'), "colour"),
        (('frame = "galactic"', 'frame = "galaktic"'), "galactic"),
        (("tt_jd = [", "tt_jd = [1.0, "), "moment.tt_jd"),
        (("[view.centre]", "[view.middle]\n[view.centre]\nlat_deg = 95.0\n[x]"), "view.centre.lat_deg"),
        (("graduated = true", "graduated = 1"), "circles[0].graduated"),
    ],
)
def test_a_bad_value_is_named(change, said):
    text = session_file.dumps(Session.demo())
    assert change[0] in text
    with pytest.raises(SessionError, match=r".+") as caught:
        session_file.loads(text.replace(*change, 1))
    assert said in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("data", [b"", b"\xff\xfe", b"format = 1", b"format = 1\nmoment = 3", b"[", b"a" * 2_000_000])
def test_a_corrupt_file_is_one_clear_line(tmp_path, data):
    path = tmp_path / "bad.toml"
    path.write_bytes(data)
    with pytest.raises(SessionError) as caught:
        session_file.read(path)
    assert "bad.toml" in str(caught.value)


def test_a_missing_file_and_a_folder_are_named(tmp_path):
    for path in (tmp_path / "none.toml", tmp_path):
        with pytest.raises(SessionError, match="cannot be read"):
            session_file.read(path)


def test_a_save_that_fails_leaves_the_old_file_whole(tmp_path):
    path = tmp_path / "mine.toml"
    session_file.write(Session.demo(), path)
    old = path.read_text(encoding="utf-8")
    with pytest.raises(FileError, match="cannot be written"):
        session_file.write(Session.demo(), tmp_path / "no such folder" / "mine.toml")
    assert path.read_text(encoding="utf-8") == old
    assert [p.name for p in tmp_path.iterdir()] == ["mine.toml"]


leaves = (
    st.none().map(lambda _: "x")
    | st.booleans()
    | st.integers(-(2**62), 2**62)
    | st.floats()
    | st.text(max_size=12)
    | st.sampled_from(FRAMES)
)
values = (
    leaves
    | st.lists(leaves | st.lists(leaves, max_size=3), max_size=4)
    | st.dictionaries(st.text(max_size=6), leaves | st.lists(leaves, max_size=3), max_size=4)
)
KEYS = sorted(
    {f.name for kind in (Session, View, Centre, Circle, Belt, Layers, Site) for f in fields(kind)} | {"tt_jd"}
)


@given(st.data())
@settings(max_examples=250, deadline=None)
def test_no_document_breaks_the_reader(data):
    """Put anything anywhere in a good document: it is read, or refused with a ColureError of one line."""
    import tomllib

    import tomli_w

    document = tomllib.loads(session_file.dumps(Session.demo()))
    for _ in range(data.draw(st.integers(1, 3))):
        table = document
        while True:
            keys = [key for key, value in table.items() if isinstance(value, dict)]
            if not keys or data.draw(st.booleans()):
                break
            table = table[data.draw(st.sampled_from(keys))]
        table[data.draw(st.sampled_from([*table, *KEYS]))] = data.draw(values)
    refused = ""
    try:
        session, _ = session_file.loads(tomli_w.dumps(document))
    except ColureError as fault:
        refused = str(fault)
    if refused:
        assert "\n" not in refused
    else:
        assert math.isfinite(session.view.width_deg)
        assert session_file.loads(session_file.dumps(session))[0] == session


@given(st.text(max_size=200))
@settings(max_examples=200, deadline=None)
def test_no_text_breaks_the_reader(text):
    with pytest.raises(ColureError):
        session_file.loads(text)


def test_values_are_refused_where_they_are_made():
    with pytest.raises(SessionError, match="width_deg"):
        View(width_deg=math.nan)
    with pytest.raises(SessionError, match="lat_deg"):
        Centre(lat_deg=91.0)
    with pytest.raises(BodyError, match="unknown"):
        Centre(body="vulcan")
    with pytest.raises(SessionError, match="half_width_deg"):
        Belt(half_width_deg=0.0)
    assert View("gnomonic", width_deg=300.0).width_deg == 150.0
    assert Centre(lon_deg=-30.0).lon_deg == 330.0
