"""Ledger figures: the steps of a direction, and the direction in every frame, while the pointer moves."""

from collections.abc import Callable
from itertools import count

import numpy as np

from colure import everyframe, frames, ledger
from colure.arrays import MAS, Float, separation, unit
from colure.moment import Moment
from colure.reduction import Observer, reduce_stars
from colure.sites import DEMO
from colure_viewer.bench.measure import Accuracy, Figure, Target, in_turn

FRAME = "horizon"
START = Moment(2461376.5, 0.4, "UTC")


def _directions() -> Callable[[], Float]:
    """Return a function that gives a new direction (3,) at every call, as a pointer on its way over the sky does."""
    turn = count()

    def following() -> Float:
        at = 1e-3 * next(turn)
        return unit(np.array([np.cos(at), np.sin(at), 0.4 + 0.3 * np.sin(7.0 * at)]))

    return following


def pointer_ledger() -> Figure:
    """The ledger of a bare direction to the observed place in the horizon, the longest there is; new at every call.

    The parts are the same without a site, the table of every frame beside it, and the ledger while time runs.
    """
    at_site = Observer("site", DEMO)
    following = _directions()
    minutes = count(1)

    def steps() -> object:
        return ledger.direction(following(), START, seen="observed", observer=at_site, place="observed", frame=FRAME)

    def from_the_earth() -> object:
        return ledger.direction(following(), START, seen="apparent", frame="ecliptic/true/date")

    def every_frame() -> object:
        return everyframe.table(following(), START, site=DEMO)

    def running() -> object:
        moment = START.shifted(next(minutes) / 1440.0)
        return ledger.direction(following(), moment, seen="observed", observer=at_site, place="observed", frame=FRAME)

    jobs = {"steps": steps, "geocentric": from_the_earth, "every_frame": every_frame, "time_runs": running}
    times = in_turn(jobs, runs=300)
    parts = {name: value for name, value in times.items() if name != "steps"}
    return Figure(times["steps"], "ms", (Target("max", 3.0),), _against_the_fast_answer(at_site), parts)


def _against_the_fast_answer(observer: Observer) -> Accuracy:
    """Return how far the end of a ledger is from the vectorised answer for the same direction."""
    here = _directions()()
    found = ledger.direction(here, START, observer=observer, place="observed", frame=FRAME)
    fast = reduce_stars(here[None, :], None, None, START, observer=observer, place="observed")
    there = frames.from_icrs(np.asarray(fast), FRAME, START, DEMO)[0]
    return Accuracy(float(separation(found.vector, there)) / MAS, "mas", 2e-4, "the vectorised path, 1e-12 rad")
