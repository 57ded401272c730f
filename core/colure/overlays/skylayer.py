"""What the chart draws of overlays: directions, outlines and residual arrows on ICRS axes, at the chart's place."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure.arrays import Float, Int, unit
from colure.errors import ColureError, SpanError
from colure.fontmetrics import face_of, width_em
from colure.framenames import Frame
from colure.moment import Moment
from colure.overlays import directions, images
from colure.overlays.model import Overlay
from colure.overlays.store import STORE, Store
from colure.reduction import Observer, apply_context, star_context
from colure.session import Session
from colure.stars import EPOCH_JD

TITLE_PART = 0.6
"""Distance of the title from the centre, as a part of the arrows' length."""
MOST_NAMES = 5_000
"""Rows of an overlay that may have a text; more would not find room."""
ARROW_PART = 0.3
"""Length of the north and east arrows as a part of the image's smaller side."""

Turn = Callable[[Float], Float]


@dataclass(frozen=True, slots=True, eq=False)
class Lines:
    """Polylines on ICRS axes: columns (3, K) and starts."""

    columns: Float
    starts: NDArray[np.int32]


@dataclass(frozen=True, slots=True, eq=False)
class OverlaySky:
    """One overlay on the sky.

    `place` is its place in the session's list, `columns` (3, N) the directions of its rows (none for an image), in the
    order of the store's rows; `foot` (3, M) and `tip` (3, M) its residual arrows; `outline` and `grid` those of an
    image, `arrows` from its centre to north and to east. `spots` (3, T), `texts` and `width_em` (T,) are its texts.
    `fault` says why there is nothing to draw.
    """

    overlay: Overlay
    place: int
    columns: Float
    foot: Float
    tip: Float
    outline: Lines | None = None
    grid: Lines | None = None
    arrows: Lines | None = None
    spots: Float = field(default_factory=lambda: np.empty((3, 0)))
    texts: tuple[str, ...] = ()
    width_em: NDArray[np.float32] = field(default_factory=lambda: np.empty(0, np.float32))
    rows: Int = field(default_factory=lambda: np.empty(0, np.int64))
    fault: str = ""

    @property
    def colour(self) -> str:
        """The overlay's own colour, or the one of its place."""
        return self.overlay.colour_at(self.place)


def key(session: Session, store: Store = STORE) -> object:
    """Return what the layer depends on.

    The visible overlays, what the store has of them, moment and observer where the chart's place moves directions, and
    moment and site where a frame follows them.
    """
    shown = tuple((place, overlay) for place, overlay in enumerate(session.overlays) if overlay.visible)
    parsed = [Frame.parse(overlay.frame) for _, overlay in shown]
    moved = session.place in ("apparent", "observed")
    dated = moved or any(
        frame.needs_moment and overlay.epoch is None for frame, (_, overlay) in zip(parsed, shown, strict=True)
    )
    sited = (moved and session.from_site) or any(frame.needs_site for frame in parsed)
    return (
        shown,
        session.place if moved else None,
        session.moment if dated else None,
        session.site if sited else None,
        session.from_site,
        session.omitted,
        store.generation,
    )


def compute(session: Session, observer: Observer, store: Store = STORE) -> tuple[OverlaySky, ...]:
    """Return the visible overlays of a session as seen by an observer, at the session's place."""
    turn = _turn(session, observer)
    out = []
    for place, overlay in enumerate(session.overlays):
        if not overlay.visible:
            continue
        try:
            make = _image if overlay.kind == "image" else _table
            out.append(make(overlay, place, session.moment, session.site, turn, store))
        except ColureError as fault:
            out.append(_nothing(overlay, place, str(fault)))
    return tuple(out)


def remarks(found: tuple[OverlaySky, ...]) -> list[str]:
    """Return what must be said beside the chart: what cannot be drawn and why, and how far arrows are enlarged."""
    lines = []
    for one in found:
        title = f"overlay {one.overlay.title}"
        if one.fault:
            lines.append(f"{title}: {one.fault}")
        elif one.foot.shape[1]:
            scale = f"{one.overlay.enlarge:g} times as long" if one.overlay.enlarge != 1.0 else "in true length"
            lines.append(f"{title}: arrows to the catalogue's places, {scale}")
        elif one.overlay.arrows and one.columns.shape[1]:
            lines.append(f"{title}: no arrows; not matched to the catalogue yet, or without a match")
    return lines


def _turn(session: Session, observer: Observer) -> Turn:
    """Return what carries catalogue directions (N, 3) to the place of the chart, as it carries the stars there."""
    if session.place not in ("apparent", "observed"):
        return _as_they_are
    try:
        context = star_context(session.moment, observer=observer, place=session.place, epoch_jd=EPOCH_JD)
    except SpanError:
        return _as_they_are
    return lambda vectors: np.asarray(apply_context(context, vectors, None, None), dtype=np.float64)


