"""What the audit's dialog asks of the core, and the answer as lines; no widget here, so that it can run beside it."""

import math
import shlex
from dataclasses import dataclass
from typing import Any

import numpy as np

from colure import audit, lookup
from colure.angles import MINUS
from colure.audit import Audit, Numbers, Question, Stars, TableFit
from colure.errors import AngleError, TargetError
from colure.frames import Frame
from colure.moment import Moment
from colure.overlays import Overlay, OverlayError
from colure.sites import Site

MOST = 40
"""Explanations that are listed."""
FEWEST = 5
"""Positions with which a rotation against the catalogue can be fitted."""
PLANES = {"fk4": "FK4 mean equator", "equator": "mean equator", "ecliptic": "mean ecliptic"}
TITLES = {
    "certain": "Certain",
    "likely": "Probable",
    "class": "Cannot be told apart",
    "fitted": "One unknown fitted",
    "none": "None of these",
}


@dataclass(frozen=True, slots=True)
class Asked:
    """The question: `numbers` or an overlay, and what they are held against: a name, a position, or "" (catalogue)."""

    numbers: Numbers | None
    overlay: Overlay | None
    against: str
    moment: Moment
    site: Site | None
    claim: str | None = None
    place: str | None = None


@dataclass(frozen=True, slots=True)
class Row:
    """One explanation in the list: whether it is in the class, figures as text, words, and its code."""

    inside: bool
    sigma: str
    off_lon: str
    off_lat: str
    words: str
    code: str


@dataclass(frozen=True, slots=True)
class Answer:
    """The answer: a title, the verdict, more lines, the explanations, and commands that mend."""

    status: str
    verdict: str
    lines: tuple[str, ...]
    rows: tuple[Row, ...]
    commands: tuple[str, ...]

    @property
    def title(self) -> str:
        """The verdict in a word or two."""
        return TITLES[self.status]

    @property
    def text(self) -> str:
        """The whole answer, for the clipboard."""
        listed = [
            "\t".join(("·" if row.inside else "", row.sigma, row.off_lon, row.off_lat, row.code, row.words))
            for row in self.rows
        ]
        return "\n".join([f"{self.title}: {self.verdict}", *self.lines, *self.commands, *listed])


def read(text: str, claim: str | None, rounding_arcsec: float | None) -> Numbers:
    """Return the positions of a text, one a line; AngleError names the line that cannot be read."""
    equatorial = claim is None or Frame.parse(claim).is_equatorial
    lines = [(at, line) for at, line in enumerate(text.splitlines(), 1) if line.strip()]
    if not lines:
        raise AngleError("no position: expected LON LAT, one position a line")
    parts = []
    for at, line in lines:
        try:
            parts.append(audit.read(line.strip(), equatorial=equatorial))
        except AngleError as fault:
            raise AngleError(f"line {at}: {fault}" if len(lines) > 1 else str(fault)) from None
    numbers = Numbers.of(
        *(np.concatenate([getattr(part, name) for part in parts]) for name in ("x", "y", "half_x", "half_y"))
    )
    return numbers if rounding_arcsec is None else numbers.rounded_to(rounding_arcsec)


def reference(text: str, moment: Moment) -> str | Stars:
    """Return the body, the star or the point that a text names."""
    target = lookup.find(text, frame="icrs", year=float(moment.julian_year))
    if target.kind == "body":
        return str(target.ref)
    if target.kind == "star":
        return Stars.of_ids([int(target.ref)], target.name)
    if target.frame is None or target.lon_deg is None or target.lat_deg is None:
        raise TargetError(f"'{text}': has no place to be held against")
    return Stars.point(target.lon_deg, target.lat_deg, target.frame, moment)


def answer(asked: Asked) -> Answer:
    """Return the answer to a question; ColureError where it cannot be asked."""
    if asked.overlay is not None:
        return _of_overlay(asked, asked.overlay)
    assert asked.numbers is not None
    if asked.against.strip():
        return _against(asked, asked.numbers)
    if len(asked.numbers) == 1:
        return _in_catalogue(asked, asked.numbers)
    if len(asked.numbers) < FEWEST:
        raise AngleError(
            f"{len(asked.numbers)} positions against the catalogue: expected one, or {FEWEST} and more; or name the "
            "body or the star"
        )
    numbers = asked.numbers
    found = audit.fit_unidentified(numbers.x % 360.0, numbers.y, half_arcsec=3600.0 * float(np.median(numbers.half_y)))
    return _of_fit(found, (), asked, "")


def _against(asked: Asked, numbers: Numbers) -> Answer:
    question = Question(reference(asked.against, asked.moment), asked.moment, asked.site, asked.claim, asked.place)
    return _of_audit(audit.ask(numbers, question))


def _in_catalogue(asked: Asked, numbers: Numbers) -> Answer:
    found = audit.audit_unknown(numbers, asked.moment, site=asked.site, claim=asked.claim, place=asked.place)
    if not found:
        return Answer("none", "no star of the catalogue stands there under any hypothesis", (), (), ())
    first = _of_audit(found[0].audit)
    others = [f"or {one.name}: {one.audit.verdict}" for one in found[1:]]
    chance = f"chance of an accidental meeting {found[0].audit.chance:.2g}"
    return Answer(
        first.status, f"{found[0].name}: {first.verdict}", (chance, *first.lines, *others), first.rows, first.commands
    )


