"""The painter: known marks at their pixels, smooth stars, phases the right way round, and no bitmap on paper."""

import dataclasses

import numpy as np
import pytest
import synthetic
from PySide6.QtCore import QByteArray
from PySide6.QtGui import QColor, QImage, QPainter
from PySide6.QtSvg import QSvgRenderer

from colure.marks import Areas, Bodies, Discs, Labels, Layer, Lines, Scene, Segments, Symbols
from colure_viewer import export, paint, themes

I32 = np.int32


def scene(*marks, width=100, height=80, ratio=1.0, clip=True, frame=None):
    return Scene(
        width, height, ratio, frame or (0.0, 0.0, width, height), (Layer("test", marks, 0, clip),), synthetic.Flat()
    )


def painted(chart, theme=themes.PAPER):
    image = export.picture(chart, theme)
    raw = np.frombuffer(image.constBits(), dtype=np.uint8).reshape(image.height(), image.bytesPerLine() // 4, 4)
    return raw[:, : image.width(), 2::-1].astype(int)


def rgb(colour):
    return list(themes.channels(colour))


def star(x, y, radius=2.0, tint=3):
    xy = np.array([[x, y]], dtype=np.float32)
    one = np.zeros(1, dtype=np.uint8)
    return Discs("star", xy, one, one + tint, np.array([radius], dtype=np.float32), np.zeros(1, dtype=np.int64))


@pytest.mark.parametrize("ratio", [1.0, 1.5, 2.0])
def test_a_star_stands_at_its_pixel(qapp, ratio):
    pixels = painted(scene(star(30.5, 20.5, 3.0), ratio=ratio))
    assert pixels.shape[:2] == (80 * ratio, 100 * ratio)
    ink = rgb(themes.PAPER.tints[3])
    assert pixels[int(20.5 * ratio), int(30.5 * ratio)].tolist() == ink
    assert pixels[int(20.5 * ratio), int(37 * ratio)].tolist() == rgb(themes.PAPER.colour("paper"))


def test_stars_move_by_parts_of_a_pixel(qapp):
    """A star that drifts a tenth of a pixel a frame never jumps, however small it is."""
    for radius in (0.62, 1.5, 4.0):
        places = []
        for step in range(31):
            dark = 243.0 - painted(scene(star(40.0 + 0.1 * step, 30.0 + 0.05 * step, radius)))[..., 0]
            dark[dark < 0.0] = 0.0
            y, x = np.mgrid[0:80, 0:100] + 0.5
            places.append(((dark * x).sum() / dark.sum(), (dark * y).sum() / dark.sum()))
        moved = np.diff(np.array(places), axis=0)
        # Phases of a quarter of a pixel: a step is 0 or 1/4, and a rounding of coverages to 1/255.
        assert np.abs(moved).max() < 0.3
        truth = np.stack([40.0 + 0.1 * np.arange(31), 30.0 + 0.05 * np.arange(31)], -1)
        assert np.abs(np.array(places) - truth).max() < 0.2


def test_many_stars_are_drawn_as_few_are(qapp, monkeypatch):
    """The bands of the fast path change nothing but the order of stars far apart."""
    monkeypatch.setattr(paint, "FEW_STARS", 1500)
    rng = np.random.default_rng(5)
    count = 4000
    xy = (rng.random((count, 2)) * [600, 500]).astype(np.float32)
    size = np.sort(rng.integers(0, 24, count)).astype(np.uint8)
    # All of one colour: where discs overlap, their order cannot be seen but in the last bit of rounding.
    discs = Discs("star", xy, size, np.full(count, 3, np.uint8), synthetic.RADII, np.arange(count))
    fast = painted(scene(discs, width=600, height=500))
    chunks = [
        dataclasses.replace(discs, xy=xy[k::4], size=size[k::4], tint=discs.tint[k::4], refs=discs.refs[k::4])
        for k in range(4)
    ]
    assert len(chunks[0].xy) < paint.FEW_STARS < count
    slow = painted(scene(*chunks, width=600, height=500))
    assert np.abs(fast - slow).max() <= 3


@pytest.mark.parametrize("weight", [1, 2, 3])
def test_a_line_is_as_thick_as_its_weight(qapp, weight):
    from colure_viewer.strokes import THICKNESS

    points = np.array([[10, 20.3], [90, 31.7]], dtype=np.float32)
    line = Lines("circle", points, np.array([0, 2], I32), weight, "#000000")
    column = 1.0 - painted(scene(line))[:, 50].mean(axis=1) / np.mean(rgb(themes.PAPER.colour("paper")))
    tilt = np.hypot(80, 11.4) / 80
    # Two smooth lines side by side cover a little more than their sum where they overlap: up to a quarter of a pixel.
    assert 0.95 <= column.sum() / tilt <= max(1.0, THICKNESS[weight]) + 0.27


def test_a_users_colour_is_kept_where_it_is_legible(qapp):
    line = Lines("circle", np.array([[0, 40.5], [100, 40.5]], np.float32), np.array([0, 2], I32), 3, "#0072B2")
    assert painted(scene(line))[40, 50].tolist() == rgb("#0072B2")


def test_dashes_leave_gaps_in_every_weight(qapp):
    points = np.array([[0, 40.5], [100, 40.5]], np.float32)
    for weight in (1, 2, 3):
        row = painted(scene(Lines("circle", points, np.array([0, 2], I32), weight, "#000000", dash=True)))[40, :, 0]
        dark = row < 100
        assert 0.4 < dark.mean() < 0.75
        assert np.abs(np.diff(dark.astype(int))).sum() >= 20


def test_areas_respect_holes_and_the_frame(qapp):
    ring = np.array([[10, 10], [90, 10], [90, 70], [10, 70], [40, 30], [60, 30], [60, 50], [40, 50]], np.float32)
    pixels = painted(scene(Areas("belt", ring, np.array([0, 4, 8], I32)), frame=(20.0, 0.0, 100.0, 80.0)))
    belt, paper = rgb(themes.PAPER.colour("belt")), rgb(themes.PAPER.colour("paper"))
    assert pixels[20, 30].tolist() == belt
    assert pixels[40, 50].tolist() == paper
    assert pixels[20, 15].tolist() == paper


def test_ticks_and_symbols_are_drawn(qapp):
    ticks = Segments("circle", np.array([[10.5, 10, 10.5, 20]], np.float32), 1, "#000000")
    cross = Symbols(
        "deepsky", ("cross",), np.zeros(1, np.uint8), np.array([[50.5, 40.5]], np.float32),
        np.array([[6, 6]], np.float32), np.zeros(1, np.float32), np.zeros(1, np.int64), "#000000",
    )  # fmt: skip
    pixels = painted(scene(ticks, cross))
    assert pixels[15, 10].max() < 60
    assert pixels[40, 46].max() < 60
    assert pixels[36, 50].max() < 60
    assert pixels[36, 46].min() > 200


@pytest.mark.parametrize("theme", [themes.PAPER, themes.SLATE], ids=lambda t: t.name)
def test_the_lit_side_of_the_moon_faces_the_limb(qapp, theme):
    def moon(lit, limb):
        one = np.ones(1, np.float32)
        return Bodies(
            ("moon",), np.array([[50.5, 40.5]], np.float32), 20 * one, lit * one, limb * one,
            np.ones(1, dtype=bool), np.zeros(1, np.int64),
        )  # fmt: skip

    thin = painted(scene(moon(0.2, 0.0)), theme)
    bright, night = thin[40, 68].sum(), thin[40, 40].sum()
    assert bright > night
    # A bright limb clockwise from +x on a page with y down: a quarter turn points down.
    down = painted(scene(moon(0.2, np.pi / 2)), theme)
    assert down[58, 50].sum() > down[24, 50].sum()
    # Half lit: the terminator runs through the middle.
    half = painted(scene(moon(0.5, 0.0)), theme)
    assert half[40, 54].sum() > half[40, 46].sum()
    gibbous = painted(scene(moon(0.8, 0.0)), theme)
    assert gibbous[40, 42].sum() == gibbous[40, 60].sum() > gibbous[40, 34].sum()


def label(text, x, y, angle=0.0, **more):
    return Labels(
        "label.star", (text,), np.zeros(1, I32), np.array([[x, y]], np.float32), np.array([angle], np.float32), **more
    )


@pytest.mark.parametrize("ratio", [1.0, 2.0])
@pytest.mark.parametrize("angle", [0.0, 0.6, np.pi / 2])
def test_a_label_is_centred_on_its_place(qapp, angle, ratio):
    pixels = painted(scene(label("HHHH", 50, 40, angle, size_pt=12, halo=False), ratio=ratio))
    y, x = np.nonzero(pixels[..., 0] < 150)
    assert len(x) > 20
    assert (x.mean() + 0.5) / ratio == pytest.approx(50, abs=0.8)
    assert (y.mean() + 0.5) / ratio == pytest.approx(40, abs=0.8)
    if angle == np.pi / 2:
        assert np.ptp(y) > 2 * np.ptp(x)


def test_a_halo_cuts_the_line_behind_the_text(qapp):
    line = Lines("grid", np.array([[0, 40.5], [100, 40.5]], np.float32), np.array([0, 2], I32), 1, "#000000")
    bare = painted(scene(line, label("i i", 50, 40, halo=False)))
    haloed = painted(scene(line, label("i i", 50, 40, halo=True)))
    assert (haloed[40, 44:56, 0] < 80).sum() < (bare[40, 44:56, 0] < 80).sum()


def test_vector_drawings_hold_shapes_only(qapp):
    chart = synthetic.chart(700, 500, stars=300)
    svg = export.encode(chart, themes.PAPER, "svg").decode()
    assert svg.count("<circle") + svg.count("<ellipse") >= 300
    for word in ("<image", "<text", "font-face", "base64"):
        assert word not in svg
    pdf = export.encode(chart, themes.PAPER, "pdf")
    assert pdf.startswith(b"%PDF")
    assert b"/Subtype /Image" not in pdf
    assert b"/FontFile" not in pdf


def test_the_vector_drawing_agrees_with_the_picture(qapp):
    chart = synthetic.chart(700, 500, stars=500, labels=20)
    image = QImage(700, 500, QImage.Format.Format_RGB32)
    image.fill(QColor("#00ff00"))
    painter = QPainter(image)
    QSvgRenderer(QByteArray(export.encode(chart, themes.PAPER, "svg"))).render(painter)
    painter.end()
    raw = np.frombuffer(image.constBits(), dtype=np.uint8).reshape(500, 700, 4)[..., 2::-1].astype(int)
    picture = painted(chart)
    # Inside the frame (the renderer of the test knows no clipping), in blocks of 10 × 10 pixels: single pixels of
    # smooth edges differ, the tone of a block only by the small differences of line widths (of 255: 4 on average).
    blocks = [p[50:450, 50:650].reshape(40, 10, 60, 10, 3).mean(axis=(1, 3)) for p in (raw, picture)]
    assert np.abs(blocks[0] - blocks[1]).mean() < 4.0


@pytest.mark.parametrize("theme", themes.THEMES.values(), ids=lambda t: t.name)
def test_every_mark_is_painted_in_every_theme(qapp, theme):
    chart = synthetic.chart(640, 480, stars=400)
    pixels = painted(chart, theme)
    assert len(np.unique(pixels.reshape(-1, 3), axis=0)) > 50
    if theme.mono:
        assert pixels[..., 1:].max() == 0


def test_an_empty_chart_is_paper(qapp):
    assert (painted(scene()) == rgb(themes.PAPER.colour("paper"))).all()
