"""Star names: IAU proper names, Bayer and Flamsteed designations, catalogue numbers, and the search through them.

The table holds what the shipped sources carry: all IAU proper names of stars in Hipparcos, about a thousand Bayer
letters, few Flamsteed numbers (counts in the resource's PROVENANCE.toml). Catalogue numbers cover every star.
"""

import re
from functools import cache
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from colure import designations, resources, stars
from colure.errors import ResourceError, TargetError, near_names

Kind = Literal["proper", "bayer", "flamsteed"]
_HIP = re.compile(r"hip\s*(\d{1,12})", re.IGNORECASE)
_TYCHO = re.compile(r"tyc\s*(\d{1,5})[\s-]+(\d{1,5})[\s-]+(\d{1,2})", re.IGNORECASE)
_GAIA = re.compile(r"gaia(?:\s*dr3)?\s*(\d{1,30})", re.IGNORECASE)


class Names(NamedTuple):
    """All names of one star; an empty string where there is none."""

    row: int
    proper: str = ""
    bayer: str = ""
    flamsteed: str = ""
    also: tuple[str, ...] = ()
    hip: str = ""
    tycho: str = ""
    gaia: str = ""

    @property
    def every(self) -> tuple[str, ...]:
        """All names, the most telling first."""
        listed = (self.proper, self.bayer, self.flamsteed, *self.also, self.hip, self.tycho, self.gaia)
        return tuple(name for name in listed if name)

    @property
    def best(self) -> str:
        """The name to print; a star without any is called by its row number."""
        return self.every[0] if self.every else f"star {self.row}"


class _Table(NamedTuple):
    rows: NDArray[np.int64]
    proper: tuple[str, ...]
    bayer: tuple[str, ...]
    flamsteed: tuple[str, ...]
    also: tuple[tuple[str, ...], ...]
    at: dict[int, int]


@cache
def _table() -> _Table:
    """Read the table, the brightest star first, so that the first of a name is the one that is meant."""
    try:
        lines = resources.path("names/names.tsv").read_text(encoding="utf-8").splitlines()[1:]
        numbers, proper, bayer, flamsteed, also = zip(*(line.split("\t") for line in lines), strict=True)
        rows = np.array(numbers, dtype=np.int64)
    except ValueError as fault:
        raise ResourceError(f"data file 'names/names.tsv': {fault}; run 'colure selfcheck'") from fault
    size = len(stars.catalogue())
    if rows.min() < 0 or rows.max() >= size:
        raise ResourceError(f"data file 'names/names.tsv': row {rows.max()} is not in the star catalogue of {size}")
    more = tuple(tuple(text.split(";")) if text else () for text in also)
    return _Table(rows, proper, bayer, flamsteed, more, {row: k for k, row in enumerate(rows.tolist())})


@cache
def _index() -> tuple[dict[str, int], dict[str, str]]:
    """Return places in the table by key, and spellings by key; a chart's labels do without."""
    table = _table()
    index: dict[str, int] = {}
    spelling: dict[str, str] = {}
    for k, every in enumerate(zip(table.proper, table.bayer, table.flamsteed, strict=True)):
        for name in (*every, *table.also[k]):
            if name:
                index.setdefault(_key(name), k)
                spelling.setdefault(_key(name), name)
    for k, name in enumerate(table.bayer):
        # "α Cap" means the brighter of α1 and α2, where no star is called α Cap itself.
        plain = re.sub(r"\d+ ", " ", name)
        if plain != name:
            index.setdefault(_key(plain), k)
    return index, spelling


def _key(text: str) -> str:
    return designations.parse(text) or designations.simplified(text)


def identify(row: int) -> Names:
    """Return all names of the star in a row of the catalogue."""
    star = stars.catalogue().rows([row])
    table = _table()
    k = table.at.get(int(row))
    hip, gaia, tycho = int(star.hip[0]), int(star.gaia[0]), star.tycho[0]
    return Names(
        row=int(row),
        proper="" if k is None else table.proper[k],
        bayer="" if k is None else table.bayer[k],
        flamsteed="" if k is None else table.flamsteed[k],
        also=() if k is None else table.also[k],
        hip=f"HIP {hip}" if hip else "",
        tycho=f"TYC {tycho[0]}-{tycho[1]}-{tycho[2]}" if tycho[0] else "",
        gaia=f"Gaia DR3 {gaia}" if gaia else "",
    )


