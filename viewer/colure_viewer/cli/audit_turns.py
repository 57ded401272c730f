"""What `colure audit` says of position angles, offsets and rates."""

import numpy as np

from colure import audit
from colure.angles import MINUS, parse_angle
from colure.audit import TurnPredictions, View
from colure.errors import AngleError, MomentError
from colure_viewer.cli.audit_answers import Asked, Found, held_against
from colure_viewer.cli.output import Answer, aligned


def _view(asked: Asked) -> View:
    if asked.against is None or asked.true is None:
        raise AngleError("audit of an image: expected --against POSITION and --true with the right value")
    moment = asked.moment
    reference = held_against(asked, moment)
    if isinstance(reference, str):
        from colure.reduction import reduce_bodies

        if moment is None:
            raise MomentError(f"--against {reference}: it moves; give --at MOMENT")
        return View(
            reduce_bodies((reference,), moment[None], place="astrometric").vectors[0], moment[None], asked.ground
        )
    return View.of(reference, moment, asked.ground)


def position_angle(asked: Asked) -> Found:
    """Return the exit code and the answer on a position angle."""
    assert asked.pa is not None
    view = _view(asked)
    assert asked.true is not None
    pa, true = parse_angle(asked.pa, "--pa"), parse_angle(asked.true, "--true")
    half = audit.last_digit(asked.pa) if asked.rounding is None else asked.rounding / 3600.0
    found = audit.position_angles(pa, half, true, view, mirrored=asked.mirrored)
    return _turned(found, [f"{value:.4f}°" for value in found.predicted[:, 0]], f"position angle {asked.pa}°", asked)


def offset(asked: Asked) -> Found:
    """Return the exit code and the answer on an offset or a rate."""
    assert asked.offset is not None
    view = _view(asked)
    assert asked.true is not None
    given = _pair(asked.offset, "--offset")
    half = max(audit.last_digit(word) for word in given) if asked.rounding is None else asked.rounding
    x, y = (float(word) for word in given)
    true = tuple(float(word) for word in _pair(asked.true, "--true"))
    found = audit.offsets(x, y, half, true, view)
    shown = [f"{dx:.4f} {dy:.4f}" for dx, dy in found.predicted[:, 0]]
    return _turned(found, shown, f"offset {asked.offset}", asked)


def _pair(text: str, what: str) -> list[str]:
    words = text.replace(MINUS, "-").replace(",", " ").split()
    try:
        sound = len(words) == 2 and all(np.isfinite(float(word)) for word in words)
    except ValueError:
        sound = False
    if not sound:
        raise AngleError(f"{what} '{text[:60]}': expected two numbers in one pair of quotes")
    return words


def _turned(found: TurnPredictions, predicted: list[str], head: str, asked: Asked) -> Found:
    judged = audit.judge(found.n_sigma)
    inside = found.n_sigma[:, 0] <= audit.WITHIN
    order = np.argsort(found.n_sigma[:, 0], kind="stable")
    count = int(inside.sum())
    status = "none" if not count else "certain" if judged.certain[0] else "likely" if count == 1 else "class"
    best = found.hypotheses[int(order[0])]
    verdict = {
        "none": f"none of these: the nearest is {best.words} at {found.n_sigma[order[0], 0]:.3g} σ",
        "class": f"one of {count} that this rounding cannot tell apart, the nearest: {best.words} [{best.code}]",
    }.get(status, f"{best.words} [{best.code}]")
    records = [
        {
            "status": status,
            "verdict": verdict,
            "rank": rank,
            "code": found.hypotheses[at].code,
            "explanation": found.hypotheses[at].words,
            "n_sigma": float(found.n_sigma[at, 0]),
            "in_class": bool(inside[at]),
            "predicted": predicted[at],
        }
        for rank, at in enumerate(order[: asked.most], 1)
    ]

    def text() -> str:
        rows = [
            [
                "·" if one["in_class"] else "",
                f"{one['n_sigma']:.3g}",
                str(one["predicted"]),
                str(one["code"]),
                str(one["explanation"]),
            ]
            for one in records
        ]
        table = aligned(["in 3σ", "σ", "predicted", "code", "explanation"], rows, left=(0, 3, 4))
        return "\n".join([head.replace("-", MINUS), f"{status}: {verdict}", "", table])

    return (1 if status == "none" else 0), Answer(records, text)
