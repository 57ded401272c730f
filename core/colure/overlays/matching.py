"""Match an overlay to the star catalogue: which stars its rows are, what is left, and what that looks like."""

from dataclasses import dataclass

import numpy as np

from colure.arrays import ARCSEC, DEG, Float, Int
from colure.overlays import hypotheses
from colure.overlays.directions import native, of
from colure.overlays.fitting import Fit, fit, offsets
from colure.overlays.hypotheses import Reading, candidates, read_in
from colure.overlays.model import Overlay, OverlayError
from colure.overlays.starindex import nearest
from colure.overlays.store import STORE, Store

RADIUS = 60.0 * ARCSEC
"""How far from a row its star is looked for at first."""
SAMPLE, SCAN = 400, 120
"""Rows on which the usual frames are tried, and on which all equinoxes are."""
CHANCE_SHIFT = 0.31 * DEG
"""Where rows are moved to count stars that stand there by chance."""
FEW = 20
"""Fewer rows than this are not looked for in every equinox: a chance agreement would be believed."""
MOST_READ = 20_000
"""Matches on which the readings are compared."""
DEFAULT_EPOCH = 2000.0


@dataclass(frozen=True, slots=True, eq=False)
class Match:
    """What an overlay is against the catalogue.

    For M matched rows: `rows` (M,) their places in the store's rows, `stars` (M,) rows of the catalogue, `given` and
    `true` (M, 3) their directions on ICRS axes as declared and by the catalogue at `epoch`, `offsets_arcsec` (M, 2) the
    residuals east and north (catalogue − overlay). `fit` is None for fewer than three. `by_chance` is how many would
    have been found had the rows been anywhere. `verdict` is the reading in a sentence.
    """

    rows: Int
    stars: Int
    given: Float
    true: Float
    offsets_arcsec: Float
    total: int
    epoch: float
    by_chance: float
    fit: Fit | None
    readings: tuple[Reading, ...]
    verdict: str
    notes: tuple[str, ...] = ()

    def __len__(self) -> int:
        return len(self.rows)


@dataclass(frozen=True, slots=True)
class _Way:
    """A reading that finds stars: directions (N, 3) of all rows, or an equinox of a plane to be refined."""

    at: Float
    frame: str
    share: float


def match(overlay: Overlay, *, limit: float = 99.0, store: Store = STORE, keep: bool = True) -> Match:
    """Return the match of a table to the stars with V < `limit`, moved to the overlay's epoch.

    The rows are looked for as declared; where that fails, in every usual frame, and then in the mean equator or
    ecliptic of every year from −200 to 2100. OverlayError where the rows cannot be had. With `keep` the store holds the
    answer for the chart's arrows.
    """
    rows = store.rows(overlay)
    if rows is None:
        raise OverlayError(store.fault(overlay) or f"overlay '{overlay.path}': an image has no rows to match")
    notes: list[str] = []
    epoch = DEFAULT_EPOCH if overlay.epoch is None else overlay.epoch
    if overlay.epoch is None:
        notes.append("no epoch declared: the stars are taken where they were in 2000.0")
    vectors = native(rows)
    declared = of(overlay, None, None, store)
    assert declared is not None
    way, found, chance = _way(vectors, declared, overlay, epoch, limit)
    if way is None:
        what = "in none of the frames that were tried do these rows lie on stars of the catalogue"
        result = _nothing(len(rows), epoch, chance * len(rows), what, notes)
    else:
        result = _matched(vectors, declared, way, found, overlay, epoch, limit, chance, notes)
    if keep:
        store.keep_match(overlay, result)
    return result


def _nothing(total: int, epoch: float, chance: float, verdict: str, notes: list[str]) -> Match:
    none, empty = np.empty(0, np.int64), np.empty((0, 3))
    return Match(none, none, empty, empty, np.empty((0, 2)), total, epoch, chance, None, (), verdict, tuple(notes))


def _share(at: Float, epoch: float, limit: float, radius: float = RADIUS) -> float:
    stars, _, _ = nearest(at, radius, epoch, limit)
    return float((stars >= 0).mean())


def _way(
    vectors: Float, declared: Float, overlay: Overlay, epoch: float, limit: float
) -> tuple[_Way | None, list[tuple[str, float]], float]:
    """Return the reading in which most rows lie on stars, equinoxes worth a fit, and the share found by chance."""
    some = hypotheses.spread_sample(len(vectors), SAMPLE)
    chance = _share(hypotheses.shifted(declared[some], CHANCE_SHIFT), epoch, limit)
    floor = chance + max(0.1, 4.0 * np.sqrt(max(chance, 0.05) / len(some)))
    share = _share(declared[some], epoch, limit)
    best = _Way(declared, overlay.frame, share) if share > floor else None
    plane = hypotheses.plane(overlay.frame)
    found: list[tuple[str, float]] = [] if plane is None else [(plane, _equinox(overlay.frame))]
    if best is not None and best.share > 0.5:
        return best, found, chance
    for frame in candidates(overlay.frame, overlay.epoch)[1:]:
        at = read_in(vectors[some], frame, overlay.epoch)
        share = 0.0 if at is None else _share(at, epoch, limit)
        if at is not None and share > floor and (best is None or share > best.share + 0.05):
            whole = read_in(vectors, frame, overlay.epoch)
            assert whole is not None
            best = _Way(whole, frame, share)
            named = hypotheses.plane(frame)
            found = [] if named is None else [(named, _equinox(frame))]
    if (best is None or best.share < 0.5) and len(vectors) >= FEW:
        for name in ("equator", "ecliptic"):
            scanned = _scan(vectors, name, epoch, limit, floor)
            if scanned is not None and (best is None or scanned[1].share > best.share + 0.05):
                best, found = scanned[1], [(name, scanned[0])]
    return best, found, chance


