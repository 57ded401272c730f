"""What `colure audit` finds, as records and in words: one function for each kind of question."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import click
import numpy as np

from colure import audit, lookup
from colure.angles import MINUS
from colure.audit import Audit, Question, Stars, TableFit
from colure.errors import AngleError, FrameError, MomentError, TargetError
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
    from colure_viewer.cli import audit_turns

    by_kind: dict[str, Callable[[Asked], Found]] = {
        "position": _position,
        "table": _table,
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


def _question(asked: Asked, reference: str | Stars, moment: Moment | None) -> Question:
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
    found = audit.ask(numbers, _question(asked, held_against(asked, moment), moment))
    return _code(found), Answer(_records(found, asked), lambda: _text(found, asked, _head(found, asked)))


def _code(found: Audit) -> int:
    return 1 if found.status == "none" else 0


def _unknown(asked: Asked, numbers: Any, moment: Moment | None) -> Found:
    stars = audit.audit_unknown(numbers, moment, site=asked.ground, claim=asked.claim, place=asked.place)
    records = [{"star": one.name, **record} for one in stars for record in _records(one.audit, asked)]

    def text() -> str:
        if not stars:
            return "none of these: no star of the catalogue stands there under any hypothesis"
        parts = []
        for one in stars:
            chance = f"accidental meeting {one.audit.chance:.2g}"
            parts.append(_text(one.audit, asked, f"{one.name} ({chance})"))
        return "\n\n".join(parts)

    return (0 if stars else 1), Answer(records, text)


def _head(found: Audit, asked: Asked) -> str:
    numbers = found.numbers
    halves = " × ".join(_arcsec(float(half) * 3600.0) for half in (numbers.half_x[0], numbers.half_y[0]))
    parts = [f"{asked.position or asked.table}", f"± {halves}"]
    reference = found.question.reference
    parts.append(f"against {reference if isinstance(reference, str) else reference.name or asked.against}")
    if found.question.moment is not None and found.question.moment.size == 1:
        parts.append(f"at {found.question.moment[0].text()}")
    if found.question.site is not None:
        parts.append(f"from {found.question.site}")
    parts.append(f"said to be {found.question.claim}" if found.question.claim else "nothing claimed")
    return " · ".join(parts)


def _arcsec(value: float) -> str:
    if value >= 3600.0:
        return f"{value / 3600.0:.3g}°"
    return f"{value:.3g}″"


def _records(found: Audit, asked: Asked) -> list[dict[str, Any]]:
    """Return one record for each explanation listed: the hypotheses by distance, then the fits."""
    dated = found.question.moment is not None and found.question.moment.size == 1
    echo: dict[str, Any] = {"status": found.status, "verdict": found.verdict, "claim": found.question.claim}
    if dated and found.question.moment is not None:
        echo |= moment_keys(found.question.moment[0])
    if found.question.site is not None:
        echo["site"] = str(found.question.site)
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
                "mend": "; ".join(found.mending.commands) if one is found.simplest else "",
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


def _text(found: Audit, asked: Asked, head: str) -> str:
    lines = [head, f"{found.status}: {found.verdict}"]
    if len(found.members) > 1 and found.settled:
        lines.append("settled: " + "; ".join(f"{name} {value}" for name, value in found.settled.items()))
    if found.separation is not None:
        lines.append(f"to decide: {found.separation.text}")
    lines += [f"mend: {command}" for command in found.mending.commands]
    if found.mending.note:
        lines.append(f"note: {found.mending.note}")
    rows = []
    for one in found.candidates[: max(asked.most, min(len(found.members), 20))]:
        inside = "·" if one in found.members else ""
        rows.append(
            [
                inside,
                f"{one.n_sigma:.1f}" if one.n_sigma < 1e4 else f"{one.n_sigma:.0e}",
                *(_offset_text(part) for part in (one.off_lon_arcsec, one.off_lat_arcsec)),
                one.hypothesis.code,
                one.hypothesis.words,
            ]
        )
    for fit in found.fits:
        rows.append(["fit", f"{fit.n_sigma:.1f}", "", "", fit.code, fit.words])
    table = aligned(["in 3σ", "σ", "lon off", "lat off", "code", "explanation"], rows, left=(0, 4, 5))
    return "\n".join([*lines, "", table])


def _offset_text(arcsec: float) -> str:
    if not np.isfinite(arcsec):
        return "?"
    sign = MINUS if arcsec < 0.0 else "+"
    size = abs(arcsec)
    return sign + (f"{size / 3600.0:.3f}°" if size >= 3600.0 else (f"{size:.3g}″" if size < 100.0 else f"{size:.0f}″"))


# Tables


def _table(asked: Asked) -> Found:
    from colure.tables import read_positions

    assert asked.table is not None
    equatorial = asked.claim is None or Frame.parse(asked.claim).is_equatorial
    read = read_positions(
        asked.table, lon=asked.lon_name, lat=asked.lat_name, equatorial=equatorial, skip_bad=asked.skip_bad
    )
    for line in (*read.notes, *read.rejected):
        click.echo(f"colure: {asked.table}: {line}", err=True)
    if asked.against is not None:
        return _body_table(asked, read)
    half = asked.rounding
    fit, notes = audit.date_table(read, identifiers=asked.id_name, magnitudes=asked.mag_name, half_arcsec=half)
    records = _fit_records(fit, asked)
    return 0, Answer(records, lambda: _fit_text(fit, asked, notes))


def _body_table(asked: Asked, read: Any) -> Found:
    """Explain the positions of one body at many moments together."""
    from colure.audit.tablefile import DATES, pick

    column = pick(read.table, asked.time_name, DATES)
    if column is None and asked.at is None:
        raise MomentError(f"table '{asked.table}': no column of moments is known by its name; name it with --time")
    moment = audit.moments(column) if column is not None else asked.moment
    if asked.rounding is not None:
        half_x = half_y = asked.rounding / 3600.0
    else:
        half_x = audit.half_digit_deg(read.table.column(read.lon_name))
        half_y = audit.half_digit_deg(read.table.column(read.lat_name))
    numbers = audit.Numbers.of(read.lon_deg, read.lat_deg, half_x, half_y)
    found = audit.ask(numbers, _question(asked, held_against(asked, moment), moment))
    head = _head(found, asked) + f" · {len(numbers)} rows together"
    return _code(found), Answer(_records(found, asked), lambda: _text(found, asked, head))


def _fit_records(fit: TableFit, asked: Asked) -> list[dict[str, Any]]:
    outliers = (np.flatnonzero((fit.rows >= 0) & ~fit.good) + 1).tolist()
    return [
        {
            "rank": rank,
            "frame": model.frame,
            "kind": model.kind,
            "equinox": model.year,
            "equinox_sigma": model.sigma,
            "epoch": fit.epoch,
            "epoch_sigma": fit.epoch_sigma,
            "rows": len(fit.rows),
            "matched": int((fit.rows >= 0).sum()),
            "agreeing": int(fit.good.sum()),
            "sigma_arcsec": model.sigma_row_arcsec,
            "left_x_arcsec": model.left_arcsec[0],
            "left_y_arcsec": model.left_arcsec[1],
            "left_z_arcsec": model.left_arcsec[2],
            "obliquity_error_arcsec": fit.obliquity_arcsec,
            "obliquity_error_sigma_arcsec": fit.obliquity_sigma_arcsec,
            "cost": model.cost,
            "disagreeing_rows": outliers if rank == 1 else [],
            "mend": f"colure convert --table {asked.table} --from {model.frame} --to {asked.claim or 'icrs'}",
        }
        for rank, model in enumerate(fit.models, 1)
    ]


def _fit_text(fit: TableFit, asked: Asked, notes: tuple[str, ...]) -> str:
    best = fit.best
    lines = [f"{asked.table} · {len(fit.rows)} rows", *notes]
    letter = "B" if best.kind == "fk4" else "J"
    plane = {"fk4": "FK4 mean equator", "equator": "mean equator", "ecliptic": "mean ecliptic"}[best.kind]
    lines.append(f"equinox {letter}{_pm(best.year, best.sigma)} ({plane} and equinox), as {best.frame}")
    for other in fit.models[1:]:
        apart = other.cost - best.cost
        said = "these rows cannot tell the two apart" if apart < audit.SURE_COST else "fits worse"
        lines.append(f"or {other.frame} ({_pm(other.year, other.sigma)}): {said} (Δχ² {apart:.1f})")
    agree = f"{int(fit.good.sum())} of {int((fit.rows >= 0).sum())} stars agree"
    lines.append(f"{agree}, scatter {_arcsec(fit.sigma_arcsec)} in a coordinate")
    left = ", ".join(
        f"{axis} {_offset_text(value)} ± {_arcsec(sigma)}"
        for axis, value, sigma in zip("xyz", best.left_arcsec, best.left_sigma_arcsec, strict=True)
    )
    lines.append(f"turn that no equinox explains, about the table's axes: {left}")
    if np.isfinite(fit.obliquity_arcsec):
        error = f"{_offset_text(fit.obliquity_arcsec)} ± {_arcsec(fit.obliquity_sigma_arcsec)}"
        lines.append(f"error of the obliquity that the table implies: {error}")
    if np.isfinite(fit.epoch_sigma):
        lines.append(f"mean epoch of the places by proper motion: {_pm(fit.epoch, fit.epoch_sigma)}")
    bad = np.flatnonzero((fit.rows >= 0) & ~fit.good) + 1
    if len(bad):
        shown = ", ".join(map(str, bad[:20])) + (f" … {len(bad)} in all" if len(bad) > 20 else "")
        lines.append(f"rows that do not agree with their star: {shown}")
    lines.append(f"mend: colure convert --table {asked.table} --from {best.frame} --to {asked.claim or 'icrs'}")
    return "\n".join(lines)


def _pm(value: float, sigma: float) -> str:
    decimals = 4 if sigma < 1e-3 else 3 if sigma < 0.01 else 2 if sigma < 0.1 else 1 if sigma < 2.0 else 0
    return f"{value:.{decimals}f} ± {sigma:.{decimals}f}".replace("-", MINUS)
