"""Which texts the map asks for, in order of rank, and the marks made of those that found room."""

from dataclasses import dataclass
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure.arrays import DEG, TWO_PI, Float, cartesian
from colure.belt import DIVISION_GLYPHS
from colure.fontmetrics import PX_PER_PT, width_px
from colure.graduation import TURN, figure
from colure.labels import NOWHERE, Placement, Request, around, join, place
from colure.marks import F32, I32, Labels, Layer
from colure.scene import bodies as body_marks
from colure.scene import stars as star_marks
from colure.scene.circles import TICKS, Curves, Scale
from colure.scene.context import Context, on_page
from colure.scene.wanted import Wanted, height, turned_half, upright
from colure.sky import FrameAxes
from colure.sky_layers import StarNames

# The first part of a text's identity; the second is the row in its source.
_BODY, _CIRCLE, _FIGURE, _STAR, _DEEP, _CONSTELLATION, _POINT, _CROSSING, _BELT = (k << 56 for k in range(1, 10))

MOST_STARS = 60
MOST_DEEP_SKY = 30
BODY_PT, SIGN_PT = 10.0, 11.0
NAME_SPOTS = 24
"""Places along a circle where its name may stand."""


def build(
    ctx: Context,
    curves: Curves | None,
    bright: star_marks.Shown | None,
    listed: body_marks.Shown,
    memory: Any,
    key: object,
) -> tuple[Layer, Placement]:
    """Return the layer of texts and the memory of where they stand."""
    previous: Placement = memory if isinstance(memory, Placement) else NOWHERE
    discs = _discs(bright, listed)
    # Bodies and circle names first: they have the rank to push figures and stars aside.
    first = [w for w in (_bodies(listed), _circle_names(ctx, curves)) if w is not None]
    spots = _laid(ctx)
    rest = [spots.get("points"), _figures(curves), spots.get("crossings"), spots.get("stars"), spots.get("signs")]
    rest += [spots.get("deep sky"), spots.get("constellations")]
    wanted = [*first, *(w for w in rest if w is not None)]
    if "overlays" in ctx.made:
        from colure.scene import overlaynames  # it builds on this module

        wanted[len(first) : len(first)] = overlaynames.wanted(ctx)
    request = join([w.request for w in wanted])
    lead = sum(len(w.request) for w in first)
    choice, memory = place(request, discs, ctx.frame, previous, lead=lead)
    shown = (choice >= 0).nonzero()[0]
    at = choice[shown]
    xy = request.centres[shown, at]
    marks: list[Labels] = []
    begin = row = 0
    for w in wanted:
        end = int(shown.searchsorted(row + len(w.request)))
        marks += w.marks(shown[begin:end] - row, at[begin:end], xy[begin:end])
        begin, row = end, row + len(w.request)
    return Layer("labels", tuple(marks), key), memory


def _discs(shown: star_marks.Shown | None, listed: body_marks.Shown) -> F32:
    """Return the marks (M, 3) that no text may cover: bodies and bright stars."""
    parts = [np.concatenate([listed.xy, listed.radius[:, None]], axis=1)]
    if shown is not None:
        parts.append(np.concatenate([shown.xy, shown.radius[:, None]], axis=1))
    return np.concatenate(parts).astype(np.float32)


def _bodies(listed: body_marks.Shown) -> Wanted | None:
    if not listed.names:
        return None
    texts, ids, half = _body_texts(listed.names)
    request = Request(ids, around(listed.xy, listed.radius, half), half)
    n = len(texts)
    return Wanted(
        "label.body", request, texts, np.arange(n, dtype=np.int32), np.zeros(n, np.float32), BODY_PT, bold=True
    )


@lru_cache(maxsize=16)
def _body_texts(names: tuple[str, ...]) -> tuple[tuple[str, ...], Any, F32]:
    """Return the texts of bodies, their identities and the half-extents (N, 2) of their boxes."""
    texts = tuple(name.capitalize() if name != "emb" else "Earth–Moon barycentre" for name in names)
    tall = 0.5 * height(BODY_PT)
    half = np.array([[0.5 * width_px(text, BODY_PT, "label.body", bold=True), tall] for text in texts], np.float32)
    return texts, np.array([_BODY + _stable(name) for name in names], np.int64), half


