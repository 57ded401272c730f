"""Put texts on a page so that none covers another, a bright star or a planet, and none jumps from frame to frame.

Every text has an identity, a rank (its place in the request) and a few positions in order of preference. A text that
stood somewhere in the frame before keeps its position as long as nothing of higher rank needs the room; a newcomer has
to find room with a margin around it, so that texts do not flicker in and out at the limit. The memory is a value,
`Placement`: the same request with the same memory gives the same answer.
"""

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.marks import F32, I64

I8 = NDArray[np.int8]

MARGIN = 2.5
"""Free pixels that a newcomer needs around it, and that an incumbent may lose."""

GAP = 3.0
"""Pixels between a mark and its text."""


HIDDEN, UNKNOWN = -1, -2
"""What a memory says of a text that found no room, and of one that it has never met."""

PATIENCE = 8
"""A text that found no room looks again in one frame of so many."""


SPREAD = 10007
"""A prime: identities that are multiples of one number get different turns by what is left of them."""


@dataclass(frozen=True, slots=True, eq=False)
class Placement:
    """Which position each text had: `ids` (N,), `choice` (N,) the number of the position, or HIDDEN.

    `turn` counts frames, so that texts without room take turns in looking for it.
    """

    ids: I64
    choice: I8
    turn: int = 0

    def recall(self, ids: I64) -> I8:
        """Return the position of each text (N,), HIDDEN for those that had none, UNKNOWN for new ones."""
        if not len(self.ids):
            return np.full(len(ids), UNKNOWN, np.int8)
        # In most frames the very same texts ask again.
        if len(ids) == len(self.ids) and (ids == self.ids).all():
            return self.choice
        order = self.ids.argsort()
        at = self.ids[order].searchsorted(ids)
        at[at == len(order)] = 0
        at = order[at]
        return np.where(self.ids[at] == ids, self.choice[at], np.int8(UNKNOWN))


NOWHERE = Placement(np.empty(0, np.int64), np.empty(0, np.int8))


@dataclass(frozen=True, slots=True, eq=False)
class Request:
    """Texts to be placed, highest rank first.

    `ids` (N,) are distinct; `centres` (N, K, 2) the positions in order of preference, NaN where there is none; `half`
    (N, 2) the half-width and half-height of the upright box that holds the text. `preference` (N, K), where given,
    is the order in which the positions are tried; the number of a position, which is what is remembered, is its column.
    """

    ids: I64
    centres: F32
    half: F32
    preference: NDArray[np.intp] | None = None

    def __len__(self) -> int:
        return len(self.ids)


def join(requests: list[Request]) -> Request:
    """Return the requests one after another, with positions padded to the longest list."""
    requests = [request for request in requests if len(request)]
    if not requests:
        return Request(np.empty(0, np.int64), np.empty((0, 1, 2), np.float32), np.empty((0, 2), np.float32))
    total, most = sum(map(len, requests)), max(request.centres.shape[1] for request in requests)
    centres = np.empty((total, most, 2), np.float32)
    preference = np.empty((total, most), np.intp)
    preference[:] = np.arange(most)
    at = 0
    for request in requests:
        rows, k = slice(at, at := at + len(request)), request.centres.shape[1]
        centres[rows, :k] = request.centres
        if k < most:
            centres[rows, k:] = np.nan
        if request.preference is not None:
            preference[rows, :k] = request.preference
    return Request(
        np.concatenate([request.ids for request in requests]),
        centres,
        np.concatenate([request.half for request in requests]),
        preference,
    )


# Where a text may stand about its mark: right first, as readers expect, then the corners, left, above, below.
_AROUND = np.array(
    [[1, 0], [0.8, -0.8], [0.8, 0.8], [-1, 0], [-0.8, -0.8], [-0.8, 0.8], [0, -1], [0, 1]], dtype=np.float32
)
_WEIGHTS = np.zeros((5, len(_AROUND), 2), np.float32)
"""How x, y, reach, half-width and half-height make up each coordinate of each position: rows of a matrix."""
_WEIGHTS[0, :, 0] = _WEIGHTS[1, :, 1] = 1.0
_WEIGHTS[2] = _AROUND
_WEIGHTS[3, :, 0], _WEIGHTS[4, :, 1] = np.sign(_AROUND).T


def around(xy: F32, radius: F32, half: F32) -> F32:
    """Return the eight positions (N, 8, 2) of texts about discs at `xy` (N, 2) with `radius` (N,)."""
    parts = np.empty((len(xy), 5), np.float32)
    parts[:, :2] = xy
    parts[:, 2] = radius
    parts[:, 2] += np.float32(GAP)
    parts[:, 3:] = half
    return np.asarray((parts @ _WEIGHTS.reshape(5, -1)).reshape(-1, len(_AROUND), 2))


