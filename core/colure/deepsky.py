"""Deep-sky objects: the NGC, the IC, Messier's list and a few others, with sizes and magnitudes (from OpenNGC).

The list is sorted by magnitude, the brightest first: V, or B where V is unknown, then those without either. Positions
are on ICRS axes at J2000.0; nothing in the list moves by as much as an arcsecond in a century.
"""

import re
from functools import cache, cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from colure import resources
from colure.arrays import DEG, TWO_PI, Float, cartesian
from colure.designations import simplified
from colure.errors import ResourceError, TargetError, near_names

TURN = TWO_PI / 2.0**32
"""Radians per unit of the stored angles."""
ROW = np.dtype(
    [
        ("ra", "<u4"),
        ("dec", "<i4"),
        ("major", "<f4"),
        ("minor", "<f4"),
        ("pa", "<i2"),
        ("vmag", "<f4"),
        ("bmag", "<f4"),
        ("sb", "<f4"),
        ("type", "u1"),
        ("messier", "u1"),
    ]
)
"""One object: place in 360°/2³², axes in arcminutes, position angle in degrees (−1: unknown), magnitudes and surface
brightness (mag per square arcsecond; NaN: unknown), index into TYPES, Messier number or 0."""
TYPES = (
    ("G", "galaxy"),
    ("GPair", "pair of galaxies"),
    ("GTrpl", "triplet of galaxies"),
    ("GGroup", "group of galaxies"),
    ("OCl", "open cluster"),
    ("GCl", "globular cluster"),
    ("*Ass", "association of stars"),
    ("Cl+N", "cluster with nebula"),
    ("Neb", "nebula"),
    ("HII", "ionised region"),
    ("EmN", "emission nebula"),
    ("RfN", "reflection nebula"),
    ("DrkN", "dark nebula"),
    ("PN", "planetary nebula"),
    ("SNR", "supernova remnant"),
    ("Nova", "nova"),
    ("*", "star"),
    ("**", "double star"),
    ("NonEx", "nothing there"),
    ("Other", "unknown"),
)
"""Codes and plain words of the kinds of objects."""
HIDDEN = frozenset({"*", "**", "NonEx", "Other"})
"""Kinds that a chart does not show, Messier's numbers aside: what turned out to be stars, or nothing."""


class Objects:
    """Some deep-sky objects: row numbers `ids` (N,) and their columns, NaN where a size or an angle is unknown."""

    def __init__(self, ids: NDArray[np.int64], data: NDArray[Any]) -> None:
        self.ids = ids
        self.data = data

    def __len__(self) -> int:
        return len(self.ids)

    def take(self, which: NDArray[Any]) -> "Objects":
        """Return the objects picked by an index or boolean array (N,)."""
        return Objects(self.ids[which], self.data[which])

    @cached_property
    def vectors(self) -> Float:
        """Unit vectors (N, 3) on ICRS axes, J2000.0."""
        return cartesian(self.data["ra"] * TURN, self.data["dec"] * TURN)

    @property
    def kind(self) -> NDArray[np.uint8]:
        """Index (N,) into TYPES."""
        kinds: NDArray[np.uint8] = self.data["type"]
        return kinds

    @cached_property
    def size_arcmin(self) -> Float:
        """Major and minor axes (N, 2) in arcminutes, NaN where unknown; a single axis stands for both."""
        major = self.data["major"].astype(np.float64)
        minor = self.data["minor"].astype(np.float64)
        return np.stack([major, np.where(np.isnan(minor), major, minor)], axis=-1)

    @cached_property
    def position_angle(self) -> Float:
        """Position angle (N,) of the major axis in radians, north through east, ICRS; NaN where unknown."""
        return np.where(self.data["pa"] < 0, np.nan, self.data["pa"] * DEG)

    @cached_property
    def magnitude(self) -> NDArray[np.float32]:
        """V magnitude (N,), or B where V is unknown, or NaN."""
        return np.where(np.isnan(self.data["vmag"]), self.data["bmag"], self.data["vmag"])

    @property
    def labels(self) -> list[str]:
        """What to print beside each: "M 31", else "NGC 7293"."""
        table = _names()
        return [f"M {m}" if m else table[k][0] for k, m in zip(self.ids, self.data["messier"], strict=True)]


