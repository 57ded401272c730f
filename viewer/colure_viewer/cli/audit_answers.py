"""What `colure audit` finds, as records and in words: one function for each kind of question."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from colure import audit, lookup
from colure.angles import MINUS
from colure.audit import Audit, Question, Stars
from colure.errors import AngleError, FrameError, TargetError
from colure.frames import Frame
from colure.moment import Moment
from colure.sites import Site
from colure_viewer.cli.output import Answer, aligned, moment_keys

Found = tuple[int, Answer]


@dataclass(frozen=True, slots=True)
class Asked:
    """The options as typed."""

    position: str | None
    table: Path | None
    against: str | None
    at: str | None
    site: str | None
    claim: str | None
    place: str | None
    origin: str | None
    exposure: float | None
    rounding: float | None
    pa: str | None
    mirrored: bool | None
    offset: str | None
    true: str | None
    lon_name: str | None
    lat_name: str | None
    id_name: str | None
    mag_name: str | None
    time_name: str | None
    skip_bad: bool
    most: int

    @property
    def moment(self) -> Moment | None:
        """The moment, if one was given."""
        return Moment.parse(self.at) if self.at else None

    @property
    def ground(self) -> Site | None:
        """The site, if one was given."""
        return Site.parse(self.site) if self.site else None


def answer(asked: Asked) -> Found:
    """Return the exit code and the answer to what was asked; refuse what contradicts itself."""
    kinds = [name for name in ("position", "table", "pa", "offset") if getattr(asked, name) is not None]
    if len(kinds) != 1:
        shown = " and ".join(kinds) or "nothing"
        raise AngleError(f"audit: {shown} given; expected one of 'LON LAT' in quotes, --table, --pa or --offset")
    if asked.origin == "site" and asked.site is None:
        raise FrameError("--origin site: no --site was given")
    if asked.true is not None and kinds[0] not in ("pa", "offset"):
        raise AngleError("--true: belongs to --pa or --offset; name the reference of a position with --against")
    if asked.claim is not None:
        Frame.parse(asked.claim)
    from colure_viewer.cli import audit_tables, audit_turns

    by_kind: dict[str, Callable[[Asked], Found]] = {
        "position": _position,
        "table": audit_tables.table,
        "pa": audit_turns.position_angle,
        "offset": audit_turns.offset,
    }
    return by_kind[kinds[0]](asked)


def held_against(asked: Asked, moment: Moment | None) -> str | Stars:
    """Return the body or the star that a text names."""
    assert asked.against is not None
    year = 2000.0 if moment is None else float(np.ravel(moment.julian_year)[0])
    target = lookup.find(asked.against, frame="icrs", year=year)
    if target.kind == "body":
        return str(target.ref)
    if target.kind == "star":
        return Stars.of_ids([int(target.ref)], target.name)
    if target.frame is None or target.lon_deg is None or target.lat_deg is None:
        raise TargetError(f"--against '{asked.against}': has no place")
    return Stars.point(target.lon_deg, target.lat_deg, target.frame, moment)


def question_of(asked: Asked, reference: str | Stars, moment: Moment | None) -> Question:
    """Return the question on a reference."""
    return Question(reference, moment, asked.ground, asked.claim, asked.place, asked.origin, asked.exposure)


def _numbers(asked: Asked) -> Any:
    assert asked.position is not None
    equatorial = asked.claim is None or Frame.parse(asked.claim).is_equatorial
    numbers = audit.read(asked.position, equatorial=equatorial)
    return numbers if asked.rounding is None else numbers.rounded_to(asked.rounding)


def _position(asked: Asked) -> Found:
    moment = asked.moment
    numbers = _numbers(asked)
    if asked.against is None:
        return _unknown(asked, numbers, moment)
    found = audit.ask(numbers, question_of(asked, held_against(asked, moment), moment))
    return exit_code(found), Answer(records_of(found, asked), lambda: worded(found, asked, heading(found, asked)))


def exit_code(found: Audit) -> int:
    """Return 1 where nothing explains the numbers, else 0."""
    return 1 if found.status == "none" else 0


def _unknown(asked: Asked, numbers: Any, moment: Moment | None) -> Found:
    stars = audit.audit_unknown(numbers, moment, site=asked.ground, claim=asked.claim, place=asked.place)
    records = [{"star": one.name, **record} for one in stars for record in records_of(one.audit, asked)]

    def text() -> str:
        if not stars:
            return "none of these: no star of the catalogue stands there under any hypothesis"
        parts = []
        for one in stars:
            chance = f"accidental meeting {one.audit.chance:.2g}"
            parts.append(worded(one.audit, asked, f"{one.name} ({chance})"))
        return "\n\n".join(parts)

    return (0 if stars else 1), Answer(records, text)


def heading(found: Audit, asked: Asked) -> str:
    """Return what was asked, in one line."""
    numbers = found.numbers
    halves = " × ".join(size_text(float(half) * 3600.0) for half in (numbers.half_x[0], numbers.half_y[0]))
    parts = [f"{asked.position or asked.table}", f"± {halves}"]
    reference = found.question.reference
    parts.append(
        f"against {reference if isinstance(reference, str) else reference.name or asked.against or 'its stars'}"
    )
    if found.question.moment is not None and found.question.moment.size == 1:
        parts.append(f"at {found.question.moment[0].text()}")
    if found.question.site is not None:
        parts.append(f"from {found.question.site}")
    parts.append(f"said to be {found.question.claim}" if found.question.claim else "nothing claimed")
    return " · ".join(parts)


def size_text(value: float) -> str:
    """Return an angle in arcseconds or degrees."""
    if value >= 3600.0:
        return f"{value / 3600.0:.3g}°"
    return f"{value:.3g}″"


def records_of(found: Audit, asked: Asked) -> list[dict[str, Any]]:
    """Return one record for each explanation listed: the hypotheses by distance, then the fits."""
    dated = found.question.moment is not None and found.question.moment.size == 1
    echo: dict[str, Any] = {"status": found.status, "verdict": found.verdict, "claim": found.question.claim}
    if dated and found.question.moment is not None:
        echo |= moment_keys(found.question.moment[0])
    if found.question.site is not None:
        echo["site"] = str(found.question.site)
    off = audit.from_claim(found.numbers, found.question) if len(found.numbers) == 1 else None
    if off is not None:
        echo |= {
            "off_ra_arcsec": off.ra,
            "off_dec_arcsec": off.dec,
            "off_lon_arcsec": off.lon,
            "off_lat_arcsec": off.lat,
            "off_along_arcsec": off.along,
            "off_across_arcsec": off.across,
        }
    records = []
    for rank, one in enumerate(found.candidates[: max(asked.most, len(found.members))], 1):
        hypothesis = one.hypothesis
        records.append(
            {
                **echo,
                "rank": rank,
                "code": hypothesis.code,
                "explanation": hypothesis.words,
                "n_sigma": one.n_sigma,
                "residual_arcsec": one.residual_arcsec,
                "residual_lon_arcsec": one.off_lon_arcsec,
                "residual_lat_arcsec": one.off_lat_arcsec,
                "in_class": one in found.members,
                "frame": hypothesis.axes.frame or "",
                "place": hypothesis.sight,
                "mend": "; ".join(_mending(found, asked)[0]) if one is found.simplest else "",
            }
        )
    for fit in found.fits:
        records.append(
            {
                **echo,
                "rank": len(records) + 1,
                "code": fit.code,
                "explanation": fit.words,
                "n_sigma": fit.n_sigma,
                "in_class": False,
                "frame": fit.frame or "",
                "fitted": fit.value,
                "fitted_sigma": fit.sigma,
                "fitted_unit": fit.unit,
            }
        )
    return records


def worded(found: Audit, asked: Asked, head: str) -> str:
    """Return the answer in words, under a heading."""
    lines = [head, f"{found.status}: {found.verdict}", *_residual_lines(found)]
    settled = [
        f"{name} {value}"
        for name, value in found.settled.items()
        if name != "moment" or found.question.moment is not None
    ]
    if len(found.members) > 1 and settled:
        lines.append("settled: " + "; ".join(settled))
    if found.separation is not None:
        lines.append(f"to decide: {found.separation.text}")
    commands, note = _mending(found, asked)
    lines += [f"mend: {command}" for command in commands]
    if note:
        lines.append(f"note: {note}")
    rows = []
    for one in found.candidates[: max(asked.most, min(len(found.members), 20))]:
        inside = "·" if one in found.members else ""
        rows.append(
            [
                inside,
                f"{one.n_sigma:.1f}" if one.n_sigma < 1e4 else f"{one.n_sigma:.0e}",
                *(offset_text(part) for part in (one.off_lon_arcsec, one.off_lat_arcsec)),
                one.hypothesis.code,
                one.hypothesis.words,
            ]
        )
    for fit in found.fits:
        rows.append(["fit", f"{fit.n_sigma:.1f}", "", "", fit.code, fit.words])
    table = aligned(["in 3σ", "σ", "lon off", "lat off", "code", "explanation"], rows, left=(0, 4, 5))
    return "\n".join([*lines, "", table])


def _mending(found: Audit, asked: Asked) -> tuple[tuple[str, ...], str]:
    """Return the commands that mend, and a note: of a table the whole file, where its axes have a name."""
    if asked.table is None or not found.members:
        return found.mending.commands, found.mending.note
    best, target = found.simplest.hypothesis, asked.claim or "icrs"
    if best.axes.frame is None or best.reading.key != "read" or best.shift is not None:
        return (), "no conversion of the file mends this; the first row is: " + "; ".join(found.mending.commands)
    wanted = found.question.default_place(target.endswith("/date"))
    note = "" if best.sight == wanted else f"the axes alone change; the places stay {best.sight}, not {wanted}"
    if best.axes.frame == target:
        return (), note
    moves = [name for name in (best.axes.frame, target) if Frame.parse(name).needs_moment]
    at = f" --at '{asked.at}'" if moves and asked.at else ""
    if moves and not asked.at:
        return (), f"every row is of its own moment, so the file cannot be converted at once. {note}".strip()
    return (f"colure convert --table {asked.table} --from {best.axes.frame} --to {target}{at}",), note


def _residual_lines(found: Audit) -> list[str]:
    off = audit.from_claim(found.numbers, found.question) if len(found.numbers) == 1 else None
    if off is None:
        return []
    from_what = f"off {off.frame}, {off.place}"
    if not np.isfinite(off.ra):
        return [f"{from_what}: {off.distance / 3600.0:.1f}°"]
    parts = [
        f"Δα cos δ {offset_text(off.ra)}, Δδ {offset_text(off.dec)}",
        f"Δλ cos β {offset_text(off.lon)}, Δβ {offset_text(off.lat)}",
    ]
    if np.isfinite(off.along):
        parts.append(f"along the motion {offset_text(off.along)}, across {offset_text(off.across)}")
    return [f"{from_what}: " + "; ".join(parts)]


def offset_text(arcsec: float) -> str:
    """Return a signed angle in arcseconds or degrees."""
    if not np.isfinite(arcsec):
        return "?"
    sign = MINUS if arcsec < 0.0 else "+"
    size = abs(arcsec)
    return sign + (f"{size / 3600.0:.3f}°" if size >= 3600.0 else (f"{size:.3g}″" if size < 100.0 else f"{size:.0f}″"))
