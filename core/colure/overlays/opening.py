"""Open a file as an overlay: what it says of itself, by which rule, and exactly what a user must still say."""

from dataclasses import dataclass, field
from pathlib import Path

from colure import tables
from colure.errors import TableError
from colure.files import FileError, read_bounded
from colure.framenames import Frame
from colure.overlays import coosys, images
from colure.overlays.columns import Pair, label_column, pairs, plane_of, stated, unit_of
from colure.overlays.headers import read_headers
from colure.overlays.model import Overlay, OverlayError
from colure.overlays.store import STORE, Store, hashed, load, positions
from colure.overlays.systems import equatorial
from colure.tables.model import Read
from colure.wording import one_line

UNITS = ("deg", "h", "h:m:s", "d:m:s", "rad")
"""Units that may be declared for a column that carries none."""
FRAMES_OF = {
    "equator": ("icrs", "equator/mean/J2000@iau1976", "equator/fk4/B1950", "equator/mean/date", "equator/true/date"),
    "ecliptic": ("ecliptic/mean/J2000", "ecliptic/mean/date", "ecliptic/mean/B1950", "ecliptic/true/date"),
    "galactic": ("galactic",),
    "supergalactic": ("supergalactic",),
    "": ("icrs", "equator/fk4/B1950", "ecliptic/mean/J2000", "ecliptic/mean/date", "galactic"),
}
"""Frames that are offered where a file names none, by the plane of its columns."""


@dataclass(frozen=True, slots=True)
class Missing:
    """Something that the file does not say: `key` is the argument of `declare` that says it."""

    key: str
    question: str
    choices: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Found:
    """What a file says of itself.

    `lon`, `lat`, `name` are columns, `frame` the frame, `epoch` the Julian year; None or empty where the file is
    silent, and then `missing` holds the question. `rules` tells, for each thing that was decided, which rule decided.
    `doubts` are lines about what is obsolete or contradictory, `rejected` about rows that cannot be used.
    """

    path: str
    sha256: str
    kind: str
    lon: str = ""
    lat: str = ""
    lon_unit: str = ""
    lat_unit: str = ""
    name: str = ""
    hdu: int = 0
    frame: str | None = None
    epoch: float | None = None
    rules: dict[str, str] = field(default_factory=dict)
    missing: tuple[Missing, ...] = ()
    doubts: tuple[str, ...] = ()
    columns: tuple[str, ...] = ()
    total: int = 0
    refused: int = 0
    rejected: tuple[str, ...] = ()
    read: Read | None = field(default=None, repr=False)
    said: "coosys.Said | None" = None

    @property
    def complete(self) -> bool:
        """Whether nothing must be asked."""
        return not self.missing


def inspect(path: Path | str, kind: str | None = None, hdu: int | None = None) -> Found:
    """Return what a file says of itself; OverlayError in one line where it is no table and no image of the sky.

    `kind` "table" or "image" settles what a FITS file that holds both is opened as; by default an image is taken where
    a header has a sky, else a table.
    """
    if kind not in (None, "table", "image"):
        raise OverlayError(f"kind {kind!r}: unknown; expected 'table' or 'image'")
    if kind == "image" or (kind is None and _looks_like_image(path)):
        return _image(path, hdu)
    return _table(path)


def _looks_like_image(path: Path | str) -> bool:
    """Whether a file begins as a FITS header does and has an image of the sky, or no table to be opened instead."""
    try:
        with Path(path).open("rb") as file:
            start = file.read(400)
    except (OSError, ValueError):
        return False  # the table's reader says why in its own words
    # A header saved as text may begin with any keyword; a remark of a table looks like one only by chance.
    if not (start.startswith((b"SIMPLE  =", b"\x1f\x8b")) or (start[8:10] == b"= " and start[:1].isalpha())):
        return False
    try:
        headers = read_headers(path)
    except OverlayError:
        if start.startswith(b"SIMPLE  ="):
            raise
        return False
    return any(images.axes_of(unit.cards) and not unit.is_table for unit in headers.units) or not any(
        unit.is_table for unit in headers.units
    )