def _of_audit(found: Audit) -> Answer:
    lines = _off(found)
    if len(found.members) > 1 and found.settled:
        lines.append("settled: " + "; ".join(f"{name} {value}" for name, value in found.settled.items()))
    if found.separation is not None:
        lines.append(f"what would decide: {found.separation.text}")
    if found.mending.note:
        lines.append(f"note: {found.mending.note}")
    inside = set(map(id, found.members))
    rows = [
        Row(
            id(one) in inside, _sigmas(one.n_sigma), offset(one.off_lon_arcsec), offset(one.off_lat_arcsec),
            one.hypothesis.words, one.hypothesis.code,
        )
        for one in found.candidates[: max(MOST, len(found.members))]
    ]  # fmt: skip
    fitted = [Row(False, _sigmas(fit.n_sigma), "", "", f"fitted: {fit.words}", fit.code) for fit in found.fits]
    return Answer(found.status, found.verdict, tuple(lines), (*fitted, *rows), found.mending.commands)


def _off(found: Audit) -> list[str]:
    """Return how far the position is from where it would be if it were what is claimed."""
    off = audit.from_claim(found.numbers, found.question) if len(found.numbers) == 1 else None
    if off is None:
        return []
    if not math.isfinite(off.ra):
        return [f"off {off.frame}, {off.place}: {off.distance / 3600.0:.1f}°"]
    parts = [f"Δα cos δ {offset(off.ra)}, Δδ {offset(off.dec)}", f"Δλ cos β {offset(off.lon)}, Δβ {offset(off.lat)}"]
    if math.isfinite(off.along):
        parts.append(f"along the motion {offset(off.along)}, across {offset(off.across)}")
    return [f"off {off.frame}, {off.place}: " + "; ".join(parts)]


def _of_overlay(asked: Asked, overlay: Overlay) -> Answer:
    from colure.arrays import DEG
    from colure.overlays.store import STORE
    from colure.tables import Positions

    rows = STORE.rows(overlay)
    if rows is None:
        raise OverlayError(STORE.fault(overlay) or f"overlay '{overlay.title}': an image has no positions to audit")
    lon, lat = rows.lon / DEG, rows.lat / DEG
    if asked.against.strip():
        halves = [audit.half_digit_deg(rows.table.column(name)) for name in (overlay.lon, overlay.lat)]
        return _against(asked, Numbers.of(lon, lat, *halves))
    read_as = Positions(rows.table, lon, lat, overlay.lon, overlay.lat, (), ())
    found, notes = audit.date_table(read_as)
    return _of_fit(found, notes, asked, overlay.path)


def _of_fit(found: TableFit, notes: tuple[str, ...], asked: Asked, path: str) -> Answer:
    best = found.best
    letter = "B" if best.kind == "fk4" else "J"
    year = f"{letter}{_pm(best.year, best.sigma)}"
    verdict = f"{PLANES[best.kind]} and equinox of {year}, as {best.frame}"
    lines = list(notes)
    unsure = False
    for other in found.models[1:]:
        apart = other.cost - best.cost
        alike = apart < audit.SURE_COST
        unsure |= alike
        said = "these rows cannot tell the two apart" if alike else "fits worse"
        lines.append(f"or {other.frame} ({_pm(other.year, other.sigma)}): {said} (Δχ² {apart:.1f})")
    agree = f"{int(found.good.sum()):,} of {int((found.rows >= 0).sum()):,} stars agree"
    lines.append(f"{agree}, scatter {found.sigma_arcsec:.3g}″ in a coordinate")
    if math.isfinite(found.obliquity_arcsec):
        error = f"{offset(found.obliquity_arcsec)} ± {found.obliquity_sigma_arcsec:.2g}″"
        lines.append(f"error of the obliquity that the table implies: {error}")
    if math.isfinite(found.epoch_sigma):
        lines.append(f"mean epoch of the places by proper motion: {_pm(found.epoch, found.epoch_sigma)}")
    bad = np.flatnonzero((found.rows >= 0) & ~found.good) + 1
    if len(bad):
        shown = ", ".join(map(str, bad[:20])) + (f" … {len(bad)} in all" if len(bad) > 20 else "")
        lines.append(f"rows that do not agree with their star: {shown}")
    command = f"colure convert --table {shlex.quote(path)} --from {best.frame} --to {asked.claim or 'icrs'}"
    return Answer("class" if unsure else "fitted", verdict, tuple(lines), (), (command,) if path else ())


def _sigmas(value: float) -> str:
    return f"{value:.1f}" if value < 1e4 else "> 10 000"


def offset(arcsec: float) -> str:
    """Return a signed angle in arcseconds or degrees; a question mark where it is not known."""
    if not math.isfinite(arcsec):
        return "?"
    sign, size = MINUS if arcsec < 0.0 else "+", abs(arcsec)
    return sign + (f"{size / 3600.0:.3f}°" if size >= 3600.0 else f"{size:.3g}″" if size < 100.0 else f"{size:.0f}″")


def _pm(value: float, sigma: float) -> str:
    decimals = 4 if sigma < 1e-3 else 3 if sigma < 0.01 else 2 if sigma < 0.1 else 1 if sigma < 2.0 else 0
    return f"{value:.{decimals}f} ± {sigma:.{decimals}f}".replace("-", MINUS)


def names(overlays: tuple[Overlay, ...]) -> list[tuple[str, Any]]:
    """Return what can be audited: typed positions, or the tables on the chart."""
    return [("typed positions", None), *((one.title, one) for one in overlays if one.kind == "table")]
