"""The conversion that mends data: command lines ready to run, and what no conversion of axes can mend."""

from dataclasses import dataclass

import numpy as np

from colure.arrays import DEG, Float, cartesian, spherical
from colure.audit.hypotheses import Hypothesis
from colure.audit.numbers import Numbers
from colure.audit.reference import Question
from colure.audit.verdict import position_of


@dataclass(frozen=True, slots=True)
class Mending:
    """Commands to be run in order, and a note in words (either may be empty)."""

    commands: tuple[str, ...]
    note: str


def mend(hypothesis: Hypothesis, numbers: Numbers, question: Question) -> Mending:
    """Return how one position, written wrongly as the hypothesis says, is brought to what was claimed (else ICRS)."""
    lon, lat = position_of(hypothesis, numbers)
    target = question.claim or "icrs"
    if not (np.isfinite(lon) and np.isfinite(lat)):
        return Mending((), f"the position is not whole; it refers to the {hypothesis.axes.words}")
    axes = hypothesis.axes
    at = f" --at '{question.moment[0]}'" if question.moment is not None else ""
    commands: list[str] = []
    if axes.key == "twice":
        once = _undo("equator/mean/date", lon, lat, question)
        commands = [_line(lon, lat, "equator/mean/date", "icrs", at), _line(*once, "equator/mean/date", target, at)]
    elif axes.key == "backwards":
        commands = [_line(lon, lat, "icrs", "equator/mean/date", at)]
        if target != "icrs":
            forth = _forth("equator/mean/date", lon, lat, question)
            commands.append(_line(*forth, "icrs", target, at))
    elif axes.frame is not None and axes.frame != target:
        commands = [_line(lon, lat, axes.frame, target, at)]
    elif axes.key == "fk4-now" and question.moment is not None:
        import erfa

        year = float(erfa.epb(*question.moment[0].tt))
        commands = [_line(lon, lat, "equator/fk4/B1950", target, f"{at} --epoch {year:.2f}")]
    elif axes.frame is None:
        back = _back(hypothesis, lon, lat, question)
        commands = [_line(*back, "icrs", target, at)]
    return Mending(tuple(commands), _note(hypothesis, question, lon, lat, target, at))


def _line(lon: float, lat: float, source: str, target: str, rest: str) -> str:
    # `--at` is said only where a frame of the line moves.
    moves = any(name.partition("@")[0].endswith("/date") or name == "cirs" for name in (source, target))
    used = rest if moves else " --epoch" + rest.partition(" --epoch")[2] if " --epoch" in rest else ""
    return f'colure convert "{lon:.7f} {lat:+.7f}" --from {source} --to {target}{used}'


def _undo(frame: str, lon: float, lat: float, question: Question) -> tuple[float, float]:
    from colure import frames

    vector = frames.to_icrs(
        cartesian(lon * DEG, lat * DEG), frame, None if question.moment is None else question.moment[0]
    )
    return _degrees(vector)


def _forth(frame: str, lon: float, lat: float, question: Question) -> tuple[float, float]:
    from colure import frames

    at = None if question.moment is None else question.moment[0]
    return _degrees(frames.from_icrs(cartesian(lon * DEG, lat * DEG), frame, at))


def _back(hypothesis: Hypothesis, lon: float, lat: float, question: Question) -> tuple[float, float]:
    """Return ICRS degrees of a position on axes without a name, which are a rotation."""
    moment = None if question.moment is None else question.moment[:1]
    columns = hypothesis.axes.turn(np.eye(3)[:, None, :], moment)[:, 0]
    return _degrees(columns @ cartesian(lon * DEG, lat * DEG))


def _degrees(vector: Float) -> tuple[float, float]:
    lon, lat = spherical(vector)
    return float(lon / DEG), float(lat / DEG)


def _note(hypothesis: Hypothesis, question: Question, lon: float, lat: float, target: str, at: str) -> str:
    parts = []
    if hypothesis.reading.key != "read":
        parts.append(f"the numbers mean {lon:.6f}° {lat:+.6f}° ({hypothesis.reading.words})".replace("-", "−"))
    place = hypothesis.sight
    wanted = question.default_place(target.endswith("/date"))
    if place != wanted or hypothesis.shift is not None:
        if isinstance(question.reference, str):
            site = f" --site '{question.site.coordinates()}'" if question.site is not None else ""
            parts.append(
                f"a conversion changes axes only; compute anew: colure where {question.reference}{at} "
                f"--frame {target} --place {wanted}{site}"
            )
        else:
            star = question.reference.name
            known = star and not star.endswith(" position")
            again = f"; compute anew: colure ledger '{star}'{at} --frame {target} --place {wanted}" if known else ""
            parts.append(f"a conversion changes axes only; the place that is claimed is {wanted}{again}")
    return "; ".join(parts)
