"""Which texts the map asks for, in order of rank, and the marks made of those that found room."""

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from colure.arrays import Float
from colure.fontmetrics import CAP_HEIGHT, PX_PER_PT, width_px
from colure.graduation import TURN, figure
from colure.labels import NOWHERE, Placement, Request, around, join, place
from colure.marks import F32, I32, Labels, Layer
from colure.scene import bodies as body_marks
from colure.scene import stars as star_marks
from colure.scene.circles import TICKS, Curve
from colure.scene.context import Context, on_page

# The first part of a text's identity; the second is the row in its source.
_BODY, _CIRCLE, _FIGURE, _STAR, _DEEP, _CONSTELLATION, _POINT = (k << 56 for k in range(1, 8))

MOST_STARS = 60
MOST_DEEP_SKY = 30
BRIGHT_RADIUS = 2.3
"""Stars with at least this radius in pixels are never covered by a text."""
MOST_BRIGHT = 400
NAME_SPOTS = 24
"""Places along a circle where its name may stand."""


@dataclass(slots=True)
class Wanted:
    """Texts of one role that ask for a place; the columns of a Request, and what to draw them with."""

    role: str
    request: Request
    texts: tuple[str, ...]
    index: I32
    angles: F32
    size_pt: float = 9.0
    italic: bool = False
    bold: bool = False
    colours: tuple[str | None, ...] = field(default=())

    def marks(self, choice: Any) -> list[Labels]:
        """Return the label marks of the texts that have a place; one for each colour."""
        shown = np.flatnonzero(choice >= 0)
        if not len(shown):
            return []
        at = choice[shown]
        xy = self.request.centres[shown, at]
        angle = self.angles[shown, at] if self.angles.ndim == 2 else self.angles[shown]
        style = {"size_pt": self.size_pt, "italic": self.italic, "bold": self.bold}
        if not self.colours:
            return [Labels(self.role, self.texts, self.index[shown], xy, angle, **style)]  # type: ignore[arg-type]
        # Rows of one colour follow each other, so each colour is a slice.
        return [
            Labels(self.role, self.texts, self.index[shown][own], xy[own], angle[own], colour=colour, **style)  # type: ignore[arg-type]
            for colour, own in self._by_colour(shown)
        ]

    def _by_colour(self, shown: Any) -> list[tuple[str | None, Any]]:
        colours = [self.colours[i] for i in shown.tolist()]
        groups: dict[str | None, list[int]] = {}
        for i, colour in enumerate(colours):
            groups.setdefault(colour, []).append(i)
        return [(colour, np.array(own)) for colour, own in groups.items()]


def height(size_pt: float) -> float:
    """Return the height in pixels of the box of a text: capitals and a little above and below."""
    return size_pt * PX_PER_PT * (CAP_HEIGHT + 0.28)


def turned_half(width: Any, tall: float, angle: Any) -> Any:
    """Return the half-extents (..., 2) of the upright boxes that hold boxes turned by angles."""
    c, s = np.abs(np.cos(angle)), np.abs(np.sin(angle))
    return np.stack([0.5 * (c * width + s * tall), 0.5 * (s * width + c * tall)], axis=-1).astype(np.float32)


def upright(tangent: F32) -> F32:
    """Return angles (N,) of tangents (N, 2), turned so that text is read from the left; almost level ones are level."""
    angle = np.arctan2(tangent[..., 1], tangent[..., 0])
    angle = np.where(angle > np.pi / 2, angle - np.pi, np.where(angle <= -np.pi / 2, angle + np.pi, angle))
    # Level text is drawn sharper, and nobody sees half a degree.
    return np.where(np.abs(angle) < 0.009, 0.0, angle).astype(np.float32)


def build(
    ctx: Context,
    curves: tuple[Curve, ...],
    shown: star_marks.Shown | None,
    listed: body_marks.Shown,
    memory: Any,
    key: object,
) -> tuple[Layer, Placement]:
    """Return the layer of texts and the memory of where they stand."""
    previous: Placement = memory if isinstance(memory, Placement) else NOWHERE
    discs = _discs(shown, listed)
    # Bodies and circle names first: they have the rank to push figures and stars aside.
    first = [w for w in (_bodies(listed), _circle_names(ctx, curves)) if w is not None]
    marks: list[Labels] = []
    boxes, first_memory = _settle(ctx, first, discs, previous, None, marks)
    second = [w for w in (_figures(curves), _stars(ctx, shown), _deep_sky(ctx), _constellations(ctx)) if w is not None]
    _, second_memory = _settle(ctx, second, discs, previous, boxes, marks)
    ids = np.concatenate([first_memory.ids, second_memory.ids])
    choice = np.concatenate([first_memory.choice, second_memory.choice])
    order = np.argsort(ids)
    return Layer("labels", tuple(marks), key), Placement(ids[order], choice[order])


