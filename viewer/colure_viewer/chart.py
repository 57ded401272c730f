"""The chart on the screen: shows the session of the desk, with the selection and the measurement over it."""

from contextlib import suppress
from typing import TYPE_CHECKING

import numpy as np
from PySide6.QtCore import QLineF, QPointF, QRectF, QSize, QTimer, Signal
from PySide6.QtGui import QColor, QImage, QPainter, QPaintEvent, QPen, QResizeEvent
from PySide6.QtWidgets import QSizePolicy, QWidget

from colure import workload
from colure.errors import ColureError
from colure.marks import Scene
from colure.session import Session
from colure.sky import Sky
from colure.sky_layers import limit_of
from colure_viewer import paint
from colure_viewer.compose import Chart, compose
from colure_viewer.desk import Desk
from colure_viewer.fonts import SANS, font

if TYPE_CHECKING:
    from colure.pointing import Pointed
    from colure_viewer.jobs import Jobs


MOST_AT_ONCE = 90_000
"""Stars that are reduced and laid out between two frames without holding up the window."""
RETICLE = (9.0, 18.0)
"""Where the strokes about the selection begin and end, in logical pixels from it."""
LATER_MS, FOLLOW_MS = 250, 150


class ChartWidget(QWidget):
    """The sky, drawn by `paint`. Pointer and keys are `colure_viewer.hand`'s, which comes after the first chart.

    `painted` says that a chart has been on the screen for the first time, `completed` that a chart with very many
    stars, shown with fewer until then, is whole.
    """

    painted = Signal()
    completed = Signal()

    def __init__(self, desk: Desk, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._desk = desk
        self._chart: Chart | None = None
        self._composed: tuple[object, ...] | None = None
        self._image: QImage | None = None
        self._drawn: tuple[object, ...] | None = None
        self._shown_once = False
        self._jobs: Jobs | None = None
        self.whole = True
        self._good: Session | None = None
        self._bad: Session | None = None
        self._reason = ""
        self._later = QTimer(self)
        self._later.setSingleShot(True)
        self._later.setInterval(LATER_MS)
        self._later.timeout.connect(self._finish)
        self._following = QTimer(self)
        self._following.setSingleShot(True)
        self._following.setInterval(FOLLOW_MS)
        self._following.timeout.connect(self._follow)
        self.ends: tuple[Pointed, Pointed] | None = None
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Expanding)
        self.setAccessibleName("Sky chart")
        desk.changed.connect(self._changed)
        desk.selected.connect(self.update)
        desk.themed.connect(self.update)

    def sizeHint(self) -> QSize:
        """A chart is happy with any room; this is a good one."""
        return QSize(900, 700)

    def minimumSizeHint(self) -> QSize:
        """Below this the title block would be cut."""
        return QSize(380, 320)

    # What is drawn

    def renew(self) -> None:
        """Compose the chart anew at the next look: what lies outside the session, such as a file, has changed."""
        self._composed = None
        self.update()

    @property
    def chart(self) -> Chart:
        """The chart of the session as the widget shows it, composed now if need be."""
        session, ratio = self._desk.session, self.devicePixelRatioF()
        key = (session, self.width(), self.height(), ratio)
        if self._chart is None or self._composed != key:
            light = workload.lighter(session, MOST_AT_ONCE)
            self._chart = self._compose(light)
            self._composed = key
            self.whole = light is session
            if not self.whole:
                self._later.start()
        return self._chart

    def _compose(self, session: Session) -> Chart:
        return compose(session, max(self.width(), 1), max(self.height(), 1), self.devicePixelRatioF(), self._chart)

    def use_jobs(self, jobs: "Jobs") -> None:
        """Let charts with very many stars be finished beside the window."""
        self._jobs = jobs
        if not self.whole:
            self._later.start()

    def _finish(self) -> None:
        """Compose the chart with all of its stars; until then fewer are shown, and the legend says down to which."""
        if self.whole or self._jobs is None or self._composed is None:
            return
        key, session = self._composed, self._desk.session
        size, ratio = (max(self.width(), 1), max(self.height(), 1)), self.devicePixelRatioF()

        def done(chart: Chart) -> None:
            if self._composed == key:
                self._chart, self.whole = chart, True
                self.update()
                self.completed.emit()

        limit = f"{limit_of(session.view):g}"
        self._jobs.run(f"Stars to {limit} mag", lambda: compose(session, *size, ratio), done, self._desk.faulted.emit)

    @property
    def current(self) -> Chart | None:
        """The chart of the session, or the last one where that cannot be drawn; None where there never was one."""
        try:
            return self.chart
        except ColureError:
            return self._chart

    @property
    def scene(self) -> Scene:
        """The scene of the current chart."""
        return (self.current or self.chart).scene

    @property
    def sky(self) -> Sky:
        """The sky of the current chart."""
        return (self.current or self.chart).sky

    def check(self, session: Session) -> None:
        """Compose a session that is about to be shown; raise its ColureError, the chart staying as it is."""
        light = workload.lighter(session, MOST_AT_ONCE)
        self._chart = self._compose(light)
        self._composed = (session, self.width(), self.height(), self.devicePixelRatioF())
        self.whole = light is session
        if not self.whole:
            self._later.start()

    def _changed(self, transient: bool) -> None:
        if self._desk.selection is not None:
            # While time runs the figures follow a few times a second, the ring at every frame.
            if transient:
                if not self._following.isActive():
                    self._following.start()
            else:
                self._follow()
        self.update()

    def _follow(self) -> None:
        """Bring the selected object to where it is now."""
        from colure import pointing

        self._following.stop()
        if self._desk.selection is not None and self._chart is not None:
            with suppress(ColureError):
                self._desk.select(pointing.again(self.sky, self._desk.selection))

    def paintEvent(self, event: QPaintEvent) -> None:
        """Draw the chart if anything in it has changed, then what lies over it."""
        chart: Chart | None
        try:
            chart = self.chart
            self._good, self._bad = self._desk.session, None
        except ColureError as fault:
            # Only a passing session, or the first of all, can be refused here: an action is checked before it is taken.
            chart = self._chart
            if self._bad is not self._desk.session:
                self._bad = self._desk.session
                QTimer.singleShot(0, lambda text=str(fault): self._refused(text))
        if chart is not None:
            key = (id(chart.scene), self._desk.theme.name)
            if self._drawn != key or self._image is None:
                self._draw(chart.scene)
                self._drawn = key
        painter = QPainter(self)
        if self._image is not None:
            painter.drawImage(QPointF(0.0, 0.0), self._image)
        else:
            self._say_empty(painter)
        if chart is not None:
            self._overlay(painter, chart.scene)
        painter.end()
        if not self._shown_once:
            self._shown_once = True
            QTimer.singleShot(0, self.painted.emit)

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A new size is a new chart."""
        super().resizeEvent(event)
        self.update()

    def _say_empty(self, painter: QPainter) -> None:
        """Say on the empty page why there is no chart."""
        theme = self._desk.theme
        painter.fillRect(self.rect(), QColor(theme.colour("paper")))
        painter.setPen(QColor(theme.colour("fault")))
        painter.setFont(font(SANS, 15.0))
        # 0x1000 wraps words; the namespace Qt that names it is slow to import and not needed otherwise.
        box = self.rect().adjusted(40, 40, -40, -40)
        painter.drawText(box, 0x1000, f"This view cannot be drawn. {self._reason}" if self._reason else "")

    def _refused(self, text: str) -> None:
        if self._good is not None:
            self._desk.break_off(self._good, text)
        else:
            self._reason = text
            self._desk.faulted.emit(text)
            self.update()

    def _draw(self, scene: Scene) -> None:
        size = QSize(round(scene.width * scene.ratio), round(scene.height * scene.ratio))
        if self._image is None or self._image.size() != size:
            self._image = QImage(size, QImage.Format.Format_RGB32)
            self._image.setDevicePixelRatio(scene.ratio)
        painter = QPainter(self._image)
        paint.draw(scene, self._desk.theme, painter)
        painter.end()

    def _pixel(self, scene: Scene, pointed: "Pointed") -> QPointF | None:
        moving = self.sky["bodies"].vector(pointed.name.casefold()) if pointed.kind == "bodies" else None
        x, y = (float(v) for v in scene.projector.project(pointed.vector if moving is None else moving))
        left, top, right, bottom = scene.frame
        inside = np.isfinite([x, y]).all() and left <= x <= right and top <= y <= bottom
        return QPointF(x, y) if inside else None

    def _overlay(self, painter: QPainter, scene: Scene) -> None:
        theme = self._desk.theme
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        selection = self._desk.selection
        if selection is not None and (at := self._pixel(scene, selection)) is not None:
            painter.setPen(QPen(QColor(theme.colour("selection")), 2.0))
            # Four strokes on the diagonals: the object, its label beside it and the lines through it stay visible.
            near, far = RETICLE
            for right, down in ((1, 1), (1, -1), (-1, 1), (-1, -1)):
                step = QPointF(0.7071 * right, 0.7071 * down)
                painter.drawLine(at + step * near, at + step * far)
        if self.ends is not None:
            from colure import pointing

            a, b = (self._pixel(scene, end) for end in self.ends)
            if a is not None and b is not None:
                colour = QColor(theme.colour("measure"))
                painter.setPen(QPen(colour, 1.4))
                painter.drawLine(QLineF(a, b))
                for end in (a, b):
                    painter.drawEllipse(end, 3.0, 3.0)
                self._tag(painter, (a + b) / 2.0, pointing.measure(self.sky, *self.ends).text, colour)
        if self.hasFocus():
            painter.setRenderHint(QPainter.RenderHint.Antialiasing, False)
            painter.setPen(QPen(QColor(theme.colour("accent")), 1.0))
            painter.drawRect(QRectF(0.5, 0.5, self.width() - 1.0, self.height() - 1.0))

    def _tag(self, painter: QPainter, at: QPointF, text: str, colour: QColor) -> None:
        painter.setFont(font(SANS, 13.0))
        size = painter.fontMetrics().size(0, text)
        box = QRectF(at.x() + 10.0, at.y() - size.height() - 6.0, size.width() + 12.0, size.height() + 6.0)
        box.moveRight(min(box.right(), self.width() - 4.0))
        box.moveTop(max(box.top(), 4.0))
        painter.fillRect(box, QColor(self._desk.theme.colour("sky")))
        painter.setPen(colour)
        painter.drawText(QPointF(box.left() + 6.0, box.top() + 3.0 + painter.fontMetrics().ascent()), text)
