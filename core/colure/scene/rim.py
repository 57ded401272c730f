"""The graduated rim: a double line with bars and ticks where the grid's coordinates meet the map's edge."""

import numpy as np

from colure.arrays import ARCSEC, Bool, Float, Int
from colure.graduation import TURN, figure, steps
from colure.marks import DIVISION, GRID, Areas, Labels, Layer, Lines, Mark, Segments
from colure.scene.context import Context
from colure.scene.layout import RIM
from colure.sky import FrameAxes

SAMPLES = 65
"""Points along a side, between which positions are interpolated."""


def build(ctx: Context) -> Layer:
    """Return the layer of the rim; sides that run off the sky carry no graduation."""
    left, top, right, bottom = ctx.frame
    marks: list[Mark] = [_box(left, top, right, bottom, DIVISION)]
    marks.append(_box(left - RIM, top - RIM, right + RIM, bottom + RIM, GRID))
    if "grid" in ctx.sky.layers:
        bars, ticks, labels = _graduation(ctx)
        if len(bars):
            starts = np.arange(len(bars) + 1, dtype=np.int32) * 4
            marks.append(Areas("rim.bar", bars.reshape(-1, 2), starts, even_odd=False))
        if len(ticks):
            marks.append(Segments("rim.tick", ticks, GRID))
        if labels is not None:
            marks.append(labels)
    return Layer("rim", tuple(marks), key(ctx), clip=False)


def key(ctx: Context) -> object:
    """Return what the layer of the rim depends on."""
    return (ctx.sky.key("grid") if "grid" in ctx.sky.layers else None, ctx.view_key)


def _box(left: float, top: float, right: float, bottom: float, weight: int) -> Lines:
    corners = np.array([[left, top], [right, top], [right, bottom], [left, bottom], [left, top]], np.float32)
    return Lines("rim", corners, np.array([0, 5], np.int32), weight)


def _graduation(ctx: Context) -> tuple[np.ndarray, np.ndarray, Labels | None]:
    """Return bars (B, 4, 2), ticks (T, 4) and figures of the four sides."""
    axes: FrameAxes = ctx.sky["grid"]
    left, top, right, bottom = ctx.frame
    t = np.linspace(0.0, 1.0, SAMPLES)
    xs, ys = left + t * (right - left), top + t * (bottom - top)
    full = np.full(SAMPLES, 0.0)
    sides = (
        (np.stack([xs, full + top], axis=1), 0, -1.0, True),
        (np.stack([xs, full + bottom], axis=1), 0, 1.0, True),
        (np.stack([full + left, ys], axis=1), 1, -1.0, False),
        (np.stack([full + right, ys], axis=1), 1, 1.0, False),
    )
    sky = ctx.projector.unproject(np.concatenate([side[0] for side in sides]))
    on: Bool = np.asarray(np.isfinite(sky).all(axis=1))
    lon, lat = axes.spherical(np.where(on[:, None], sky, 1.0))
    bars: list[Float] = []
    ticks: list[Float] = []
    texts: list[str] = []
    places: list[tuple[float, float]] = []
    for k, (points, axis, outward, is_lon) in enumerate(sides):
        mine = slice(k * SAMPLES, (k + 1) * SAMPLES)
        if not on[mine].all():
            continue
        values = np.unwrap(lon[mine]) if is_lon else lat[mine]
        along = points[:, axis]
        turn = np.diff(values)
        # A side on which the coordinate turns back, as round a pole, cannot be read as a scale.
        if not ((turn > 0.0).all() or (turn < 0.0).all()):
            continue
        across = points[0, 1 - axis]
        density = float(np.abs(along[-1] - along[0]) / max(abs(values[-1] - values[0]), 1e-12))
        chosen = steps(density, 4.0, 62.0)
        at, arcsec = _crossings(values, along, chosen.minor)
        major, middle = arcsec % chosen.major == 0, arcsec % chosen.middle == 0
        length = np.where(major, RIM, np.where(middle, 4.0, 2.5))
        ends = np.full((len(at), 4), across)
        ends[:, axis], ends[:, 2 + axis] = at, at
        ends[:, 3 - axis] = across + outward * length
        ticks.append(ends)
        bars += _bars(at[middle], arcsec[middle] // chosen.middle, across, outward, axis, along)
        for position, value in zip(at[major].tolist(), arcsec[major].tolist(), strict=True):
            texts.append(figure(int(value) % TURN if is_lon else int(value), signed=not is_lon))
            away = across + outward * (RIM + (9.0 if is_lon else 10.0))
            places.append((position, away) if axis == 0 else (away, position))
    found = np.array(bars, np.float32).reshape(-1, 4, 2)
    strokes = np.concatenate(ticks).astype(np.float32) if ticks else np.empty((0, 4), np.float32)
    return found, strokes, _figures(ctx, texts, places)


def _crossings(values: Float, along: Float, step: int) -> tuple[Float, Int]:
    """Return where (px) along a side a coordinate passes the multiples of a step, and the multiples (arcsec)."""
    low, high = float(values.min()), float(values.max())
    arcsec = np.arange(int(np.ceil(low / ARCSEC / step)), int(np.floor(high / ARCSEC / step)) + 1) * step
    order = slice(None) if values[-1] > values[0] else slice(None, None, -1)
    return np.interp(arcsec * ARCSEC, values[order], along[order]), arcsec


def _bars(at: Float, count: Int, across: float, outward: float, axis: int, along: Float) -> list[Float]:
    """Return every second stretch between middle ticks as a filled bar in the middle of the rim."""
    low, high = float(min(along[0], along[-1])), float(max(along[0], along[-1]))
    order = np.argsort(at)
    edges = np.concatenate([[low], at[order], [high]])
    # The stretch above multiple m is filled where m is even; the first stretch lies below the first multiple met.
    growing = len(at) < 2 or count[order][-1] >= count[order][0]
    first = count[order] if growing else count[order] - 1
    parity = np.concatenate([[first[0] - 1 if growing else first[0] + 1], first]) % 2 if len(at) else np.zeros(1)
    inner, outer = across + outward * (RIM - 2.0), across + outward * 2.0
    bars = []
    for k in np.flatnonzero(parity == 0).tolist():
        a, b = edges[k], edges[k + 1]
        corners = np.array([[a, inner], [b, inner], [b, outer], [a, outer]])
        bars.append(corners if axis == 0 else corners[:, ::-1])
    return bars


def _figures(ctx: Context, texts: list[str], places: list[tuple[float, float]]) -> Labels | None:
    if not texts or not ctx.page.figures:
        return None
    xy = np.array(places, np.float32)
    left, top, right, bottom = ctx.frame
    # The corners belong to both sides: leave them clear.
    clear = ((xy[:, 0] > left + 18) & (xy[:, 0] < right - 18)) | ((xy[:, 1] > top + 10) & (xy[:, 1] < bottom - 10))
    keep = np.flatnonzero(clear)
    unique = tuple(dict.fromkeys(texts[i] for i in keep))
    numbers = {text: i for i, text in enumerate(unique)}
    index = np.array([numbers[texts[i]] for i in keep], np.int32)
    angle = np.zeros(len(keep), np.float32)
    # Latitudes stand beside the vertical sides, read upwards, so that long figures need no wide margin.
    angle[(xy[keep, 0] < left) | (xy[keep, 0] > right)] = -np.pi / 2
    return Labels("figure.rim", unique, index, xy[keep], angle, 9.0, halo=False)