def _image(path: Path | str, hdu: int | None) -> Found:
    found = images.find(path, hdu)
    ruling = found.ruling
    missing = []
    if ruling.frame is None:
        plane = "ecliptic" if found.axes == "ecliptic" else "equator"
        missing.append(Missing("frame", ruling.rule, FRAMES_OF[plane]))
    rules = {"frame": ruling.rule, "epoch": ruling.epoch_rule or "no date of exposure in the header"}
    return Found(
        str(path), found.unit.sha256, "image", hdu=found.unit.place, frame=ruling.frame, epoch=ruling.epoch,
        rules=rules, missing=tuple(missing), doubts=(*ruling.doubts, *found.notes), total=1,
    )  # fmt: skip


def _table(path: Path | str) -> Found:
    where = f"overlay '{path}'"
    data = load(path)
    try:
        read = tables.read_bytes(data, where, skip_bad=True)
    except TableError as fault:
        raise OverlayError(str(fault)) from None
    return _described(str(path), data, read, None, None)


def _described(path: str, data: bytes, read: Read, lon: str | None, lat: str | None) -> Found:
    """Return what is known of a table whose columns are found, or were named."""
    table = read.table
    missing: list[Missing] = []
    rules: dict[str, str] = {}
    pair = _pair(path, read, lon, lat, missing, rules)
    lon_unit = lat_unit = ""
    said: coosys.Said | None = None
    if pair is not None:
        equatorial_plane = pair.plane in ("equator", "")
        for key, column, is_lon in (("lon_unit", pair.lon, True), ("lat_unit", pair.lat, False)):
            unit, why = unit_of(table.column(column), equatorial_plane, is_lon)
            rules[key] = f"column '{one_line(column, 30)}': {why}"
            if unit is None:
                missing.append(Missing(key, rules[key], UNITS))
            elif is_lon:
                lon_unit = unit
            else:
                lat_unit = unit
        said = _said(path, data, read, pair)
        if said is None or said.frame is None:
            plane = pair.plane
            silent = "the file names no frame" if said is None or not said.rule else said.rule
            of = {"equator": "equatorial", "": ""}.get(plane, plane)
            question = f"{silent}; which frame are its {of + ' ' if of else ''}columns in?"
            missing.append(Missing("frame", question, FRAMES_OF[plane]))
        else:
            rules["frame"] = said.rule
        if said is not None and said.epoch is not None:
            rules["epoch"] = said.epoch_rule
    name = label_column(table)
    return Found(
        path, hashed(data), "table",
        lon=pair.lon if pair else "", lat=pair.lat if pair else "", lon_unit=lon_unit, lat_unit=lat_unit, name=name,
        frame=said.frame if said else None, epoch=said.epoch if said else None,
        rules=rules, missing=tuple(missing), doubts=(*read.notes, *(said.doubts if said else ())),
        columns=table.names, total=len(table) + len(read.rejected), refused=len(read.rejected),
        rejected=tuple(str(row) for row in read.rejected[:200]), read=read, said=said,
    )  # fmt: skip


def _pair(
    path: str, read: Read, lon: str | None, lat: str | None, missing: list[Missing], rules: dict[str, str]
) -> Pair | None:
    if lon is not None or lat is not None:
        if lon is None or lat is None:
            raise OverlayError(f"overlay '{path}': one column of two is named; expected both lon and lat")
        try:
            column = read.table.column(lon)
            other = read.table.column(lat)
        except TableError as fault:
            raise OverlayError(f"overlay '{path}': {fault}") from None
        rules["columns"] = "named by the user"
        return Pair(column.name, other.name, plane_of(column), rules["columns"], stated(column.name))
    found = pairs(read.table)
    if not found:
        shown = ", ".join(one_line(name, 30) for name in read.table.names[:12])
        for key, what in (("lon", "longitudes"), ("lat", "latitudes")):
            question = f"no column of {what} is known by its UCD or its name; it has {shown}"
            missing.append(Missing(key, question, read.table.names[:200]))
        return None
    more = f", the first of {len(found)} such pairs" if len(found) > 1 else ""
    rules["columns"] = found[0].rule + more
    return found[0]


