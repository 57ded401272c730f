"""From a session to a chart: the two calls of the core that a window, an export and a film all make."""

from dataclasses import dataclass

from colure import scene as scenes
from colure import sky as skies
from colure.marks import Scene
from colure.session import Session
from colure.sky import Sky


@dataclass(frozen=True, slots=True, eq=False)
class Chart:
    """The sky of a session and the scene drawn from it."""

    sky: Sky
    scene: Scene


def compose(session: Session, width: int, height: int, ratio: float, previous: Chart | None = None) -> Chart:
    """Return the chart of a session on a page of logical pixels; what has not changed since `previous` is kept."""
    sky = skies.compute(session, previous.sky if previous is not None else None)
    scene = scenes.build(sky, (width, height), ratio, previous.scene if previous is not None else None)
    return Chart(sky, scene)
