"""A ledger in writing: records with the documented keys, aligned text, JSON and CSV."""

import csv
import io
import json
import math
from typing import Any

import numpy as np

from colure import angles, everyframe
from colure.arrays import DEG, separation
from colure.bodies import CAUTION_DEG, FROM_EARTH
from colure.errors import SpanError
from colure.frames import Frame
from colure.ledger.doubt import IN_EPHEMERIS
from colure.ledger.entries import Entry, Ledger
from colure.reduction import reduce_bodies

_EQUATORIAL, _OTHER = Frame("icrs"), Frame("galactic")
_DASH = angles.UNKNOWN
CAUTION = (
    f"CAUTION: within {CAUTION_DEG:g}° of the Sun. Pointing optics near the Sun injures eyes and instruments; follow"
    " the rules of your site."
)


def records(ledger: Ledger, *, matrices: bool = False) -> list[dict[str, Any]]:
    """Return one record for each step; unknown figures are NaN. `matrices` adds those of the turns, by rows.

    A covariance that was given with the position stands in every record as `sigma_lon_arcsec` (times cos lat),
    `sigma_lat_arcsec` and `correlation` of the direction after the step.
    """
    found = []
    for number, entry in enumerate(ledger.entries, start=1):
        record: dict[str, Any] = {
            "number": number,
            "step": entry.step,
            "frame": entry.frame,
            "lon_deg": entry.lon_deg,
            "lat_deg": entry.lat_deg,
            "size_arcsec": entry.size_arcsec,
            "pa_deg": entry.pa_deg,
            "model": entry.model,
            "uncertainty_arcsec": entry.uncertainty_arcsec,
            "source": entry.source,
            "omitted": entry.omitted,
        }
        if any(other.covariance is not None for other in ledger.entries):
            record |= _sigmas(entry)
        if matrices:
            record["matrix"] = None if entry.matrix is None else entry.matrix.tolist()
        found.append(record)
    return found


def _sigmas(entry: Entry) -> dict[str, float]:
    if entry.covariance is None:
        return {"sigma_lon_arcsec": math.nan, "sigma_lat_arcsec": math.nan, "correlation": math.nan}
    (xx, xy), (_, yy) = entry.covariance
    product = math.sqrt(max(float(xx * yy), 0.0))
    return {
        "sigma_lon_arcsec": math.sqrt(max(float(xx), 0.0)),
        "sigma_lat_arcsec": math.sqrt(max(float(yy), 0.0)),
        "correlation": float(xy) / product if product else math.nan,
    }


def heading(ledger: Ledger) -> dict[str, Any]:
    """Return what every record of a ledger has in common."""
    moment, observer = ledger.moment, ledger.observer
    common: dict[str, Any] = {
        "body": ledger.target,
        "kind": ledger.kind,
        "utc": moment.isot("UTC") if bool(np.all(moment.has_utc)) else None,
        "tt_jd": float(moment.jd_tt),
        "ut1_jd": float(moment.ut1[0]) + float(moment.ut1[1]),
        "delta_t_s": float(moment.delta_t_s),
        "calendar": str(moment.calendar_used),
        "to_frame": ledger.frame,
        "place": ledger.place,
        "origin": observer.origin,
    }
    if observer.origin == "site":
        common["site"] = str(observer.site)
    if observer.origin in FROM_EARTH:
        common["caution"] = near_sun(ledger)
    return common | ledger.given


def near_sun(ledger: Ledger) -> bool:
    """Return whether the direction lies within CAUTION_DEG of the Sun, seen from the Earth or a site on it."""
    if ledger.observer.origin not in FROM_EARTH:
        return False
    try:
        sun = reduce_bodies(("sun",), ledger.moment, observer=ledger.observer, place="astrometric").vectors[0]
    except SpanError:
        return False  # no Sun, no telescope
    return bool(separation(sun, ledger.direction) < CAUTION_DEG * DEG)


def full_records(ledger: Ledger, *, matrices: bool = False) -> list[dict[str, Any]]:
    """Return the records of `records` with the keys of `heading` before each."""
    common = heading(ledger)
    return [{**common, **record} for record in records(ledger, matrices=matrices)]


def as_json(ledger: Ledger, *, matrices: bool = False) -> str:
    """Return the full records as a JSON array; unknown figures are null."""
    plain = [
        {key: None if isinstance(value, float) and not math.isfinite(value) else value for key, value in record.items()}
        for record in full_records(ledger, matrices=matrices)
    ]
    return json.dumps(plain, ensure_ascii=False, indent=1)


def as_csv(ledger: Ledger) -> str:
    """Return the full records as CSV with a header line; unknown figures are empty."""
    rows = full_records(ledger)
    out = io.StringIO()
    writer = csv.DictWriter(out, list(dict.fromkeys(key for row in rows for key in row)), lineterminator="\n")
    writer.writeheader()
    for row in rows:
        writer.writerow({key: _cell(value) for key, value in row.items()})
    return out.getvalue()


def _cell(value: Any) -> Any:
    return "" if value is None or (isinstance(value, float) and not math.isfinite(value)) else value