def _as_they_are(vectors: Float) -> Float:
    return vectors


def _nothing(overlay: Overlay, place: int, fault: str) -> OverlaySky:
    none = np.empty((3, 0))
    return OverlaySky(overlay, place, none, none, none, fault=fault)


def _columns(vectors: Float) -> Float:
    return np.ascontiguousarray(vectors.T)


def _widths(texts: tuple[str, ...]) -> NDArray[np.float32]:
    face = face_of("label.overlay")
    return np.array([width_em(text, face) for text in texts], np.float32)


def _table(overlay: Overlay, place: int, moment: Moment, site: Any, turn: Turn, store: Store) -> OverlaySky:
    found = directions.of(overlay, moment, site, store)
    rows = store.rows(overlay)
    if found is None or rows is None:
        return _nothing(overlay, place, store.fault(overlay))
    columns = _columns(turn(found))
    foot = tip = np.empty((3, 0))
    match = store.match(overlay) if overlay.arrows else None
    if match is not None and len(match):
        foot = np.ascontiguousarray(columns[:, match.rows])
        tip = _columns(stretched(foot.T, turn(match.true), overlay.enlarge))
    spots, texts = np.empty((3, 0)), ()
    at: Int = np.empty(0, np.int64)
    if overlay.names_shown and overlay.name and len(rows) <= MOST_NAMES:
        every_text = rows.texts(overlay.name)
        at = np.array([k for k, text in enumerate(every_text) if text], np.int64)
        texts = tuple(every_text[k][:40] for k in at.tolist())
        spots = np.ascontiguousarray(columns[:, at])
    return OverlaySky(overlay, place, columns, foot, tip, spots=spots, texts=texts, width_em=_widths(texts), rows=at)


def stretched(given: Float, true: Float, factor: float) -> Float:
    """Return the ends (M, 3) of arrows from `given` towards `true`, `factor` times as long, at most half a turn."""
    axis = np.cross(given, true)
    sine = np.sqrt((axis * axis).sum(axis=1))
    angle = np.minimum(np.arctan2(sine, (given * true).sum(axis=1)) * factor, 3.0)
    tangent = true - (true * given).sum(axis=1)[:, None] * given
    length = np.sqrt((tangent * tangent).sum(axis=1))
    tangent = tangent / np.where(length > 0.0, length, 1.0)[:, None]
    return np.asarray(given * np.cos(angle)[:, None] + tangent * np.sin(angle)[:, None])


def _image(overlay: Overlay, place: int, moment: Moment, site: Any, turn: Turn, store: Store) -> OverlaySky:
    shape = store.shape(overlay)
    if shape is None:
        return _nothing(overlay, place, store.fault(overlay))

    def on_sky(vectors: Float) -> Float:
        return turn(np.asarray(directions.to_icrs(vectors, overlay.frame, overlay.epoch, moment, site)))

    outline = _lines([shape.edge], on_sky)
    grid = _lines(list(shape.grid), on_sky)
    sides = [side for side in images.sides(shape) if np.isfinite(side)]
    reach = ARROW_PART * min(sides) if sides else 0.0
    ends = [unit(shape.centre * np.cos(reach) + away * np.sin(reach)) for away in (shape.north, shape.east)]
    arrows = _lines([np.stack([shape.centre, end]) for end in ends], on_sky) if reach else None
    texts = [f"{overlay.title} (mirrored)" if shape.mirrored else overlay.title]
    # South of the centre, where no arrow is.
    spots = [unit(shape.centre - shape.north * np.tan(TITLE_PART * reach))]
    if reach:
        far = reach * 1.25
        spots += [unit(shape.centre * np.cos(far) + away * np.sin(far)) for away in (shape.north, shape.east)]
        texts += ["N", "E"]
    shown = _columns(on_sky(np.stack(spots)))
    none = np.empty((3, 0))
    listed = tuple(texts)
    return OverlaySky(
        overlay, place, none, none, none, outline, grid, arrows, shown, listed, _widths(listed),
        np.arange(len(listed), dtype=np.int64),
    )  # fmt: skip


def _lines(parts: list[Float], on_sky: Turn) -> Lines | None:
    """Return polylines, broken where a projection gave no place."""
    runs = [run for part in parts for run in _whole(part)]
    if not runs:
        return None
    starts = np.concatenate([[0], np.cumsum([len(run) for run in runs])]).astype(np.int32)
    return Lines(_columns(on_sky(np.concatenate(runs))), starts)


def _whole(line: Float) -> list[Float]:
    """Return the runs of a polyline (M, 3) whose points are all finite, of two points and more."""
    good = np.isfinite(line).all(axis=1)
    if good.all():
        return [line]
    edges = np.flatnonzero(np.diff(np.concatenate([[False], good, [False]]).astype(np.int8)))
    return [line[a:b] for a, b in edges.reshape(-1, 2).tolist() if b - a > 1]
