"""The outline of a FITS image on the sky: corners, edges, north and east, parity and a grid of its pixels."""

import gzip
import io
import warnings
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from colure.arrays import DEG, Float, cartesian
from colure.arrays import unit as normed
from colure.overlays.fitsrules import PAIRS, Ruling, decide
from colure.overlays.headers import MOST_UNPACKED, Headers, HeaderText, read_headers
from colure.overlays.model import OverlayError
from colure.overlays.projectioncards import projection_cards
from colure.wording import one_line

EDGE_POINTS = 33
"""Points on each edge: a distorted or a wide image has no straight edges."""
GRID_LINES = 3
"""Lines inside the image in each direction."""
MOST_PIXELS = 1e9
"""The largest size of an axis that is taken for one."""
_BOUNDS = {"WCSAXES": 20, **{f"{letters}_ORDER": 9 for letters in ("A", "B", "AP", "BP")}}
"""Sizes that a projection library takes from the header to set up its tables: more than any real image has."""
_INHERITED = ("RADESYS", "RADECSYS", "EQUINOX", "EPOCH", "MJD-OBS", "DATE-OBS", "MJD-AVG", "DATE-AVG")


@dataclass(frozen=True, slots=True, eq=False)
class Shape:
    """An image on its own axes, whatever frame they are said to be.

    Vectors (…, 3) are on the axes of the header (longitude and latitude as its projection gives them): `corners`
    (4, 3) of the outermost pixels' outer corners in the order (1, 1), (n, 1), (n, m), (1, m); `edge` (M, 3) the closed
    outline; `grid` (K, EDGE_POINTS, 3) lines of equal pixel number; `centre` (3,); `north` and `east` (3,) the unit
    tangents there towards the axes' pole and growing longitude; NaN where the projection gives no place. `size` are
    pixels, `scale_arcsec` (2,) the sides of one at the centre, `pa_deg` the position angle of the picture's +y from the
    axes' north through east, `mirrored` whether east is to the right when north is up.
    """

    corners: Float
    edge: Float
    grid: Float
    centre: Float
    north: Float
    east: Float
    size: tuple[int, int]
    scale_arcsec: tuple[float, float]
    pa_deg: float
    mirrored: bool
    axes: str
    notes: tuple[str, ...] = ()

    @property
    def parity(self) -> str:
        """The parity in words."""
        return "east right of north (mirrored)" if self.mirrored else "east left of north"


@dataclass(frozen=True, slots=True, eq=False)
class ImageHeader:
    """A header that has a sky: its place in the file, its kind of axes, and what they are by the rules of FITS."""

    unit: HeaderText
    axes: str
    ruling: Ruling
    size: tuple[int, int]
    notes: tuple[str, ...] = ()


def axes_of(cards: Mapping[str, Any]) -> str | None:
    """Return the kind of celestial axes of a header, one of the values of PAIRS, or None where it has no sky."""
    kinds = {_stem(str(value)) for key, value in cards.items() if key[:5] == "CTYPE" and key[5:].isdigit()}
    return next((kind for (lon, lat), kind in PAIRS.items() if lon in kinds and lat in kinds), None)


def _stem(ctype: str) -> str:
    return ctype.strip().upper()[:4].rstrip("-").partition("-")[0]


def _no_sky(headers: Headers, where: str) -> OverlayError:
    """Return the line for a file none of whose headers has a sky."""
    named = [
        one_line(str(value), 12)
        for unit in headers.units
        for key, value in unit.cards.items()
        if key[:5] == "CTYPE" and key[5:].isdigit()
    ]
    found = f"its axes are {', '.join(dict.fromkeys(named[:6]))}" if named else "no CTYPE in its headers"
    return OverlayError(f"{where}: a header of no sky, {found}; expected RA/DEC, ELON/ELAT, GLON/GLAT or SLON/SLAT")


def find(path: Path | str, hdu: int | None = None) -> ImageHeader:
    """Return the first header of a file (or that at a place) that has a sky; OverlayError in one line if none has."""
    where = f"image '{path}'"
    headers = read_headers(path)
    units = [unit for unit in headers.units if hdu is None or unit.place == hdu]
    unsized: int | None = None
    for unit in units:
        axes = axes_of(unit.cards)
        if axes is None or unit.is_table:
            continue
        cards, notes = _inherited(unit, headers)
        size = _size(unit.cards)
        if size is None:
            unsized = unit.place if unsized is None else unsized
            continue
        return ImageHeader(unit, axes, decide(cards, axes), size, (*headers.notes, *notes))
    if hdu is not None and not units:
        raise OverlayError(f"{where}: has no header {hdu}; it has {len(headers.units)}")
    if unsized is not None:
        raise OverlayError(f"{where}: header {unsized} has axes of the sky but no size; expected NAXIS1 and NAXIS2")
    raise _no_sky(headers, where)