def _settle(
    ctx: Context,
    wanted: list[Wanted],
    discs: F32,
    previous: Placement,
    fixed: F32 | None,
    marks: list[Labels],
) -> tuple[F32, Placement]:
    """Place texts, add their marks, and return the boxes (M, 4) that they take and their memory."""
    request = join([w.request for w in wanted])
    choice, memory = place(request, discs, ctx.frame, previous, fixed)
    at = 0
    for w in wanted:
        marks += w.marks(choice[at : at + len(w.request)])
        at += len(w.request)
    shown = np.flatnonzero(choice >= 0)
    return np.concatenate([request.centres[shown, choice[shown]], request.half[shown]], axis=1), memory


def _discs(shown: star_marks.Shown | None, listed: body_marks.Shown) -> F32:
    """Return the marks (M, 3) that no text may cover: bodies and bright stars."""
    parts = [np.concatenate([listed.xy, listed.radius[:, None]], axis=1)]
    if shown is not None:
        # Rows are faintest first.
        bright = np.flatnonzero(shown.radius >= BRIGHT_RADIUS)[-MOST_BRIGHT:]
        parts.append(np.concatenate([shown.xy[bright], shown.radius[bright, None]], axis=1))
    return np.concatenate(parts).astype(np.float32)


def _bodies(listed: body_marks.Shown) -> Wanted | None:
    if not listed.names:
        return None
    texts = tuple(name.capitalize() if name != "emb" else "Earth–Moon barycentre" for name in listed.names)
    size = 10.0
    half = np.array([[0.5 * width_px(t, size, "label.body", bold=True), 0.5 * height(size)] for t in texts], np.float32)
    ids = np.array([_BODY + _stable(name) for name in listed.names], np.int64)
    n = len(texts)
    request = Request(ids, around(listed.xy, listed.radius, half), half)
    return Wanted("label.body", request, texts, np.arange(n, dtype=np.int32), np.zeros(n, np.float32), size, bold=True)


def _stable(name: str) -> int:
    """Return a number of up to 55 bits that belongs to a name in every run."""
    value = 0
    for letter in name:
        value = (value * 131 + ord(letter)) & ((1 << 55) - 1)
    return value


