"""The chart as numbers: pixels of known stars, the side of east for every flip, ticks and figures, keys, picking."""

from dataclasses import replace

import numpy as np
import pytest

from colure import names, scene, sky
from colure.arrays import ARCSEC, cartesian, separation
from colure.frames import from_icrs
from colure.graduation import figure, grid_step, steps, visible_longitudes
from colure.marks import Areas, Bodies, Discs, Labels, Lines, Scene, Segments, Symbols
from colure.reduction import Observer, reduce_bodies
from colure.scene.stars import CELL, scale_of
from colure.session import PROJECTIONS, Centre, Circle, Session, View

DEMO = Session.demo()
SIZE = (1100, 800)


def chart(session: Session = DEMO, size=SIZE, previous: Scene | None = None, **view) -> Scene:
    if view:
        session = replace(session, view=replace(session.view, **view))
    return scene.build(sky.compute(session), size, 1.0, previous)


def star(page: Scene, name: str) -> np.ndarray:
    """Return the pixel of a star by its name, off the layer itself."""
    mark = page.layer("stars").marks[0]
    row = names.find(name)
    at = np.flatnonzero(mark.refs == row)
    assert len(at) == 1, name
    return mark.xy[at[0]].astype(np.float64)


def texts(page: Scene, role: str) -> list[tuple[str, float, float]]:
    return [
        (mark.texts[i], float(x), float(y))
        for layer in page.layers
        for mark in layer.marks
        if isinstance(mark, Labels) and mark.role == role
        for i, (x, y) in zip(mark.index.tolist(), mark.xy.tolist(), strict=True)
    ]


# Geometry


@pytest.mark.parametrize("projection", PROJECTIONS)
def test_a_known_star_stands_at_its_longitude_and_latitude(projection):
    """Aldebaran: α 68.98016°, δ +16.50930° (Hipparcos, ICRS), ecliptic λ 69.789°, β −5.467° of J2000."""
    centre = Centre("ecliptic/mean/J2000", 69.789, -5.467)
    page = chart(projection=projection, centre=centre, up="ecliptic/mean/J2000", width_deg=20.0)
    left, top, right, bottom = page.frame
    # Within 1′ of the middle, the rounding of the figures above and its motion since 1991 (7″).
    middle = np.array([0.5 * (left + right), 0.5 * (top + bottom)])
    arcmin = (right - left) / 20.0 / 60.0
    assert np.linalg.norm(star(page, "Aldebaran") - middle) < 1.0 * arcmin


