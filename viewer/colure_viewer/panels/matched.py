"""What an overlay's match to the catalogue says, in lines."""

from typing import TYPE_CHECKING

from colure.angles import MINUS, format_number

if TYPE_CHECKING:
    from colure.overlays.matching import Match


def lines(found: "Match") -> tuple[str, ...]:
    """Return the reading, then the fitted shift, turn, scale and scatter, and what must be minded."""
    out = [found.verdict]
    if found.by_chance >= 0.5:
        out.append(f"{found.by_chance:.0f} matches would be found by chance")
    fit = found.fit
    if fit is None:
        return (*out, *found.notes)
    east, north, turn, scale = fit.sigma
    parts = (("shift east", fit.east_arcsec, east), ("north", fit.north_arcsec, north), ("turn", fit.turn_arcsec, turn))
    out.append("fitted: " + ", ".join(f"{name} {signed(value, sigma)}" for name, value, sigma in parts))
    if fit.has_scale:
        out.append(f"scale {format_number(fit.scale, 7)} ± {max(scale, 1e-7):.1g}")
    else:
        out.append("no scale: the rows lie all over the sky")
    out.append(
        f"rms {angle(fit.rms_arcsec)} after it, median {angle(fit.before_arcsec)} before; {fit.count:,} rows used"
    )
    return (*out, *found.notes)


def angle(arcsec: float) -> str:
    """Return an angle in the unit that suits it, with three figures."""
    for unit, size in (("°", 3600.0), ("′", 60.0)):
        if arcsec >= 2.0 * size:
            return f"{arcsec / size:.3g}{unit}"
    return f"{max(arcsec, 1e-4):.3g}″"


def signed(arcsec: float, sigma: float) -> str:
    """Return an angle with its sign and its uncertainty, both in arcseconds."""
    places = 4
    for places in range(5):
        if sigma >= 10.0**-places:
            break
    text = f"{arcsec:+.{places + 1}f}″ ± {sigma:.{places + 1}f}″"
    return text.replace("-", MINUS)
