"""Frame figures: a whole sky composed and painted into a picture, beside a bare painter and pyqtgraph."""

from dataclasses import replace

from PySide6.QtGui import QPainter

from colure.marks import Discs, Labels, Scene
from colure.session import Belt, Centre, Circle, Layers, Session, View
from colure_viewer import paint
from colure_viewer.app import application
from colure_viewer.bench.measure import Figure, Target, in_turn
from colure_viewer.bench.peers import bare_painter, new_image, pyqtgraph_items
from colure_viewer.compose import Chart, compose
from colure_viewer.themes import THEMES

HD = (1920, 1080, 1.0)
EIGHT = (
    "equator/mean/date",
    "ecliptic/mean/date",
    "ecliptic/mean/-1000",
    "equator/mean/J2000",
    "equator/mean/-1000",
    "galactic",
    "invariable",
    "horizon",
)
STEP_DAYS = 1.0
RUNS = 60


def session(limit: float) -> Session:
    """Return the session of the figures: whole sky, eight graduated circles, belt, edges, ten bodies, names."""
    demo = Session.demo()
    return replace(
        demo,
        view=View("azimuthal-equal-area", Centre("ecliptic/mean/date", 75.0, 6.0), width_deg=360.0, limit_mag=limit),
        circles=tuple(Circle(frame, graduated=True) for frame in EIGHT),
        belt=Belt(visible=True, divisions=True, crossings=True),
        layers=Layers(edges=True, deep_sky=False, milky_way=False, grid=None, constellation_names=False),
    )


class Film:
    """Frames in a row: each begins with the chart before it, as a window does."""

    def __init__(self, limit: float, page: tuple[int, int, float]) -> None:
        self.application = application()  # Qt forgets an application that nobody holds
        self.session = session(limit)
        self.page = page
        self.chart: Chart = compose(self.session, *page)
        self.image = new_image(self.chart.scene)
        self.theme = THEMES["paper"]
        self.turn = 0

    def paint(self) -> None:
        """The chart as it is, painted anew."""
        painter = QPainter(self.image)
        paint.draw(self.chart.scene, self.theme, painter)
        painter.end()

    def next_date(self) -> None:
        """Everything anew: the precession and the space motion of every star, the circles, the bodies."""
        self.session = replace(self.session, moment=self.session.moment.shifted(STEP_DAYS))
        self.chart = compose(self.session, *self.page, previous=self.chart)
        self.paint()

    def next_view(self) -> None:
        """The same moment, seen a little further along."""
        self.turn += 1
        centre = replace(self.session.view.centre, lon_deg=75.0 + 0.4 * self.turn)
        self.session = replace(self.session, view=replace(self.session.view, centre=centre))
        self.chart = compose(self.session, *self.page, previous=self.chart)
        self.paint()


def counts(scene: Scene) -> dict[str, float]:
    """Return how many of each thing the frame holds, for the record."""
    marks = [mark for layer in scene.layers for mark in layer.marks]
    labels = [mark for mark in marks if isinstance(mark, Labels)]
    return {
        "stars": float(scene.layer("stars").total),
        "discs": float(sum(len(mark.xy) for mark in marks if isinstance(mark, Discs) and mark.role == "star")),
        "labels": float(sum(len(mark.index) for mark in labels if mark.role.startswith("label"))),
        "figures": float(sum(len(mark.index) for mark in labels if mark.role.startswith("figure"))),
    }


def _full(limit: float, page: tuple[int, int, float], most_ms: float, *, judged: bool) -> Figure:
    film = Film(limit, page)
    for _ in range(8):
        film.next_date()
    jobs = {"colure": film.next_date, "paint": film.paint, "bare painter": bare_painter(film.chart.scene)}
    if judged:
        jobs["pyqtgraph items"] = pyqtgraph_items(film.chart.scene)
    times = in_turn(jobs, runs=RUNS, seconds=30.0, burst=6)
    targets = [Target("max", most_ms)]
    if judged:
        targets += [
            Target("x_floor", 2.0, "bare painter", times["bare painter"]),
            Target("x_faster", 8.0, "pyqtgraph items", times["pyqtgraph items"]),
        ]
    parts = {"paint_ms": times["paint"], "bare_painter_ms": times["bare painter"], **counts(film.chart.scene)}
    return Figure(times["colure"], "ms", tuple(targets), parts=parts)


def frame_full_v8() -> Figure:
    """Whole sky with stars to V 8, all recomputed for a new date."""
    return _full(8.0, HD, 8.0, judged=True)


def frame_full_v65() -> Figure:
    """Whole sky with stars to V 6.5, all recomputed for a new date."""
    return _full(6.5, HD, 5.0, judged=False)


def frame_full_v8_4k() -> Figure:
    """The same to V 8 on 3840×2160 device pixels, two to a logical pixel."""
    return _full(8.0, (1920, 1080, 2.0), 25.0, judged=False)


def frame_pan_v8() -> Figure:
    """Whole sky with stars to V 8, the view alone changed; labels are placed."""
    film = Film(8.0, HD)
    for _ in range(8):
        film.next_view()
    times = in_turn({"colure": film.next_view}, runs=RUNS)
    return Figure(times["colure"], "ms", (Target("max", 6.0),), parts=counts(film.chart.scene))