def labels(kind: Kind) -> tuple[NDArray[np.int64], tuple[str, ...]]:
    """Return the rows (n,) of the stars that have a name of a kind, the brightest first, and the names to print.

    A Bayer label is the letter with its index ("θ1"), a Flamsteed label the number, without the constellation.
    """
    table = _table()
    names = {"proper": table.proper, "bayer": table.bayer, "flamsteed": table.flamsteed}[kind]
    has = [k for k, name in enumerate(names) if name]
    short = tuple(names[k] if kind == "proper" else names[k].rsplit(" ", 1)[0] for k in has)
    return table.rows[has], short


def find(text: str) -> int:
    """Return the row of a star by any of its names; raise TargetError with near names.

    Understood are proper names, Bayer and Flamsteed designations in every usual spelling ("α Tau", "alpha Tauri",
    "alf Tau", "61 Cyg"), "HIP 21421", "TYC 1266-1416-1" and "Gaia DR3 …". Case and accents do not count.
    """
    asked = " ".join(text.split())
    number = _by_number(asked)
    if number is not None:
        return number
    table = _table()
    index, spelling = _index()
    k = index.get(_key(asked)) if asked else None
    if k is not None:
        return int(table.rows[k])
    designation = designations.parse(asked)
    if designation:
        carried = f"{sum(map(bool, table.bayer))} Bayer letters and {sum(map(bool, table.flamsteed))} Flamsteed numbers"
        raise TargetError(f"star '{designation}': not among the {carried} carried; give its HIP or TYC number")
    expected = "expected a proper name, a designation such as 'α Tau' or '61 Cyg', or a HIP, TYC or Gaia DR3 number"
    raise TargetError(f"star '{asked}': in no list; {expected}{near_names(asked, spelling.values())}")


def _by_number(text: str) -> int | None:
    """Return the row of a catalogue number, None for any other text; raise TargetError for a number not there."""
    catalogue = stars.catalogue()
    if form := _HIP.fullmatch(text):
        row, listed = catalogue.by_hip(int(form[1])), "the new reduction of Hipparcos lists 117955 of 1 to 120404"
    elif form := _TYCHO.fullmatch(text):
        row = catalogue.by_tycho(int(form[1]), int(form[2]), int(form[3]))
        listed = "expected a star of Tycho-2 (1-9537, 1-12121, 1-4) that is no blend of another"
    elif form := _GAIA.fullmatch(text):
        row, listed = catalogue.by_gaia(int(form[1])), "only Gaia stars with G < 10 are carried"
    else:
        return None
    if row is None:
        raise TargetError(f"star '{text}': not in the catalogue; {listed}")
    return row


def search(text: str, most: int = 10) -> list[tuple[str, int]]:
    """Return up to `most` (name, row) whose name begins with the text, the brightest star first; for completion."""
    asked = designations.simplified(text)
    number = re.fullmatch(r"\s*(hip|tyc|gaia).*", text, re.IGNORECASE)
    if number:
        try:
            row = find(text)
        except TargetError:
            return []
        return [(" ".join(text.split()), row)]
    if not asked:
        return []
    whole = designations.parse(text)
    found = [(name, row) for plain, key, name, row in _completions() if plain.startswith(asked) or key == whole]
    return found[:most]


@cache
def _completions() -> tuple[tuple[str, str, str, int], ...]:
    """Return every name as it is compared, keyed and printed, and its row, the brightest star first."""
    table = _table()
    index, spelling = _index()
    listed = sorted(index.items(), key=lambda item: item[1])
    return tuple(
        (designations.simplified(key), key, spelling[key], int(table.rows[k])) for key, k in listed if key in spelling
    )
