"""What explains the chart: the title block at the corners, the magnitude legend, and the caution about the Sun."""

from functools import lru_cache

import numpy as np

from colure.arrays import DEG, separation
from colure.fontmetrics import PX_PER_PT, width_px
from colure.frames import Frame
from colure.graduation import figure
from colure.marks import Discs, Labels, Layer, Mark
from colure.moment import Moment
from colure.scene.context import Context
from colure.scene.layout import Layout
from colure.scene.stars import scale_of
from colure.session import Centre, View
from colure.sites import Site

TITLE_PT, LEGEND_PT = 10.0, 9.0
MINUS = "\N{MINUS SIGN}"
NEAR_SUN_DEG = 20.0
FINDER_WIDTH_DEG = 40.0
"""A chart no wider than this is taken for a finder chart."""

_SYMBOLS = {
    "ecliptic": ("λ", "β"),
    "galactic": ("l", "b"),
    "supergalactic": ("SGL", "SGB"),
    "horizon": ("azimuth", "altitude"),
    "invariable": ("λ", "β"),
}


def angle_across(width_deg: float) -> str:
    """Return an angle in the largest unit that needs few figures: `110°`, `3.5°`, `40′`, `90″`."""
    if width_deg >= 1.0:
        return f"{width_deg:.3g}°"
    minutes = width_deg * 60.0
    return f"{minutes:.3g}′" if minutes >= 1.0 else f"{minutes * 60.0:.3g}″"


@lru_cache(maxsize=256)
def frame_label(name: str) -> str:
    """Return a frame as a reader calls it."""
    return Frame.parse(name).label()


@lru_cache(maxsize=256)
def up_label(up: str, rotation_deg: float = 0.0) -> str:
    """Return which way is up, and by how much the picture is turned from it."""
    if up == "zenith":
        text = "zenith up"
    else:
        frame = Frame.parse(up)
        plain = up in ("ecliptic/mean/date", "equator/mean/date", "ecliptic/true/date", "equator/true/date")
        text = f"{frame.plane if plain or frame.plane in ('galactic', 'invariable') else frame.label()} up"
        text = text.replace("equator up", "north up")
    return text if rotation_deg == 0.0 else f"{text}, turned {rotation_deg:g}°"


def projection_label(name: str) -> str:
    """Return a projection's name as it is printed."""
    return {"plate-carree": "plate carrée", "mercator": "Mercator", "hammer": "Hammer"}.get(
        name, name.replace("-", " ")
    )


@lru_cache(maxsize=256)
def centre_label(centre: Centre, width_deg: float) -> str:
    """Return what the chart is centred on: a body, or a position with figures as fine as a pixel, and its frame."""
    if centre.body is not None:
        return f"centred on {centre.body.capitalize()}"
    # A hundredth of the width, in the unit below: nobody reads a finer position off a chart.
    step = 60 if width_deg >= 2.0 else 1
    plane = Frame.parse(centre.frame).plane
    first, second = _SYMBOLS.get(plane, ("α", "δ"))
    lon = round(centre.lon_deg * 3600.0 / step) * step
    lat = round(centre.lat_deg * 3600.0 / step) * step
    return f"{first} {_minutes(lon % 1296000)}  {second} {_minutes(lat, True)}  ({frame_label(centre.frame)})"


def _minutes(arcsec: int, signed: bool = False) -> str:
    text = figure(arcsec, signed)
    return text if "′" in text else f"{text} 00′"


def title(ctx: Context) -> Layer:
    """Return the layer of the title block, the legend and the notes."""
    session, view, page = ctx.sky.session, ctx.view, ctx.page
    rows = len(page.above)
    key = title_key(ctx)
    if rows == 0:
        return Layer("title", (), key, clip=False)
    left, right = ctx.frame[0] - 7.0, ctx.frame[2] + 7.0
    # The moment apart from the rest: while time runs, nothing else of the block changes.
    moment = _block((("left", 0, _moment_text(session.moment)),), page, left, right)
    steady = _block(
        _steady_lines(session.site, session.from_site, session.place, session.omitted, view), page, left, right
    )
    legend = _legend(ctx.limit, "stars" in ctx.sky.layers, right, page.below[rows - 1], page.below[0])
    return Layer("title", (moment, steady, *legend), key, clip=False)


@lru_cache(maxsize=4)
def _moment_text(moment: Moment) -> str:
    """Return the moment as it is printed; kept while the view alone changes."""
    return str(moment.text())


@lru_cache(maxsize=16)
def _steady_lines(
    site: Site, from_site: bool, place: str, omitted: tuple[str, ...], view: View
) -> tuple[tuple[str, int, str], ...]:
    """Return the lines of the block but the moment's: side, row (0 the uppermost, −1 the first at the foot), text."""
    where = f"{site.name} · {site.coordinates()}" if site.name else site.coordinates()
    seen_from = f"from {site.name or 'the site'}" if from_site else "from the Earth’s centre"
    without = f", without {', '.join(omitted)}" if omitted else ""
    across = f"{angle_across(view.width_deg)} across"
    return (
        ("right", 0, f"{projection_label(view.projection)} · {up_label(view.up, view.rotation_deg)} · {across}"),
        ("left", -1, centre_label(view.centre, view.width_deg)),
        ("left", 1, where),
        ("right", 1, "east left" if view.east_left else "east right, a map"),
        ("left", -2, f"{place} places, {seen_from}{without}"),
    )