def _circle_names(ctx: Context, curves: tuple[Curve, ...]) -> Wanted | None:
    """Return the circles' names, to stand along their curves between two figures, on the north side."""
    rows = []
    size = 10.0
    tall = height(size)
    for curve in curves:
        text = curve.circle.name
        wide = width_px(text, size, "label.circle", italic=True)
        # Spots are fixed longitudes, so that a name stays at its longitude while the view moves over it.
        step = max(curve.steps.major, 1)
        spots = np.flatnonzero(((curve.arcsec - step // 2) % step < curve.steps.minor) & curve.shown)
        spots = spots[: len(spots) // 1]
        if not len(spots):
            spots = np.flatnonzero(curve.shown)[:: max(int(curve.shown.sum() // NAME_SPOTS), 1)]
        if not len(spots):
            continue
        number = (curve.arcsec[spots] // step) % NAME_SPOTS
        angle = upright(curve.tangent[spots])
        lift = (TICKS[2] if curve.circle.graduated else 0.0) + 4.0 + 0.5 * tall
        xy = curve.xy[spots] + curve.north[spots] * np.float32(lift)
        half = turned_half(wide, tall, angle)
        centres = np.full((NAME_SPOTS, 2), np.nan, np.float32)
        angles = np.zeros(NAME_SPOTS, np.float32)
        halves = np.zeros((NAME_SPOTS, 2), np.float32)
        centres[number], angles[number], halves[number] = xy, angle, half
        rows.append((_CIRCLE + curve.number, centres, angles, halves, text, curve.circle.colour))
    if not rows:
        return None
    ids = np.array([row[0] for row in rows], np.int64)
    centres = np.stack([row[1] for row in rows])
    # One box for all spots of a name: the largest that any of its angles needs.
    half = np.stack([row[3].max(axis=0) for row in rows])
    middle = np.array([0.5 * (ctx.frame[0] + ctx.frame[2]), 0.5 * (ctx.frame[1] + ctx.frame[3])], np.float32)
    distance = np.linalg.norm(centres - (middle - np.float32(0.22) * middle), axis=2)
    preference = np.argsort(np.nan_to_num(distance, nan=1e9), axis=1)
    request = Request(ids, centres, half, preference)
    texts = tuple(row[4] for row in rows)
    return Wanted(
        "label.circle",
        request,
        texts,
        np.arange(len(rows), dtype=np.int32),
        np.stack([row[2] for row in rows]),
        size,
        italic=True,
        colours=tuple(row[5] for row in rows),
    )


def _figures(curves: tuple[Curve, ...]) -> Wanted | None:
    """Return the degree figures along the graduated circles: below the line, or above the ticks."""
    size = 9.0
    tall = height(size)
    arcs, xy, tangent, north, ids, colours = [], [], [], [], [], []
    for curve in curves:
        if not curve.circle.graduated:
            continue
        at = np.flatnonzero((curve.arcsec % curve.steps.major == 0) & curve.shown)
        if len(at) > 1 and (curve.arcsec[at[-1]] - curve.arcsec[at[0]]) % TURN == 0:
            at = at[:-1]
        arcs.append(curve.arcsec[at] % TURN)
        xy.append(curve.xy[at])
        tangent.append(curve.tangent[at])
        north.append(curve.north[at])
        ids.append(_FIGURE + (curve.number << 32) + curve.arcsec[at] % TURN)
        colours += [curve.circle.colour] * len(at)
    if not arcs or not sum(map(len, arcs)):
        return None
    every = np.concatenate(arcs)
    values, index = np.unique(every, return_inverse=True)
    texts = tuple(figure(value) for value in values.tolist())
    widths = np.array([width_px(text, size, "figure.circle") for text in texts], np.float32)[index]
    angle = upright(np.concatenate(tangent))
    half = turned_half(widths, tall, angle)
    at_xy, up = np.concatenate(xy), np.concatenate(north)
    down = np.float32(3.5 + 0.5 * tall)
    over = np.float32(TICKS[2] + 3.0 + 0.5 * tall)
    centres = np.stack([at_xy - up * down, at_xy + up * over], axis=1)
    request = Request(np.concatenate(ids).astype(np.int64), centres, half)
    return Wanted("figure.circle", request, texts, index.astype(np.int32), angle, size, colours=tuple(colours))


def _about(
    ctx: Context,
    role: str,
    code: int,
    columns: Float,
    texts: tuple[str, ...],
    rows: Any,
    radius: Any,
    most: int,
    **style: Any,
) -> Wanted | None:
    """Return texts about points of the sky, the first `most` that are on the map."""
    if not len(texts):
        return None
    xy, on = on_page(ctx, columns, 0.0)
    at = np.flatnonzero(on)[:most]
    if not len(at):
        return None
    size = style.get("size_pt", 9.0)
    italic = style.get("italic", False)
    wide = np.array([width_px(texts[i], size, role, italic=italic) for i in at.tolist()], np.float32)
    half = np.stack([0.5 * wide, np.full(len(at), 0.5 * height(size), np.float32)], axis=1)
    r = np.broadcast_to(np.asarray(radius, np.float32), (len(texts),))[at]
    centres = around(xy[at], r, half)
    if style.pop("centred", False):
        centres = np.concatenate([xy[at][:, None, :], centres], axis=1)
    request = Request(code + np.asarray(rows, np.int64)[at], centres, half)
    listed = tuple(texts[i] for i in at.tolist())
    return Wanted(role, request, listed, np.arange(len(at), dtype=np.int32), np.zeros(len(at), np.float32), **style)


def _stars(ctx: Context, shown: star_marks.Shown | None) -> Wanted | None:
    """Return the names of the brightest named stars on the map."""
    if shown is None or not ctx.sky.session.layers.star_names:
        return None
    named = ctx.sky["star names"]
    radius = star_marks.RADII[star_marks.size_class(named.vmag, ctx.limit)]
    bright = int(np.searchsorted(named.vmag, ctx.limit))
    directions = ctx.sky["stars"].directions[:, named.at[:bright]]
    return _about(
        ctx, "label.star", _STAR, directions, named.texts[:bright], named.ids[:bright], radius[:bright], MOST_STARS
    )


def _deep_sky(ctx: Context) -> Wanted | None:
    if "deep sky" not in ctx.made:
        return None
    spots = ctx.made["deep sky"][1]
    if spots is None:
        return None
    return _about(ctx, "label.deepsky", _DEEP, spots.columns, spots.texts, spots.rows, spots.radius, MOST_DEEP_SKY)


def _constellations(ctx: Context) -> Wanted | None:
    if "constellations" not in ctx.sky.layers:
        return None
    names = ctx.sky["constellations"]
    rows = np.arange(len(names.texts))
    return _about(
        ctx, "label.constellation", _CONSTELLATION, names.columns, names.texts, rows, 4.0, 88, italic=True, centred=True
    )