def _equinox(frame: str) -> float:
    from colure.framenames import Frame

    jd1, jd2 = Frame.parse(frame).equinox_tt()
    return 2000.0 + (jd1 - 2451545.0 + jd2) / 365.25


def _scan(vectors: Float, name: str, epoch: float, limit: float, floor: float) -> tuple[float, _Way] | None:
    """Return the year whose mean plane puts most of a sample on stars, refined, or None where none stands out."""
    some = vectors[hypotheses.spread_sample(len(vectors), SCAN)]
    # Neighbouring years overlap: precession is 50″ a year.
    years = np.arange(hypotheses.FIRST_YEAR, hypotheses.LAST_YEAR, 1.6 * (RADIUS / ARCSEC) / 50.3)
    turned = np.einsum("yji,nj->yni", hypotheses.matrices(name, years), some)
    stars, _, _ = nearest(turned.reshape(-1, 3), RADIUS, epoch, limit)
    counts = (stars.reshape(len(years), -1) >= 0).mean(axis=1)
    at = int(np.argmax(counts))
    # The best of a thousand chances lies some four sigmas above their mean.
    chance = float(np.median(counts))
    if counts[at] < max(floor, chance + 5.0 * np.sqrt(max(chance, 1.0 / len(some)) / len(some))):
        return None
    year = float(years[at])
    more = vectors[hypotheses.spread_sample(len(vectors), 10 * SCAN)]
    for radius in (2.0 * RADIUS, RADIUS, RADIUS):
        here = more @ hypotheses.matrices(name, np.array([year]))[0]
        found, place, _ = nearest(here, radius, epoch, limit)
        good = found >= 0
        if int(good.sum()) < 3:
            return None
        fitted = hypotheses.fit_year(more[good], place[good], name, year)
        if fitted is None:
            return None
        year = fitted[0]
    whole = vectors @ hypotheses.matrices(name, np.array([year]))[0]
    return year, _Way(whole, name, _share(whole[hypotheses.spread_sample(len(whole), SAMPLE)], epoch, limit))


def _matched(
    vectors: Float,
    declared: Float,
    way: _Way,
    found: list[tuple[str, float]],
    overlay: Overlay,
    epoch: float,
    limit: float,
    chance: float,
    notes: list[str],
) -> Match:
    """Return the match along a reading that finds stars: near ones first, then as near as their scatter says."""
    stars, place, apart = nearest(way.at, RADIUS, epoch, limit)
    good = np.flatnonzero(stars >= 0)
    if len(good) >= 3:
        # What the reading leaves in common is taken off before the stars are settled.
        rough = fit(way.at[good], place[good])
        assert rough is not None
        left = np.hypot(rough.residuals[:, 0], rough.residuals[:, 1])
        sigma = max(float(np.median(left)) / 1.1774, 0.02 * ARCSEC)
        good = good[left <= max(8.0 * sigma, 1.0 * ARCSEC)]
        radius = min(RADIUS, float(apart[good].max()) if len(good) else RADIUS)
    else:
        radius = RADIUS
    given, true = declared[good], place[good]
    by_chance = chance * len(vectors) * (radius / RADIUS) ** 2
    if len(good) > 1 and len(np.unique(stars[good])) < len(good):
        twice = len(good) - len(np.unique(stars[good]))
        notes.append(f"{twice} rows lie on a star that another row lies on too")
    some = good[hypotheses.spread_sample(len(good), MOST_READ)]
    listed = hypotheses.readings(vectors[some], place[some], overlay.frame, overlay.epoch, found) if len(some) else ()
    fitted = fit(given, true)
    rest = offsets(given, true) / ARCSEC
    verdict = _verdict(listed, fitted, overlay, len(good), len(vectors))
    return Match(
        good, stars[good], given, true, rest, len(vectors), epoch, by_chance, fitted, listed, verdict, tuple(notes)
    )


def _amount(arcsec: float) -> str:
    """Return an angle in the unit that suits it, with as many digits as a scatter has."""
    if arcsec < 0.001:
        return "less than 0.001″"
    if arcsec < 60.0:
        return f"{arcsec:.2g}″"
    return f"{arcsec / 60.0:.3g}′" if arcsec < 6000.0 else f"{arcsec / 3600.0:.3g}°"


def _verdict(listed: tuple[Reading, ...], fitted: Fit | None, overlay: Overlay, count: int, total: int) -> str:
    """Return the reading in a sentence."""
    begin = f"{count:,} of {total:,} rows lie on stars"
    if not listed:
        return begin
    best = listed[0]
    like = [reading.words for reading in listed[1:] if not reading.separable and reading.year is None]
    also = f"; {len(like)} other readings cannot be told apart from it: {', '.join(like)}" if len(like) > 1 else ""
    also = f"; cannot be told apart from it: {like[0]}" if len(like) == 1 else also
    if best.frame == overlay.frame:
        return f"{begin}, as {best.words}, to {_amount(best.rms_arcsec)}{also}"
    declared = next((reading for reading in listed if reading.frame == overlay.frame), None)
    instead = "" if declared is None else f" instead of {_amount(declared.rms_arcsec)} as {declared.words}"
    return f"{begin} as if {best.words}, to {_amount(best.rms_arcsec)}{instead}{also}"
