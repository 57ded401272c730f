"""The pictures that are kept: discs of the right area at every phase, texts where they are said to be."""

import numpy as np
import pytest

from colure_viewer import atlas
from colure_viewer.atlas import StarAtlas, TextAtlas

# From the smallest disc of a chart (scene.stars.SMALLEST) to one of the largest.
RADII = np.array([0.62, 0.8, 1.0, 2.3, 5.0], dtype=np.float32)


@pytest.mark.parametrize("ratio", [1.0, 1.5, 2.0])
def test_a_disc_has_its_area_and_place_at_every_phase(qapp, ratio):
    stars = StarAtlas(RADII, ("#000000", "#FF0000"), ratio)
    picture = stars.pixmap.toImage()
    alpha = atlas.pixels(picture)[..., 3].astype(float) / 255.0
    for size, radius in enumerate(RADII * ratio):
        for y in range(stars.phases):
            for x in range(stars.phases):
                row = stars.table[((size * 2 + 1) * stars.phases + y) * stars.phases + x]
                left, top, width, height = (int(v) for v in row[2:6])
                tile = alpha[top : top + height, left : left + width]
                # Coverages are rounded to 1/255 in some 10 to 100 pixels: 2 % of the area.
                assert tile.sum() == pytest.approx(np.pi * radius**2, rel=0.02)
                across, down = np.arange(width) + 0.5, np.arange(height) + 0.5
                centroid = np.array([(tile.sum(0) * across).sum(), (tile.sum(1) * down).sum()]) / tile.sum()
                # A fragment is drawn with its middle on x, y: the disc's own place is pixel + phase. Its middle is only
                # as good as a smooth edge of one pixel can make it: half a phase for the smallest.
                offset = centroid - row[4:6] / 2 + row[:2]
                assert offset == pytest.approx(np.array([x, y]) / stars.phases, abs=0.125)


def test_colour_is_that_of_the_tint(qapp):
    stars = StarAtlas(RADII, ("#102030", "#FF8040"), 1.0)
    row = stars.table[(4 * 2 + 1) * stars.phases**2]
    picture = stars.pixmap.toImage()
    middle = picture.pixelColor(int(row[2] + row[4] / 2), int(row[3] + row[5] / 2))
    assert middle.name() == "#ff8040"


def test_a_text_is_drawn_once_and_its_halo_surrounds_it(qapp):
    text = TextAtlas()
    face = ("Colure Sans", 16.0, False, False)
    first = text.tiles(["30°", "60°", "30°"], face, "#000000", "#FFFFFF", 1.0)
    assert first[0] == first[2] != first[1]
    assert text.tiles(["60°"], face, "#000000", "#FFFFFF", 1.0)[0] == first[1]
    left, top, width, height, anchor_x, anchor_y = (int(v) for v in text.table[first[0]])
    picture = text.pixmap.toImage()
    tile = atlas.pixels(picture)[top : top + height, left : left + width]
    ink = (tile[..., 3] > 200) & (tile[..., 0] < 60)
    rim = (tile[..., 3] > 200) & (tile[..., 0] > 200)
    assert ink.any()
    assert rim.sum() > ink.sum() / 2
    rows, columns = np.nonzero(ink)
    # The anchor is the middle of the advance width and of the capitals' height: within a pixel of the ink's middle,
    # which a ° without a partner at the left pulls about.
    assert anchor_y == pytest.approx((rows.min() + rows.max()) / 2, abs=1.5)
    assert anchor_x == pytest.approx((columns.min() + columns.max()) / 2, abs=1.5)


def test_the_atlas_grows_without_losing_tiles(qapp):
    text = TextAtlas()
    face = ("Colure Serif", 30.0, True, False)
    [first] = text.tiles(["ecliptic"], face, "#123456", None, 1.0)

    def tile(number):
        left, top, width, height = (int(v) for v in text.table[number][:4])
        picture = text.pixmap.toImage()
        return atlas.pixels(picture)[top : top + height, left : left + width].copy()

    before, height = tile(first), text.pixmap.height()
    text.tiles([f"star {i}" for i in range(300)], face, "#123456", None, 1.0)
    assert text.pixmap.height() > height
    assert np.array_equal(tile(first), before)
    text.clear()
    assert text.pixmap.height() == height