def size_text(size_arcsec: float, sigma_arcsec: float = math.nan) -> str:
    """Return an angle between two directions with the figures that its uncertainty supports."""
    if not math.isfinite(size_arcsec):
        return _DASH
    sigma = sigma_arcsec if math.isfinite(sigma_arcsec) and sigma_arcsec > 0.0 else 1e-5
    sigma = max(sigma, 1e-5)
    if size_arcsec < 60.0:
        return f"{angles.format_number(size_arcsec, min(max(angles.decimals_for(sigma), 0), 5))}″"
    smallest, places = angles.dms_places(sigma)
    text = angles.format_dms(size_arcsec / 3600.0, min(places, 5), smallest=smallest, plus=False)
    return text.removeprefix("00°").lstrip("0")


def sigma_text(entry: Entry) -> str:
    """Return 1σ with two figures; a dash where it is unknown."""
    sigma = entry.uncertainty_arcsec
    if not math.isfinite(sigma):
        return _DASH
    if sigma == 0.0:
        return "0″"
    if sigma < 1e-6:
        return "<0.000001″"
    return f"{angles.format_number(sigma, min(max(1 - math.floor(math.log10(sigma)), 0), 6))}″"


def direction_texts(entry: Entry, sigma_arcsec: float) -> tuple[str, str]:
    """Return longitude and latitude of an entry as text, in hours where they are right ascensions."""
    frame = _EQUATORIAL if entry.equatorial else _OTHER
    return everyframe.texts(entry.lon_deg, entry.lat_deg, frame, max(sigma_arcsec, 1e-5))


def as_text(ledger: Ledger, *, matrices: bool = False) -> str:
    """Return a ledger as aligned lines for people and for the clipboard."""
    frame = Frame.parse(ledger.frame)
    observer = ledger.observer
    seen_from = str(observer.site) if observer.origin == "site" else observer.origin
    lines = [
        f"{ledger.target} · {ledger.place} place · {frame.label()} ({frame}) · from {seen_from}",
        f"{ledger.moment.text()} · ΔT {angles.format_number(float(ledger.moment.delta_t_s), 2)} s{_given(ledger)}",
    ]
    header = ("step", "size", "PA", "longitude", "latitude", "± step", "axes after it", "model")
    rows = []
    sum2 = 0.0
    for entry in ledger.entries:
        if math.isfinite(entry.uncertainty_arcsec):
            sum2 += entry.uncertainty_arcsec**2
        lon, lat = direction_texts(entry, math.sqrt(sum2))
        name = f"{entry.step} (left out)" if entry.omitted else entry.step
        angle = angles.format_degrees(round(entry.pa_deg, 1) % 360.0, 1) if math.isfinite(entry.pa_deg) else _DASH
        # The parallax of a body is as good as its ephemeris, whose doubt stands in the first line.
        digits = (
            math.sqrt(sum2) if (entry.uncertainty_arcsec, entry.source) == IN_EPHEMERIS else entry.uncertainty_arcsec
        )
        size = size_text(entry.size_arcsec, digits)
        rows.append((name, size, angle, lon, lat, sigma_text(entry), entry.frame, entry.model))
    lines += _aligned([header, *rows])
    known = ledger.uncertainty_arcsec
    unknown = [entry.step for entry in ledger.entries if not math.isfinite(entry.uncertainty_arcsec)]
    if known:
        total = f"{angles.format_number(known, min(max(1 - math.floor(math.log10(known)), 0), 6))}″"
        lines.append(f"end ± {total} (1σ)" + (f", without {', '.join(unknown)}: unknown" if unknown else ""))
    else:
        lines.append(f"end: 1σ unknown ({', '.join(unknown)})" if unknown else "end: exact, by definition")
    last = _sigmas(ledger.entries[-1])
    if math.isfinite(last["sigma_lon_arcsec"]):
        lines.append(
            f"covariance carried to the end: {last['sigma_lon_arcsec']:.3g}″ along longitude, "
            f"{last['sigma_lat_arcsec']:.3g}″ along latitude, correlation {last['correlation']:.3f}"
        )
    if near_sun(ledger):
        lines.append(CAUTION)
    if matrices:
        lines += _matrices(ledger)
    return "\n".join(lines)


def _given(ledger: Ledger) -> str:
    echo = ledger.given
    parts = []
    if "epoch" in echo:
        parts.append(f"position at {echo['epoch']}")
    if "pm_lon_mas_yr" in echo:
        east, north = (angles.format_number(echo[key], 2, plus=True) for key in ("pm_lon_mas_yr", "pm_lat_mas_yr"))
        parts.append(f"motion {east} {north} mas/yr")
    if echo.get("parallax_mas"):
        parts.append(f"parallax {angles.format_number(echo['parallax_mas'], 2)} mas")
        parts.append(f"radial velocity {angles.format_number(echo['rv_km_s'], 1, plus=True)} km/s")
    if "distance_au" in echo:
        parts.append(f"distance {echo['distance_au']:.7f} au")
    return "".join(f" · {part}" for part in parts)


def _aligned(rows: list[tuple[str, ...]]) -> list[str]:
    widths = [max(len(row[at]) for row in rows) for at in range(len(rows[0]))]
    left = (0, 6, 7)
    lines = []
    for row in rows:
        cells = [
            cell.ljust(width) if at in left else cell.rjust(width)
            for at, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return lines


def _matrices(ledger: Ledger) -> list[str]:
    lines = []
    for entry in ledger.entries:
        if entry.matrix is not None:
            lines += ["", f"{entry.step}: components before it to components on {entry.frame}"]
            lines += ["  ".join(f"{value:+.15f}".replace("-", angles.MINUS) for value in row) for row in entry.matrix]
    return lines
