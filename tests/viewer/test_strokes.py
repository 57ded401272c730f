"""Weights as parallels, dashes as strokes, symbols as shapes; primitives that share memory with numpy."""

import itertools

import numpy as np
import pytest

from colure_viewer import primitives, strokes


def starts(*lengths):
    return np.concatenate([[0], np.cumsum(lengths)]).astype(np.int32)


@pytest.mark.parametrize("ratio", [1.0, 1.25, 2.0, 3.0])
@pytest.mark.parametrize("weight", [1, 2, 3])
def test_parallels_make_up_the_thickness_without_a_seam(weight, ratio):
    places = strokes.offsets(weight, ratio)
    assert places == pytest.approx([-p for p in reversed(places)])
    assert places[-1] - places[0] + 1.0 == pytest.approx(max(1.0, strokes.THICKNESS[weight] * ratio))
    assert all(b - a <= 0.8 + 1e-9 for a, b in itertools.pairwise(places))


def test_normals_do_not_look_across_the_gap_between_polylines():
    points = np.array([[0.0, 0], [10, 0], [500, 500], [500, 510]])
    n = strokes.normals(points, starts(2, 2))
    assert n == pytest.approx(np.array([[0.0, 1], [0, 1], [-1, 0], [-1, 0]]))


def test_dashes_are_measured_along_each_line():
    points = np.array([[0.0, 0], [30, 0], [100, 100], [100, 104], [100, 109]])
    cut = strokes.dashes(points, starts(2, 3), 5.0, 5.0)
    expected = [[0, 0, 5, 0], [10, 0, 15, 0], [20, 0, 25, 0], [100, 100, 100, 105]]
    assert cut == pytest.approx(np.array(expected, dtype=float), abs=1e-4)


def test_a_dash_is_cut_at_the_end_of_its_line():
    cut = strokes.dashes(np.array([[0.0, 0], [12, 0]]), starts(2), 5.0, 5.0)
    assert cut[-1] == pytest.approx([10, 0, 12, 0], abs=1e-4)


def test_nothing_to_dash():
    assert strokes.dashes(np.empty((0, 2)), starts(), 5.0, 5.0).shape == (0, 4)
    assert strokes.dashes(np.zeros((1, 2)), starts(1), 5.0, 5.0).shape == (0, 4)


def test_a_symbol_is_turned_clockwise_on_the_page():
    xy, size = np.array([[50.0, 80.0]]), np.array([[10.0, 2.0]])
    level = strokes.symbols("cross", xy, size, np.array([0.0]))
    assert level[0] == pytest.approx([40, 80, 60, 80])
    turned = strokes.symbols("cross", xy, size, np.array([np.pi / 2]))
    # y runs down: the first axis, turned clockwise by a quarter, points down.
    assert turned[0] == pytest.approx([50, 70, 50, 90])


def test_every_shape_stays_near_its_half_axes():
    for name, shape in strokes.SHAPES.items():
        assert np.abs(shape).max() <= 1.3, name


def test_level_lines():
    box = np.array([[0.0, 0], [9, 0], [9, 9], [0, 9], [0, 0]])
    assert strokes.is_level(box, starts(5))
    assert not strokes.is_level(box + np.array([[0, 0], [0, 1], [0, 0], [0, 0], [0, 0]]), starts(5))
    # The step between two lines is no piece of either.
    assert strokes.is_level(np.array([[0.0, 0], [5, 0], [9, 9], [9, 12]]), starts(2, 2))


def test_a_batch_shares_its_memory(qapp):
    batch = primitives.lines()
    rows = batch.rows(3)
    rows[:] = [[1, 2, 3, 4], [5, 6, 7, 8], [9, 10, 11, 12]]
    assert (batch.first().x1(), batch.first().y2()) == (1.0, 4.0)
    assert batch.at(2).x1() == 9.0
    rows[0, 0] = 42.0
    assert batch.first().x1() == 42.0
    batch.rows(1000)[0, 0] = 7.0
    assert batch.first().x1() == 7.0


def test_an_empty_batch_has_no_first(qapp):
    with pytest.raises(ValueError, match="empty"):
        primitives.lines().first()


def test_polygon_and_path_hold_the_points(qapp):
    points = np.array([[1.5, 2.5], [3, 4], [5, 6], [7, 8], [9, 10.25]])
    shape = primitives.polygon(points)
    assert [(p.x(), p.y()) for p in shape.toList()] == [tuple(p) for p in points.tolist()]
    both = primitives.path(points, starts(2, 3))
    elements = [(both.elementAt(i).type.name, both.elementAt(i).x, both.elementAt(i).y) for i in range(5)]
    moves = [name == "MoveToElement" for name, *_ in elements]
    assert moves == [True, False, True, False, False]
    assert elements[4][1:] == (9.0, 10.25)
    assert primitives.path(np.empty((0, 2)), starts()).isEmpty()
    assert primitives.polygon(np.empty((0, 2))).isEmpty()


def test_an_empty_line_before_others_takes_nothing_from_them():
    points = np.array([[0.0, 0], [30, 0], [60, 0]])
    assert strokes.dashes(points, starts(0, 3), 4.0, 6.0) == pytest.approx(strokes.dashes(points, starts(3), 4.0, 6.0))


def test_level_lines_become_boxes_of_whole_pixels():
    corner = np.array([[2.0, 3], [9, 3], [9, 8], [20, 30], [20, 25]])
    assert strokes.boxes(corner, starts(3, 2), 1).tolist() == [[2, 3, 8, 1], [9, 3, 1, 6], [20, 25, 1, 6]]
    assert strokes.boxes(corner, starts(3, 2), 3).tolist() == [[1, 2, 10, 3], [8, 2, 3, 8], [19, 24, 3, 8]]


def test_strokes_know_their_normals():
    xy = np.array([[0.0, 0, 10, 0], [5, 5, 5, 9], [1, 1, 1, 1]])
    assert strokes.across(xy) == pytest.approx(np.array([[0.0, 1, 0, 1], [-1, 0, -1, 0], [0, 0, 0, 0]]))