class _Obstacles(NamedTuple):
    """What stands fixed on the page: rectangles and, after them, the squares round discs, as low and high corners."""

    low: F32
    high: F32
    discs: F32

    @classmethod
    def of(cls, discs: F32, boxes: F32 | None) -> "_Obstacles":
        low, high = discs[:, :2] - discs[:, 2:], discs[:, :2] + discs[:, 2:]
        if boxes is not None and len(boxes):
            low = np.concatenate([boxes[:, :2] - boxes[:, 2:], low])
            high = np.concatenate([boxes[:, :2] + boxes[:, 2:], high])
        return cls(low, high, discs)


def _inside(low: F32, high: F32, frame: tuple[float, float, float, float]) -> NDArray[np.bool_]:
    """Return which boxes (N,) lie within a frame; NaN compares false, so a position that does not exist does not."""
    left, top, right, bottom = frame
    out = low[:, 0] >= left
    out &= low[:, 1] >= top
    out &= high[:, 0] <= right
    out &= high[:, 1] <= bottom
    return np.asarray(out)


def _crossing(low1: F32, high1: F32, low2: F32, high2: F32) -> NDArray[np.bool_]:
    """Return which boxes overlap (N, M), given by their low and high corners (N, 2) and (M, 2)."""
    low2, high2 = low2.T.copy(), high2.T.copy()
    # Comparisons only: they write one byte for each pair, where differences would write four.
    out = low1[:, :1] < high2[0]
    out &= high1[:, :1] > low2[0]
    out &= low1[:, 1:] < high2[1]
    out &= high1[:, 1:] > low2[1]
    return np.asarray(out)


