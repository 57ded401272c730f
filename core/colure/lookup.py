"""Find what a typed text means: a body, a star, a deep-sky object, a constellation, a point or a position.

`search` answers while somebody types, `find` when they are done. A target that is not a body is a longitude and a
latitude in a frame, which a chart can be centred on.
"""

import re
from bisect import bisect_left
from collections.abc import Iterable
from functools import cache, lru_cache

from colure import angles, constellations, deepsky, designations, names
from colure.errors import ColureError, TargetError, near_names
from colure.framenames import PLANES, Frame
from colure.targets import BODY_NAMES, KINDS, POINTS, Kind, Target, make
from colure.wording import one_line

LONGEST = 120
"""A longer text is no name and no position."""

_NUMBERED = re.compile(r"(hip|tyc|gaia)\b|(m|messier|ngc|ic)\s*\d", re.IGNORECASE)
_POSITION = re.compile(r"[-+−.]?\s*\d")
_UNIT = re.compile(r"(?<![^\W\d_])(deg|degrees?|hours?|arcmin|arcsec)(?![^\W\d_])", re.IGNORECASE)
_ARTICLE = re.compile(r"the\s+(?=\w)", re.IGNORECASE)
_LETTERS = {spelling: letter for letter, *spellings in designations.GREEK for spelling in (letter, *spellings)}


Found = tuple[int, Kind, str | int, str]
"""How good (0 whole, 1 beginning, 2 beginning of a later word), kind, ref, and the name that matched."""


def position(text: str, frame: str = "icrs") -> tuple[Frame, float, float]:
    """Return frame, longitude and latitude in degrees of `FRAME LON LAT`, or of `LON LAT` in the frame given.

    Raises FrameError for a frame that is none and AngleError for angles that are none or could be read two ways.
    """
    head, _, rest = text.strip().partition(" ")
    if re.split(r"[/@]", head)[0].casefold() in PLANES:
        used = Frame.parse(head)
    else:
        used, rest = Frame.parse(frame), text
    lon, lat = angles.parse_position(rest, equatorial=used.is_equatorial)
    return used, lon, lat


def search(text: str, *, frame: str = "icrs", most: int = 12, year: float = 2000.0) -> tuple[Target, ...]:
    """Return up to `most` targets that a text, perhaps not typed to its end, may mean, the best first.

    `frame` is that of a position typed without one; stars are placed at the Julian year `year`. Whole names come
    first, then names that begin so, then names with such a word; among equals the kinds take turns, each with its
    brightest first. A text that fits nothing gives an empty tuple.
    """
    asked = " ".join(text.split())
    if not asked or len(asked) > LONGEST:
        return ()
    if _looks_like_position(asked):
        try:
            return (_position_target(asked, frame),)
        except ColureError:
            return ()
    asked = _ARTICLE.sub("", asked, count=1) if _ARTICLE.match(asked) else asked
    found: dict[tuple[Kind, str | int], Found] = {}
    for source in (_bodies, _points, _constellations, _stars, _deepsky, _words):
        for entry in source(asked, most):
            key = entry[1], entry[2]
            if key not in found or entry[0] < found[key][0]:
                found[key] = entry
    turn: dict[tuple[int, Kind], int] = {}
    ranked = []
    for entry in found.values():
        place = turn[entry[:2]] = turn.get(entry[:2], -1) + 1
        ranked.append((entry[0], place, KINDS.index(entry[1]), entry))
    ranked.sort(key=lambda item: item[:3])
    return tuple(make(*entry[1:], year) for *_, entry in ranked[:most])


