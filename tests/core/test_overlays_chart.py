"""Overlays on the chart: a layer with a frozen key, marks, arrows and outlines where they belong, and session files."""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from colure import marks, scene, session_file, sky
from colure.arrays import ARCSEC, DEG, cartesian, separation
from colure.errors import SessionError
from colure.overlays import Overlay, directions, matching, opening, skylayer
from colure.overlays.store import STORE
from colure.scene.overlays import CELL, CROWD, ref, unref
from colure.session import Centre, Session, View
from colure.stars import catalogue

PAGE = (900, 700)


@pytest.fixture(autouse=True)
def _empty_store() -> None:
    STORE.clear()


def _table(tmp_path: Path, lon: object, lat: object, name: str = "list.csv") -> Path:
    path = tmp_path / name
    rows = "\n".join(f"{a:.9f},{b:.9f},r{k}" for k, (a, b) in enumerate(zip(lon, lat, strict=True)))  # type: ignore[call-overload]
    path.write_text(f"ra_deg,dec_deg,name\n{rows}\n", encoding="ascii")
    return path


def _session(*overlays: Overlay, width: float = 10.0, place: str = "astrometric") -> Session:
    view = View("stereographic", Centre("icrs", 80.0, 20.0), up="equator/mean/J2000", width_deg=width)
    return replace(Session.demo(), view=view, overlays=overlays, place=place)


def _scene(session: Session, before: sky.Sky | None = None) -> tuple[sky.Sky, marks.Scene]:
    found = sky.compute(session, before)
    return found, scene.build(found, PAGE)


def test_marks_stand_where_their_directions_are_and_are_picked(tmp_path: Path) -> None:
    lon, lat = np.array([79.0, 80.5, 200.0]), np.array([20.0, 21.0, 0.0])
    overlay = opening.open_file(_table(tmp_path, lon, lat), frame="equator/fk4/B1950")
    _, chart = _scene(_session(overlay))
    layer = chart.layer("overlays")
    mark = next(m for m in layer.marks if isinstance(m, marks.Symbols))
    v = directions.of(overlay)
    assert v is not None
    assert mark.role == "overlay.0"
    assert mark.colour == overlay.colour_at(0)
    assert np.allclose(mark.xy, chart.projector.project(v[:2]), atol=0.01)  # the third is far off the page
    assert (layer.shown, layer.total) == (2, 2)
    picked = chart.pick(float(mark.xy[1, 0]), float(mark.xy[1, 1]))
    assert picked is not None
    assert picked.layer == "overlays"
    assert unref(picked.row) == (0, 1)
    assert unref(int(ref(3, np.array([7]))[0])) == (3, 7)


def test_the_layer_is_made_anew_only_when_its_own_part_changes(tmp_path: Path) -> None:
    overlay = opening.open_file(_table(tmp_path, [80.0], [20.0]), frame="icrs")
    first = _session(overlay)
    one = sky.compute(first)
    later = sky.compute(replace(first, moment=first.moment.shifted(400.0)), one)
    assert later["overlays"] is one["overlays"]
    turned = sky.compute(replace(first, view=replace(first.view, width_deg=5.0)), one)
    assert turned["overlays"] is one["overlays"]
    for other in (
        replace(first, overlays=(replace(overlay, frame="equator/fk4/B1950"),)),
        replace(first, overlays=(replace(overlay, colour="#000000"),)),
        replace(first, place="apparent"),
    ):
        assert sky.compute(other, one)["overlays"] is not one["overlays"]
    dated = replace(first, overlays=(replace(overlay, frame="equator/mean/date"),))
    two = sky.compute(dated)
    assert sky.compute(replace(dated, moment=dated.moment.shifted(1.0)), two)["overlays"] is not two["overlays"]
    fixed = replace(first, overlays=(replace(overlay, frame="equator/mean/date", epoch=1990.0),))
    three = sky.compute(fixed)
    assert sky.compute(replace(fixed, moment=fixed.moment.shifted(1.0)), three)["overlays"] is three["overlays"]


def test_an_apparent_chart_carries_overlays_as_it_carries_stars(tmp_path: Path) -> None:
    star = catalogue().brighter(4.0).take(np.array([5]))
    session = _session(place="apparent")
    year = float(session.moment.julian_year)
    lon, lat = np.degrees([np.arctan2(*star.directions(year)[0, [1, 0]]), np.arcsin(star.directions(year)[0, 2])])
    overlay = opening.open_file(_table(tmp_path, [lon % 360.0], [lat]), frame="icrs", epoch=year)
    found = sky.compute(
        replace(session, overlays=(overlay,), view=replace(session.view, width_deg=360.0, limit_mag=5.0))
    )
    at = np.flatnonzero(found["stars"].base.ids == star.ids[0])
    shown = np.asarray(found["stars"].directions[:, at[0]], dtype=np.float64)
    mine = found["overlays"][0].columns[:, 0]
    # The chart's wide stars are float32, good to 0.07″, and have a parallax of up to some tenths; aberration is 20″.
    assert separation(mine, shown) < 0.4 * ARCSEC
    assert separation(mine, star.directions(year)[0]) > 1.0 * ARCSEC