def places(path: Path | str) -> tuple[int, ...]:
    """Return the places in a file of all headers that have a sky and a size: the chips of a camera, for example."""
    units = read_headers(path).units
    return tuple(unit.place for unit in units if axes_of(unit.cards) and not unit.is_table and _size(unit.cards))


def _inherited(unit: HeaderText, headers: Headers) -> tuple[Mapping[str, Any], list[str]]:
    """Return the cards of a header with what only the primary header says of the frame, and a note about it."""
    if unit.place == 0:
        return unit.cards, []
    primary = headers.units[0].cards
    own = any(key in unit.cards for key in ("RADESYS", "RADECSYS", "EQUINOX", "EPOCH"))
    taken = {key: primary[key] for key in _INHERITED if key in primary and key not in unit.cards}
    if own:  # a system and an equinox belong together: only dates may come from elsewhere
        taken = {key: value for key, value in taken.items() if key[:3] in ("MJD", "DAT")}
    frame_keys = [key for key in taken if key[:3] not in ("MJD", "DAT")]
    note = [f"{', '.join(frame_keys)} taken from the primary header"] if frame_keys else []
    return {**unit.cards, **taken}, note


def _size(cards: Mapping[str, Any]) -> tuple[int, int] | None:
    """Return the pixels of the two axes of the sky, those of the image itself where it is packed into a table."""
    z = "Z" if cards.get("ZIMAGE") else ""
    stems = [{_stem(str(cards.get(f"CTYPE{i}", ""))): i} for i in range(1, 10)]
    places = {stem: i for entry in stems for stem, i in entry.items() if stem}
    pair = next((pair for pair in PAIRS if pair[0] in places and pair[1] in places), None)
    if pair is None:
        return None
    values = [cards.get(f"{z}NAXIS{i}") for i in sorted((places[pair[0]], places[pair[1]]))]
    whole = [int(v) for v in values if isinstance(v, int | float) and 1 <= v <= MOST_PIXELS]
    return (whole[0], whole[1]) if len(whole) == 2 else None


def shape(path: Path | str, found: ImageHeader) -> Shape:
    """Return the outline of an image; OverlayError in one line where its header gives no projection."""
    where = f"image '{path}'"
    try:
        wcs, notes = _wcs(path, found)
        return _shape(wcs, found, notes)
    except OverlayError:
        raise
    except MemoryError:
        raise OverlayError(f"{where}: its distortion tables do not fit into memory") from None
    except Exception as fault:  # whatever the projection library meets in a damaged header, a user gets one line
        text = one_line(" ".join((str(fault) or type(fault).__name__).split()), 160)
        raise OverlayError(f"{where}: header {found.unit.place} gives no projection, {text}") from None


def _wcs(path: Path | str, found: ImageHeader) -> tuple[Any, tuple[str, ...]]:
    """Return astropy's celestial WCS of a header, with the distortion tables of its file where it names them."""
    from astropy.io import fits
    from astropy.wcs import WCS

    cards = found.unit.cards
    for key, most in _BOUNDS.items():
        value = cards.get(key, 0)
        if not (isinstance(value, int | float) and 0 <= value <= most):
            raise OverlayError(f"image '{path}': {key} is {one_line(str(value), 20)}; expected 0 to {most}")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # what is odd about the frame is said in our own words
        header = fits.Header.fromstring(projection_cards(found.unit, f"image '{path}'"))
        tabled = any(key.startswith(("CPDIS", "CQDIS", "D2IMDIS", "DP1", "D2IMEXT")) for key in cards)
        tabled |= any("-TAB" in str(value) for key, value in cards.items() if key.startswith("CTYPE"))
        if tabled:
            with fits.open(_whole_file(path), lazy_load_hdus=True, ignore_missing_simple=True) as units:
                return WCS(header, units).celestial, ("distortion tables of the file are applied",)
        return WCS(header).celestial, ()


def _whole_file(path: Path | str) -> Path | io.BytesIO:
    """Return a file to be opened whole: as it is, or unpacked up to the bound."""
    with Path(path).open("rb") as file:
        if file.read(2) != b"\x1f\x8b":
            return Path(path)
    with gzip.open(path, "rb") as unpacked:
        data = unpacked.read(MOST_UNPACKED + 1)
    if len(data) > MOST_UNPACKED:
        raise OverlayError(f"image '{path}': more than {MOST_UNPACKED:,} bytes when unpacked, with distortion tables")
    return io.BytesIO(data)