def find(text: str, *, frame: str = "icrs", year: float = 2000.0) -> Target:
    """Return the one target that a text names, whole; raise TargetError with near names if there is none.

    A text that begins like a position is read as one, and raises what is wrong with it (AngleError, FrameError).
    """
    asked = " ".join(text.split())
    if not asked:
        raise TargetError("target: nothing was given; expected a name, or a position such as '75.5 -6.2'")
    if len(asked) > LONGEST:
        raise TargetError(f"target '{one_line(asked)}': {len(asked)} characters long; expected a name or a position")
    if _looks_like_position(asked):
        return _position_target(asked, frame)
    for target in search(asked, frame=frame, year=year):
        if _is_whole(asked, target):
            return target
    numbered = _NUMBERED.match(asked)
    if numbered and numbered[2]:
        return make("deepsky", deepsky.find(asked), asked, year)
    if numbered or designations.parse(asked):
        return make("star", names.find(asked), asked, year)
    raise TargetError(
        f"target '{one_line(asked)}': in no list; expected a body, a star, a deep-sky object, a constellation, or a "
        f"position such as '75.5 -6.2' or 'ecliptic/mean/date 75.5 -6.2'{near_names(asked, _all_names())}"
    )


def prepare() -> None:
    """Read every table that a search needs, about 0.3 s of work, so that the first letter typed finds them ready."""
    search("a")


def _looks_like_position(text: str) -> bool:
    plane = re.split(r"[/@\s]", text, maxsplit=1)[0].casefold()
    if plane in PLANES:
        # "ecliptic" and "horizon" alone may begin the name of a point.
        return "/" in text or "@" in text or bool(re.search(r"\s\S*\d", text))
    # "61 Cyg" is a star: a position begins with a number and has no word but those of units.
    return bool(_POSITION.match(text)) and not re.search(r"[^\W\d_]{2,}", _UNIT.sub("", text))


def _position_target(text: str, frame: str) -> Target:
    used, lon, lat = position(text, frame)
    shown = angles.format_position(lon, lat, equatorial=used.is_equatorial)
    return Target("position", f"{used} {lon!r} {lat!r}", shown, used.label(), str(used), lon, lat)


@lru_cache(maxsize=4096)
def _simple(text: str) -> str:
    return designations.simplified(text)


def _tight(text: str) -> str:
    return _simple(text).replace(" ", "")


def _is_whole(asked: str, target: Target) -> bool:
    """Whether the text is a whole name of a target, not only its beginning."""
    match target.kind:
        case "star":
            every: Iterable[str] = names.identify(int(target.ref)).every
            whole = designations.parse(asked)
            if whole is not None and any(whole == name or whole == re.sub(r"\d+ ", " ", name) for name in every):
                return True
        case "deepsky":
            every = deepsky.names(int(target.ref))
        case "constellation":
            entry = constellations.find(str(target.ref))
            every = (entry.code, entry.name, entry.genitive)
        case "body":
            every = (str(target.ref), *BODY_NAMES[str(target.ref)])
        case _:
            every = next((listed for listed, *_ in POINTS if listed[0] == target.ref), (target.name,))
    bare = _ARTICLE.sub("", asked, count=1) if _ARTICLE.match(asked) else asked
    wanted = {_tight(bare), _tight(re.sub(r"(?i)^messier ", "m", bare))}
    return any(_tight(name) in wanted for name in every)


def _plain(asked: str, kind: Kind, ref: str | int, listed: Iterable[str]) -> Found | None:
    """Return how a text fits the names of one thing, or None."""
    wanted = _simple(asked)
    best: Found | None = None
    for name in listed:
        key = _simple(name)
        if key == wanted:
            return 0, kind, ref, name
        if key.startswith(wanted) and best is None:
            best = 1, kind, ref, name
    return best


def _bodies(asked: str, most: int) -> list[Found]:
    fits = (_plain(asked, "body", ref, listed) for ref, listed in BODY_NAMES.items())
    return [entry for entry in fits if entry][:most]


def _points(asked: str, most: int) -> list[Found]:
    fits = (_plain(asked, "point", listed[0], listed) for listed, *_ in POINTS)
    return [entry for entry in fits if entry][:most]


def _constellations(asked: str, most: int) -> list[Found]:
    fits = (
        _plain(asked, "constellation", entry.code, (entry.name, entry.code, entry.genitive))
        for entry in constellations.constellations()
    )
    return [entry for entry in fits if entry][:most]