@lru_cache(maxsize=16)
def _block(lines: tuple[tuple[str, int, str], ...], page: Layout, left: float, right: float) -> Labels:
    """Return the mark of lines of the title block, those that the page has a row for."""
    rows = len(page.above)
    texts: list[str] = []
    places: list[tuple[float, float]] = []
    for side, row, text in lines:
        if row >= rows or row < -rows:
            continue
        # Row −1 is nearest the map at the foot of the page.
        y = page.above[row] if row >= 0 else page.below[rows + row]
        fitted, width = _fitted(text, 0.56 * (right - left) if side == "left" else 0.43 * (right - left))
        texts.append(fitted)
        places.append((left + 0.5 * width if side == "left" else right - 0.5 * width, y))
    xy = np.array(places, np.float32)
    index = np.arange(len(texts), dtype=np.int32)
    return Labels("title", tuple(texts), index, xy, np.zeros(len(texts), np.float32), TITLE_PT, halo=False)


def title_key(ctx: Context) -> object:
    """Return what the title block depends on."""
    session = ctx.sky.session
    stars = "stars" in ctx.sky.layers
    what = (session.place, session.from_site, session.omitted)
    return (session.moment, session.site, what, ctx.view, ctx.limit, ctx.page, stars)


@lru_cache(maxsize=256)
def _fitted(text: str, room: float) -> tuple[str, float]:
    """Return a text cut to the room at one of its ` · `, or anywhere, and its width."""
    width = width_px(text, TITLE_PT, "title")
    while width > room and " · " in text:
        text = text.rpartition(" · ")[0]
        width = width_px(text, TITLE_PT, "title")
    while width > room and len(text) > 4:
        text = text[:-2].rstrip() + "…"
        width = width_px(text, TITLE_PT, "title")
    return text, width


@lru_cache(maxsize=64)
def _legend(faintest_shown: float, stars: bool, right: float, y_text: float, y_discs: float) -> tuple[Mark, ...]:
    """Return the magnitude limit, and below it discs of whole magnitudes with their figures."""
    scale = scale_of(faintest_shown)
    limit = f"stars to {faintest_shown:.1f} mag".replace("-", MINUS)
    if stars and y_discs != y_text:
        limit += f" · area × {scale.area_ratio:.2f} a magnitude"
    width = width_px(limit, LEGEND_PT, "legend")
    marks: list[Mark] = [
        Labels(
            "legend",
            (limit,),
            np.zeros(1, np.int32),
            np.array([[right - 0.5 * width, y_text]], np.float32),
            np.zeros(1, np.float32),
            LEGEND_PT,
            halo=False,
        )
    ]
    if y_discs == y_text or not stars:
        return tuple(marks)
    faintest = int(np.floor(faintest_shown))
    magnitudes = np.arange(int(np.ceil(scale.brightest)), faintest + 1)[::-1]
    texts = tuple(f"{m}".replace("-", MINUS) for m in magnitudes.tolist())
    size = scale.size(magnitudes.astype(np.float32))
    x = right
    discs: list[tuple[float, float]] = []
    labels: list[tuple[float, float]] = []
    for text, radius in zip(texts, scale.radii[size].tolist(), strict=True):
        w = width_px(text, LEGEND_PT, "legend")
        labels.append((x - 0.5 * w, y_discs))
        x -= w + 4.0 + radius
        discs.append((x, y_discs))
        x -= radius + 11.0
    n = len(texts)
    neutral = np.full(n, 3, np.uint8)
    marks.append(
        Discs("legend.star", np.array(discs, np.float32), size, neutral, scale.radii, np.full(n, -1, np.int64))
    )
    angle = np.zeros(n, np.float32)
    unique = Labels(
        "legend", texts, np.arange(n, dtype=np.int32), np.array(labels, np.float32), angle, LEGEND_PT, halo=False
    )
    return (*marks, unique)


def warning(ctx: Context) -> str:
    """Return the warning about the Sun where a finder chart lies within 20° of it, or an empty text."""
    sun = ctx.sky["bodies"].vector("sun")
    if sun is not None and ctx.view.width_deg <= FINDER_WIDTH_DEG:
        apart = float(separation(ctx.window.centre, sun)) / DEG - ctx.window.radius / DEG
        if apart < NEAR_SUN_DEG:
            return (
                "The Sun is in this field. Pointing optics at the Sun injures eyes and instruments."
                if apart <= 0.0
                else f"The Sun is {max(apart, 0.1):.0f}° from this field. "
                "Pointing optics near the Sun injures eyes and instruments."
            )
    return ""


def caution(ctx: Context, text: str, key: object) -> Layer:
    """Return the layer of a warning."""
    if not text:
        return Layer("caution", (), key)
    left, _, right, bottom = ctx.frame
    size = 10.0
    while size > 9.0 and width_px(text, size, "caution", bold=True) > right - left - 20:
        size -= 0.5
    parts = [text]
    if width_px(text, size, "caution", bold=True) > right - left - 20:
        parts = [part if part.endswith(".") else part + "." for part in text.split(". ")]
    y = bottom - 12.0 - size * PX_PER_PT * 1.3 * np.arange(len(parts))[::-1]
    xy = np.stack([np.full(len(parts), 0.5 * (left + right)), y], axis=1).astype(np.float32)
    index = np.arange(len(parts), dtype=np.int32)
    label = Labels("caution", tuple(parts), index, xy, np.zeros(len(parts), np.float32), size, bold=True)
    return Layer("caution", (label,), key)