@pytest.mark.parametrize("east_left", [True, False])
@pytest.mark.parametrize("turn", [0.0, 90.0, 180.0, 270.0])
@pytest.mark.parametrize("projection", ["stereographic", "hammer"])
def test_the_side_of_east_for_every_flip(east_left, turn, projection):
    """Seen from Aldebaran, Elnath is north-east and Menkar south-west: 82.6° and 44.3° against 69.8° of longitude."""
    page = chart(
        projection=projection,
        east_left=east_left,
        rotation_deg=turn,
        width_deg=90.0,
        centre=Centre("ecliptic/mean/J2000", 69.8, -5.5),
        up="ecliptic/mean/J2000",
    )
    a, east, west = star(page, "Aldebaran"), star(page, "Elnath"), star(page, "Menkar")
    quarter = int(turn // 90.0)
    # Undo the anticlockwise turn of the picture; y runs down.
    back = np.linalg.matrix_power(np.array([[0.0, -1.0], [1.0, 0.0]]), quarter)
    to_east, to_west = back @ (east - a), back @ (west - a)
    left = -1.0 if east_left else 1.0
    assert np.sign(to_east[0]) == left
    assert np.sign(to_west[0]) == -left
    assert to_east[1] < 0.0
    assert to_west[1] > 0.0


def test_zenith_up_puts_the_zenith_above_and_east_on_its_side():
    """Facing north at the horizon: the zenith is straight up, and east is to the right of a sky chart."""
    page = chart(centre=Centre("horizon", 0.0, 20.0), up="zenith", width_deg=100.0)
    from colure.frames import to_icrs

    def at(azimuth: float, altitude: float) -> np.ndarray:
        v = to_icrs(cartesian(np.radians(azimuth), np.radians(altitude)), "horizon", DEMO.moment, DEMO.site)
        return page.projector.project(v)

    north, higher, east = at(0.0, 20.0), at(0.0, 40.0), at(30.0, 20.0)
    assert higher[0] == pytest.approx(north[0], abs=1e-6)
    assert higher[1] < north[1]
    # East left in the sense of the sky: facing north, the east is on the right hand.
    assert east[0] > north[0]


def test_unproject_and_project_are_inverse_and_refuse_the_margin():
    page = chart()
    v = page.unproject(321.0, 400.0)
    np.testing.assert_allclose(page.projector.project(v), [321.0, 400.0], atol=1e-9)
    assert page.unproject(2.0, 2.0) is None


def test_bodies_and_stars_share_one_place():
    """The distance between Mars and Regulus on the page is that of their astrometric places from the site."""
    session = replace(DEMO, view=View("gnomonic", Centre(body="mars"), "icrs", width_deg=20.0))
    s = sky.compute(session)
    page = scene.build(s, SIZE)
    (mark,) = [m for m in page.layer("bodies").marks if isinstance(m, Bodies)]
    mars = mark.xy[mark.names.index("mars")]
    v = reduce_bodies(("mars",), session.moment, observer=Observer("site", session.site), place="astrometric").vectors[
        0
    ]
    # Pixels are float32 and below 1100: 1e-4.
    np.testing.assert_allclose(mars, page.projector.project(v), atol=2e-4)


# Circles


def test_ticks_stand_on_the_circle_at_whole_degrees():
    session = replace(DEMO, circles=(Circle("ecliptic/mean/date"),))
    page = chart(session)
    (ticks,) = [m for m in page.layer("circles").marks if isinstance(m, Segments)]
    sky_at = page.projector.unproject(ticks.xy[:, :2].astype(np.float64))
    local = from_icrs(sky_at, "ecliptic/mean/date", DEMO.moment)
    degrees = np.degrees(np.arctan2(local[:, 1], local[:, 0])) % 360.0
    # A float32 pixel is 1e-4 of a pixel, and a pixel is 0.1°.
    np.testing.assert_allclose(degrees, np.round(degrees), atol=1e-4)
    assert len(set(np.round(degrees).astype(int))) == len(degrees)
    length = np.hypot(*(ticks.xy[:, 2:] - ticks.xy[:, :2]).T)
    tens = np.round(degrees).astype(int) % 10 == 0
    assert length[tens].min() > length[~tens].max()
    # North is up here, so every tick points up the page.
    assert (ticks.xy[:, 3] < ticks.xy[:, 1]).all()


@pytest.mark.parametrize("east_left", [True, False])
def test_ticks_point_north_on_charts_and_on_maps(east_left):
    for frame in ("equator/mean/date", "horizon"):
        session = replace(DEMO, circles=(Circle(frame),))
        # The galactic pole up, so that nothing is level.
        page = chart(session, east_left=east_left, up="galactic", centre=Centre(frame, 200.0, 0.0))
        (ticks,) = [m for m in page.layer("circles").marks if isinstance(m, Segments)]
        tips = page.projector.unproject(ticks.xy[:, 2:].astype(np.float64))
        local = from_icrs(tips, frame, DEMO.moment, DEMO.site)
        assert (local[:, 2] > 0.0).all()


def test_degree_figures_stand_beside_their_tick():
    session = replace(DEMO, circles=(Circle("ecliptic/mean/date"),), bodies=())
    page = chart(session)
    figures = texts(page, "figure.circle")
    assert len(figures) > 5
    for text, x, y in figures:
        v = from_icrs(page.projector.unproject(np.array([x, y])), "ecliptic/mean/date", DEMO.moment)
        lon = np.degrees(np.arctan2(v[1], v[0]))
        # The figure is centred on the line through its tick, square to the circle.
        assert abs(lon - float(text.rstrip("°"))) < 0.3


@pytest.mark.parametrize(("width", "unit"), [(110.0, "°"), (3.0, "′"), (10.0 / 60.0, "″")])
def test_the_graduation_follows_the_zoom(width, unit):
    session = replace(DEMO, circles=(Circle("ecliptic/mean/date"),))
    page = chart(session, width_deg=width, projection="gnomonic", centre=Centre("ecliptic/mean/date", 75.02, 0.01))
    figures = [text for text, _, _ in texts(page, "figure.circle")]
    assert len(figures) >= 2
    assert any(unit in text for text in figures)
    (ticks,) = [m for m in page.layer("circles").marks if isinstance(m, Segments)]
    x = np.sort(ticks.xy[:, 0])
    assert np.diff(x).min() > 3.5


def test_every_step_of_the_ladder_divides_the_next():
    for scale in np.geomspace(1.0, 1e9, 60):
        chosen = steps(float(scale))
        assert chosen.middle % chosen.minor == 0
        assert chosen.major % chosen.middle == 0
        assert 1296000 % chosen.major == 0
        assert 648000 % grid_step(float(scale)) == 0


def test_figures_as_text():
    assert figure(70 * 3600) == "70°"
    assert figure(-10 * 3600) == "350°"
    assert figure(63 * 3600 + 600) == "63° 10′"
    assert figure(-310, signed=True) == "−0° 05′ 10″"
    assert figure(20 * 3600, signed=True) == "+20°"
    assert figure(0, signed=True) == "0°"


@pytest.mark.parametrize(
    ("lat", "radius", "at_lat"), [(0.2, 0.3, 0.1), (1.0, 0.2, 1.1), (-0.5, 0.1, -0.45), (1.4, 0.3, 1.5)]
)
def test_visible_longitudes_hold_all_of_the_cone_and_little_more(lat, radius, at_lat):
    first, last = visible_longitudes(2.0, lat, radius, at_lat)
    lon = np.linspace(2.0 - np.pi, 2.0 + np.pi, 20001)
    seen = separation(cartesian(lon, at_lat), cartesian(2.0, lat)) <= radius
    assert seen.any()
    assert lon[seen].min() >= first - 1e-3
    assert lon[seen].max() <= last + 1e-3
    if last - first < 6.0:
        assert lon[seen].max() - lon[seen].min() == pytest.approx(last - first, abs=2e-3)


# Stars


def test_one_mark_a_cell_and_the_brightest_has_it():
    page = chart(projection="hammer", width_deg=360.0, limit_mag=8.0)
    layer = page.layer("stars")
    (mark,) = layer.marks
    cells = np.floor((mark.xy - [page.frame[0] - 16.0, page.frame[1] - 16.0]) / CELL).astype(int)
    assert len(np.unique(cells, axis=0)) == len(mark.xy) == layer.shown
    assert layer.shown < layer.total
    assert any(f"{layer.shown} of {layer.total}" in note for note in page.notes)
    # Faintest first, so that bright ones are painted last; no bright star is lost.
    assert (np.diff(mark.size.astype(int)) >= 0).all()
    for name in ("Sirius", "Canopus", "Arcturus", "Vega", "Capella", "Rigel"):
        star(page, name)


def test_areas_of_discs_fall_by_one_ratio():
    for limit in (5.6, 7.2, 9.0, 12.5):
        scale = scale_of(limit)
        magnitudes = np.arange(np.ceil(scale.brightest), limit + 1e-9, 0.05)
        area = scale.radii[scale.size(magnitudes)].astype(np.float64) ** 2
        slope = np.polyfit(magnitudes, np.log(area), 1)[0]
        # Sizes are quantised; over the whole range that is a few per cent.
        assert np.exp(slope) == pytest.approx(scale.area_ratio, rel=0.02)
    assert scale_of(7.0).radii.shape == (24,)


def test_stars_move_by_parts_of_a_pixel():
    """A ten-thousandth of a turn in rotation moves every star by its share, none by a whole pixel's jump."""
    a = chart(width_deg=60.0)
    b = chart(width_deg=60.0, rotation_deg=0.005)
    ma, mb = a.layer("stars").marks[0], b.layer("stars").marks[0]
    common, ia, ib = np.intersect1d(ma.refs, mb.refs, return_indices=True)
    assert len(common) > 0.98 * len(ma.refs)
    moved = np.hypot(*(mb.xy[ib] - ma.xy[ia]).T)
    middle = [0.5 * (a.frame[0] + a.frame[2]), 0.5 * (a.frame[1] + a.frame[3])]
    away = np.hypot(*(ma.xy[ia] - middle).T)
    np.testing.assert_allclose(moved, away * np.radians(0.005), atol=5e-4)


def test_the_limit_follows_the_width_unless_it_is_set():
    faint = [chart(width_deg=w).layer("stars").total for w in (110.0, 40.0, 12.0)]
    assert all(500 < n < 8000 for n in faint)
    assert "stars to 7.2 mag" in " ".join(text for text, _, _ in texts(chart(width_deg=110.0), "legend"))
    assert chart(limit_mag=3.0).layer("stars").total < 60


# Bodies


def test_the_moon_shows_its_true_phase_and_where_the_sun_is():
    session = replace(DEMO, view=View("stereographic", Centre(body="moon"), "ecliptic/mean/date", width_deg=120.0))
    s = sky.compute(session)
    page = scene.build(s, SIZE)
    (mark,) = page.layer("bodies").marks
    moon = mark.names.index("moon")
    moon_v, sun_v = s["bodies"].vector("moon"), s["bodies"].vector("sun")
    elongation = separation(moon_v, sun_v)
    # Phase angle and elongation add to 180° but for the Sun's finite distance (0.15°): (1 − cos E)/2 to 0.002.
    assert mark.lit[moon] == pytest.approx(0.5 * (1.0 - np.cos(elongation)), abs=0.002)
    towards = page.projector.project(moon_v + 0.05 * (sun_v - moon_v)) - page.projector.project(moon_v)
    angle = np.arctan2(towards[1], towards[0])
    assert np.cos(angle - mark.limb[moon]) > 0.999


def test_discs_are_true_when_zoomed_in_and_marks_when_not():
    wide, near = chart(centre=Centre(body="jupiter")), chart(centre=Centre(body="jupiter"), width_deg=0.05)
    mark = near.layer("bodies").marks[0]
    j = mark.names.index("jupiter")
    assert mark.true_size[j]
    # Equatorial radius 71492 km (IAU 2015) at its distance.
    s = sky.compute(replace(DEMO, view=replace(DEMO.view, centre=Centre(body="jupiter"))))["bodies"]
    radius = np.arcsin(71492.0 / 149597870.7 / s.distance_au[s.names.index("jupiter")])
    assert mark.radius[j] == pytest.approx(radius * near.projector.scale, rel=1e-4)
    assert not wide.layer("bodies").marks[0].true_size[wide.layer("bodies").marks[0].names.index("jupiter")]


# Labels


def boxes(page: Scene) -> list[tuple[str, float, float, float, float]]:
    from colure.fontmetrics import width_px
    from colure.scene.names import height

    out = []
    for mark in page.layer("labels").marks:
        for i, (x, y), angle in zip(mark.index.tolist(), mark.xy.tolist(), mark.angle.tolist(), strict=True):
            w = width_px(mark.texts[i], mark.size_pt, mark.role, italic=mark.italic, bold=mark.bold)
            h = height(mark.size_pt)
            c, s = abs(np.cos(angle)), abs(np.sin(angle))
            out.append((mark.texts[i], x, y, 0.5 * (c * w + s * h), 0.5 * (s * w + c * h)))
    return out


NEAR = {"width_deg": 12.0, "centre": Centre("ecliptic/mean/date", 68.0, -4.0)}


@pytest.mark.parametrize("view", [{}, {"projection": "hammer", "width_deg": 360.0}, NEAR])
def test_no_label_covers_another_a_bright_star_or_a_planet(view):
    page = chart(**view)
    found = boxes(page)
    assert len(found) > 5
    for i, (_, x, y, w, h) in enumerate(found):
        for _, x2, y2, w2, h2 in found[:i]:
            assert abs(x - x2) >= w + w2 - 0.01 or abs(y - y2) >= h + h2 - 0.01
    stars = page.layer("stars").marks[0]
    radius = stars.radii[stars.size]
    bright = np.column_stack([stars.xy, radius])[radius >= 2.3][-300:]
    bodies = page.layer("bodies").marks
    discs = np.concatenate([bright, *[np.column_stack([m.xy, m.radius]) for m in bodies]])
    for text, x, y, w, h in found:
        gap = np.hypot(np.maximum(np.abs(discs[:, 0] - x) - w, 0), np.maximum(np.abs(discs[:, 1] - y) - h, 0))
        assert (gap >= discs[:, 2] - 0.01).all(), text


def test_labels_do_not_jump_while_time_runs():
    """An hour in steps of two minutes at one view: texts of stars stay on their side, and none comes and goes."""
    previous = None
    sides: dict[str, list[tuple[float, float]]] = {}
    session = replace(DEMO, bodies=(), circles=(Circle("ecliptic/mean/date", colour="#D55E00"),))
    for k in range(30):
        now = replace(session, moment=DEMO.moment.shifted(k * 2.0 / 1440.0))
        previous = chart(now, previous=previous)
        for text, x, y in texts(previous, "label.star"):
            sides.setdefault(text, []).append((x, y))
    assert len(sides) > 20
    for text, places in sides.items():
        assert len(places) == 30, text
        # The sky itself moves by far less than a pixel here (precession of an hour).
        assert np.ptp(np.array(places), axis=0).max() < 0.5, text


def test_a_still_from_none_is_repeatable():
    a, b = chart(), chart()
    assert boxes(a) == boxes(b)


# Layers


def test_layers_are_handed_on_while_their_key_is_the_same():
    s = sky.compute(DEMO)
    first = scene.build(s, SIZE)
    second = scene.build(sky.compute(replace(DEMO), s), SIZE, 1.0, first)
    assert all(a is b for a, b in zip(first.layers, second.layers, strict=True))
    later = sky.compute(replace(DEMO, bodies=("mars",)), s)
    third = scene.build(later, SIZE, 1.0, second)
    kept = {a.name for a, b in zip(second.layers, third.layers, strict=True) if a is b}
    assert {"sky", "stars", "circles", "milky way", "grid", "deep sky", "rim"} <= kept
    assert "bodies" not in kept


def test_a_fixed_view_of_a_fixed_sky_redraws_only_what_moves():
    session = replace(DEMO, circles=(Circle("galactic"),), view=View("hammer", Centre("galactic"), "galactic"))
    session = replace(session, layers=replace(session.layers, grid="galactic"))
    s = sky.compute(session)
    first = scene.build(s, SIZE)
    later = sky.compute(replace(session, moment=DEMO.moment.shifted(0.1)), s)
    second = scene.build(later, SIZE, 1.0, first)
    kept = {a.name for a, b in zip(first.layers, second.layers, strict=True) if a is b}
    assert {"sky", "milky way", "grid", "circles", "deep sky", "rim"} <= kept


# Picking, furniture, robustness


def test_pick_finds_the_star_and_the_body_under_the_pointer():
    page = chart()
    x, y = star(page, "Aldebaran")
    found = page.pick(x + 2.0, y - 1.0)
    assert found is not None
    assert (found.layer, found.row) == ("stars", names.find("Aldebaran"))
    (mark,) = page.layer("bodies").marks
    bx, by = mark.xy[mark.names.index("uranus")].tolist()
    body = page.pick(bx, by)
    assert body is not None
    assert body.layer == "bodies"
    assert sky.compute(DEMO)["bodies"].names[body.row] == "uranus"
    assert page.pick(1.0, 1.0) is None


def test_the_title_block_says_what_the_chart_is():
    page = chart()
    said = " | ".join(text for text, _, _ in texts(page, "title"))
    for part in (
        "2026-12-01 21:36:00 UTC",
        "Quern Hill",
        "129.40° E 25.90° S 710 m",
        "stereographic",
        "ecliptic up",
        "110° across",
        "east left",
        "λ 75° 00′",
        "β +6° 00′",
        "mean ecliptic",
        "astrometric",
    ):
        assert part in said
    assert "east right" in " ".join(text for text, _, _ in texts(chart(east_left=False), "title"))
    legend = [mark for mark in page.layer("title").marks if isinstance(mark, Discs)]
    assert len(legend) == 1


@pytest.mark.parametrize(("offset", "warned"), [(0.0, True), (15.0, True), (24.0, False)])
def test_the_caution_near_the_sun(offset, warned):
    s = sky.compute(DEMO)["bodies"].vector("sun")
    local = from_icrs(s, "ecliptic/mean/date", DEMO.moment)
    lon = np.degrees(np.arctan2(local[1], local[0])) + offset
    page = chart(projection="gnomonic", width_deg=4.0, centre=Centre("ecliptic/mean/date", lon, 0.0))
    said = " ".join(text for text, _, _ in texts(page, "caution"))
    assert ("injures eyes" in said) == warned
    assert any("injures eyes" in note for note in page.notes) == warned


@pytest.mark.parametrize("projection", PROJECTIONS)
@pytest.mark.parametrize("width", [0.05, 3.0, 110.0, 360.0])
@pytest.mark.parametrize("centre", [(0.0, 90.0), (180.0, -90.0), (359.99, 0.0)])
def test_every_view_is_laid_out_with_finite_numbers(projection, width, centre):
    session = replace(DEMO, layers=replace(DEMO.layers, edges=True), place="apparent")
    at = Centre("equator/true/date", *centre)
    page = chart(session, (700, 520), projection=projection, width_deg=width, centre=at, up="equator/true/date")
    for layer in page.layers:
        for mark in layer.marks:
            points = mark.points if isinstance(mark, Lines | Areas) else mark.xy
            assert np.isfinite(points).all(), (layer.name, mark.role)
            assert np.abs(points).max(initial=0.0) < 2e4, (layer.name, mark.role)
            if isinstance(mark, Lines | Areas):
                assert mark.starts[0] == 0
                assert mark.starts[-1] == len(mark.points)
                assert (np.diff(mark.starts) >= 2).all()


@pytest.mark.parametrize("size", [(120, 90), (320, 240), (640, 480), (3840, 2160)])
def test_every_size_of_page_has_a_map_within_it(size):
    page = chart(size=size)
    left, top, right, bottom = page.frame
    assert 0 < left < right < size[0]
    assert 0 < top < bottom < size[1]


def test_the_rim_figures_are_the_longitudes_at_the_edge():
    page = chart(centre=Centre("ecliptic/mean/date", 75.0, 0.0), projection="mercator", width_deg=90.0)
    found = texts(page, "figure.rim")
    left, top, _, _ = page.frame
    above = [(text, x) for text, x, y in found if y < top]
    assert len(above) >= 5
    for text, x in above:
        v = page.projector.unproject(np.array([x, top + 1.0]))
        local = from_icrs(v, "ecliptic/mean/date", DEMO.moment)
        lon = np.degrees(np.arctan2(local[1], local[0])) % 360.0
        assert lon == pytest.approx(float(text.rstrip("°")), abs=0.05)
    beside = [(text, y) for text, x, y in found if x < left]
    for text, y in beside:
        v = page.projector.unproject(np.array([left + 1.0, y]))
        lat = np.degrees(np.arcsin(from_icrs(v, "ecliptic/mean/date", DEMO.moment)[2]))
        assert lat == pytest.approx(float(text.rstrip("°").replace("−", "-")), abs=0.05)


def test_a_pixel_of_the_narrowest_field_is_resolved():
    """In a field of one minute of arc, a star's pixel agrees with its direction to a hundredth of a pixel."""
    row = names.find("Aldebaran")
    s = sky.compute(DEMO)
    base = s["stars"].base
    v = s["stars"].directions[:, np.flatnonzero(base.ids == row)[0]].astype(np.float64)
    local = from_icrs(v, "icrs")
    at = Centre(
        "icrs", np.degrees(np.arctan2(local[1], local[0])), np.degrees(np.arcsin(local[2] / np.linalg.norm(local)))
    )
    session = replace(DEMO, view=View("gnomonic", at, "icrs", width_deg=1.0 / 60.0))
    near = sky.compute(session)
    page = scene.build(near, SIZE)
    base = near["stars"].base
    exact = near["stars"].directions[:, np.flatnonzero(base.ids == row)[0]]
    assert near["stars"].directions.dtype == np.float64
    np.testing.assert_allclose(star(page, "Aldebaran"), page.projector.project(exact), atol=0.01)
    assert page.projector.scale * ARCSEC > 10.0


def test_a_small_page_shows_fewer_stars_unless_the_limit_is_set():
    small, large = chart(size=(420, 320)), chart()
    density = [
        page.layer("stars").total / ((page.frame[2] - page.frame[0]) * (page.frame[3] - page.frame[1]))
        for page in (small, large)
    ]
    # Half as dense again at most, where the same limit would be several times as dense.
    assert density[0] < 1.5 * density[1]
    assert chart(size=(420, 320), limit_mag=7.2).layer("stars").total > small.layer("stars").total


def test_crossings_are_crosses_with_the_points_shown_or_not():
    """The first four crossings were once drawn as equinoxes where the points were switched off."""
    belt = replace(DEMO.belt, crossings=True)
    for shown in (True, False):
        session = replace(DEMO, belt=belt, layers=replace(DEMO.layers, points=shown))
        session = replace(session, view=replace(session.view, projection="hammer", width_deg=360.0))
        marks = [m for m in chart(session).layer("points").marks if isinstance(m, Symbols)]
        last = marks[-1]
        assert len(last.xy) > 10
        assert {last.kinds[kind] for kind in last.kind} == {"cross"}