def _said(path: str, data: bytes, read: Read, pair: Pair) -> coosys.Said | None:
    """Return what the file says of the frame of a pair: COOSYS, keywords, remarks, then the columns themselves."""
    said: coosys.Said | None = None
    if data.startswith(b"SIMPLE  ="):
        headers = read_headers(path)
        unit = next((unit for unit in headers.units if unit.is_table), None)
        said = coosys.of_header(unit, pair.plane) if unit is not None else None
    elif data[:2000].lstrip(b"\xef\xbb\xbf \t\r\n").startswith(b"<"):
        said = coosys.of_votable(data, pair.lon, pair.lat, pair.plane)
    if said is None:
        said = coosys.of_remarks(read.table.meta)
    if said is not None and said.rule:
        return said
    epoch = (said.epoch, said.epoch_rule) if said is not None else (None, "")
    if pair.plane in ("galactic", "supergalactic"):
        return coosys.Said(pair.plane, f"{pair.rule}: {pair.plane}", *epoch)
    if pair.system == "icrs":
        return coosys.Said("icrs", f"the name '{one_line(pair.lon, 30)}' states ICRS", *epoch)
    if pair.system:
        system, year = pair.system.split()
        rule = f"the name '{one_line(pair.lon, 30)}' states equinox {'J' if system == 'FK5' else 'B'}{year}: {system}"
        return coosys.Said(equatorial(system, float(year)), rule, *epoch)
    return said


def declare(
    found: Found,
    *,
    lon: str | None = None,
    lat: str | None = None,
    lon_unit: str | None = None,
    lat_unit: str | None = None,
    name: str | None = None,
    frame: str | None = None,
    epoch: float | None = None,
    label: str = "",
    colour: str | None = None,
    store: Store = STORE,
) -> Overlay:
    """Return the overlay of a file, what it leaves out filled in by the caller.

    An argument overrules what the file says, and the overlay's `rule` tells so. OverlayError lists in one line all that
    is still missing. Its rows are put into the store; the rows that cannot be used are listed there.
    """
    if found.kind == "table" and (lon is not None or lat is not None):
        found = _described(found.path, _again(found), _need(found), lon or found.lon, lat or found.lat)
    given = {"lon_unit": lon_unit, "lat_unit": lat_unit, "frame": frame}
    left = [miss for miss in found.missing if given.get(miss.key) is None]
    if left:
        raise OverlayError(f"overlay '{found.path}': {'; '.join(miss.question for miss in left)}")
    for key, unit in (("lon_unit", lon_unit), ("lat_unit", lat_unit)):
        if unit is not None and unit not in UNITS:
            raise OverlayError(f"{key} '{one_line(unit, 20)}': unknown; expected {', '.join(UNITS)}")
    chosen, rule = found.frame, found.rules.get("frame", "")
    if frame is not None:
        declared = str(Frame.parse(frame))
        rule = f"declared by the user; the file says {found.frame}" if found.frame else "declared by the user"
        rule = found.rules.get("frame", "") if declared == found.frame else rule
        chosen = declared
    assert chosen is not None
    overlay = Overlay(
        found.path, found.sha256, chosen, found.kind, rule,
        epoch=found.epoch if epoch is None else float(epoch),
        lon=found.lon, lat=found.lat, lon_unit=lon_unit or found.lon_unit, lat_unit=lat_unit or found.lat_unit,
        name=found.name if name is None else name, hdu=found.hdu, label=label, colour=colour,
    )  # fmt: skip
    if overlay.kind == "image":
        store.put(overlay, images.shape(found.path, images.find(found.path, found.hdu)))
        return overlay
    if overlay.name and overlay.name not in found.columns:
        raise OverlayError(f"overlay '{found.path}': no column '{one_line(overlay.name)}'")
    try:
        store.put(overlay, positions(_need(found), f"overlay '{found.path}'", overlay))
    except TableError as fault:
        raise OverlayError(str(fault)) from None
    return overlay


def _need(found: Found) -> Read:
    if found.read is None:
        raise OverlayError(f"overlay '{found.path}': was not opened by `inspect`")
    return found.read


def _again(found: Found) -> bytes:
    """Return the bytes of a file that was opened: the same ones, or an OverlayError."""
    try:
        data = read_bounded(found.path, tables.MOST_BYTES)
    except FileError as fault:
        raise OverlayError(f"overlay {str(fault).removeprefix('file ')}") from None
    if hashed(data) != found.sha256:
        raise OverlayError(f"overlay '{found.path}': the file has changed since it was opened; open it again")
    return data


def open_file(path: Path | str, **said: object) -> Overlay:
    """Return the overlay of a file in one step: `declare(inspect(path), …)`."""
    return declare(inspect(path), **said)  # type: ignore[arg-type]
