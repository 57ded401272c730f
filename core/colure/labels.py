"""Put texts on a page so that none covers another, a bright star or a planet, and none jumps from frame to frame.

Every text has an identity, a rank (its place in the request) and a few positions in order of preference. A text that
stood somewhere in the frame before keeps its position as long as nothing of higher rank needs the room; a newcomer has
to find room with a margin around it, so that texts do not flicker in and out at the limit. The memory is a value,
`Placement`: the same request with the same memory gives the same answer.
"""

from dataclasses import dataclass

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

PATIENCE = 4
"""A text that found no room looks again in one frame of so many."""


@dataclass(frozen=True, slots=True, eq=False)
class Placement:
    """Which position each text had: `ids` (N,) sorted, `choice` (N,) the number of the position, or HIDDEN.

    `turn` counts frames, so that texts without room take turns in looking for it.
    """

    ids: I64
    choice: I8
    turn: int = 0

    def recall(self, ids: I64) -> I8:
        """Return the position of each text (N,), HIDDEN for those that had none, UNKNOWN for new ones."""
        if not len(self.ids):
            return np.full(len(ids), UNKNOWN, np.int8)
        at = np.minimum(np.searchsorted(self.ids, ids), len(self.ids) - 1)
        return np.where(self.ids[at] == ids, self.choice[at], np.int8(UNKNOWN))


NOWHERE = Placement(np.empty(0, np.int64), np.empty(0, np.int8))


def merged(parts: list[Placement]) -> Placement:
    """Return one memory of texts that were placed in turn."""
    ids = np.concatenate([part.ids for part in parts])
    choice = np.concatenate([part.choice for part in parts])
    order = np.argsort(ids)
    return Placement(ids[order], choice[order], max(part.turn for part in parts))


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
    most = max(request.centres.shape[1] for request in requests)
    centres = np.full((sum(map(len, requests)), most, 2), np.nan, np.float32)
    preference = np.tile(np.arange(most), (len(centres), 1))
    at = 0
    for request in requests:
        rows, k = slice(at, at + len(request)), request.centres.shape[1]
        centres[rows, :k] = request.centres
        if request.preference is not None:
            preference[rows, :k] = request.preference
        at += len(request)
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


def around(xy: F32, radius: F32, half: F32) -> F32:
    """Return the eight positions (N, 8, 2) of texts about discs at `xy` (N, 2) with `radius` (N,)."""
    reach = (radius + np.float32(GAP))[:, None, None] * _AROUND
    corner = np.sign(_AROUND)
    return np.asarray(xy[:, None, :] + reach + corner * half[:, None, :], dtype=np.float32)


def _hits_discs(centres: F32, half: F32, discs: F32, margin: float) -> NDArray[np.bool_]:
    """Return which boxes (N,) come within `margin` of a disc; `discs` (M, 3) are x, y, radius."""
    hit = np.zeros(len(centres), dtype=bool)
    if not len(discs) or not len(centres):
        return hit
    # The squares round the discs first: few boxes come near one, and only those are measured.
    box, disc = np.nonzero(_overlap(centres, half, discs[:, :2], discs[:, [2, 2]], margin))
    if not len(box):
        return hit
    gap = np.abs(centres[box] - discs[disc, :2]) - half[box]
    np.maximum(gap, 0.0, out=gap)
    reach = discs[disc, 2] + np.float32(margin)
    hit[box[gap[:, 0] ** 2 + gap[:, 1] ** 2 < reach * reach]] = True
    return hit


def _overlap(c1: F32, h1: F32, c2: F32, h2: F32, margin: float) -> NDArray[np.bool_]:
    """Return which boxes (N, M) overlap or come within `margin` of each other."""
    grown = h1 + np.float32(margin)
    low1, high1 = (c1 - grown)[:, :, None], (c1 + grown)[:, :, None]
    low2, high2 = np.ascontiguousarray((c2 - h2).T), np.ascontiguousarray((c2 + h2).T)
    # Comparisons only: they write one byte for each pair, where differences would write four.
    out = np.less(low1[:, 0], high2[0])
    out &= np.greater(high1[:, 0], low2[0])
    out &= np.less(low1[:, 1], high2[1])
    out &= np.greater(high1[:, 1], low2[1])
    return np.asarray(out)