def _places(wcs: Any, x: Float, y: Float) -> Float:
    """Return unit vectors (…, 3) on the header's axes of pixels numbered from 1; NaN where there is no place."""
    flat = np.stack([x.ravel(), y.ravel()], axis=-1)
    with np.errstate(all="ignore"), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        lonlat = np.asarray(wcs.all_pix2world(flat, 1), dtype=np.float64).reshape(*x.shape, 2)
    lon, lat = lonlat[..., wcs.wcs.lng], lonlat[..., wcs.wcs.lat]
    good = np.isfinite(lon) & np.isfinite(lat) & (np.abs(lat) <= 90.0 + 1e-9)
    vectors = cartesian(np.where(good, lon, 0.0) * DEG, np.where(good, lat, 0.0) * DEG)
    vectors[~good] = np.nan
    return vectors


def _shape(wcs: Any, found: ImageHeader, notes: tuple[str, ...]) -> Shape:
    width, height = found.size
    left, right, bottom, top = 0.5, width + 0.5, 0.5, height + 0.5
    t = np.linspace(0.0, 1.0, EDGE_POINTS)
    across, along = left + (right - left) * t, bottom + (top - bottom) * t
    x = np.concatenate([across, np.full_like(t, right), across[::-1], np.full_like(t, left)])
    y = np.concatenate([np.full_like(t, bottom), along, np.full_like(t, top), along[::-1]])
    edge = _places(wcs, x, y)
    corners = edge[[0, EDGE_POINTS, 2 * EDGE_POINTS, 3 * EDGE_POINTS]]
    inner = (np.arange(GRID_LINES) + 1.0) / (GRID_LINES + 1.0)
    gx = np.concatenate([np.repeat(left + (right - left) * inner, EDGE_POINTS), np.tile(across, GRID_LINES)])
    gy = np.concatenate([np.tile(along, GRID_LINES), np.repeat(bottom + (top - bottom) * inner, EDGE_POINTS)])
    grid = _places(wcs, gx, gy).reshape(2 * GRID_LINES, EDGE_POINTS, 3)
    middle = np.array([(width + 1) / 2.0, (height + 1) / 2.0])
    centre = _places(wcs, middle[:1], middle[1:])[0]
    whole = np.isfinite(edge).all(axis=1)
    if not np.isfinite(centre).all():
        if not whole.any():
            raise OverlayError(f"header {found.unit.place}: no pixel of its edge or centre lies on the sky")
        centre = normed(edge[whole].mean(axis=0))
        notes = (*notes, "the centre of the image lies off the sky: its scale and angle are not known")
    # One pixel along each axis, or as much of one as a small image has.
    step = _places(wcs, middle[0] + np.array([-0.5, 0.5, 0.0, 0.0]), middle[1] + np.array([0.0, 0.0, -0.5, 0.5]))
    north, east = compass(centre)
    dx, dy = step[1] - step[0], step[3] - step[2]
    jacobian = np.array([[dx @ east, dy @ east], [dx @ north, dy @ north]])
    scale = np.hypot(jacobian[0], jacobian[1]) / DEG * 3600.0
    pa = float(np.degrees(np.arctan2(jacobian[0, 1], jacobian[1, 1])) % 360.0)
    # Right and up as a picture is shown: east must be against them for the sky as it is seen.
    mirrored = bool(jacobian[0, 0] * jacobian[1, 1] - jacobian[0, 1] * jacobian[1, 0] > 0.0)
    if not whole.all() and whole.any():
        notes = (*notes, "part of the image's edge lies off the sky")
    return Shape(
        corners, edge, grid, centre, north, east, found.size, (float(scale[0]), float(scale[1])), pa, mirrored,
        found.axes, notes,
    )  # fmt: skip


def compass(vector: Float) -> tuple[Float, Float]:
    """Return the unit tangents (3,) towards the pole of the axes and towards growing longitude."""
    flat = float(np.hypot(vector[0], vector[1]))
    if not flat > 1e-12:
        return np.array([-1.0, 0.0, 0.0]), np.array([0.0, 1.0, 0.0])
    east = np.array([-vector[1] / flat, vector[0] / flat, 0.0])
    return np.cross(vector, east), east


def sides(outline: Shape) -> tuple[float, float]:
    """Return the width and height of an image in radians, along lines through its centre."""
    (nx, ny), (sx, sy) = outline.size, outline.scale_arcsec
    return nx * sx / 3600.0 * DEG, ny * sy / 3600.0 * DEG