@cache
def everything() -> Objects:
    """Return all objects, hidden kinds included."""
    data = np.asarray(resources.load_array("deepsky/objects.npy"))
    if data.dtype != ROW or data.ndim != 1:
        raise ResourceError(
            f"data file 'deepsky/objects.npy': holds {data.dtype}, expected {ROW}; run 'colure selfcheck'"
        )
    return Objects(np.arange(len(data)), data)


@cache
def catalogue() -> Objects:
    """Return the objects that a chart shows, the brightest first."""
    whole = everything()
    hidden = [k for k, (code, _) in enumerate(TYPES) if code in HIDDEN]
    return whole.take(np.flatnonzero(~np.isin(whole.kind, hidden) | (whole.data["messier"] > 0)))


def brighter(magnitude: float, *, messier: bool = True) -> Objects:
    """Return the objects of `catalogue()` brighter than a magnitude; with `messier`, also all of Messier's."""
    shown = catalogue()
    keep = shown.magnitude < magnitude
    return shown.take(np.flatnonzero(keep | (shown.data["messier"] > 0) if messier else keep))


@cache
def _names() -> list[tuple[str, tuple[str, ...], tuple[str, ...]]]:
    """Return for each row its name, common names and other names."""
    count = len(everything())
    try:
        lines = resources.path("deepsky/names.tsv").read_text(encoding="utf-8").splitlines()[1:]
        fields = [line.split("\t") for line in lines]
        table = [(f[0], tuple(f[1].split(";")) if f[1] else (), tuple(f[2].split(";")) if f[2] else ()) for f in fields]
    except (ValueError, IndexError) as fault:
        raise ResourceError(f"data file 'deepsky/names.tsv': {fault}; run 'colure selfcheck'") from fault
    if len(table) != count:
        raise ResourceError(
            f"data file 'deepsky/names.tsv': {len(table)} names, expected {count}; run 'colure selfcheck'"
        )
    return table


@cache
def _index() -> tuple[dict[str, int], dict[str, str]]:
    """Return rows by key, and spellings by key; a chart's labels do without."""
    table = _names()
    index: dict[str, int] = {}
    spelling: dict[str, str] = {}
    for k, messier in enumerate(everything().data["messier"].tolist()):
        name, common, also = table[k]
        for text in (*([f"M {messier}"] if messier else []), name, *common, *also):
            index.setdefault(_key(text), k)
            spelling.setdefault(_key(text), text)
    return index, spelling


def _key(text: str) -> str:
    """Return a name for comparison: simplified, numbers without leading zeros, catalogue and number run together."""
    plain = _ARTICLE.sub("", simplified(text)).replace("messier", "m", 1)
    return _CATALOGUE.sub(r"\1", _ZEROS.sub("", plain))


_ARTICLE = re.compile(r"^the ")
_ZEROS = re.compile(r"(?<!\d)0+(?=\d)")
_CATALOGUE = re.compile(r"^([a-z]+) (?=\d)")


def names(row: int) -> tuple[str, ...]:
    """Return all names of an object: Messier number, catalogue name, common names, other catalogue names."""
    name, common, also = _names()[row]
    messier = int(everything().data["messier"][row])
    return (*([f"M {messier}"] if messier else []), name, *common, *also)


def type_of(row: int) -> str:
    """Return in plain words what an object is."""
    return TYPES[int(everything().data["type"][row])][1]


def find(text: str) -> int:
    """Return the row of an object by any of its names ("M31", "ngc 224", "Andromeda Galaxy"); raise TargetError."""
    row = _index()[0].get(_key(text)) if text.strip() else None
    if row is None:
        asked = " ".join(text.split())
        common = [name for entry in _names() for name in entry[1]]
        # Near numbers are no help; near names are.
        near = near_names(asked, common) if re.search(r"[^\W\d]{4}", asked) else ""
        raise TargetError(f"object '{asked}': in no list; expected an M, NGC or IC number or a common name{near}")
    return row


def search(text: str, most: int = 10) -> list[tuple[str, int]]:
    """Return up to `most` (name, row) whose name begins with the text, the brightest first; for completion."""
    wanted = _key(text)
    index, spelling = _index()
    if not wanted:
        return []
    found = [(k, key) for key, k in index.items() if key.startswith(wanted)]
    return [(spelling[key], k) for k, key in sorted(found)[:most]]