def _stars(asked: str, most: int) -> list[Found]:
    found: list[Found] = []
    wanted = _tight(asked)
    whole = designations.parse(asked)
    for query in (asked, *_designations(asked)):
        for name, row in names.search(query, most):
            is_whole = _tight(name) == wanted or (whole is not None and name == whole)
            found.append((0 if is_whole else 1, "star", row, name))
    return found


def _designations(asked: str) -> list[str]:
    """Return the printed beginnings that a designation under way may have: "alpha taur" gives "α Tau"."""
    head, _, rest = asked.partition(" ")
    form = re.fullmatch(r"(?P<letter>[^\W\d_]+)(?P<index>\d{0,2})", head)
    letter = _LETTERS.get(form["letter"].casefold()) if form else None
    if not (form and letter):
        return []
    start = letter + form["index"].lstrip("0")
    if not rest:
        return [start]
    begun = _simple(rest)
    codes = [
        entry.code
        for entry in constellations.constellations()
        if any(_simple(word).startswith(begun) for word in (entry.code, entry.name, entry.genitive))
    ]
    return [f"{start} {code}" for code in codes]


def _deepsky(asked: str, most: int) -> list[Found]:
    wanted = _tight(asked)
    found: list[Found] = []
    for name, row in deepsky.search(asked, 2 * most):
        is_whole = _tight(name) == wanted
        if is_whole or not _is_hidden(row):
            found.append((0 if is_whole else 1, "deepsky", row, name))
    return found[:most]


def _is_hidden(row: int) -> bool:
    """Whether a listed object turned out to be a star or nothing: it is found by its whole name only."""
    return deepsky.TYPES[int(deepsky.everything().kind[row])][0] in deepsky.HIDDEN


def _words(asked: str, most: int) -> list[Found]:
    """Return the names that have a later word that begins so, the brightest first within a kind."""
    wanted = _simple(asked)
    if len(wanted) < 3:
        return []
    listed = _later_words()
    at = bisect_left(listed, (wanted,))
    found: list[tuple[int, Found]] = []
    while at < len(listed) and listed[at][0].startswith(wanted):
        _, order, kind, ref, name = listed[at]
        found.append((order, (2, kind, ref, name)))
        at += 1
    found.sort(key=lambda item: item[0])
    return [entry for _, entry in found[: 4 * most]]


@cache
def _later_words() -> tuple[tuple[str, int, Kind, str | int, str], ...]:
    """Return, sorted, what follows each blank in a name of several words, its order in its kind, and the name."""
    listed: list[tuple[str, int, Kind, str | int, str]] = []

    def add(kind: Kind, ref: str | int, order: int, name: str) -> None:
        words = _simple(name).split(" ")
        for i in range(1, len(words)):
            listed.append((" ".join(words[i:]), order, kind, ref, name))

    for order, (points, *_) in enumerate(POINTS):
        for name in points:
            add("point", points[0], order, name)
    add("body", "emb", 0, BODY_NAMES["emb"][0].replace("–", " "))
    for order, entry in enumerate(constellations.constellations()):
        add("constellation", entry.code, order, entry.name)
    rows, labels = names.labels("proper")
    for order, (row, name) in enumerate(zip(rows.tolist(), labels, strict=True)):
        add("star", row, order, name)
    for row, name in _common_names():
        add("deepsky", row, row, name)
    return tuple(sorted(listed, key=lambda item: item[:2]))


@cache
def _common_names() -> tuple[tuple[int, str], ...]:
    """Return row and name of the deep-sky objects that are called something other than a number in a list."""
    return tuple(
        (row, name)
        for row in range(len(deepsky.everything()))
        for name in deepsky.names(row)
        if not any(c.isdigit() for c in name) and not _is_hidden(row)
    )


@cache
def _all_names() -> tuple[str, ...]:
    """Return every name in words, for the near ones of a misspelt one."""
    listed = [name for group in BODY_NAMES.values() for name in group]
    listed += [name for points, *_ in POINTS for name in points]
    listed += [word for entry in constellations.constellations() for word in (entry.name, entry.genitive)]
    return tuple(dict.fromkeys([*listed, *names.labels("proper")[1], *(name for _, name in _common_names())]))
