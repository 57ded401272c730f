"""The rows and outlines behind overlays, read once, kept by the hash of their file, and never changed."""

import hashlib
from collections import OrderedDict
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path
from threading import RLock
from typing import Any

from colure import tables
from colure.arrays import DEG, Float, Int
from colure.errors import ColureError, TableError
from colure.files import FileError, read_bounded
from colure.overlays import images
from colure.overlays.columns import plane_of
from colure.overlays.model import Overlay, OverlayError
from colure.tables import Column, Table
from colure.tables.model import Read
from colure.tables.positions import pick
from colure.tables.reading import MOST_BYTES

KEPT = 24
"""Overlays whose rows are kept at a time."""
LISTED = 200
"""Refused rows that are listed; more are counted."""


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """The good rows of a table: longitude and latitude (N,) in radians in the declared frame.

    `numbers` (N,) are the rows' numbers in the file, `table` all their columns, `rejected` one line for each refused
    row (the first LISTED of `refused` ones).
    """

    lon: Float
    lat: Float
    numbers: Int
    table: Table
    rejected: tuple[str, ...]
    refused: int
    notes: tuple[str, ...]

    def __len__(self) -> int:
        return len(self.lon)

    def texts(self, column: str) -> tuple[str, ...]:
        """Return the cells of a column as texts; empty ones where there is no such column."""
        found = self.table.find(column) if column else None
        if found is None:
            return ("",) * len(self)
        return tuple("" if text == "nan" else text for text in map(str, found.values.tolist()))


def hashed(data: bytes) -> str:
    """Return the sha256 of a file's bytes in hexadecimal."""
    return hashlib.sha256(data).hexdigest()


def load(path: Path | str) -> bytes:
    """Return the bytes of a table file; OverlayError in one line where it cannot be read or is too large."""
    try:
        return read_bounded(path, MOST_BYTES)
    except FileError as fault:
        raise OverlayError(f"overlay {str(fault).removeprefix('file ')}") from None


def positions(found: Read, where: str, overlay: Overlay) -> Rows:
    """Return the positions of a table that was read, in the columns and units of an overlay."""
    units = {overlay.lon: overlay.lon_unit, overlay.lat: overlay.lat_unit}
    columns = tuple(replace(c, unit=units[c.name]) if units.get(c.name) else c for c in found.table)
    # The numbers of the rows ride along as a column, through the screening.
    numbered = Table((*columns, Column(_NUMBER, found.rows)), found.table.meta)
    lon = found.table.find(overlay.lon)
    equatorial = lon is not None and plane_of(lon) == "equator"
    good = pick(
        Read(numbered, found.rows, found.rejected, found.notes),
        where, overlay.lon, overlay.lat, (), (), equatorial, True,
    )  # fmt: skip
    table = Table(tuple(c for c in good.table if c.name != _NUMBER), good.table.meta)
    arrays = [good.lon_deg * DEG, good.lat_deg * DEG, good.table.column(_NUMBER).values]
    for array in arrays:
        array.flags.writeable = False
    count = len(good.rejected)
    return Rows(arrays[0], arrays[1], arrays[2], table, good.rejected[:LISTED], count, good.notes)


_NUMBER = "\x00row"


class Store:
    """Rows of tables and outlines of images by the hash of their source; safe to use from several threads.

    What could not be read is remembered too, with the reason, until `retry`: a session whose file is missing is shown,
    and says so. `generation` grows whenever an answer may have changed, so that it can stand in a layer's key.
    """

    def __init__(self) -> None:
        self._lock = RLock()
        self._kept: OrderedDict[tuple[str, ...], Any] = OrderedDict()
        self._faults: dict[tuple[str, ...], str] = {}
        self._matches: OrderedDict[object, Any] = OrderedDict()
        self.generation = 0

    def rows(self, overlay: Overlay) -> Rows | None:
        """Return the rows of a table, read at the first call; None where they cannot be had (see `fault`)."""
        found = self._get(overlay, self._read_rows) if overlay.kind == "table" else None
        assert found is None or isinstance(found, Rows)
        return found

    def shape(self, overlay: Overlay) -> images.Shape | None:
        """Return the outline of an image, read at the first call; None where it cannot be had (see `fault`)."""
        found = self._get(overlay, self._read_shape) if overlay.kind == "image" else None
        assert found is None or isinstance(found, images.Shape)
        return found

    def fault(self, overlay: Overlay) -> str:
        """Return why an overlay has no rows or outline, in one line; empty where it has, or was not asked for yet."""
        return self._faults.get((overlay.path, *overlay.source), "")

    def ready(self, overlay: Overlay) -> bool:
        """Whether asking for an overlay's rows or outline costs no reading of a file."""
        return overlay.source in self._kept or (overlay.path, *overlay.source) in self._faults

    def put(self, overlay: Overlay, value: Rows | images.Shape) -> None:
        """Keep what was read for an overlay."""
        with self._lock:
            self._keep(overlay.source, value)

    def retry(self) -> None:
        """Forget every fault, so that missing files are looked for again."""
        with self._lock:
            self._faults.clear()
            self.generation += 1

    def clear(self) -> None:
        """Forget everything."""
        with self._lock:
            self._kept.clear()
            self._matches.clear()
            self.retry()

    def keep_match(self, overlay: Overlay, value: Any) -> None:
        """Keep the match of an overlay to the catalogue, for its arrows to be drawn."""
        with self._lock:
            self._matches[match_key(overlay)] = value
            while len(self._matches) > KEPT:
                self._matches.popitem(last=False)
            self.generation += 1

    def match(self, overlay: Overlay) -> Any:
        """Return the match kept for an overlay in its present frame and epoch, or None."""
        return self._matches.get(match_key(overlay))

    def _keep(self, key: tuple[str, ...], value: Any) -> None:
        self._kept[key] = value
        while len(self._kept) > KEPT:
            self._kept.popitem(last=False)
        self.generation += 1

    def _get(self, overlay: Overlay, read: Callable[[Overlay], Any]) -> Any:
        key = overlay.source
        with self._lock:
            if key in self._kept:
                self._kept.move_to_end(key)
                return self._kept[key]
            named = (overlay.path, *key)
            if named in self._faults:
                return None
            try:
                value = read(overlay)
            except ColureError as fault:
                self._faults[named] = str(fault)
                self.generation += 1
                return None
            self._keep(key, value)
            return value

    @staticmethod
    def _read_rows(overlay: Overlay) -> Rows:
        where = f"overlay '{overlay.path}'"
        data = load(overlay.path)
        if hashed(data) != overlay.sha256:
            raise OverlayError(f"{where}: the file has changed since it was opened; open it again")
        try:
            return positions(tables.read_bytes(data, where, skip_bad=True), where, overlay)
        except TableError as fault:
            raise OverlayError(str(fault)) from None

    @staticmethod
    def _read_shape(overlay: Overlay) -> images.Shape:
        found = images.find(overlay.path, overlay.hdu)
        if found.unit.sha256 != overlay.sha256:
            raise OverlayError(f"overlay '{overlay.path}': its header has changed since it was opened; open it again")
        return images.shape(overlay.path, found)


def match_key(overlay: Overlay) -> object:
    """Return what a match depends on."""
    return (overlay.source, overlay.frame, overlay.epoch)


STORE = Store()
"""The store that a program uses."""