def _meetings(cross: NDArray[np.bool_]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Return the rows and the columns of what is true, which is little; one dimension is searched much faster."""
    return np.divmod(cross.reshape(-1).nonzero()[0], cross.shape[1])


def _on_discs(box: Any, disc: Any, low: F32, high: F32, discs: F32, margin: float) -> NDArray[np.intp]:
    """Return those of the boxes `box` (K,) within `margin` of the discs `disc` (K,), whose squares they meet."""
    middle, reach = discs[disc, :2], discs[disc, 2] + np.float32(margin)
    gap = np.maximum(np.maximum(low[box] - middle, middle - high[box]), 0.0)
    return np.asarray(box[gap[:, 0] ** 2 + gap[:, 1] ** 2 < reach * reach])


def place(
    request: Request,
    discs: F32,
    frame: tuple[float, float, float, float],
    previous: Placement = NOWHERE,
    boxes: F32 | None = None,
    lead: int = 0,
) -> tuple[I8, Placement]:
    """Return the position given to each text (N,), −1 for those without room, and the memory for the next frame.

    `discs` (M, 3) are marks (x, y, radius) and `boxes` (M, 4) rectangles (x, y, half-width, half-height) that no text
    may cover; every text lies within `frame`. The first `lead` texts take their room even from those behind them that
    have stood there before.
    """
    n, k = request.centres.shape[:2]
    choice = np.full(n, HIDDEN, np.int8)
    if not n:
        return choice, Placement(NOWHERE.ids, NOWHERE.choice, previous.turn + 1)
    fixed = _Obstacles.of(discs, boxes)
    recalled = previous.recall(request.ids)

    # Incumbents keep their positions unless one of higher rank, a mark or the edge of the map is in the way.
    old = ((recalled >= 0) & (recalled < k)).nonzero()[0]
    if len(old):
        had = recalled[old]
        stays = _standing(request.centres[old, had], request.half[old], fixed, frame)
        choice[old[stays]] = had[stays]

    # Newcomers, the displaced, and of the hidden those whose turn it is: all positions against all that is fixed by
    # now, in one go.
    waits = recalled == HIDDEN
    waits &= (request.ids % SPREAD + previous.turn) % PATIENCE != 0
    new = ((choice < 0) & ~waits).nonzero()[0]
    while len(new):
        new = _seek(request, new, recalled, choice, fixed, frame, lead)
    return choice, Placement(request.ids, choice, previous.turn + 1)


def _standing(at: F32, half: F32, fixed: _Obstacles, frame: tuple[float, float, float, float]) -> NDArray[np.intp]:
    """Return which of the boxes, in order of rank, can stay where they are."""
    low, high = at - half, at + half
    stands = _inside(low, high, frame)
    n, walls = len(at), len(fixed.low) - len(fixed.discs)
    cross = _crossing(low, high, np.concatenate([low, fixed.low]), np.concatenate([high, fixed.high]))
    box, other = _meetings(cross)
    if len(box) > n:  # each meets itself at least
        on_disc = other >= n + walls
        stands[box[(other >= n) & ~on_disc]] = False
        stands[_on_discs(box[on_disc], other[on_disc] - (n + walls), low, high, fixed.discs, 0.0)] = False
        # One that overlaps another of higher rank, in a column before its own, gives way.
        clash = (other < box) & stands[box] & stands[np.minimum(other, n - 1)]
        stands[box[clash]] = False
    return np.asarray(stands.nonzero()[0])


def _seek(
    request: Request,
    new: NDArray[np.intp],
    recalled: I8,
    choice: I8,
    fixed: _Obstacles,
    frame: tuple[float, float, float, float],
    lead: int,
) -> NDArray[np.intp]:
    """Find room for the texts `new`, in order of rank, and write it into `choice`; return the texts they displaced."""
    k = request.centres.shape[1]
    if request.preference is None:
        order = np.empty((len(new), k), np.intp)
        order[:] = np.arange(k)
    else:
        order = request.preference[new]
    # What lost its place looks there first.
    had = recalled[new]
    for i in ((had >= 0) & (had < k)).nonzero()[0].tolist():
        order[i] = [had[i], *(j for j in order[i].tolist() if j != had[i])]
    row, position = new.repeat(k), order.reshape(-1)
    at, size = request.centres[row, position], request.half[row]
    low, high = at - size, at + size
    usable = _inside(low, high, frame).nonzero()[0]
    row, low, high = row[usable], low[usable], high[usable]
    kept = (choice >= 0).nonzero()[0]
    there, extent = request.centres[kept, choice[kept]], request.half[kept]
    kept_low, kept_high = there - extent, there + extent
    margin = np.float32(MARGIN)
    near = _crossing(
        low - margin,
        high + margin,
        np.concatenate([kept_low, fixed.low]),
        np.concatenate([kept_high, fixed.high]),
    )
    leading = int(kept.searchsorted(lead))
    if lead:
        # Those in the lead need not mind who stands behind them.
        near[: int(row.searchsorted(lead)), leading : len(kept)] = False
    marks = near.shape[1] - len(fixed.discs)
    box, other = _meetings(near)
    on_disc = other >= marks
    taken = np.zeros(len(row), dtype=bool)
    taken[box[~on_disc]] = True
    taken[_on_discs(box[on_disc], other[on_disc] - marks, low, high, fixed.discs, MARGIN)] = True
    free = (~taken).nonzero()[0]
    if not len(free):
        return free
    found = usable[free]
    _settle(row[free], position[found], at[found], size[found], choice)
    ahead = new[: int(new.searchsorted(lead))]
    ahead = ahead[choice[ahead] >= 0]
    if not len(ahead):
        return ahead
    there, extent = request.centres[ahead, choice[ahead]], request.half[ahead]
    under = _crossing(kept_low[leading:], kept_high[leading:], there - extent, there + extent).any(axis=1)
    displaced = kept[leading:][under]
    choice[displaced] = HIDDEN
    return displaced


def _settle(texts: NDArray[np.intp], positions: NDArray[np.intp], at: F32, size: F32, out: I8) -> None:
    """Give each newcomer in order of rank its first free position that no newcomer before it has taken."""
    # Few newcomers, or the first frame of all: a plain loop over a grid of buckets as large as a usual text.
    bucket = 64.0
    taken: dict[tuple[int, int], list[tuple[float, float, float, float]]] = {}
    done = -1
    rows = zip(texts.tolist(), positions.tolist(), at.tolist(), size.tolist(), strict=True)
    for text, position, (x, y), (w, h) in rows:
        if text == done:
            continue
        columns = range(int((x - w - MARGIN) // bucket), int((x + w + MARGIN) // bucket) + 1)
        lines = range(int((y - h - MARGIN) // bucket), int((y + h + MARGIN) // bucket) + 1)
        cells = [(i, j) for i in columns for j in lines]
        blocked = any(
            abs(x - x2) < w + w2 + MARGIN and abs(y - y2) < h + h2 + MARGIN
            for cell in cells
            for x2, y2, w2, h2 in taken.get(cell, ())
        )
        if blocked:
            continue
        for cell in cells:
            taken.setdefault(cell, []).append((x, y, w, h))
        out[text] = position
        done = text