def _stable(name: str) -> int:
    """Return a number of up to 55 bits that belongs to a name in every run."""
    value = 0
    for letter in name:
        value = (value * 131 + ord(letter)) & ((1 << 55) - 1)
    return value


def _circle_names(ctx: Context, curves: Curves | None) -> Wanted | None:
    """Return the circles' names, to stand along their curves between two figures, on the north side."""
    if curves is None:
        return None
    size = 10.0
    tall = height(size)
    scale = curves.scale
    at = scale.between[curves.shown[scale.between]]
    count = len(curves.circles)
    has = np.bincount(scale.row[at], minlength=count) > 0
    if not has.all():
        bare = ~has & (np.bincount(scale.row[curves.shown], minlength=count) > 0)
        # No such longitude is on the map: any point will do.
        at = np.sort(np.concatenate([at, np.flatnonzero(curves.shown & bare[scale.row])[::5]]))
        has |= bare
    if not len(at):
        return None
    used = np.flatnonzero(has)
    row = (np.cumsum(has) - 1)[scale.row[at]]
    circles = [curves.circles[i] for i in used.tolist()]
    texts = tuple(circle.name for circle in circles)
    widths = _circle_widths(texts, size)
    lift = (np.where(scale.graduated[used], TICKS[2], 0.0) + 4.0 + 0.5 * tall).astype(np.float32)
    tangent = curves.tangent[at]
    angle = upright(tangent)
    # A spot's number belongs to its longitude, so that a name stays there while the view moves over it.
    number = (scale.arcsec[at] // scale.major[scale.row[at]]) % NAME_SPOTS
    centres = np.full((len(used), NAME_SPOTS, 2), np.nan, np.float32)
    angles = np.zeros((len(used), NAME_SPOTS), np.float32)
    halves = np.zeros((len(used), NAME_SPOTS, 2), np.float32)
    centres[row, number] = curves.xy[at] + curves.north[at] * lift[row, None]
    angles[row, number] = angle
    halves[row, number] = turned_half(widths[row], tall, tangent)
    # Best left of the middle and above it, where nothing else begins.
    left, top, right, bottom = ctx.frame
    dx, dy = centres[:, :, 0] - (0.6 * left + 0.4 * right), centres[:, :, 1] - (0.6 * top + 0.4 * bottom)
    preference = np.argsort(dx * dx + dy * dy, axis=1)  # what is no number comes last
    # One box for all spots of a name: the largest that any of its angles needs.
    request = Request(_CIRCLE + curves.numbers[used], centres, halves.max(axis=1), preference)
    return Wanted(
        "label.circle",
        request,
        texts,
        np.arange(len(used), dtype=np.int32),
        angles,
        size,
        italic=True,
        colours=tuple(circle.colour for circle in circles),
    )


@lru_cache(maxsize=16)
def _circle_widths(texts: tuple[str, ...], size_pt: float) -> Float:
    return np.array([width_px(text, size_pt, "label.circle", italic=True) for text in texts])


def _figures(curves: Curves | None) -> Wanted | None:
    """Return the degree figures along the graduated circles: below the line, or above the ticks."""
    if curves is None:
        return None
    size = 9.0
    tall = height(size)
    every = _graduation(curves.scale, size)
    on = curves.shown[every.at].nonzero()[0]
    if not len(on):
        return None
    at, row = every.at[on], every.row[on]
    ids = _FIGURE + (curves.numbers[row] << 32) + every.arcsec[on]
    tangent = curves.tangent[at]
    xy, up = curves.xy[at], curves.north[at]
    down, over = np.float32(3.5 + 0.5 * tall), np.float32(TICKS[2] + 3.0 + 0.5 * tall)
    centres = np.empty((len(at), 2, 2), np.float32)
    centres[:, 0] = xy - up * down
    centres[:, 1] = xy + up * over
    request = Request(ids, centres, turned_half(every.width[on], tall, tangent))
    colours = [circle.colour for circle in curves.circles]
    return Wanted(
        "figure.circle",
        request,
        every.texts,
        every.number[on],
        upright(tangent),
        size,
        colours=tuple(colours[i] for i in row.tolist()),
    )


class _Graduation(NamedTuple):
    """The figures of circles, wherever these are: the point, circle, longitude, text and width in pixels of each."""

    at: NDArray[np.intp]
    row: NDArray[np.intp]
    arcsec: NDArray[np.int64]
    number: I32
    width: F32
    texts: tuple[str, ...]


@lru_cache(maxsize=4)
def _graduation(scale: Scale, size_pt: float) -> _Graduation:
    """Return the figures of a graduation, which stays the same while the moment alone changes."""
    raw = scale.arcsec[scale.figures]
    # A circle that closes has its first point twice.
    once = ~((raw % TURN == 0) & (raw > 0))
    at, arcsec = scale.figures[once], raw[once] % TURN
    values, index = np.unique(arcsec, return_inverse=True)
    texts, wide = _figure_texts(tuple(values.tolist()), size_pt)
    return _Graduation(at, scale.row[at], arcsec, index.astype(np.int32), wide[index], texts)


@lru_cache(maxsize=64)
def _figure_texts(arcsec: tuple[int, ...], size_pt: float) -> tuple[tuple[str, ...], F32]:
    """Return the figures of longitudes and their widths in pixels."""
    texts = tuple(figure(value) for value in arcsec)
    return texts, np.array([width_px(text, size_pt, "figure.circle") for text in texts], np.float32)


@dataclass(frozen=True, slots=True, eq=False)
class Spots:
    """Texts about points of the sky: directions (3, N), a text, its width in em, its row and a radius for each.

    The first `most` that are on the map ask for a place.
    """

    role: str
    code: int
    columns: Any
    texts: tuple[str, ...]
    width_em: F32
    rows: Any
    radius: Any
    most: int = 1000
    centred: bool = False


def _laid(ctx: Context) -> dict[str, Wanted]:
    """Return what each group of points of the sky asks for; the points of all are projected together."""
    groups = {
        "points": _named(ctx, "points", "label.point", _POINT),
        "crossings": _named(ctx, "crossings", "label.belt", _CROSSING),
        "stars": _stars(ctx),
        "deep sky": _deep_sky(ctx),
        "constellations": _named(ctx, "constellations", "label.constellation", _CONSTELLATION),
    }
    real = {name: group for name, group in groups.items() if group is not None and group.columns.shape[1]}
    columns = [group.columns for group in real.values()]
    signs = _sign_columns(ctx)
    if signs is not None:
        columns.append(signs)
    if not columns:
        return {}
    xy, on = on_page(ctx, np.concatenate(columns, axis=1), 0.0)
    out: dict[str, Wanted] = {}
    at = 0
    for name, group in real.items():
        n = group.columns.shape[1]
        wanted = _about(group, xy[at : at + n], on[at : at + n].nonzero()[0][: group.most])
        if wanted is not None:
            out[name] = wanted
        at += n
    belt = _signs(xy[at:], on[at:]) if signs is not None else None
    if belt is not None:
        out["signs"] = belt
    return out


def _about(group: Spots, xy: F32, at: Any, size: float = 9.0) -> Wanted | None:
    """Return the texts of a group at its points `at`, for which there are positions round each."""
    if not len(at):
        return None
    half = np.empty((len(at), 2), np.float32)
    half[:, 0] = group.width_em[at] * np.float32(0.5 * size * PX_PER_PT)
    half[:, 1] = 0.5 * height(size)
    here = xy[at]
    r = group.radius[at] if isinstance(group.radius, np.ndarray) else np.full(len(at), group.radius, np.float32)
    centres = around(here, r, half)
    if group.centred:
        centres = np.concatenate([here[:, None, :], centres], axis=1)
    request = Request(group.code + group.rows[at], centres, half)
    level = np.zeros(len(at), np.float32)
    return Wanted(
        group.role, request, group.texts, at.astype(np.int32), level, size, italic=group.role == "label.constellation"
    )


def _stars(ctx: Context) -> Spots | None:
    """Return the names of the brightest named stars on the map."""
    if "stars" not in ctx.sky.layers or "star names" not in ctx.sky.layers:
        return None
    named = ctx.sky["star names"]
    radius = _named_radii(named, ctx.limit)
    bright = len(radius)
    directions = ctx.sky["stars"].directions[:, named.at[:bright]]
    return Spots(
        "label.star",
        _STAR,
        directions,
        named.texts,
        named.width_em[:bright],
        named.ids[:bright],
        radius,
        MOST_STARS,
    )


@lru_cache(maxsize=4)
def _named_radii(named: StarNames, limit: float) -> F32:
    """Return the radii in pixels of the named stars that are not fainter than a limit, the brightest first."""
    bright = int(np.searchsorted(named.vmag, limit, side="right"))
    scale = star_marks.scale_of(limit)
    return np.asarray(scale.radii[scale.size(named.vmag[:bright])])


def _deep_sky(ctx: Context) -> Spots | None:
    spots = ctx.made["deep sky"][1] if "deep sky" in ctx.made else None
    if spots is None:
        return None
    return Spots(
        "label.deepsky",
        _DEEP,
        spots.columns,
        spots.texts,
        spots.width_em,
        spots.rows,
        spots.radius,
        MOST_DEEP_SKY,
    )


def _named(ctx: Context, layer: str, role: str, code: int) -> Spots | None:
    """Return the texts of a layer of the sky that is nothing but texts at directions."""
    if layer not in ctx.sky.layers:
        return None
    found = ctx.sky[layer]
    rows = np.arange(len(found.texts))
    # A constellation's name stands on its middle, the others beside their mark.
    centred = layer == "constellations"
    return Spots(role, code, found.columns, found.texts, found.width_em, rows, 5.0, centred=centred)


def _sign_columns(ctx: Context) -> Float | None:
    """Return the directions (3, 24) of the signs of the belt's divisions: in the middle of each, near both edges."""
    if "belt" not in ctx.sky.layers or not ctx.sky.session.belt.divisions:
        return None
    axes: FrameAxes = ctx.sky["belt"]
    lon, lat, columns = _sign_places(ctx.sky.session.belt.half_width_deg)
    return axes.columns(lon, lat) if axes.matrix is None else axes.matrix @ columns


def _signs(xy: F32, on: Any) -> Wanted | None:
    """Return the signs of the belt's divisions at their places (24, 2) of which those `on` (24,) are on the map."""
    xy[~on] = np.nan
    at = (on[:12] | on[12:]).nonzero()[0]
    if not len(at):
        return None
    centres = np.empty((len(at), 2, 2), np.float32)
    centres[:, 0] = xy[:12][at]
    centres[:, 1] = xy[12:][at]
    request = Request(_BELT + at, centres, _sign_halves()[at])
    return Wanted("label.belt", request, DIVISION_GLYPHS, at.astype(np.int32), np.zeros(len(at), np.float32), SIGN_PT)


@lru_cache(maxsize=1)
def _sign_halves() -> F32:
    """Return the half-extents (12, 2) of the boxes of the signs."""
    tall = 0.5 * height(SIGN_PT)
    return np.array([[0.5 * width_px(t, SIGN_PT, "label.belt"), tall] for t in DIVISION_GLYPHS], np.float32)


@lru_cache(maxsize=8)
def _sign_places(half_width_deg: float) -> tuple[Float, Float, Float]:
    """Return longitudes, latitudes (24,) and directions (3, 24) of the signs near the north edge, then the south."""
    lon = np.tile((np.arange(12) + 0.5) * (TWO_PI / 12.0), 2)
    lat = np.repeat([0.8, -0.8], 12) * (half_width_deg * DEG)
    return lon, lat, cartesian(lon, lat).T
