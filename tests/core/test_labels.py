"""Labels: none covers another, a mark or the edge; none moves without need; room is kept with a margin."""

import numpy as np
import pytest

from colure.fontmetrics import face_of, width_em, width_px
from colure.labels import HIDDEN, MARGIN, NOWHERE, PATIENCE, Placement, Request, around, join, place

FRAME = (0.0, 0.0, 1000.0, 700.0)


def crowd(n: int = 300, seed: int = 1) -> tuple[Request, np.ndarray]:
    rng = np.random.default_rng(seed)
    xy = rng.uniform([0, 0], [1000, 700], (n, 2)).astype(np.float32)
    half = np.stack([rng.uniform(12, 45, n), np.full(n, 7.0)], axis=1).astype(np.float32)
    radius = rng.uniform(1.5, 6.0, n).astype(np.float32)
    return Request(np.arange(n), around(xy, radius, half), half), np.column_stack([xy, radius]).astype(np.float32)


def overlaps(centres: np.ndarray, half: np.ndarray) -> np.ndarray:
    d = np.abs(centres[:, None] - centres[None])
    both = (d < half[:, None] + half[None] - 1e-3).all(axis=2)
    np.fill_diagonal(both, False)
    return both


def positions(request: Request, choice: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    shown = np.flatnonzero(choice >= 0)
    return request.centres[shown, choice[shown]], request.half[shown]


@pytest.mark.parametrize("seed", range(4))
def test_no_text_covers_another_a_mark_or_the_edge(seed):
    request, discs = crowd(seed=seed)
    choice, _ = place(request, discs, FRAME)
    centres, half = positions(request, choice)
    assert len(centres) > 40
    assert not overlaps(centres, half).any()
    assert (centres - half >= [0.0, 0.0]).all()
    assert (centres + half <= [1000.0, 700.0]).all()
    gap = np.maximum(np.abs(centres[:, None] - discs[None, :, :2]) - half[:, None], 0.0)
    assert (np.linalg.norm(gap, axis=2) >= discs[:, 2] - 1e-3).all()


def test_rank_decides_who_gets_the_room():
    half = np.array([[30.0, 7.0], [30.0, 7.0]], np.float32)
    centres = np.array([[[500.0, 300.0]], [[510.0, 300.0]]], np.float32)
    choice, _ = place(Request(np.array([7, 3]), centres, half), np.empty((0, 3), np.float32), FRAME)
    np.testing.assert_array_equal(choice, [0, HIDDEN])


def test_the_same_request_and_memory_give_the_same_answer():
    request, discs = crowd()
    first, memory = place(request, discs, FRAME)
    again, _ = place(request, discs, FRAME)
    np.testing.assert_array_equal(first, again)
    kept, _ = place(request, discs, FRAME, memory)
    shown = first >= 0
    np.testing.assert_array_equal(kept[shown], first[shown])


def test_texts_do_not_jump_while_their_marks_drift():
    """Marks drift by a pixel in all; hardly a text changes its side, and none flickers in and out."""
    request, discs = crowd(200, seed=5)
    rng = np.random.default_rng(0)
    drift = rng.normal(0.0, 0.05, (200, 2)).astype(np.float32)
    choice, memory = place(request, discs, FRAME)
    history = [choice]
    for k in range(1, 25):
        moved = Request(request.ids, request.centres + drift[:, None, :] * k, request.half)
        marks = discs.copy()
        marks[:, :2] += drift * k
        choice, memory = place(moved, marks, FRAME, memory)
        centres, half = positions(moved, choice)
        assert not overlaps(centres, half).any()
        history.append(choice)
    table = np.array(history)
    shown_first = table[0] >= 0
    changes = (np.diff(table[:, shown_first], axis=0) != 0).sum(axis=0)
    # Two marks that drift together must part somewhere; nobody may go back and forth.
    assert (changes > 0).mean() < 0.1
    assert changes.max() <= 2


def test_a_newcomer_needs_a_margin_that_an_incumbent_may_lose():
    half = np.array([[20.0, 7.0], [20.0, 7.0]], np.float32)
    none = np.empty((0, 3), np.float32)

    def ask(gap: float) -> Request:
        return Request(np.array([0, 1]), np.array([[[300.0, 300.0]], [[340.0 + gap, 300.0]]], np.float32), half)

    assert place(ask(MARGIN - 1.0), none, FRAME)[0][1] == HIDDEN
    _, memory = place(ask(MARGIN + 1.0), none, FRAME)
    assert place(ask(MARGIN - 1.0), none, FRAME, memory)[0][1] == 0
    assert place(ask(-1.0), none, FRAME, memory)[0][1] == HIDDEN


def test_a_newcomer_in_the_lead_takes_the_room_of_one_that_stood_there():
    half = np.full((2, 2), 10.0, np.float32)
    none = np.empty((0, 3), np.float32)
    nan = [np.nan, np.nan]
    spots = np.array([[[300.0, 300.0], nan], [[305.0, 300.0], [400.0, 300.0]]], np.float32)
    behind = Request(np.array([2]), spots[1:], half[1:])
    choice, memory = place(behind, none, FRAME)
    np.testing.assert_array_equal(choice, [0])
    both = Request(np.array([1, 2]), spots, half)
    # Without the lead the newcomer finds the room taken; with it, the other moves to its second place at once.
    np.testing.assert_array_equal(place(both, none, FRAME, memory)[0], [HIDDEN, 0])
    np.testing.assert_array_equal(place(both, none, FRAME, memory, lead=1)[0], [0, 1])


@pytest.mark.parametrize("seed", range(4))
def test_no_text_covers_another_whoever_leads(seed):
    request, discs = crowd(seed=seed)
    _, memory = place(request, discs, FRAME)
    # The last of the crowd come to the front, and a third of the memory is lost.
    turned = Request(request.ids[::-1].copy(), request.centres[::-1].copy(), request.half[::-1].copy())
    part = Placement(memory.ids[::3], memory.choice[::3], memory.turn)
    centres, half = positions(turned, place(turned, discs, FRAME, part, lead=40)[0])
    assert len(centres) > 40
    assert not overlaps(centres, half).any()


def test_the_hidden_look_again_within_a_few_frames():
    half = np.full((1, 2), 10.0, np.float32)
    request = Request(np.array([5]), np.array([[[300.0, 300.0]]], np.float32), half)
    wall = np.array([[300.0, 300.0, 20.0, 20.0]], np.float32)
    none = np.empty((0, 3), np.float32)
    choice, memory = place(request, none, FRAME, NOWHERE, wall)
    assert choice[0] == HIDDEN
    for _ in range(PATIENCE):
        choice, memory = place(request, none, FRAME, memory)
    assert choice[0] == 0


def test_a_missing_position_is_never_taken():
    centres = np.array([[[np.nan, np.nan], [400.0, 300.0]]], np.float32)
    request = Request(np.array([1]), centres, np.full((1, 2), 8.0, np.float32))
    choice, _ = place(request, np.empty((0, 3), np.float32), FRAME)
    assert choice[0] == 1


def test_preference_is_the_order_of_trying_and_the_column_is_remembered():
    centres = np.array([[[100.0, 100.0], [200.0, 200.0], [300.0, 300.0]]], np.float32)
    request = Request(np.array([1]), centres, np.full((1, 2), 8.0, np.float32), np.array([[2, 0, 1]]))
    choice, memory = place(request, np.empty((0, 3), np.float32), FRAME)
    assert choice[0] == 2
    plain = Request(request.ids, centres, request.half)
    assert place(plain, np.empty((0, 3), np.float32), FRAME, memory)[0][0] == 2


def test_joined_requests_keep_their_positions():
    a, _ = crowd(5, seed=1)
    b = Request(np.array([100]), np.array([[[50.0, 60.0]]], np.float32), np.full((1, 2), 5.0, np.float32))
    both = join([a, b])
    assert both.centres.shape == (6, 8, 2)
    np.testing.assert_array_equal(both.centres[5, 0], [50.0, 60.0])
    assert np.isnan(both.centres[5, 1:]).all()


def test_an_empty_request_is_answered():
    choice, memory = place(join([]), np.empty((0, 3), np.float32), FRAME)
    assert len(choice) == 0
    assert isinstance(memory, Placement)


def test_figures_have_one_width_in_every_face():
    for face in range(5):
        assert len({width_em(d, face) for d in "0123456789"}) == 1
        assert width_em("♈♉☉☽☿♀♂♃♄♅♆♇αδελβ−′″°", face) > 10.0


def test_a_text_is_as_wide_as_its_letters():
    # Serif for the title, sans for figures, as the painter sets them.
    assert face_of("title") == 2
    assert face_of("label.circle", italic=True) == 3
    assert face_of("figure.rim") == 0
    assert width_px("10", 9.0, "figure.rim") == pytest.approx(2 * width_em("1") * 12.0)
    assert width_em("") == 0.0