def test_a_crowd_is_thinned_to_one_mark_a_cell_and_says_so(tmp_path: Path) -> None:
    rng = np.random.default_rng(3)
    count = 60_000
    overlay = opening.open_file(_table(tmp_path, rng.uniform(76, 84, count), rng.uniform(17, 23, count)), frame="icrs")
    _, chart = _scene(_session(overlay))
    layer = chart.layer("overlays")
    mark = layer.marks[0]
    assert isinstance(mark, marks.Discs)
    assert mark.colour == overlay.colour_at(0)
    # Cells are counted from 16 pixels outside the map, as the stars' are; a pixel of float32 may lie on an edge.
    cells = np.floor((mark.xy - np.array(chart.frame[:2]) + 16.0) / CELL).astype(int)
    assert len(mark.xy) == layer.shown > CROWD
    assert len(np.unique(cells, axis=0)) >= 0.999 * layer.shown
    assert layer.total > layer.shown
    assert f"overlays: {layer.shown} of {layer.total} shown, one in each 3-pixel cell" in chart.notes


def test_arrows_lead_from_the_row_to_its_star_and_are_enlarged(tmp_path: Path) -> None:
    stars = catalogue().cone(80.0 * DEG, 20.0 * DEG, 3.0 * DEG, vmag=8.0, year=2000.0)
    v = stars.directions(2000.0)
    lon, lat = np.degrees(np.arctan2(v[:, 1], v[:, 0])) % 360.0, np.degrees(np.arcsin(v[:, 2]))
    overlay = opening.open_file(_table(tmp_path, lon, lat), frame="equator/fk4/B1950", epoch=2000.0)
    overlay = replace(overlay, arrows=True)
    _, bare = _scene(_session(overlay))
    assert not any(isinstance(m, marks.Segments) for m in bare.layer("overlays").marks)  # no match was made yet
    found = matching.match(overlay)
    _, chart = _scene(_session(overlay))
    shafts = [m for m in chart.layer("overlays").marks if isinstance(m, marks.Segments)]
    assert len(shafts) == 1
    strokes = shafts[0].xy[: len(shafts[0].xy) // 3]
    true = chart.projector.project(found.true)
    ends = np.hypot(*(strokes[:, None, 2:] - true[None]).T).min(axis=0)
    assert ends.max() < 0.05
    lengths = np.hypot(strokes[:, 2] - strokes[:, 0], strokes[:, 3] - strokes[:, 1])
    _, twice = _scene(_session(replace(overlay, enlarge=2.0)))
    assert any("2 times as long" in note for note in twice.notes)
    assert any("not matched" in note for note in bare.notes)
    longer = next(m for m in twice.layer("overlays").marks if isinstance(m, marks.Segments)).xy
    longer = longer[: len(longer) // 3]
    doubled = np.hypot(longer[:, 2] - longer[:, 0], longer[:, 3] - longer[:, 1])
    assert np.median(doubled) / np.median(lengths) == pytest.approx(2.0, rel=0.02)


def test_stretched_arrows_keep_their_direction() -> None:
    given = cartesian(np.array([1.0, 2.0]), np.array([0.3, -0.9]))
    true = cartesian(np.array([1.001, 2.0]), np.array([0.3, -0.9]))
    tip = skylayer.stretched(given, true, 7.0)
    assert separation(given[0], tip[0]) == pytest.approx(7.0 * separation(given[0], true[0]), rel=1e-12)
    assert abs(tip[0] @ np.cross(given[0], true[0])) < 1e-15
    assert separation(tip[1], given[1]) < 1e-15


def test_an_image_has_an_outline_a_grid_arrows_and_its_title(tmp_path: Path) -> None:
    cards = {
        "SIMPLE": "T", "BITPIX": "8", "NAXIS": "2", "NAXIS1": "600", "NAXIS2": "400", "CTYPE1": "'RA---TAN'",
        "CTYPE2": "'DEC--TAN'", "CRVAL1": "80.0", "CRVAL2": "20.0", "CRPIX1": "300.5", "CRPIX2": "200.5",
        "CDELT1": "-0.01", "CDELT2": "0.01", "RADESYS": "'ICRS'",
    }  # fmt: skip
    path = tmp_path / "field.hdr"
    path.write_text("\n".join(f"{key:<8}= {value}".ljust(80) for key, value in cards.items()), encoding="ascii")
    overlay = opening.open_file(path)
    assert overlay.kind == "image"
    found, chart = _scene(_session(overlay))
    layer = chart.layer("overlays")
    lines = [m for m in layer.marks if isinstance(m, marks.Lines)]
    outline = max(lines, key=lambda m: m.weight)
    corners = cartesian(np.array([80.0]) * DEG, np.array([20.0]) * DEG)
    middle = chart.projector.project(corners)[0]
    width = np.ptp(outline.points[:, 0])
    # 6° by 4° of 10° across: the width in pixels is 0.6 of the map's (stereographic: within a few thousandths).
    assert width / (chart.frame[2] - chart.frame[0]) == pytest.approx(0.6, rel=0.01)
    assert np.allclose(outline.points.mean(axis=0), middle, atol=4.0)
    assert any(m.dotted for m in lines)
    arrows = next(m for m in layer.marks if isinstance(m, marks.Segments)).xy[:2]
    # North is up and east to the left of this chart.
    assert arrows[0, 3] < arrows[0, 1] - 20
    assert arrows[1, 2] < arrows[1, 0] - 20
    assert found["overlays"][0].texts == ("field.hdr", "N", "E")
    texts = [m for m in chart.layer("labels").marks if isinstance(m, marks.Labels) and m.role == "label.overlay"]
    shown = {m.texts[i] for m in texts for i in m.index.tolist()}
    assert {"N", "E"} <= shown
    assert all(m.colour == overlay.colour_at(0) for m in texts)


def test_names_of_rows_are_shown_where_asked_for(tmp_path: Path) -> None:
    overlay = opening.open_file(_table(tmp_path, [79.0, 81.0], [19.0, 21.0]), frame="icrs")
    assert overlay.name == "name"
    for asked, expected in ((False, set()), (True, {"r0", "r1"})):
        _, chart = _scene(_session(replace(overlay, names_shown=asked)))
        texts = [m for m in chart.layer("labels").marks if isinstance(m, marks.Labels) and m.role == "label.overlay"]
        assert {m.texts[i] for m in texts for i in m.index.tolist()} == expected


def test_an_outline_that_crosses_the_edge_of_the_page_is_cut(tmp_path: Path) -> None:
    overlay = opening.open_file(_table(tmp_path, [80.0], [20.0]), frame="icrs")
    line = skylayer._whole(np.array([[1.0, 0, 0], [0, 1, 0], [np.nan] * 3, [0, 0, 1], [1, 0, 0]]))
    assert [len(run) for run in line] == [2, 2]
    assert overlay.visible


def test_a_missing_file_is_shown_as_a_note_and_the_rest_is_drawn(tmp_path: Path) -> None:
    lost = Overlay(str(tmp_path / "lost.csv"), "0" * 64, "icrs", lon="ra", lat="dec")
    here = opening.open_file(_table(tmp_path, [80.0], [20.0]), frame="icrs")
    _, chart = _scene(_session(lost, here))
    assert any(note.startswith("overlay lost.csv: ") and "cannot be read" in note for note in chart.notes)
    assert [m.role for m in chart.layer("overlays").marks] == ["overlay.1"]


def test_a_hidden_overlay_draws_nothing(tmp_path: Path) -> None:
    overlay = opening.open_file(_table(tmp_path, [80.0], [20.0]), frame="icrs")
    _, chart = _scene(_session(replace(overlay, visible=False)))
    assert chart.layer("overlays").marks == ()


def test_the_session_file_keeps_overlays_and_their_unknown_keys() -> None:
    one = Overlay(
        "a b.csv", "0" * 64, "equator/fk4/B1950", rule="declared by the user", epoch=1991.25, lon="ra", lat="de"
    )
    two = Overlay(
        "i.fits", "f" * 64, "icrs", "image", hdu=2, colour="#123456", visible=False, arrows=True, enlarge=50.0
    )
    session = replace(Session.demo(), overlays=(one, two))
    text = session_file.dumps(session)
    back, unknown = session_file.loads(text)
    assert unknown == ()
    assert back.overlays == (one, two)
    more, unknown = session_file.loads(text.replace('path = "a b.csv"', 'path = "a b.csv"\nflavour = 3'))
    assert unknown == ("overlays[0].flavour",)
    assert "flavour = 3" in session_file.dumps(more)


@pytest.mark.parametrize(
    ("old", "new", "says"),
    [
        ('path = "a.csv"', "", r"overlays\[0\].path: missing"),
        (f'sha256 = "{"0" * 64}"', 'sha256 = "../../x"', "overlays.sha256"),
        ('frame = "icrs"', 'frame = "icks"', "overlays.frame"),
        ("hdu = 0", "hdu = 1.5", "a whole number"),
        ("enlarge = 1.0", "enlarge = -1.0", "overlays.enlarge"),
    ],
)
def test_a_bad_overlay_in_a_session_file_is_named(old: str, new: str, says: str) -> None:
    text = session_file.dumps(replace(Session.demo(), overlays=(Overlay("a.csv", "0" * 64, "icrs", lon="a", lat="b"),)))
    assert old in text
    with pytest.raises(SessionError, match=says):
        session_file.loads(text.replace(old, new))
