"""What a session holds of an overlay: where its file is, which one it was, and what its numbers are said to mean."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

from colure.errors import FrameError, TableError
from colure.frames import Frame

KINDS = ("table", "image")
COLOURS = ("#D55E00", "#0072B2", "#CC79A7", "#009E73", "#E69F00", "#56B4E9", "#000000")
"""Okabe & Ito, "Color Universal Design" (2008), without the yellow: the colours that overlays take in turn."""
SHAPES = ("cross", "diamond", "triangle", "square")
"""The marks that overlays take in turn, so that their colour is not all that tells them apart."""
FIRST_EPOCH, LAST_EPOCH = -3000.0, 4000.0


class OverlayError(TableError):
    """A file that cannot be laid on the chart, or a declaration that lacks something."""


def _none() -> Mapping[str, Any]:
    return MappingProxyType({})


@dataclass(frozen=True, slots=True)
class Overlay:
    """One overlay of a session; its rows live in a store and are found by `sha256`.

    `kind` is "table" or "image". `sha256` is that of the whole table file, or of the header of an image. `frame` is the
    declared frame of the numbers, `rule` the sentence that says how it was decided. `epoch` is the Julian year (TT) at
    which the positions hold, None where nobody said. `lon`, `lat` and `name` are columns of a table, `lon_unit` and
    `lat_unit` units declared for columns that carry none; `hdu` is the place of an image's header in its file.
    `arrows` shows the residuals against the catalogue, enlarged by `enlarge`.
    """

    path: str
    sha256: str
    frame: str
    kind: str = "table"
    rule: str = ""
    epoch: float | None = None
    lon: str = ""
    lat: str = ""
    lon_unit: str = ""
    lat_unit: str = ""
    name: str = ""
    hdu: int = 0
    label: str = ""
    colour: str | None = None
    visible: bool = True
    names_shown: bool = False
    arrows: bool = False
    enlarge: float = 1.0
    extras: Mapping[str, Any] = field(default_factory=_none, compare=False)

    def __post_init__(self) -> None:
        """Check every field; OverlayError says which."""
        if self.kind not in KINDS:
            raise OverlayError(f"overlays.kind: {self.kind!r} is unknown; expected {' or '.join(KINDS)}")
        try:
            object.__setattr__(self, "frame", str(Frame.parse(self.frame)))
        except FrameError as fault:
            raise OverlayError(f"overlays.frame: {fault}") from fault
        if not (len(self.sha256) == 64 and set(self.sha256) <= set("0123456789abcdef")):
            raise OverlayError(f"overlays.sha256: {self.sha256[:70]!r}; expected 64 digits 0-9, a-f")
        if self.epoch is not None and not (
            math.isfinite(self.epoch) and FIRST_EPOCH <= self.epoch <= LAST_EPOCH
        ):  # also refuses NaN
            raise OverlayError(f"overlays.epoch: {self.epoch}; expected a year from {FIRST_EPOCH:g} to {LAST_EPOCH:g}")
        if not (math.isfinite(self.enlarge) and 1.0 <= self.enlarge <= 1e6):
            raise OverlayError(f"overlays.enlarge: {self.enlarge}; expected 1 to 1000000")
        if self.kind == "table" and not (self.lon and self.lat):
            raise OverlayError("overlays: a table needs its columns lon and lat")
        if self.hdu < 0:
            raise OverlayError(f"overlays.hdu: {self.hdu}; expected 0 or more")
        colour = self.colour
        if colour is not None and not (
            len(colour) == 7 and colour[0] == "#" and set(colour[1:]) <= set("0123456789abcdefABCDEF")
        ):
            raise OverlayError(f"overlays.colour: {colour!r} is no colour; expected #RRGGBB")

    @property
    def title(self) -> str:
        """The name shown: the user's own, or that of the file."""
        return self.label or self.path.replace("\\", "/").rstrip("/").rpartition("/")[2]

    @property
    def source(self) -> tuple[str, ...]:
        """What its rows are a function of, apart from the frame: the key of a store."""
        return (self.kind, self.sha256, str(self.hdu), self.lon, self.lat, self.lon_unit, self.lat_unit)

    def colour_at(self, place: int) -> str:
        """Return its own colour, or the one that the overlay at a place of the list takes."""
        return self.colour or COLOURS[place % len(COLOURS)]