def place(
    request: Request,
    discs: F32,
    frame: tuple[float, float, float, float],
    previous: Placement = NOWHERE,
    boxes: F32 | None = None,
) -> tuple[I8, Placement]:
    """Return the position given to each text (N,), −1 for those without room, and the memory for the next frame.

    `discs` (M, 3) are marks (x, y, radius) and `boxes` (M, 4) rectangles (x, y, half-width, half-height) that no text
    may cover; every text lies within `frame`.
    """
    n, k = request.centres.shape[:2]
    choice = np.full(n, -1, np.int8)
    if not n:
        return choice, Placement(NOWHERE.ids, NOWHERE.choice, previous.turn + 1)
    left, top, right, bottom = frame
    half = request.half
    fixed = np.empty((0, 4), np.float32) if boxes is None else boxes
    low = np.array([left, top], np.float32) + half
    high = np.array([right, bottom], np.float32) - half
    recalled = previous.recall(request.ids)

    # Incumbents keep their positions unless one of higher rank, a mark or the edge of the map is in the way.
    old = np.flatnonzero((recalled >= 0) & (recalled < k))
    at, size = request.centres[old, recalled[old]], half[old]
    # NaN compares false, so that a position that does not exist is not on the page either.
    stands = ((at >= low[old]) & (at <= high[old])).all(axis=1)
    stands &= ~_hits_discs(at, size, discs, 0.0)
    if len(fixed):
        stands &= ~_overlap(at, size, fixed[:, :2], fixed[:, 2:], 0.0).any(axis=1)
    old, at, size = old[stands], at[stands], size[stands]
    clash = _overlap(at, size, at, size, 0.0)
    # Each box overlaps itself; one that overlaps another of higher rank, in a column before its own, gives way.
    if len(old):
        stays = old[np.argmax(clash, axis=1) >= np.arange(len(old))]
        choice[stays] = recalled[stays]

    # Newcomers, the displaced, and of the hidden those whose turn it is: all positions against all that is fixed by
    # now, in one go.
    waits = (recalled == HIDDEN) & ((request.ids + previous.turn) % PATIENCE != 0)
    new = np.flatnonzero((choice < 0) & ~waits)
    if len(new):
        _seek(request, new, recalled[new], choice, discs, fixed, low, high)
    order_of_ids = np.argsort(request.ids)
    return choice, Placement(request.ids[order_of_ids], choice[order_of_ids], previous.turn + 1)


def _seek(
    request: Request,
    new: NDArray[np.intp],
    recalled: I8,
    choice: I8,
    discs: F32,
    fixed: F32,
    low: F32,
    high: F32,
) -> None:
    """Find room for the texts `new`, in order of rank, and write it into `choice`."""
    k = request.centres.shape[1]
    order = np.tile(np.arange(k), (len(new), 1)) if request.preference is None else request.preference[new]
    # What lost its place looks there first.
    for i in np.flatnonzero((recalled >= 0) & (recalled < k)).tolist():
        order[i] = [recalled[i], *(j for j in order[i].tolist() if j != recalled[i])]
    text, position = np.repeat(np.arange(len(new)), k), order.reshape(-1)
    row = new[text]
    at = request.centres[row, position]
    usable = np.flatnonzero(((at >= low[row]) & (at <= high[row])).all(axis=1))
    text, position, at, size = text[usable], position[usable], at[usable], request.half[row[usable]]
    taken = _hits_discs(at, size, discs, MARGIN)
    kept = np.flatnonzero(choice >= 0)
    taken |= _overlap(at, size, request.centres[kept, choice[kept]], request.half[kept], MARGIN).any(axis=1)
    if len(fixed):
        taken |= _overlap(at, size, fixed[:, :2], fixed[:, 2:], MARGIN).any(axis=1)
    free = np.flatnonzero(~taken)
    if len(free):
        _settle(new, text[free], position[free], at[free], size[free], choice)


def _settle(
    new: NDArray[np.intp], texts: NDArray[np.intp], positions: NDArray[np.intp], at: F32, size: F32, out: I8
) -> None:
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
        out[new[text]] = position
        done = text
